/* `identify`: the answer in the form that was asked for. */
#include "command/command.h"
#include "command/identify_request.h"

#include "whichacid/figure.h"
#include "whichacid/report.h"

#include <stdlib.h>
#include <string.h>
#include <strings.h>

enum identify_page identify_page_of(const struct identify_request *request)
{
    static const struct {
        const char *ending;
        enum identify_page page;
    } endings[] = {
        {".html", IDENTIFY_HTML},   {".htm", IDENTIFY_HTML},          {".pdf", IDENTIFY_PDF},
        {".md", IDENTIFY_MARKDOWN}, {".markdown", IDENTIFY_MARKDOWN},
    };
    const char *ending = request->output != NULL ? strrchr(request->output, '.') : NULL;
    for (size_t i = 0; i < sizeof endings / sizeof endings[0]; i++) {
        if (ending != NULL && !request->json && strcasecmp(ending, endings[i].ending) == 0) {
            return endings[i].page;
        }
    }
    return IDENTIFY_TEXT;
}

/* A page with its figures. Without gnuplot the page is made all the same, and the person told. */
static enum wa_status write_page(const struct identify_request *request,
                                 const struct wa_result *result, const char *version, bool as_pdf,
                                 char **bytes, size_t *size, struct wa_error *error)
{
    struct wa_figure_set figures;
    enum wa_status status = wa_figure_set_draw(result, &figures, error);
    if (status != WA_OK) {
        return status;
    }
    if (figures.missing[0] != '\0') {
        fprintf(stderr, "whichacid: the page has no figures: %s\n", figures.missing);
    }
    const struct wa_page_options options = {
        .version = version, .figures = &figures, .paper = request->paper};
    if (as_pdf) {
        status = wa_report_pdf(result, &options, bytes, size, error);
    } else {
        status = wa_report_html(result, &options, bytes, error);
        *size = status == WA_OK ? strlen(*bytes) : 0;
    }
    wa_figure_set_free(&figures);
    return status;
}

enum wa_status identify_write(const struct identify_request *request,
                              const struct wa_result *result,
                              const struct wa_report_options *options, struct wa_text *answer,
                              struct wa_error *error)
{
    const enum identify_page page = identify_page_of(request);
    char *bytes = NULL;
    size_t size = 0;
    enum wa_status status;
    if (page == IDENTIFY_HTML || page == IDENTIFY_PDF) {
        status = write_page(request, result, options->version, page == IDENTIFY_PDF, &bytes, &size,
                            error);
    } else {
        status = page == IDENTIFY_MARKDOWN
                     ? wa_report_markdown(result, options->version, &bytes, error)
                 : request->json ? wa_report_json(result, options, &bytes, error)
                                 : wa_report_text(result, options, &bytes, error);
        size = status == WA_OK ? strlen(bytes) : 0;
    }
    if (status == WA_OK) {
        wa_text_append_bytes(answer, bytes, size);
    }
    free(bytes);
    return status;
}
