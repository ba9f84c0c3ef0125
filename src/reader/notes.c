/* Notes above, between and under the tables: "# name: value", "name: value", "name;value". */
#include "reader/reader_internal.h"

#include "base/grow.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define NAME_MAX_BYTES 60
#define NAME_MAX_WORDS 6

/* A name starts with a letter and is short. */
static bool is_name(const char *text, size_t length)
{
    wa_text_trim(&text, &length);
    if (length == 0 || length > NAME_MAX_BYTES) {
        return false;
    }
    unsigned char first = (unsigned char)text[0];
    bool letter = (first >= 'a' && first <= 'z') || (first >= 'A' && first <= 'Z') || first >= 0x80;
    size_t words = 1;
    for (size_t i = 0; i < length; i++) {
        words += text[i] == ' ';
    }
    return letter && words <= NAME_MAX_WORDS;
}

static bool is_known_name(const char *text, size_t length)
{
    char folded[128];
    wa_text_fold(text, length, folded, sizeof folded);
    return wa_note_known_name(folded) != NULL;
}

/* "Sample volume (mL)" names the unit of what follows. */
static void split_unit(const char *name, size_t *name_length, const char **unit,
                       size_t *unit_length)
{
    size_t length = *name_length;
    if (length < 4 || (name[length - 1] != ')' && name[length - 1] != ']')) {
        return;
    }
    size_t open = length - 1;
    while (open > 0 && name[open] != '(' && name[open] != '[') {
        open--;
    }
    if (open < 2 || name[open - 1] != ' ') {
        return;
    }
    *unit = name + open + 1;
    *unit_length = length - open - 2;
    *name_length = open - 1;
}

static bool add_note(struct wa_found_notes *notes, const char *name, size_t name_length,
                     const char *text, size_t text_length, uint32_t row, bool loose)
{
    if (!wa_grow(&notes->notes, &notes->capacity, notes->count + 1, sizeof *notes->notes)) {
        return false;
    }
    struct wa_found_note *note = &notes->notes[notes->count];
    *note = (struct wa_found_note){.row = row, .loose = loose};
    wa_text_trim(&name, &name_length);
    wa_text_trim(&text, &text_length);
    const char *unit = "";
    size_t unit_length = 0;
    split_unit(name, &name_length, &unit, &unit_length);
    snprintf(note->name, sizeof note->name, "%.*s", (int)name_length, name);
    struct wa_text value = {0};
    wa_text_append(&value, "%.*s", (int)text_length, text);
    if (unit_length > 0 && text_length > 0) {
        wa_text_append(&value, " %.*s", (int)unit_length, unit);
    }
    note->text = value.bytes;
    notes->count += !value.failed;
    if (value.failed) {
        wa_text_free(&value);
    }
    return !value.failed;
}

/* Cells from `first` on, joined by spaces: "0,1" | "mol/L". */
static void join_cells(const struct wa_sheet *sheet, const struct wa_row *row, size_t first,
                       struct wa_text *joined)
{
    for (size_t c = first; c < row->cell_count; c++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        if (length > 0) {
            wa_text_append(joined, "%s%.*s", joined->length > 0 ? " " : "", (int)length, text);
        }
    }
}

/* What stands on the line after the comment mark, without the spreadsheet's quotes and the
 * delimiters that fill the row up. */
static void bare_line(const struct wa_sheet *sheet, const struct wa_row *row, const char **text,
                      size_t *length)
{
    *text = sheet->text + row->text_start;
    *length = row->text_length;
    wa_text_trim(text, length);
    while (*length > 0 && sheet->delimiter != '\0' && sheet->delimiter != ' ' &&
           (*text)[*length - 1] == sheet->delimiter) {
        --*length;
        wa_text_trim(text, length);
    }
    if (*length >= 2 && (*text)[0] == '"' && (*text)[*length - 1] == '"') {
        ++*text;
        *length -= 2;
    }
    while (*length > 0 && ((*text)[0] == '#' || (*text)[0] == '%')) {
        ++*text;
        --*length;
    }
    wa_text_trim(text, length);
}

