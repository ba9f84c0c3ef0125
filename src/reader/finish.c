/* What surrounds the points of each run: its heading, its notes, and the rows of words. */
#include "reader/reader_internal.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Rows [from, to) whose notes and words are a run's own. */
struct surroundings {
    uint32_t from, to;
    bool first; /* nothing but the head of the file stands above */
};

static struct surroundings surroundings_of(const struct wa_reading *reading, size_t i)
{
    const struct wa_span *span = &reading->spans[i];
    struct surroundings around = {.to = (uint32_t)reading->sheet.row_count, .first = true};
    for (size_t k = 0; k < reading->list.count; k++) {
        const struct wa_span *other = &reading->spans[k];
        if (other->last_row < span->first_row && other->last_row + 1 > around.from) {
            around.from = other->last_row + 1;
            around.first = false;
        }
        if (other->first_row > span->last_row) {
            around.to = span->last_row + 1;
        }
    }
    return around;
}

static bool has_note(const struct wa_run *run, const char *name)
{
    char folded[128];
    wa_text_fold(name, strlen(name), folded, sizeof folded);
    const char *known = wa_note_known_name(folded);
    return wa_run_find_note(run, known != NULL ? known : folded) != NULL;
}

static enum wa_status add_note(struct wa_run *run, const struct wa_sheet *sheet,
                               const struct wa_found_note *note, struct wa_error *error)
{
    enum wa_status status = wa_run_note(run, note->name, note->text, WA_ORIGIN_NOTE,
                                        (long)sheet->rows[note->row].line, error);
    if (status == WA_OK) {
        run->notes[run->note_count - 1].loose = note->loose;
    }
    return status;
}

/* Own notes first; then those at the head of the file that the run does not replace; then the
 * options. */
static enum wa_status give_notes(struct wa_reading *reading, size_t i, struct surroundings around,
                                 struct wa_error *error)
{
    struct wa_run *run = &reading->list.runs[i];
    const struct wa_found_notes *notes = &reading->notes;
    enum wa_status status = WA_OK;
    for (size_t k = 0; status == WA_OK && k < notes->count; k++) {
        const struct wa_found_note *note = &notes->notes[k];
        if (note->row >= around.from && note->row < around.to) {
            status = add_note(run, &reading->sheet, note, error);
        }
    }
    size_t own = run->note_count;
    for (size_t k = 0; status == WA_OK && !around.first && k < notes->count; k++) {
        const struct wa_found_note *note = &notes->notes[k];
        size_t all = run->note_count;
        run->note_count = own;
        bool replaced = has_note(run, note->name);
        run->note_count = all;
        if (note->row < reading->spans[0].first_row && !replaced) {
            status = add_note(run, &reading->sheet, note, error);
        }
    }
    for (size_t k = 0; status == WA_OK && k < reading->options->given_count; k++) {
        status = wa_run_note(run, reading->options->given[k].name, reading->options->given[k].text,
                             WA_ORIGIN_OPTION, 0, error);
    }
    return status;
}

/* The row of words nearest above the run's table or points. */
static const struct wa_row *heading_row(struct wa_reading *reading, size_t i,
                                        struct surroundings around)
{
    const struct wa_span *span = &reading->spans[i];
    const struct wa_table_part *table = &reading->tables[span->table];
    uint32_t below = span->first_row;
    if (table->header_row != SIZE_MAX && table->header_row >= around.from &&
        table->header_row < below) {
        below = (uint32_t)table->header_row;
    }
    for (uint32_t r = below; r > around.from; r--) {
        struct wa_row *row = &reading->sheet.rows[r - 1];
        bool words = row->kind == WA_ROW_WORDS || row->kind == WA_ROW_COMMENT ||
                     (row->kind == WA_ROW_NUMBERS && row->number_count == 1);
        if (words && !row->used) {
            row->used = true;
            return row;
        }
        if (!words && row->kind != WA_ROW_BLANK) {
            return NULL;
        }
    }
    return NULL;
}

static char *heading_from_row(const struct wa_sheet *sheet, const struct wa_row *row)
{
    struct wa_text heading = {0};
    for (size_t c = 0; c < row->cell_count && heading.length < 80; c++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        if (length > 0) {
            wa_text_append(&heading, "%s%.*s", heading.length > 0 ? " " : "",
                           (int)(length > 80 ? 80 : length), text);
        }
    }
    return heading.bytes;
}

