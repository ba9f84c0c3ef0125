/* Paragraphs and tables that never exceed the width. */
#include "base/grow.h"
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char bold[] = "\x1B[1m";
static const char plain[] = "\x1B[0m";

void report_heading(struct report_writer *writer, const char *heading)
{
    wa_text_append(&writer->text, "\n%s%s%s\n", writer->colour ? bold : "", heading,
                   writer->colour ? plain : "");
}

/* A figure stays with its unit, and a value with its uncertainty: "0.30 ± 0.02 mL" is one word as
 * far as lines go, while "30 of 40" may as well be. */
static bool may_break(const char *text, size_t at)
{
    static const char plus_minus[] = "\xC2\xB1";
    const unsigned char next = (unsigned char)text[at + 1];
    if (strncmp(text + at + 1, plus_minus, 2) == 0 ||
        (at >= 2 && strncmp(text + at - 2, plus_minus, 2) == 0)) {
        return false;
    }
    bool after_figure = at > 0 && text[at - 1] >= '0' && text[at - 1] <= '9';
    bool unit =
        (next >= 'A' && next <= 'Z') || (next >= 'a' && next <= 'z') || next == '%' || next == 0xC2;
    return !(after_figure && unit);
}

/* The longest piece of `text` that fits `room` columns: whole words, or part of one that is longer
 * than a line. Returns its bytes. */
static size_t piece_that_fits(const char *text, size_t room)
{
    size_t columns = 0;
    size_t last_space = 0;
    size_t at = 0;
    while (text[at] != '\0') {
        size_t bytes;
        size_t wide = report_point_columns(text + at, &bytes);
        if (text[at] == ' ' && may_break(text, at)) {
            last_space = at;
        }
        if (columns + wide > room && at > 0) {
            return last_space > 0 ? last_space : at;
        }
        columns += wide;
        at += bytes;
    }
    return at;
}

static void fold(struct report_writer *writer, const char *first, size_t hang, const char *text)
{
    size_t lead = report_columns(first);
    wa_text_append(&writer->text, "%s", first);
    while (*text == ' ') {
        text++;
    }
    do {
        size_t room = writer->columns > lead + 1 ? writer->columns - lead : 1;
        size_t piece = piece_that_fits(text, room);
        size_t shown = piece;
        while (shown > 0 && text[shown - 1] == ' ') {
            shown--;
        }
        wa_text_append_bytes(&writer->text, text, shown);
        wa_text_append_bytes(&writer->text, "\n", 1);
        for (text += piece; *text == ' ';) {
            text++;
        }
        lead = hang;
        if (*text != '\0') {
            wa_text_append(&writer->text, "%*s", (int)hang, "");
        }
    } while (*text != '\0');
}

/* Format, clean and fold. */
static void fold_formatted(struct report_writer *writer, const char *first, size_t hang,
                           const char *format, va_list arguments)
{
    char *words = NULL;
    if (vasprintf(&words, format, arguments) < 0) {
        writer->text.failed = true;
        return;
    }
    struct wa_text clean = {0};
    report_clean(&clean, words, true);
    free(words);
    if (clean.failed) {
        writer->text.failed = true;
    } else {
        fold(writer, first, hang, clean.bytes);
    }
    wa_text_free(&clean);
}

void report_paragraph(struct report_writer *writer, const char *first, size_t hang,
                      const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    fold_formatted(writer, first, hang, format, arguments);
    va_end(arguments);
}

#define LABEL_COLUMNS ((size_t)26)

void report_item(struct report_writer *writer, const char *label, const char *format, ...)
{
    struct wa_text first = {0};
    wa_text_append(&first, "  ");
    report_clean(&first, label, true);
    size_t columns = first.failed ? 0 : report_columns(first.bytes);
    if (columns + 2 <= LABEL_COLUMNS) {
        wa_text_append(&first, "%*s", (int)(LABEL_COLUMNS - columns), "");
    }
    va_list arguments;
    va_start(arguments, format);
    if (first.failed) {
        writer->text.failed = true;
    } else if (columns + 2 <= LABEL_COLUMNS) {
        fold_formatted(writer, first.bytes, LABEL_COLUMNS, format, arguments);
    } else {
        report_paragraph(writer, "  ", 4, "%s:", label);
        fold_formatted(writer, "    ", 4, format, arguments);
    }
    va_end(arguments);
    wa_text_free(&first);
}

bool report_has_sentence(const struct wa_result_sentence *sentences, size_t count,
                         const char *sentence)
{
    for (size_t i = 0; i < count; i++) {
        if (sentences[i].sentence != NULL && strcmp(sentences[i].sentence, sentence) == 0) {
            return true;
        }
    }
    return false;
}

