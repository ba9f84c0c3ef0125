/* Which columns hold the volume and the reading of each run. */
#include "reader/reader_internal.h"

#include <math.h>
#include <string.h>

static bool mostly_numbers(const struct wa_table_part *table, size_t c)
{
    size_t most = 0;
    for (size_t i = 0; i < table->column_count; i++) {
        most = table->columns[i].numbers > most ? table->columns[i].numbers : most;
    }
    return table->columns[c].numbers * 2 >= most && table->columns[c].numbers >= 2;
}

static bool runs_one_way(const struct wa_column *column)
{
    size_t against = column->rising < column->falling ? column->rising : column->falling;
    size_t with = column->rising > column->falling ? column->rising : column->falling;
    return with > 0 && against * 10 <= with;
}

static bool looks_like_pH(const struct wa_column *column)
{
    return column->in_pH_range * 10 >= column->numbers * 8 && column->highest > column->lowest;
}

/* 1, 2, 3, ... in every row. */
static bool counts_rows(const struct wa_column *column)
{
    return column->numbers >= 3 && column->counted + 1 == column->numbers &&
           (column->first == 0 || column->first == 1);
}

static enum wa_role role_by_unit(enum wa_unit unit)
{
    return wa_unit_is_volume(unit)        ? WA_ROLE_VOLUME
           : unit == WA_UNIT_PH           ? WA_ROLE_PH
           : wa_unit_is_voltage(unit)     ? WA_ROLE_MV
           : wa_unit_is_time(unit)        ? WA_ROLE_TIME
           : wa_unit_is_temperature(unit) ? WA_ROLE_TEMPERATURE
                                          : WA_ROLE_UNKNOWN;
}

static bool has_role(const struct wa_table_part *table, enum wa_role role)
{
    for (size_t c = 0; c < table->column_count; c++) {
        if (table->columns[c].header.role == role && mostly_numbers(table, c)) {
            return true;
        }
    }
    return false;
}

static bool has_reading(const struct wa_table_part *table)
{
    return has_role(table, WA_ROLE_PH) || has_role(table, WA_ROLE_MV);
}

/* Units in the cells name a column whose header did not. */
static void roles_from_units(struct wa_table_part *table)
{
    for (size_t c = 0; c < table->column_count; c++) {
        struct wa_column *column = &table->columns[c];
        enum wa_role role = role_by_unit(column->cell_unit);
        if (column->header.role == WA_ROLE_UNKNOWN && role != WA_ROLE_UNKNOWN) {
            column->header.role = role;
        }
        if (column->header.role == role && role != WA_ROLE_UNKNOWN) {
            column->header.unit = column->cell_unit;
        }
    }
}

/* Columns that no header and no unit names, in order. */
static size_t unknown_columns(const struct wa_table_part *table, size_t found[WA_COLUMNS_MAX])
{
    size_t count = 0;
    for (size_t c = 0; c < table->column_count; c++) {
        if (table->columns[c].header.role == WA_ROLE_UNKNOWN && mostly_numbers(table, c)) {
            found[count++] = c;
        }
    }
    return count;
}

static void drop_counting_column(struct wa_table_part *table, size_t *unknown, size_t *count)
{
    if (*count >= 3 && counts_rows(&table->columns[unknown[0]])) {
        table->columns[unknown[0]].header.role = WA_ROLE_OTHER;
        memmove(unknown, unknown + 1, (*count - 1) * sizeof *unknown);
        --*count;
    }
}

static enum wa_role reading_role(const struct wa_column *column)
{
    return looks_like_pH(column) ? WA_ROLE_PH : WA_ROLE_MV;
}

/* volume, pH, volume, pH without header words: both volumes run one way from the same place. */
static bool are_pairs(const struct wa_table_part *table, const size_t *unknown, size_t count)
{
    if (count < 4 || count % 2 != 0) {
        return false;
    }
    const struct wa_column *lead = &table->columns[unknown[0]];
    for (size_t i = 0; i < count; i += 2) {
        const struct wa_column *volume = &table->columns[unknown[i]];
        const struct wa_column *reading = &table->columns[unknown[i + 1]];
        double span = fabs(lead->last - lead->first);
        if (!runs_one_way(volume) || !looks_like_pH(reading) ||
            reading->highest - reading->lowest < 1 ||
            fabs(volume->first - lead->first) > 0.1 * span ||
            fabs(volume->last - lead->last) > 0.6 * span) {
            return false;
        }
    }
    return true;
}

static bool starts_at_zero(const struct wa_column *column)
{
    return column->first == 0 && runs_one_way(column);
}

/* Of three columns or more, the first that could be pH and does not count up from zero, with the
 * nearest rising column before it. */
static void guess_among(const struct wa_table_part *table, const size_t *unknown, size_t count,
                        size_t *volume, size_t *reading)
{
    for (size_t i = 1; i < count; i++) {
        const struct wa_column *column = &table->columns[unknown[i]];
        if (!looks_like_pH(column) || starts_at_zero(column)) {
            continue;
        }
        for (size_t k = i; k > 0; k--) {
            const struct wa_column *before = &table->columns[unknown[k - 1]];
            if (runs_one_way(before) && before->rising > before->falling) {
                *volume = k - 1;
                *reading = i;
                return;
            }
        }
    }
}

