/* Text to rows of cells: libcsv splits each line once the delimiter is known. */
#include "reader/reader_internal.h"

#include "base/grow.h"

#include <csv.h>
#include <stdlib.h>
#include <string.h>

/* A quoted field may run over so many lines; beyond, the quote was a stray one. */
#define QUOTED_LINES_MAX 8

/* A table has few lines of words; beyond so many a text is prose and its words are not weighed. */
#define WORD_LINES_MAX 2000

/* libcsv's callbacks fill this. */
struct filling {
    struct wa_sheet *sheet;
    struct wa_row *row;
    bool failed;
};

static void on_cell(void *bytes, size_t length, void *data)
{
    struct filling *filling = data;
    struct wa_sheet *sheet = filling->sheet;
    if (filling->failed || filling->row->cell_count == UINT16_MAX) {
        return;
    }
    if (!wa_grow(&sheet->cells, &sheet->cell_capacity, sheet->cell_count + 1,
                 sizeof *sheet->cells) ||
        !wa_grow(&sheet->cell_text, &sheet->cell_text_capacity,
                 sheet->cell_text_length + length + 1, 1)) {
        filling->failed = true;
        return;
    }
    const char *text = bytes;
    size_t kept = length;
    wa_text_trim(&text, &kept);
    struct wa_cell *cell = &sheet->cells[sheet->cell_count++];
    *cell = (struct wa_cell){(uint32_t)sheet->cell_text_length, (uint32_t)kept};
    memcpy(sheet->cell_text + sheet->cell_text_length, text, kept);
    sheet->cell_text_length += kept;
    filling->row->cell_count++;
}

static void on_row(int terminator, void *data)
{
    (void)terminator;
    (void)data;
}

/* Feed one logical line; `quote` is 0 when its quotes are stray. */
static void feed(struct csv_parser *parser, struct filling *filling, const char *line,
                 size_t length, char quote)
{
    csv_set_quote(parser, (unsigned char)quote);
    if (csv_parse(parser, line, length, on_cell, on_row, filling) != length ||
        csv_fini(parser, on_cell, on_row, filling) != 0) {
        filling->failed = true;
    }
}

/* Lines from the one at `line` on that one quoted field holds together; 0 for a stray quote. */
static size_t lines_of_field(const char *line, const char *end, const char **stop)
{
    bool quoted = false;
    size_t lines = 1;
    const char *first_stop = NULL;
    for (const char *at = line; at <= end; at++) {
        if (at == end || *at == '\n') {
            first_stop = first_stop == NULL ? at : first_stop;
            if (!quoted) {
                *stop = at;
                return lines;
            }
            if (at == end || ++lines > QUOTED_LINES_MAX) {
                break;
            }
        } else if (*at == '"') {
            quoted = !quoted;
        }
    }
    *stop = first_stop;
    return 0;
}

/* "# note" and "% note"; "#" alone in its cell is the header of a counting column. */
static bool is_comment(const char *line, size_t length, char delimiter, size_t *mark_length)
{
    size_t at = 0;
    while (at < length && (line[at] == ' ' || line[at] == '"')) {
        at++;
    }
    if (at == length || (line[at] != '#' && line[at] != '%')) {
        return false;
    }
    while (at < length && (line[at] == '#' || line[at] == '%')) {
        at++;
    }
    *mark_length = at;
    return !(at < length && delimiter != ' ' && line[at] == delimiter);
}

/* "-----", "====", ":--:": a line drawn under a header. */
static bool is_rule(const struct wa_sheet *sheet, const struct wa_row *row, size_t column)
{
    size_t length;
    const char *text = wa_sheet_cell(sheet, row, column, &length);
    for (size_t i = 0; i < length; i++) {
        if (strchr("-=_+*:|~.", text[i]) == NULL) {
            return false;
        }
    }
    return true;
}

static void classify(struct wa_sheet *sheet, struct wa_row *row, bool comment)
{
    size_t filled = 0;
    for (size_t i = 0; i < row->cell_count; i++) {
        struct wa_cell_value value = wa_sheet_value(sheet, row, i);
        filled += value.kind != WA_CELL_EMPTY && !is_rule(sheet, row, i);
        row->number_count = (uint16_t)(row->number_count + wa_cell_is_numeric(&value));
    }
    if (comment) {
        row->kind = WA_ROW_COMMENT;
    } else if (filled == 0) {
        row->kind = WA_ROW_BLANK;
    } else if (row->number_count >= 1) {
        row->kind = WA_ROW_NUMBERS;
    } else {
        row->kind = WA_ROW_WORDS;
    }
}

