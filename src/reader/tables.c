/* Where the tables of a sheet are: header rows, the rows under them, and what the numbers of each
 * column look like. */
#include "reader/reader_internal.h"

#include "base/grow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define HEADER_CELL_MAX 90 /* longer cells are prose */
#define LOOK_AHEAD 8       /* rows between a header and its first numbers */

static bool starts_like_number(const char *text, size_t length)
{
    return length > 0 && strchr("0123456789+-.,<", text[0]) != NULL;
}

/* Which roles the cells of rows [first, end) name together. */
static void roles_of(const struct wa_sheet *sheet, size_t first, size_t end, bool *volume,
                     bool *reading)
{
    *volume = false;
    *reading = false;
    size_t columns = 0;
    for (size_t r = first; r < end; r++) {
        columns = sheet->rows[r].cell_count > columns ? sheet->rows[r].cell_count : columns;
    }
    for (size_t c = 0; c < columns && c < WA_COLUMNS_MAX; c++) {
        char joined[2 * HEADER_CELL_MAX + 2];
        size_t at = 0;
        for (size_t r = first; r < end; r++) {
            size_t length;
            const char *text = wa_sheet_cell(sheet, &sheet->rows[r], c, &length);
            if (length == 0 || length > HEADER_CELL_MAX || starts_like_number(text, length)) {
                continue;
            }
            joined[at] = ' ';
            memcpy(joined + at + (at > 0), text, length);
            at += length + (at > 0);
        }
        struct wa_header header = wa_header_parse(joined, at);
        *volume = *volume || header.role == WA_ROLE_VOLUME;
        *reading = *reading || header.role == WA_ROLE_PH || header.role == WA_ROLE_MV;
    }
}

static bool may_be_header(const struct wa_sheet *sheet, size_t r)
{
    const struct wa_row *row = &sheet->rows[r];
    if (row->cell_count < 2 || row->text_length > 2000) {
        return false;
    }
    if (row->kind == WA_ROW_COMMENT) {
        return row->number_count == 0;
    }
    if (row->kind == WA_ROW_NUMBERS) {
        size_t length;
        const char *first = wa_sheet_cell(sheet, row, 0, &length);
        return row->number_count < row->cell_count && !starts_like_number(first, length) &&
               wa_cell_parse(first, length).kind == WA_CELL_WORDS;
    }
    return row->kind == WA_ROW_WORDS;
}

/* A row under the names that holds units alone: "mL", "(mL)", "[-]". */
static bool is_unit_row(const struct wa_sheet *sheet, size_t r)
{
    size_t units = 0;
    const struct wa_row *row = &sheet->rows[r];
    if (row->kind != WA_ROW_WORDS && row->kind != WA_ROW_COMMENT) {
        return false;
    }
    for (size_t c = 0; c < row->cell_count; c++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        char folded[40];
        size_t size = wa_text_fold(text, length, folded, sizeof folded);
        const char *at = folded;
        if (size > 2 && (at[0] == '(' || at[0] == '[')) {
            at++;
            size -= 2;
        }
        bool dash = size == 0 || (size == 1 && (at[0] == '-' || at[0] == '1'));
        bool unit = !dash && (wa_unit_find(at, size) != WA_UNIT_NONE || strchr(at, '/') != NULL ||
                              at[0] == '%');
        if (!dash && !unit) {
            return false;
        }
        units += unit;
    }
    return units > 0;
}

static bool numbers_follow(const struct wa_sheet *sheet, size_t r)
{
    for (size_t i = r; i < sheet->row_count && i < r + LOOK_AHEAD; i++) {
        if (sheet->rows[i].kind == WA_ROW_NUMBERS && sheet->rows[i].number_count >= 2) {
            return true;
        }
    }
    return false;
}

