/* The page as PDF: WeasyPrint lays the HTML out and loads nothing, for the page names nothing. */
#include "report/html_internal.h"

#include "base/process.h"

#include <stdlib.h>
#include <string.h>

static const int longest_seconds = 120;

static enum wa_status convert(const char *page, char **bytes, size_t *size, struct wa_error *error)
{
    static const char *const arguments[] = {"weasyprint", "--quiet", "--encoding", "utf-8",
                                            "-",          "-",       NULL};
    struct wa_process_output output;
    const enum wa_status status =
        wa_process_run(arguments, page, strlen(page), longest_seconds, &output, error);
    if (output.missing) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "PDF is made by WeasyPrint, which is not installed: install the Debian "
                       "package weasyprint, or write .html and print it from a browser.");
    }
    if (status != WA_OK) {
        return status;
    }
    if (output.size < 5 || memcmp(output.bytes, "%PDF-", 5) != 0) {
        free(output.bytes);
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "WeasyPrint gave no PDF; write .html and print it from a browser.");
    }
    *bytes = output.bytes;
    *size = output.size;
    return WA_OK;
}

enum wa_status wa_report_pdf(const struct wa_result *result, const struct wa_page_options *options,
                             char **bytes, size_t *size, struct wa_error *error)
{
    struct wa_page_options chosen = options != NULL ? *options : (struct wa_page_options){0};
    if (chosen.paper == WA_PAPER_OF_READER) {
        chosen.paper = WA_PAPER_A4;
    }
    char *page = NULL;
    enum wa_status status = wa_report_html(result, &chosen, &page, error);
    if (status == WA_OK) {
        status = convert(page, bytes, size, error);
    }
    free(page);
    return status;
}
