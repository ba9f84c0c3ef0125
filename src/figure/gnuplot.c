/* One gnuplot a figure: the script goes in, the finished picture comes out. */
#include "figure/figure_internal.h"

#include "base/process.h"

static const int longest_seconds = 30;

enum wa_status figure_run(const struct wa_text *script, char **bytes, size_t *size,
                          struct wa_error *error)
{
    /* -d: the settings of the person or the machine do not change how a report looks. */
    static const char *const arguments[] = {"gnuplot", "-d", "-", NULL};
    struct wa_process_output output;
    if (script->failed || script->bytes == NULL) {
        return wa_fail_memory(error);
    }
    const enum wa_status status =
        wa_process_run(arguments, script->bytes, script->length, longest_seconds, &output, error);
    if (output.missing) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "Figures are drawn by gnuplot, which is not installed: install the Debian "
                       "package gnuplot-nox.");
    }
    if (status != WA_OK) {
        return status;
    }
    if (output.size == 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "gnuplot drew nothing%s%s; check that the Debian package gnuplot-nox is "
                       "complete.",
                       output.complaint[0] != '\0' ? ": " : "", output.complaint);
    }
    *bytes = output.bytes;
    *size = output.size;
    return WA_OK;
}
