#include "identify/identify_internal.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>

char *wa_sentence(const char *format, ...)
{
    char *text = NULL;
    va_list arguments;
    va_start(arguments, format);
    if (vasprintf(&text, format, arguments) < 0) {
        text = NULL;
    }
    va_end(arguments);
    return text;
}

enum wa_status wa_add_sentence(struct wa_result_sentence **list, size_t *count, const char *code,
                               char *sentence, struct wa_error *error)
{
    struct wa_result_sentence *larger =
        sentence != NULL ? realloc(*list, (*count + 1) * sizeof *larger) : NULL;
    if (larger == NULL) {
        free(sentence);
        return wa_fail_memory(error);
    }
    *list = larger;
    larger[(*count)++] = (struct wa_result_sentence){.code = code, .sentence = sentence};
    return WA_OK;
}