/* Whether a header begins at row r; *end is one past its last row. */
static bool header_at(const struct wa_sheet *sheet, size_t r, size_t *end)
{
    bool volume;
    bool reading;
    if (!may_be_header(sheet, r) || !numbers_follow(sheet, r + 1)) {
        return false;
    }
    roles_of(sheet, r, r + 1, &volume, &reading);
    bool below = r + 1 < sheet->row_count;
    bool units = below && is_unit_row(sheet, r + 1);
    *end = r + 1 + units;
    if (units && (volume || reading)) {
        roles_of(sheet, r, r + 2, &volume, &reading);
    }
    if (volume && reading) {
        return numbers_follow(sheet, *end);
    }
    /* Names over two rows: "Volume | " above "NaOH (mL) | pH". */
    if ((volume || reading) && below && may_be_header(sheet, r + 1)) {
        bool volume_below;
        bool reading_below;
        roles_of(sheet, r + 1, r + 2, &volume_below, &reading_below);
        roles_of(sheet, r, r + 2, &volume, &reading);
        *end = r + 2;
        return volume && reading && !(volume_below && reading_below) && numbers_follow(sheet, *end);
    }
    return false;
}

static bool is_plain_data(const struct wa_sheet *sheet, size_t r)
{
    const struct wa_row *row = &sheet->rows[r];
    if (row->kind != WA_ROW_NUMBERS || row->number_count < 2) {
        return false;
    }
    for (size_t c = 0; c < row->cell_count; c++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        if (length > 0) {
            return starts_like_number(text, length) ||
                   wa_cell_parse(text, length).kind == WA_CELL_NUMBER;
        }
    }
    return false;
}

/* The first of at least `needed` rows of numbers in [first, end), SIZE_MAX when there are none. */
static size_t data_start(const struct wa_sheet *sheet, size_t first, size_t end, size_t needed)
{
    size_t start = SIZE_MAX;
    size_t seen = 0;
    size_t other = 0;
    for (size_t r = first; r < end; r++) {
        if (is_plain_data(sheet, r)) {
            start = seen == 0 ? r : start;
            other = 0;
            if (++seen >= needed) {
                return start;
            }
        } else if (sheet->rows[r].kind != WA_ROW_BLANK && ++other > 2) {
            seen = 0;
        }
    }
    return SIZE_MAX;
}

static void set_header_text(const struct wa_sheet *sheet, struct wa_table_part *table, size_t c)
{
    struct wa_column *column = &table->columns[c];
    char joined[2 * HEADER_CELL_MAX + 2];
    size_t at = 0;
    for (size_t r = table->header_row; r < table->header_end; r++) {
        size_t length;
        const char *text = wa_sheet_cell(sheet, &sheet->rows[r], c, &length);
        if (length == 0 || length > HEADER_CELL_MAX) {
            continue;
        }
        joined[at] = ' ';
        memcpy(joined + at + (at > 0), text, length);
        at += length + (at > 0);
    }
    for (size_t i = 0; i < at; i++) {
        joined[i] = joined[i] == '\n' ? ' ' : joined[i];
    }
    column->header = wa_header_parse(joined, at);
    size_t shown = at < sizeof column->text ? at : sizeof column->text - 1;
    while (shown < at && shown > 0 && ((unsigned char)joined[shown] & 0xC0) == 0x80) {
        shown--;
    }
    memcpy(column->text, joined, shown);
    column->text[shown] = '\0';
}

/* Words set apart by single spaces may be cut wrongly. When there are more of them than columns,
 * the named ones are taken in order if they are as many as the columns; else none is trusted. */