/* Guess among unnamed columns: which is the volume, which the reading. */
static void guess_both(struct wa_table_part *table, const size_t *unknown, size_t count)
{
    if (are_pairs(table, unknown, count)) {
        for (size_t i = 0; i < count; i++) {
            table->columns[unknown[i]].header.role = i % 2 == 0 ? WA_ROLE_VOLUME : WA_ROLE_PH;
        }
        return;
    }
    size_t volume = 0;
    size_t reading = 1;
    const struct wa_column *first = &table->columns[unknown[0]];
    const struct wa_column *second = &table->columns[unknown[1]];
    if (count == 2 && !runs_one_way(first) && runs_one_way(second) && looks_like_pH(first)) {
        volume = 1;
        reading = 0;
    } else if (count > 2) {
        guess_among(table, unknown, count, &volume, &reading);
    }
    table->columns[unknown[volume]].header.role = WA_ROLE_VOLUME;
    table->columns[unknown[reading]].header.role = reading_role(&table->columns[unknown[reading]]);
}

static bool guess_roles(struct wa_table_part *table)
{
    size_t unknown[WA_COLUMNS_MAX];
    bool volume = has_role(table, WA_ROLE_VOLUME);
    bool reading = has_reading(table);
    if (volume && reading) {
        return false;
    }
    size_t count = unknown_columns(table, unknown);
    drop_counting_column(table, unknown, &count);
    if (!volume && !reading && count >= 2) {
        guess_both(table, unknown, count);
        return true;
    }
    for (size_t i = 0; i < count && volume != reading; i++) {
        struct wa_column *column = &table->columns[unknown[i]];
        if (!volume && runs_one_way(column)) {
            column->header.role = WA_ROLE_VOLUME;
            return true;
        }
        if (!reading && column->highest > column->lowest) {
            column->header.role = reading_role(column);
            return true;
        }
    }
    return false;
}

static bool is_reading(const struct wa_column *column)
{
    return column->header.role == WA_ROLE_PH || column->header.role == WA_ROLE_MV;
}

static bool is_measured(const struct wa_table_part *table, size_t c)
{
    return mostly_numbers(table, c) && !table->columns[c].header.computed;
}

/* Totals are what is wanted; then plain volumes, burette readings, increments. A column that
 * starts at zero is a total whatever its name. */
static int volume_rank(const struct wa_column *column)
{
    int rank = column->header.total       ? 3
               : column->header.increment ? 0
               : column->header.burette   ? 1
                                          : 2;
    return rank + (column->first == 0 && rank > 0 ? 2 : 0);
}

/* Whether each reading stands before its volume: pH, V, pH, V. */
static bool readings_lead(const struct wa_table_part *table)
{
    size_t volumes = 0;
    size_t readings = 0;
    for (size_t c = 0; c < table->column_count; c++) {
        const struct wa_column *column = &table->columns[c];
        readings += is_reading(column);
        if (column->header.role == WA_ROLE_VOLUME && ++volumes > readings) {
            return false;
        }
    }
    return volumes > 1;
}

/* The volume column of the reading in column c. */
static int volume_for(const struct wa_table_part *table, size_t c)
{
    int best = -1;
    int step = readings_lead(table) ? 1 : -1;
    bool passed_reading = false;
    size_t readings = 0;
    for (size_t i = 0; i < table->column_count; i++) {
        readings += is_reading(&table->columns[i]);
    }
    for (int at = (int)c + step; at >= 0 && at < (int)table->column_count; at += step) {
        const struct wa_column *column = &table->columns[at];
        passed_reading = passed_reading || (is_reading(column) && best >= 0);
        if (column->header.role != WA_ROLE_VOLUME || !is_measured(table, (size_t)at)) {
            continue;
        }
        if (best < 0 ||
            (!passed_reading && volume_rank(column) > volume_rank(&table->columns[best]))) {
            best = at;
        }
    }
    bool any = best < 0 || readings == 1;
    for (int at = 0; any && at < (int)table->column_count; at++) {
        if (table->columns[at].header.role == WA_ROLE_VOLUME && is_measured(table, (size_t)at) &&
            (best < 0 || volume_rank(&table->columns[at]) > volume_rank(&table->columns[best]))) {
            best = at;
        }
    }
    return best;
}

static int first_with(const struct wa_table_part *table, enum wa_role role)
{
    for (size_t c = 0; c < table->column_count; c++) {
        if (table->columns[c].header.role == role && mostly_numbers(table, c)) {
            return (int)c;
        }
    }
    return -1;
}

static const char *name_of(const struct wa_column *column)
{
    return column->text[0] != '\0' ? column->text : "without a header";
}

