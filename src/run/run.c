#include "whichacid/run.h"

#include "base/text.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void wa_run_free(struct wa_run *run)
{
    if (run == NULL) {
        return;
    }
    free(run->file);
    free(run->heading);
    free(run->points);
    for (size_t i = 0; i < run->note_count; i++) {
        free(run->notes[i].name);
        free(run->notes[i].text);
    }
    free(run->notes);
    for (size_t i = 0; i < run->set_aside_count; i++) {
        free(run->set_aside[i].text);
        free(run->set_aside[i].reason);
    }
    free(run->set_aside);
    for (size_t i = 0; i < run->remark_count; i++) {
        free(run->remarks[i]);
    }
    free(run->remarks);
    *run = (struct wa_run){0};
}

void wa_run_list_free(struct wa_run_list *list)
{
    if (list == NULL) {
        return;
    }
    for (size_t i = 0; i < list->count; i++) {
        wa_run_free(&list->runs[i]);
    }
    free(list->runs);
    *list = (struct wa_run_list){0};
}

/* Room for one more element; the arrays of a run grow by doubling at powers of two. */
static void *grow_by_one(void *array, size_t count, size_t element_size)
{
    if (count != 0 && (count & (count - 1)) != 0) {
        return array;
    }
    return realloc(array, (count == 0 ? 1 : 2 * count) * element_size);
}

enum wa_status wa_run_remark(struct wa_run *run, struct wa_error *error, const char *format, ...)
{
    char sentence[1024];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(sentence, sizeof sentence, format, arguments);
    va_end(arguments);
    for (size_t i = 0; i < run->remark_count; i++) {
        if (strcmp(run->remarks[i], sentence) == 0) {
            return WA_OK;
        }
    }
    char **remarks = grow_by_one(run->remarks, run->remark_count, sizeof *remarks);
    if (remarks == NULL) {
        return wa_fail_memory(error);
    }
    run->remarks = remarks;
    remarks[run->remark_count] = wa_text_copy(sentence, strlen(sentence));
    if (remarks[run->remark_count] == NULL) {
        return wa_fail_memory(error);
    }
    run->remark_count++;
    return WA_OK;
}

enum wa_status wa_run_note(struct wa_run *run, const char *name, const char *text,
                           enum wa_origin origin, long line, struct wa_error *error)
{
    struct wa_note *notes = grow_by_one(run->notes, run->note_count, sizeof *notes);
    if (notes == NULL) {
        return wa_fail_memory(error);
    }
    run->notes = notes;
    char folded[128];
    size_t length = wa_text_fold(name, strlen(name), folded, sizeof folded);
    for (size_t i = 0; i < length; i++) {
        folded[i] = folded[i] == '_' || folded[i] == '-' ? ' ' : folded[i];
    }
    struct wa_note note = {
        .name = wa_text_copy(folded, length),
        .text = wa_text_copy(text, strlen(text)),
        .origin = origin,
        .line = line,
    };
    if (note.name == NULL || note.text == NULL) {
        free(note.name);
        free(note.text);
        return wa_fail_memory(error);
    }
    notes[run->note_count++] = note;
    return WA_OK;
}

enum wa_status wa_run_set_aside(struct wa_run *run, long line, const char *text, size_t length,
                                const char *reason, struct wa_error *error)
{
    struct wa_set_aside *rows = grow_by_one(run->set_aside, run->set_aside_count, sizeof *rows);
    if (rows == NULL) {
        return wa_fail_memory(error);
    }
    run->set_aside = rows;
    size_t shown = length;
    if (shown > 120) {
        for (shown = 120; shown > 0 && ((unsigned char)text[shown] & 0xC0) == 0x80;) {
            shown--;
        }
    }
    struct wa_set_aside row = {
        .line = line,
        .text = wa_text_copy(text, shown),
        .reason = wa_text_copy(reason, strlen(reason)),
    };
    if (row.text == NULL || row.reason == NULL) {
        free(row.text);
        free(row.reason);
        return wa_fail_memory(error);
    }
    rows[run->set_aside_count++] = row;
    return WA_OK;
}