void report_sentences(struct report_writer *writer, const char *heading,
                      const struct wa_result_sentence *sentences, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        if (i == 0) {
            report_heading(writer, heading);
        }
        const char *sentence = sentences[i].sentence != NULL ? sentences[i].sentence : "";
        if (!report_has_sentence(sentences, i, sentence)) {
            report_paragraph(writer, "  - ", 4, "%s", sentence);
        }
    }
}

void report_row(struct report_table *table)
{
    if (table->failed ||
        !wa_grow(&table->rows, &table->capacity, table->row_count + 1, sizeof *table->rows)) {
        table->failed = true;
        return;
    }
    memset(table->rows[table->row_count++], 0, sizeof *table->rows);
}

void report_cell(struct report_table *table, size_t column, const char *format, ...)
{
    if (table->failed || table->row_count == 0 || column >= REPORT_CELLS_MAX) {
        return;
    }
    char words[4 * REPORT_CELL_SIZE];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(words, sizeof words, format, arguments);
    va_end(arguments);
    struct wa_text clean = {0};
    report_clean(&clean, words, true);
    if (clean.failed) {
        table->failed = true;
        wa_text_free(&clean);
        return;
    }
    size_t length = clean.length;
    if (length >= REPORT_CELL_SIZE) {
        for (length = REPORT_CELL_SIZE - 1;
             length > 0 && ((unsigned char)clean.bytes[length] & 0xC0) == 0x80;) {
            length--;
        }
    }
    char *cell = table->rows[table->row_count - 1][column];
    memcpy(cell, clean.bytes, length);
    cell[length] = '\0';
    wa_text_free(&clean);
    if (column >= table->column_count) {
        table->column_count = column + 1;
    }
}

#define FIRST_CELL_LEAST 16 /* columns to which the first cells of a table may be folded */

static void draw_as_list(struct report_writer *writer, const struct report_table *table)
{
    for (size_t row = 1; row < table->row_count; row++) {
        report_paragraph(writer, "  ", 4, "%s: %s", table->rows[0][0], table->rows[row][0]);
        for (size_t column = 1; column < table->column_count; column++) {
            if (table->rows[row][column][0] != '\0') {
                report_paragraph(writer, "    ", 6, "%s: %s", table->rows[0][column],
                                 table->rows[row][column]);
            }
        }
    }
}

/* The next line of a first cell that may be folded, drawn; the rest is left in `cell`. */
static size_t draw_first(struct wa_text *text, const char **cell, size_t width, size_t indent)
{
    size_t piece = piece_that_fits(*cell, width - indent);
    size_t start = text->length;
    wa_text_append(text, "%*s", (int)(2 + indent), "");
    wa_text_append_bytes(text, *cell, piece);
    for (*cell += piece; **cell == ' ';) {
        ++*cell;
    }
    return text->failed ? 0 : 2 + width - report_columns(text->bytes + start);
}

static void draw_row(struct report_writer *writer, const struct report_table *table, size_t row,
                     const size_t *widths)
{
    struct wa_text *text = &writer->text;
    const char *first = table->rows[row][0];
    size_t pending = draw_first(text, &first, widths[0], 0) + 2;
    for (size_t column = 1; column < table->column_count; column++) {
        const char *cell = table->rows[row][column];
        if (cell[0] != '\0') {
            wa_text_append(text, "%*s%s", (int)pending, "", cell);
            pending = 0;
        }
        pending += widths[column] - report_columns(cell) + 2;
    }
    while (*first != '\0') {
        wa_text_append_bytes(text, "\n", 1);
        draw_first(text, &first, widths[0], 2);
    }
    wa_text_append_bytes(text, "\n", 1);
}

void report_table_draw(struct report_writer *writer, struct report_table *table)
{
    size_t widths[REPORT_CELLS_MAX] = {0};
    size_t total = 0;
    for (size_t column = 0; column < table->column_count; column++) {
        for (size_t row = 0; row < table->row_count; row++) {
            size_t columns = report_columns(table->rows[row][column]);
            widths[column] = columns > widths[column] ? columns : widths[column];
        }
        total += widths[column] + 2;
    }
    if (total > writer->columns && total - widths[0] + FIRST_CELL_LEAST <= writer->columns) {
        widths[0] -= total - writer->columns;
        total = writer->columns;
    }
    if (table->failed) {
        writer->text.failed = true;
    } else if (total > writer->columns) {
        draw_as_list(writer, table);
    } else {
        for (size_t row = 0; row < table->row_count; row++) {
            draw_row(writer, table, row, widths);
        }
    }
    free(table->rows);
    *table = (struct report_table){0};
}
