/* Tables that do not stand as rows of volume and reading: on their side, one number a line, or in
 * the markup of a page. They are written out again as plain rows and then read like any other. */
#include "reader/reader_internal.h"

#include "base/grow.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

/* Text that is written out again, and the line of the file each of its lines came from. */
struct rebuilt {
    struct wa_text text;
    uint32_t *lines;
    size_t count, capacity;
};

static void end_line(struct rebuilt *rebuilt, uint32_t line)
{
    wa_text_append_bytes(&rebuilt->text, "\n", 1);
    if (!wa_grow(&rebuilt->lines, &rebuilt->capacity, rebuilt->count + 1, sizeof *rebuilt->lines)) {
        rebuilt->text.failed = true;
        return;
    }
    rebuilt->lines[rebuilt->count++] = line;
}

static void copy_row(struct rebuilt *rebuilt, const struct wa_sheet *sheet,
                     const struct wa_row *row)
{
    const char *text = sheet->text + row->text_start;
    for (size_t i = 0; i < row->text_length; i++) {
        bool parts =
            text[i] == sheet->delimiter && sheet->delimiter != ' ' && row->kind != WA_ROW_COMMENT;
        char byte = parts || text[i] == '\n' ? '\t' : text[i];
        wa_text_append_bytes(&rebuilt->text, &byte, 1);
    }
    end_line(rebuilt, row->line);
}

/* The words at the head of a row of numbers, and where its numbers begin. */
static size_t head_of(const struct wa_sheet *sheet, const struct wa_row *row, struct wa_text *head)
{
    size_t c = 0;
    for (; c < row->cell_count; c++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        if (wa_cell_parse(text, length).kind == WA_CELL_NUMBER) {
            break;
        }
        if (length > 0) {
            wa_text_append(head, "%s%.*s", head->length > 0 ? " " : "", (int)length, text);
        }
    }
    return c;
}

#define SIDEWAYS_MAX 16

/* Rows that each hold one quantity of all points. */
struct sideways {
    const struct wa_row *row[SIDEWAYS_MAX];
    struct wa_text head[SIDEWAYS_MAX];
    size_t first_number[SIDEWAYS_MAX];
    size_t count;
    bool volume, reading;
};

static void find_sideways(const struct wa_sheet *sheet, struct sideways *found)
{
    for (size_t r = 0; r < sheet->row_count && found->count < SIDEWAYS_MAX; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->kind != WA_ROW_NUMBERS || row->number_count < WA_POINTS_NEEDED) {
            continue;
        }
        struct wa_text *head = &found->head[found->count];
        size_t first = head_of(sheet, row, head);
        struct wa_header header =
            wa_header_parse(head->bytes != NULL ? head->bytes : "", head->length);
        bool volume = header.role == WA_ROLE_VOLUME;
        bool reading = header.role == WA_ROLE_PH || header.role == WA_ROLE_MV;
        if (first == 0 || !(volume || reading)) {
            wa_text_free(head);
            continue;
        }
        found->volume = found->volume || volume;
        found->reading = found->reading || reading;
        found->first_number[found->count] = first;
        found->row[found->count++] = row;
    }
}

static void write_sideways(struct rebuilt *rebuilt, const struct sideways *found,
                           const struct wa_sheet *sheet)
{
    size_t points = 0;
    uint32_t line = found->row[0]->line;
    for (size_t k = 0; k < found->count; k++) {
        size_t cells = found->row[k]->cell_count - found->first_number[k];
        points = cells > points ? cells : points;
        wa_text_append(&rebuilt->text, "%s%s", k > 0 ? "\t" : "", found->head[k].bytes);
    }
    end_line(rebuilt, line);
    for (size_t i = 0; i < points; i++) {
        for (size_t k = 0; k < found->count; k++) {
            size_t length;
            const char *text =
                wa_sheet_cell(sheet, found->row[k], found->first_number[k] + i, &length);
            wa_text_append(&rebuilt->text, "%s%.*s", k > 0 ? "\t" : "", (int)length, text);
        }
        end_line(rebuilt, line);
    }
}

static bool rebuild_sideways(const struct wa_sheet *sheet, struct rebuilt *rebuilt)
{
    struct sideways found = {0};
    find_sideways(sheet, &found);
    bool is_table = found.volume && found.reading;
    for (size_t r = 0, k = 0; is_table && r < sheet->row_count; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (k < found.count && row == found.row[k]) {
            if (k++ == 0) {
                write_sideways(rebuilt, &found, sheet);
            }
        } else {
            copy_row(rebuilt, sheet, row);
        }
    }
    for (size_t k = 0; k < found.count; k++) {
        wa_text_free(&found.head[k]);
    }
    return is_table;
}

/* The one number that stands alone on a row. */
static bool lone_number(const struct wa_sheet *sheet, const struct wa_row *row,
                        struct wa_cell_value *value)
{
    if (row->kind != WA_ROW_NUMBERS || row->cell_count != 1) {
        return false;
    }
    *value = wa_sheet_value(sheet, row, 0);
    return value->kind == WA_CELL_NUMBER;
}

/* One number a line, volume and reading in turn: the volumes carry their unit, or the words above
 * name the two in that order. */
