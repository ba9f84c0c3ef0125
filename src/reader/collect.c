/* The rows of a table as raw points of one run: units converted, odd cells named. */
#include "reader/reader_internal.h"

#include "base/grow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *volume_complaint(const struct wa_cell_value *value)
{
    return value->kind == WA_CELL_EMPTY   ? "There is no volume."
           : value->kind == WA_CELL_LIMIT ? "The volume is a limit, not a value."
                                          : "The volume is not a number.";
}

static const char *reading_complaint(const struct wa_cell_value *value)
{
    return value->kind == WA_CELL_EMPTY   ? "There is no reading."
           : value->kind == WA_CELL_LIMIT ? "The reading is a limit, not a value."
                                          : "The reading is not a number.";
}

static void count_mark(struct wa_raw_list *list, const struct wa_cell_value *value)
{
    list->dots += value->mark == '.';
    list->dots_three += value->mark == '.' && value->three_after;
    list->commas += value->mark == ',';
    list->commas_three += value->mark == ',' && value->three_after;
    list->starred += value->starred;
}

/* An extra column such as the time, in its own unit; NaN when absent. */
static double extra(const struct wa_sheet *sheet, const struct wa_table_part *table,
                    const struct wa_row *row, int column)
{
    if (column < 0) {
        return NAN;
    }
    struct wa_cell_value value = wa_sheet_value(sheet, row, (size_t)column);
    if (value.kind != WA_CELL_NUMBER) {
        return NAN;
    }
    enum wa_unit unit =
        value.unit != WA_UNIT_NONE ? value.unit : table->columns[column].header.unit;
    return unit == WA_UNIT_KELVIN ? value.value - 273.15 : value.value * wa_unit_factor(unit);
}

/* The unit of a column: its header's or cells' when they fit what the column is. */
static enum wa_unit column_unit(const struct wa_column *column, bool volume)
{
    enum wa_unit candidates[] = {column->header.unit, column->cell_unit};
    for (size_t i = 0; i < 2; i++) {
        bool fits = volume ? wa_unit_is_volume(candidates[i])
                           : candidates[i] == WA_UNIT_PH || wa_unit_is_voltage(candidates[i]);
        if (fits) {
            return candidates[i];
        }
    }
    return WA_UNIT_NONE;
}

static enum wa_unit reading_unit(const struct wa_column *column, enum wa_role kind, bool *assumed)
{
    *assumed = false;
    if (kind == WA_ROLE_PH) {
        return WA_UNIT_PH;
    }
    enum wa_unit unit = column_unit(column, false);
    if (wa_unit_is_voltage(unit)) {
        return unit;
    }
    *assumed = true;
    double size = fmax(fabs(column->lowest), fabs(column->highest));
    return size <= 2 ? WA_UNIT_VOLT : WA_UNIT_MV;
}

static enum wa_status fail_grouped(const struct wa_sheet *sheet, const struct wa_row *row,
                                   size_t column, struct wa_error *error)
{
    size_t length;
    const char *text = wa_sheet_cell(sheet, row, column, &length);
    return wa_fail(error, WA_ERROR_INPUT, sheet->name, (long)row->line,
                   "'%.*s' has a thousands separator, which could be taken for a decimal mark; "
                   "write the number without it.",
                   (int)(length > 40 ? 40 : length), text);
}