/* Over the columns of one run: the cell above the header, else the header of the reading. */
static char *heading_from_columns(const struct wa_reading *reading, const struct wa_span *span)
{
    const struct wa_sheet *sheet = &reading->sheet;
    const struct wa_table_part *table = &reading->tables[span->table];
    size_t low = (size_t)(span->choice.volume < span->choice.reading ? span->choice.volume
                                                                     : span->choice.reading);
    if (table->header_row != SIZE_MAX && table->header_row > 0) {
        const struct wa_row *above = &sheet->rows[table->header_row - 1];
        for (size_t c = (size_t)span->choice.reading + 1; above->cell_count > 1 && c > low; c--) {
            size_t length;
            const char *text = wa_sheet_cell(sheet, above, c - 1, &length);
            if (length > 0 && length < 80) {
                return wa_text_copy(text, length);
            }
        }
    }
    const char *header = table->columns[span->choice.reading].text;
    char numbered[120];
    snprintf(numbered, sizeof numbered, "%s%scolumn %d", header, header[0] != '\0' ? ", " : "",
             span->choice.reading + 1);
    return wa_text_copy(numbered, strlen(numbered));
}

static bool stands_beside_others(const struct wa_reading *reading, size_t i)
{
    for (size_t k = 0; k < reading->list.count; k++) {
        if (k != i && reading->spans[k].table == reading->spans[i].table &&
            reading->spans[k].beside != reading->spans[i].beside) {
            return true;
        }
    }
    return false;
}

static enum wa_status give_heading(struct wa_reading *reading, size_t i, struct surroundings around,
                                   struct wa_error *error)
{
    struct wa_run *run = &reading->list.runs[i];
    if (reading->list.count < 2) {
        return WA_OK;
    }
    if (stands_beside_others(reading, i)) {
        run->heading = heading_from_columns(reading, &reading->spans[i]);
        return run->heading == NULL ? wa_fail_memory(error) : WA_OK;
    }
    int label = reading->tables[reading->spans[i].table].label_column;
    if (label >= 0) {
        size_t length;
        const struct wa_row *first = &reading->sheet.rows[reading->spans[i].first_row];
        const char *text = wa_sheet_cell(&reading->sheet, first, (size_t)label, &length);
        run->heading = wa_text_copy(text, length);
        return run->heading == NULL ? wa_fail_memory(error) : WA_OK;
    }
    const struct wa_row *row = heading_row(reading, i, around);
    if (row != NULL) {
        run->heading = heading_from_row(&reading->sheet, row);
        return run->heading == NULL ? wa_fail_memory(error) : WA_OK;
    }
    char counted[32];
    snprintf(counted, sizeof counted, "run %zu of the file", i + 1);
    run->heading = wa_text_copy(counted, strlen(counted));
    return run->heading == NULL ? wa_fail_memory(error) : WA_OK;
}

static int compare_lines(const void *a, const void *b)
{
    const struct wa_set_aside *x = a;
    const struct wa_set_aside *y = b;
    return (x->line > y->line) - (x->line < y->line);
}

static enum wa_status give_words(struct wa_reading *reading, size_t i, struct surroundings around,
                                 struct wa_error *error)
{
    struct wa_run *run = &reading->list.runs[i];
    const struct wa_span *span = &reading->spans[i];
    const struct wa_table_part *table = &reading->tables[span->table];
    for (uint32_t r = around.from; r < around.to && span->beside == 0; r++) {
        const struct wa_row *row = &reading->sheet.rows[r];
        bool outside = r < table->first_row || r >= table->end_row;
        bool words = row->kind == WA_ROW_WORDS || row->kind == WA_ROW_COMMENT ||
                     (row->kind == WA_ROW_NUMBERS && outside);
        if (!words || row->used) {
            continue;
        }
        const char *reason = row->kind == WA_ROW_COMMENT   ? "A comment."
                             : row->kind == WA_ROW_NUMBERS ? "A row outside the table."
                                                           : "A row of words.";
        enum wa_status status =
            wa_run_set_aside(run, (long)row->line, reading->sheet.text + row->text_start,
                             row->text_length, reason, error);
        if (status != WA_OK) {
            return status;
        }
    }
    if (run->set_aside_count > 1) {
        qsort(run->set_aside, run->set_aside_count, sizeof *run->set_aside, compare_lines);
    }
    return WA_OK;
}

enum wa_status wa_runs_finish(struct wa_reading *reading, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < reading->list.count; i++) {
        struct surroundings around = surroundings_of(reading, i);
        status = give_notes(reading, i, around, error);
        if (status == WA_OK) {
            status = give_heading(reading, i, around, error);
        }
        if (status == WA_OK) {
            status = give_words(reading, i, around, error);
        }
        if (status == WA_OK) {
            status = wa_run_apply_notes(&reading->list.runs[i], error);
        }
    }
    return status;
}