static bool add_line(struct wa_sheet *sheet, struct csv_parser *parser, const char *line,
                     size_t length, uint32_t number, bool stray_quote, struct wa_text *spaced)
{
    if (!wa_grow(&sheet->rows, &sheet->row_capacity, sheet->row_count + 1, sizeof *sheet->rows)) {
        return false;
    }
    struct wa_row *row = &sheet->rows[sheet->row_count++];
    *row = (struct wa_row){
        .text_start = (uint32_t)(line - sheet->text),
        .text_length = (uint32_t)length,
        .first_cell = (uint32_t)sheet->cell_count,
        .line = number,
    };
    size_t mark = 0;
    bool comment = is_comment(line, length, sheet->delimiter, &mark);
    const char *fed = line + mark * comment;
    size_t fed_length = length - mark * comment;
    struct filling filling = {.sheet = sheet, .row = row};
    if (sheet->delimiter == ' ') {
        if (!wa_grow(&spaced->bytes, &spaced->capacity, fed_length + 1, 1)) {
            return false;
        }
        bool careful = sheet->word_lines < WORD_LINES_MAX;
        fed_length = wa_sheet_join_spaces(fed, fed_length, careful, spaced->bytes);
        fed = spaced->bytes;
    }
    feed(parser, &filling, fed, fed_length, stray_quote || comment ? '\0' : '"');
    classify(sheet, row, comment);
    sheet->word_lines += row->number_count < 2;
    return !filling.failed;
}

static bool fill_rows(struct wa_sheet *sheet, struct csv_parser *parser, size_t length)
{
    struct wa_text spaced = {0};
    const char *end = sheet->text + length;
    uint32_t number = 1;
    bool ok = true;
    for (const char *line = sheet->text; ok && line < end;) {
        const char *stop = memchr(line, '\n', (size_t)(end - line));
        stop = stop != NULL ? stop : end;
        size_t lines = 1;
        if (memchr(line, '"', (size_t)(stop - line)) != NULL) {
            lines = lines_of_field(line, end, &stop);
        }
        ok = add_line(sheet, parser, line, (size_t)(stop - line), number, lines == 0, &spaced);
        number += (uint32_t)(lines == 0 ? 1 : lines);
        line = stop + 1;
    }
    wa_text_free(&spaced);
    return ok;
}

enum wa_status wa_sheet_fill(struct wa_sheet *sheet, const struct wa_decoded *decoded,
                             struct wa_error *error)
{
    sheet->text = decoded->text;
    sheet->delimiter = wa_sheet_delimiter(decoded->text, decoded->length);
    struct csv_parser parser;
    if (csv_init(&parser, 0) != 0) {
        return wa_fail_memory(error);
    }
    bool spaces = sheet->delimiter == ' ' || sheet->delimiter == '\0';
    csv_set_delim(&parser, (unsigned char)(spaces ? '\x1F' : sheet->delimiter));
    bool ok = fill_rows(sheet, &parser, decoded->length);
    csv_free(&parser);
    return ok ? WA_OK : wa_fail_memory(error);
}

void wa_sheet_free(struct wa_sheet *sheet)
{
    free(sheet->cell_text);
    free(sheet->cells);
    free(sheet->rows);
    *sheet = (struct wa_sheet){0};
}

const char *wa_sheet_cell(const struct wa_sheet *sheet, const struct wa_row *row, size_t column,
                          size_t *length)
{
    if (column >= row->cell_count) {
        *length = 0;
        return "";
    }
    const struct wa_cell *cell = &sheet->cells[row->first_cell + column];
    *length = cell->length;
    return cell->length == 0 ? "" : sheet->cell_text + cell->start;
}

struct wa_cell_value wa_sheet_value(const struct wa_sheet *sheet, const struct wa_row *row,
                                    size_t column)
{
    size_t length;
    const char *text = wa_sheet_cell(sheet, row, column, &length);
    return wa_cell_parse(text, length);
}