/* Fill one raw point; a row that says nothing about this run leaves *skip set. */
static enum wa_status fill_raw(const struct wa_sheet *sheet, const struct wa_table_part *table,
                               const struct wa_column_choice *choice, uint32_t r, bool several,
                               struct wa_raw_list *list, struct wa_raw *raw, bool *skip,
                               struct wa_error *error)
{
    const struct wa_row *row = &sheet->rows[r];
    struct wa_cell_value volume = wa_sheet_value(sheet, row, (size_t)choice->volume);
    struct wa_cell_value reading = wa_sheet_value(sheet, row, (size_t)choice->reading);
    *raw = (struct wa_raw){.row = r, .plus = volume.plus};
    *skip = several && reading.kind == WA_CELL_EMPTY;
    if (volume.kind == WA_CELL_GROUPED || reading.kind == WA_CELL_GROUPED) {
        bool first = volume.kind == WA_CELL_GROUPED;
        return fail_grouped(sheet, row, (size_t)(first ? choice->volume : choice->reading), error);
    }
    enum wa_unit volume_unit = wa_unit_is_volume(volume.unit) ? volume.unit : list->volume_unit;
    enum wa_unit own_unit = wa_unit_is_voltage(reading.unit) && choice->kind == WA_ROLE_MV
                                ? reading.unit
                                : list->reading_unit;
    bool has_volume = volume.kind == WA_CELL_NUMBER;
    bool has_reading = reading.kind == WA_CELL_NUMBER;
    raw->point = (struct wa_point){
        .volume_mL = has_volume ? volume.value * wa_unit_factor(volume_unit) : NAN,
        .reading = has_reading ? reading.value * wa_unit_factor(own_unit) : NAN,
        .written_volume = has_volume ? volume.value : NAN,
        .written_reading = has_reading ? reading.value : NAN,
        .time_s = extra(sheet, table, row, choice->time),
        .temperature_C = extra(sheet, table, row, choice->temperature),
        .line = (long)row->line,
    };
    if (!has_volume) {
        raw->wrong = volume_complaint(&volume);
    } else if (!has_reading) {
        raw->wrong = reading_complaint(&reading);
    }
    if (has_volume && has_reading) {
        count_mark(list, &volume);
        count_mark(list, &reading);
        list->volume_decimals =
            volume.decimals > list->volume_decimals ? volume.decimals : list->volume_decimals;
        list->reading_decimals =
            reading.decimals > list->reading_decimals ? reading.decimals : list->reading_decimals;
    }
    return WA_OK;
}

/* 1.234 beside 0,5 or 1,234 beside 0.5: one of the two is no decimal mark. */
static enum wa_status check_marks(const struct wa_sheet *sheet, const struct wa_raw_list *list,
                                  struct wa_error *error)
{
    bool both = list->dots > 0 && list->commas > 0;
    bool commas_group = both && list->commas == list->commas_three;
    bool dots_group = both && list->dots == list->dots_three;
    if (commas_group || dots_group) {
        return wa_fail(error, WA_ERROR_INPUT, sheet->name, 0,
                       "Some numbers have a %s as a thousands separator beside others with a %s "
                       "as the decimal mark; write the numbers without thousands separators.",
                       commas_group ? "comma" : "point", commas_group ? "point" : "comma");
    }
    return WA_OK;
}

static bool same_cell(const struct wa_sheet *sheet, size_t column, uint32_t a, uint32_t b)
{
    size_t a_length;
    size_t b_length;
    const char *a_text = wa_sheet_cell(sheet, &sheet->rows[a], column, &a_length);
    const char *b_text = wa_sheet_cell(sheet, &sheet->rows[b], column, &b_length);
    return a_length == b_length && memcmp(a_text, b_text, a_length) == 0;
}

enum wa_status wa_raw_collect(const struct wa_sheet *sheet, const struct wa_table_part *table,
                              const struct wa_column_choice *choice, bool among_several,
                              struct wa_raw_list *list, struct wa_error *error)
{
    const struct wa_column *volume = &table->columns[choice->volume];
    const struct wa_column *reading = &table->columns[choice->reading];
    list->volume_unit = column_unit(volume, true);
    list->volume_unit_assumed = list->volume_unit == WA_UNIT_NONE;
    list->volume_unit = list->volume_unit_assumed ? WA_UNIT_ML : list->volume_unit;
    list->reading_unit = reading_unit(reading, choice->kind, &list->reading_unit_assumed);
    bool after_words = false;
    if (!wa_grow(&list->raw, &list->capacity, list->count + table->row_count, sizeof *list->raw)) {
        return wa_fail_memory(error);
    }
    for (size_t r = table->first_row; r < table->end_row; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->kind != WA_ROW_NUMBERS || row->used) {
            after_words = true;
            continue;
        }
        struct wa_raw *raw = &list->raw[list->count];
        bool skip;
        enum wa_status status =
            fill_raw(sheet, table, choice, (uint32_t)r, among_several, list, raw, &skip, error);
        if (status != WA_OK) {
            return status;
        }
        raw->after_words = after_words;
        raw->new_label = list->count > 0 && !skip && table->label_column >= 0 &&
                         !same_cell(sheet, (size_t)table->label_column,
                                    list->raw[list->count - 1].row, (uint32_t)r);
        after_words = after_words && skip;
        list->count += !skip;
    }
    return check_marks(sheet, list, error);
}
