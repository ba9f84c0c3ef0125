#include "whichacid/error.h"

#include <stdarg.h>
#include <stdio.h>

enum wa_status wa_fail(struct wa_error *error, enum wa_status status, const char *file, long line,
                       const char *format, ...)
{
    if (error != NULL) {
        error->status = status;
        error->line = line;
        snprintf(error->file, sizeof error->file, "%s", file != NULL ? file : "");
        va_list arguments;
        va_start(arguments, format);
        vsnprintf(error->message, sizeof error->message, format, arguments);
        va_end(arguments);
    }
    return status;
}

enum wa_status wa_fail_memory(struct wa_error *error)
{
    return wa_fail(error, WA_ERROR_MEMORY, NULL, 0, "There is not enough memory for this.");
}