/* A reading that is left out, and why, goes into the remark. */
static bool is_left_out(const struct wa_table_part *table, size_t c,
                        const struct wa_column_choice *choices, size_t count,
                        struct wa_text *remark)
{
    const struct wa_column *column = &table->columns[c];
    int volume = volume_for(table, c);
    for (size_t i = 0; i < count; i++) {
        bool other_kind = choices[i].kind != column->header.role;
        if (choices[i].volume == volume && (other_kind || column->header.second)) {
            wa_text_append(remark,
                           "Column %zu ('%s') is not used; the run is read from column %d "
                           "('%s'). ",
                           c + 1, name_of(column), choices[i].reading + 1,
                           name_of(&table->columns[choices[i].reading]));
            return true;
        }
    }
    return false;
}

/* pH columns first, so that mV beside them is what is left out. */
static size_t take_readings(const struct wa_table_part *table, enum wa_role role,
                            struct wa_column_choice choices[WA_CHOICES_MAX], size_t count,
                            struct wa_text *remark)
{
    for (int pass = 0; pass < 2; pass++) {
        for (size_t c = 0; c < table->column_count && count < WA_CHOICES_MAX; c++) {
            const struct wa_column *column = &table->columns[c];
            if (column->header.role != role || !is_measured(table, c) ||
                column->header.second != (pass == 1) ||
                is_left_out(table, c, choices, count, remark)) {
                continue;
            }
            int volume = volume_for(table, c);
            if (volume >= 0) {
                choices[count++] = (struct wa_column_choice){
                    .volume = volume,
                    .reading = (int)c,
                    .time = first_with(table, WA_ROLE_TIME),
                    .temperature = first_with(table, WA_ROLE_TEMPERATURE),
                    .kind = role,
                };
            }
        }
    }
    return count;
}

static void say_guess(const struct wa_column_choice *choice, struct wa_text *remark)
{
    wa_text_append(remark,
                   "The header does not name all columns; column %d is taken as the volume and "
                   "column %d as the %s. ",
                   choice->volume + 1, choice->reading + 1,
                   choice->kind == WA_ROLE_PH ? "pH" : "potential in mV");
}

/* A column such as "sample" whose text stays for many rows and then changes tells runs apart. */
static bool tells_runs_apart(const struct wa_sheet *sheet, const struct wa_table_part *table,
                             size_t c)
{
    static const char *const words[] = {"sample",  "run",       "trial",   "replicate", "probe",
                                        "serie",   "essai",     "versuch", "muestra",   "campione",
                                        "amostra", "titration", "monster", "lauf",      "curve"};
    char folded[64];
    wa_text_fold(table->columns[c].text, strlen(table->columns[c].text), folded, sizeof folded);
    bool named = false;
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++) {
        named = named || strstr(folded, words[i]) != NULL;
    }
    size_t rows = 0;
    size_t changes = 0;
    const struct wa_row *before = NULL;
    for (size_t r = table->first_row; named && r < table->end_row; r++) {
        const struct wa_row *row = &sheet->rows[r];
        if (row->kind != WA_ROW_NUMBERS || row->number_count < 2) {
            continue;
        }
        size_t length;
        size_t length_before = 0;
        const char *text = wa_sheet_cell(sheet, row, c, &length);
        const char *text_before =
            before != NULL ? wa_sheet_cell(sheet, before, c, &length_before) : text;
        length_before = before != NULL ? length_before : length;
        changes += length != length_before || memcmp(text, text_before, length) != 0;
        before = row;
        rows++;
    }
    return changes > 0 && (changes + 1) * WA_POINTS_NEEDED <= rows;
}

static int label_column(const struct wa_sheet *sheet, const struct wa_table_part *table)
{
    for (size_t c = 0; c < table->column_count; c++) {
        enum wa_role role = table->columns[c].header.role;
        if ((role == WA_ROLE_UNKNOWN || role == WA_ROLE_OTHER) &&
            tells_runs_apart(sheet, table, c)) {
            return (int)c;
        }
    }
    return -1;
}

enum wa_status wa_columns_choose(const struct wa_sheet *sheet, struct wa_table_part *table,
                                 struct wa_column_choice choices[WA_CHOICES_MAX], size_t *count,
                                 struct wa_text *remark, struct wa_error *error)
{
    *count = 0;
    roles_from_units(table);
    table->label_column = label_column(sheet, table);
    if (table->label_column >= 0) {
        table->columns[table->label_column].header.role = WA_ROLE_OTHER;
    }
    bool guessed = guess_roles(table);
    *count = take_readings(table, WA_ROLE_PH, choices, *count, remark);
    *count = take_readings(table, WA_ROLE_MV, choices, *count, remark);
    if (guessed && *count > 0) {
        say_guess(&choices[0], remark);
    }
    for (size_t i = 0; i < *count; i++) {
        const struct wa_column *volume = &table->columns[choices[i].volume];
        if (volume->header.unit == WA_UNIT_DROP) {
            long line = (long)sheet->rows[table->first_row].line;
            return wa_fail(error, WA_ERROR_INPUT, sheet->name, line,
                           "The volume is counted in drops, whose size is unknown; weigh or "
                           "measure the volume of a drop and give millilitres.");
        }
    }
    return remark->failed ? wa_fail_memory(error) : WA_OK;
}