static void settle_loose_header(const struct wa_sheet *sheet, struct wa_table_part *table)
{
    size_t data_columns = 0;
    for (size_t r = table->first_row; r < table->end_row; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->kind == WA_ROW_NUMBERS && row->cell_count > data_columns) {
            data_columns = row->cell_count;
        }
    }
    if (sheet->delimiter != ' ' || table->column_count <= data_columns || data_columns == 0) {
        return;
    }
    size_t named = 0;
    for (size_t c = 0; c < table->column_count; c++) {
        named += table->columns[c].header.role != WA_ROLE_UNKNOWN;
    }
    size_t to = 0;
    for (size_t c = 0; c < table->column_count && named == data_columns; c++) {
        if (table->columns[c].header.role != WA_ROLE_UNKNOWN) {
            table->columns[to++] = table->columns[c];
        }
    }
    for (size_t c = to; c < table->column_count; c++) {
        table->columns[c] = (struct wa_column){0};
    }
    table->column_count = data_columns < WA_COLUMNS_MAX ? data_columns : WA_COLUMNS_MAX;
}

static void count_value(struct wa_column *column, const struct wa_cell_value *value)
{
    double x = value->value;
    if (column->numbers == 0) {
        column->first = column->lowest = column->highest = x;
    } else {
        column->rising += x > column->last;
        column->falling += x < column->last;
        column->counted += x - column->last == 1;
        column->lowest = fmin(column->lowest, x);
        column->highest = fmax(column->highest, x);
    }
    column->last = x;
    column->numbers++;
    column->plus_signs += value->plus;
    column->in_pH_range += x >= -2 && x <= 16;
    column->cell_unit = value->unit != WA_UNIT_NONE ? value->unit : column->cell_unit;
}

static void fill_columns(const struct wa_sheet *sheet, struct wa_table_part *table)
{
    size_t columns = 0;
    bool has_header = table->header_row != SIZE_MAX;
    for (size_t r = has_header ? table->header_row : table->first_row; r < table->end_row; r++) {
        size_t count = sheet->rows[r].cell_count;
        bool counts = sheet->rows[r].kind == WA_ROW_NUMBERS || r < table->first_row;
        columns = counts && count > columns ? count : columns;
    }
    table->column_count = columns < WA_COLUMNS_MAX ? columns : WA_COLUMNS_MAX;
    for (size_t c = 0; has_header && c < table->column_count; c++) {
        set_header_text(sheet, table, c);
    }
    if (has_header) {
        settle_loose_header(sheet, table);
    }
    for (size_t r = table->first_row; r < table->end_row; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->kind != WA_ROW_NUMBERS) {
            continue;
        }
        table->row_count++;
        for (size_t c = 0; c < row->cell_count && c < table->column_count; c++) {
            struct wa_cell_value value = wa_sheet_value(sheet, row, c);
            if (value.kind == WA_CELL_NUMBER) {
                count_value(&table->columns[c], &value);
            } else if (value.kind == WA_CELL_GROUPED) {
                table->columns[c].numbers++;
            }
        }
    }
}

/* Growing list of tables. */
struct table_list {
    struct wa_table_part *tables;
    size_t count, capacity;
};

static bool add_table(struct table_list *list, const struct wa_sheet *sheet, size_t header_row,
                      size_t header_end, size_t first_row, size_t end_row)
{
    if (!wa_grow(&list->tables, &list->capacity, list->count + 1, sizeof *list->tables)) {
        return false;
    }
    struct wa_table_part *table = &list->tables[list->count++];
    *table = (struct wa_table_part){.header_row = header_row,
                                    .header_end = header_end,
                                    .first_row = first_row,
                                    .end_row = end_row};
    fill_columns(sheet, table);
    return true;
}

/* Rows of numbers without a full header; the row above may still name a column. */
static bool add_headless(struct table_list *list, const struct wa_sheet *sheet, size_t first,
                         size_t end, size_t needed)
{
    size_t start = data_start(sheet, first, end, needed);
    if (start == SIZE_MAX) {
        return true;
    }
    size_t above = start;
    while (above > first && sheet->rows[above - 1].kind == WA_ROW_BLANK) {
        above--;
    }
    bool volume = false;
    bool reading = false;
    if (above > first && may_be_header(sheet, above - 1)) {
        roles_of(sheet, above - 1, above, &volume, &reading);
    }
    bool named = volume || reading;
    return add_table(list, sheet, named ? above - 1 : SIZE_MAX, named ? above : SIZE_MAX, start,
                     end);
}