/* "name: value" on the line as a whole. */
static bool colon_note(const struct wa_sheet *sheet, const struct wa_row *row, const char **name,
                       size_t *name_length, const char **value, size_t *value_length)
{
    const char *text;
    size_t length;
    bare_line(sheet, row, &text, &length);
    size_t at = 0;
    while (at < length && text[at] != ':' && text[at] != '=') {
        at++;
    }
    if (at == length || !is_name(text, at)) {
        return false;
    }
    *name = text;
    *name_length = at;
    *value = text + at + 1;
    *value_length = length - at - 1;
    return true;
}

static enum wa_status take_note(struct wa_sheet *sheet, uint32_t r, bool in_table,
                                struct wa_found_notes *notes, struct wa_error *error)
{
    struct wa_row *row = &sheet->rows[r];
    bool comment = row->kind == WA_ROW_COMMENT;
    const char *name;
    size_t name_length;
    const char *value;
    size_t value_length;
    size_t first_length;
    const char *first = wa_sheet_cell(sheet, row, 0, &first_length);
    bool colon_cell = first_length > 0 && first[first_length - 1] == ':' && row->cell_count > 1;
    bool cells_note = !comment && row->cell_count >= 2 && row->number_count <= 2 &&
                      sheet->delimiter != ' ' && is_name(first, first_length) &&
                      (colon_cell || memchr(first, ':', first_length) == NULL);
    bool ok = true;
    if (cells_note && (!in_table || is_known_name(first, first_length - colon_cell))) {
        struct wa_text joined = {0};
        join_cells(sheet, row, 1, &joined);
        if (joined.length > 0) {
            ok = add_note(notes, first, first_length - colon_cell, joined.bytes, joined.length, r,
                          true);
            row->used = true;
        }
        ok = ok && !joined.failed;
        wa_text_free(&joined);
    } else if (colon_note(sheet, row, &name, &name_length, &value, &value_length) &&
               (comment || !in_table || is_known_name(name, name_length))) {
        ok = add_note(notes, name, name_length, value, value_length, r, !comment);
        row->used = true;
    }
    return ok ? WA_OK : wa_fail_memory(error);
}

/* What stands under the last numbers of a table is no longer in it. */
static size_t last_data_row(const struct wa_sheet *sheet, const struct wa_table_part *part)
{
    size_t r = part->end_row;
    while (r > part->first_row && sheet->rows[r - 1].number_count < 2) {
        r--;
    }
    return r > part->first_row ? r - 1 : part->end_row;
}

enum wa_status wa_notes_find(struct wa_sheet *sheet, const struct wa_table_part *tables,
                             size_t table_count, struct wa_found_notes *notes,
                             struct wa_error *error)
{
    size_t table = 0;
    size_t last_data = 0;
    const struct wa_table_part *last_part = NULL;
    for (uint32_t r = 0; r < sheet->row_count; r++) {
        struct wa_row *row = &sheet->rows[r];
        while (table < table_count && r >= tables[table].end_row) {
            table++;
        }
        const struct wa_table_part *part = table < table_count ? &tables[table] : NULL;
        if (part != NULL && part != last_part) {
            last_part = part;
            last_data = last_data_row(sheet, part);
        }
        bool in_header = part != NULL && part->header_row != SIZE_MAX && r >= part->header_row &&
                         r < part->header_end;
        bool in_table = part != NULL && r >= part->first_row && r <= last_data;
        bool numbers = row->kind == WA_ROW_NUMBERS && in_table && row->number_count >= 2;
        if (in_header) {
            row->used = true;
        }
        if (row->kind == WA_ROW_BLANK || in_header || numbers) {
            continue;
        }
        enum wa_status status = take_note(sheet, r, in_table, notes, error);
        if (status != WA_OK) {
            return status;
        }
    }
    return WA_OK;
}

void wa_notes_free(struct wa_found_notes *notes)
{
    for (size_t i = 0; i < notes->count; i++) {
        free(notes->notes[i].text);
    }
    free(notes->notes);
    *notes = (struct wa_found_notes){0};
}