static bool numbers_alternate(const struct wa_sheet *sheet)
{
    size_t count = 0;
    size_t volumes = 0;
    size_t stray = 0;
    bool volume_named = false;
    bool reading_named = false;
    for (size_t r = 0; r < sheet->row_count; r++) {
        const struct wa_row *row = &sheet->rows[r];
        struct wa_cell_value value;
        if (lone_number(sheet, row, &value)) {
            bool volume = wa_unit_is_volume(value.unit);
            volumes += volume && count % 2 == 0;
            stray += volume && count % 2 == 1;
            count++;
        } else if (row->kind == WA_ROW_WORDS && count == 0 && row->text_length < 80) {
            struct wa_header header =
                wa_header_parse(sheet->text + row->text_start, row->text_length);
            reading_named = (volume_named && header.role == WA_ROLE_PH) ||
                            (reading_named && header.role == WA_ROLE_UNKNOWN);
            volume_named = volume_named || header.role == WA_ROLE_VOLUME;
        } else if (row->number_count >= 2) {
            return false;
        }
    }
    bool by_unit = stray == 0 && volumes * 2 >= count && volumes > 0;
    return count >= 2 * WA_POINTS_NEEDED && stray == 0 &&
           (by_unit || (volume_named && reading_named));
}

static bool rebuild_alternating(const struct wa_sheet *sheet, struct rebuilt *rebuilt)
{
    if (!numbers_alternate(sheet)) {
        return false;
    }
    wa_text_append(&rebuilt->text, "volume\tpH");
    end_line(rebuilt, sheet->rows[0].line);
    bool half = false;
    uint32_t line = 0;
    for (size_t r = 0; r < sheet->row_count; r++) {
        const struct wa_row *row = &sheet->rows[r];
        struct wa_cell_value value;
        if (!lone_number(sheet, row, &value)) {
            continue;
        }
        const char *text = sheet->text + row->text_start;
        wa_text_append(&rebuilt->text, "%s%.*s", half ? "\t" : "", (int)row->text_length, text);
        line = half ? line : row->line;
        if (half) {
            end_line(rebuilt, line);
        }
        half = !half;
    }
    if (half) {
        end_line(rebuilt, line);
    }
    return true;
}

enum wa_status wa_reader_rebuild(struct wa_sheet *sheet, struct wa_decoded *decoded,
                                 const char **remark, struct wa_error *error)
{
    struct rebuilt rebuilt = {0};
    *remark = NULL;
    if (rebuild_sideways(sheet, &rebuilt)) {
        *remark = "The table lies on its side, one quantity a row; every point carries the line "
                  "of the volumes.";
    } else if (rebuild_alternating(sheet, &rebuilt)) {
        *remark = "There is one number a line; they are taken as volume and pH in turn.";
    }
    if (rebuilt.text.failed) {
        wa_text_free(&rebuilt.text);
        free(rebuilt.lines);
        return wa_fail_memory(error);
    }
    if (*remark == NULL) {
        return WA_OK;
    }
    const char *name = sheet->name;
    wa_sheet_free(sheet);
    free(decoded->text);
    decoded->text = rebuilt.text.bytes;
    decoded->length = rebuilt.text.length;
    sheet->name = name;
    enum wa_status status = wa_sheet_fill(sheet, decoded, error);
    for (size_t r = 0; status == WA_OK && r < sheet->row_count && r < rebuilt.count; r++) {
        sheet->rows[r].line = rebuilt.lines[r];
    }
    free(rebuilt.lines);
    return status;
}

/* Where the tag that starts at `at` ends, and whether it is the one named. */
static bool tag_is(const char *at, const char *name)
{
    size_t length = strlen(name);
    return strncasecmp(at, name, length) == 0 &&
           (at[length] == '>' || at[length] == ' ' || at[length] == '/' || at[length] == '\n');
}

/* The few entities that stand in tables of numbers. */
static size_t entity_at(const char *at, const char **text)
{
    static const char *const entities[][2] = {
        {"&nbsp;", " "}, {"&micro;", "µ"}, {"&plusmn;", "±"}, {"&minus;", "-"}, {"&#8722;", "-"},
        {"&deg;", "°"},  {"&lt;", "<"},    {"&gt;", ">"},     {"&amp;", "&"},   {"&#160;", " "},
        {"&mu;", "µ"},   {"&sup3;", "³"},  {"&thinsp;", " "}, {"&Delta;", "Δ"},
    };
    for (size_t i = 0; i < sizeof entities / sizeof entities[0]; i++) {
        size_t length = strlen(entities[i][0]);
        if (strncmp(at, entities[i][0], length) == 0) {
            *text = entities[i][1];
            return length;
        }
    }
    return 0;
}

/* What a tag turns into. */
static const char *replacement_of_tag(const char *at)
{
    if (tag_is(at, "</td") || tag_is(at, "</th")) {
        return "\t";
    }
    bool line = tag_is(at, "</tr") || tag_is(at, "<br") || tag_is(at, "</p") ||
                tag_is(at, "</table") || tag_is(at, "</caption") || tag_is(at, "</div") ||
                tag_is(at, "<table");
    return line ? "\n" : "";
}

bool wa_reader_strip_markup(struct wa_decoded *decoded)
{
    char *text = decoded->text;
    if (strcasestr(text, "<tr") == NULL ||
        (strcasestr(text, "</td>") == NULL && strcasestr(text, "</th>") == NULL)) {
        return false;
    }
    size_t to = 0;
    for (size_t at = 0; at < decoded->length;) {
        const char *piece = NULL;
        size_t used = 1;
        if (text[at] == '<') {
            const char *close = strchr(text + at, '>');
            used = close != NULL ? (size_t)(close - (text + at)) + 1 : decoded->length - at;
            piece = replacement_of_tag(text + at);
        } else if (text[at] == '&') {
            size_t entity = entity_at(text + at, &piece);
            used = entity > 0 ? entity : 1;
        }
        if (piece == NULL) {
            text[to++] = text[at] == '\n' || text[at] == '\t' ? ' ' : text[at];
        } else {
            /* No replacement is longer than what it stands for. */
            size_t length = strlen(piece);
            memcpy(text + to, piece, length);
            to += length;
        }
        at += used;
    }
    text[to] = '\0';
    decoded->length = to;
    return true;
}