static int first_named(const struct wa_table_part *table, bool volume)
{
    for (size_t c = 0; c < table->column_count; c++) {
        enum wa_role role = table->columns[c].header.role;
        bool wanted = volume ? role == WA_ROLE_VOLUME : role == WA_ROLE_PH || role == WA_ROLE_MV;
        if (wanted && table->columns[c].numbers > 0) {
            return (int)c;
        }
    }
    return -1;
}

/* A table under the same header that goes on where the one above ended is the same run, cut for a
 * page or a notebook's column. */
static bool goes_on(const struct wa_table_part *table, const struct wa_table_part *next)
{
    int v = first_named(table, true);
    int r = first_named(table, false);
    if (v < 0 || r < 0 || table->column_count != next->column_count ||
        table->header_row == SIZE_MAX || next->header_row == SIZE_MAX) {
        return false;
    }
    for (size_t c = 0; c < table->column_count; c++) {
        if (strcmp(table->columns[c].text, next->columns[c].text) != 0) {
            return false;
        }
    }
    const struct wa_column *volume = &table->columns[v];
    const struct wa_column *reading = &table->columns[r];
    const struct wa_column *next_volume = &next->columns[v];
    const struct wa_column *next_reading = &next->columns[r];
    double direction = volume->last - volume->first;
    return next_volume->numbers > 0 && next_reading->numbers > 0 &&
           (next_volume->first - volume->last) * direction > 0 &&
           (next_volume->last - next_volume->first) * direction >= 0 &&
           fabs(next_reading->first - reading->last) < fabs(next_reading->first - reading->first);
}

static void join_tables(struct wa_sheet *sheet, struct table_list *list)
{
    size_t to = 0;
    for (size_t t = 1; t < list->count; t++) {
        struct wa_table_part *above = &list->tables[to];
        const struct wa_table_part *table = &list->tables[t];
        if (!goes_on(above, table)) {
            list->tables[++to] = *table;
            continue;
        }
        for (size_t r = table->header_row; r < table->header_end; r++) {
            sheet->rows[r].used = true;
        }
        above->end_row = table->end_row;
        memset(above->columns, 0, sizeof above->columns);
        above->row_count = 0;
        fill_columns(sheet, above);
    }
    list->count = list->count > 0 ? to + 1 : 0;
}

enum wa_status wa_tables_find(struct wa_sheet *sheet, struct wa_table_part **tables, size_t *count,
                              struct wa_error *error)
{
    struct table_list list = {0};
    size_t from = 0;
    bool ok = true;
    size_t header = SIZE_MAX;
    size_t header_end = 0;
    for (size_t r = 0; ok && r <= sheet->row_count; r++) {
        size_t end = 0;
        bool at_end = r == sheet->row_count;
        if (!at_end && !header_at(sheet, r, &end)) {
            continue;
        }
        if (header != SIZE_MAX) {
            ok = add_table(&list, sheet, header, header_end, header_end, r);
        } else {
            ok = add_headless(&list, sheet, from, r, at_end ? 3 : WA_POINTS_NEEDED);
        }
        if (list.count > WA_TABLES_MAX) {
            free(list.tables);
            return wa_fail(error, WA_ERROR_INPUT, sheet->name, (long)sheet->rows[header].line,
                           "More than %d tables in one file; give them in several files.",
                           WA_TABLES_MAX);
        }
        header = r;
        header_end = end;
        from = end;
        r = at_end ? r : end - 1;
    }
    if (!ok) {
        free(list.tables);
        return wa_fail_memory(error);
    }
    join_tables(sheet, &list);
    *tables = list.tables;
    *count = list.count;
    return WA_OK;
}
