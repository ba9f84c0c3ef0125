/* From a file to its runs: the steps in order, and the sentences for what is no titration. */
#include "reader/reader_internal.h"

#include "base/file.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* A comma that parts the cells and marks the decimals at once: 0,50,2,83. */
static bool comma_is_both(const struct wa_sheet *sheet)
{
    size_t rows = 0;
    size_t padded = 0;
    if (sheet->delimiter != ',') {
        return false;
    }
    for (size_t r = 0; r < sheet->row_count && rows < 200; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->number_count < 4 || row->number_count != row->cell_count) {
            continue;
        }
        rows++;
        bool zero_led = false;
        for (size_t c = 0; c < row->cell_count; c++) {
            size_t length;
            const char *text = wa_sheet_cell(sheet, row, c, &length);
            if (memchr(text, '.', length) != NULL) {
                return false;
            }
            zero_led = zero_led || (length >= 2 && text[0] == '0');
        }
        padded += zero_led;
    }
    return rows >= 3 && padded * 4 >= rows;
}

/* Why a sheet without a table of volume and reading has none. */
static enum wa_status fail_no_table(const struct wa_sheet *sheet, struct wa_error *error)
{
    size_t single = 0;
    size_t several = 0;
    for (size_t r = 0; r < sheet->row_count; r++) {
        single += sheet->rows[r].number_count == 1;
        several += sheet->rows[r].number_count >= 2;
    }
    if (several > 0 && several < WA_POINTS_NEEDED) {
        return wa_fail(error, WA_ERROR_INPUT, sheet->name, 0,
                       "Only %zu row%s with a volume and a reading; at least %d are needed to "
                       "show a curve.",
                       several, several == 1 ? " was found" : "s were found", WA_POINTS_NEEDED);
    }
    if (several == 0 && single >= 3) {
        return wa_fail(error, WA_ERROR_INPUT, sheet->name, 0,
                       "There is one column of numbers only; a titration needs a volume and a "
                       "reading in every row.");
    }
    return wa_fail(error, WA_ERROR_INPUT, sheet->name, 0,
                   "No table with a volume and a reading was found; give rows such as '0.50, "
                   "2.83', with a header 'volume (mL), pH' above them if the columns are not "
                   "plain.");
}

static enum wa_status read_tables(struct wa_reading *reading, struct wa_error *error)
{
    struct wa_sheet *sheet = &reading->sheet;
    if (comma_is_both(sheet)) {
        return wa_fail(error, WA_ERROR_INPUT, sheet->name, 0,
                       "Commas stand between the columns and as decimal marks, so the numbers "
                       "cannot be told apart; use semicolons between the columns.");
    }
    enum wa_status status = wa_tables_find(sheet, &reading->tables, &reading->table_count, error);
    if (status == WA_OK && reading->table_count == 0) {
        status = wa_reader_rebuild(sheet, &reading->decoded, &reading->remark, error);
        if (status == WA_OK && reading->remark != NULL) {
            free(reading->tables);
            reading->tables = NULL;
            status = wa_tables_find(sheet, &reading->tables, &reading->table_count, error);
        }
    }
    if (status == WA_OK && reading->table_count == 0) {
        return fail_no_table(sheet, error);
    }
    if (status == WA_OK) {
        status =
            wa_notes_find(sheet, reading->tables, reading->table_count, &reading->notes, error);
    }
    for (size_t t = 0; status == WA_OK && t < reading->table_count; t++) {
        status = wa_runs_of_table(reading, t, error);
    }
    if (status == WA_OK && reading->list.count == 0) {
        status = reading->refusal.message[0] != '\0' ? WA_ERROR_INPUT : fail_no_table(sheet, error);
        if (reading->refusal.message[0] != '\0' && error != NULL) {
            *error = reading->refusal;
        }
    }
    return status == WA_OK ? wa_runs_finish(reading, error) : status;
}

static enum wa_status append_runs(struct wa_run_list *list, struct wa_run_list *more,
                                  struct wa_error *error)
{
    struct wa_run *runs = realloc(list->runs, (list->count + more->count) * sizeof *runs);
    if (runs == NULL) {
        return wa_fail_memory(error);
    }
    memcpy(runs + list->count, more->runs, more->count * sizeof *runs);
    list->runs = runs;
    list->count += more->count;
    free(more->runs);
    *more = (struct wa_run_list){0};
    return WA_OK;
}

enum wa_status wa_read_memory(const char *bytes, size_t size, const char *name,
                              const struct wa_reader_options *options, struct wa_run_list *list,
                              struct wa_error *error)
{
    static const struct wa_reader_options defaults;
    struct wa_reading reading = {0};
    reading.sheet.name = name;
    reading.options = options != NULL ? options : &defaults;
    if (size > WA_FILE_LIMIT) {
        return wa_fail(error, WA_ERROR_INPUT, name, 0,
                       "The file is larger than %u MB, which no titration is.",
                       WA_FILE_LIMIT >> 20);
    }
    enum wa_status status = wa_reader_decode(bytes, size, name, &reading.decoded, error);
    if (status == WA_OK && wa_reader_strip_markup(&reading.decoded)) {
        reading.markup = true;
    }
    if (status == WA_OK) {
        status = wa_sheet_fill(&reading.sheet, &reading.decoded, error);
    }
    if (status == WA_OK) {
        status = read_tables(&reading, error);
    }
    if (status == WA_OK) {
        status = append_runs(list, &reading.list, error);
    }
    wa_run_list_free(&reading.list);
    wa_notes_free(&reading.notes);
    free(reading.tables);
    wa_sheet_free(&reading.sheet);
    free(reading.decoded.text);
    return status;
}

enum wa_status wa_read_file(const char *path, const struct wa_reader_options *options,
                            struct wa_run_list *list, struct wa_error *error)
{
    char *bytes;
    size_t size;
    enum wa_status status = wa_file_read(path, WA_FILE_LIMIT, &bytes, &size, error);
    if (status != WA_OK) {
        return status;
    }
    const char *name = strcmp(path, "-") == 0 ? "standard input" : path;
    status = wa_read_memory(bytes, size, name, options, list, error);
    free(bytes);
    return status;
}
