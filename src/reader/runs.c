/* A table's raw points to runs: where one run ends and the next begins, what its volumes count,
 * which rows cannot be right. */
#include "reader/reader_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Whether raw[i] begins another run after the one that began at `first`: the volume is back where
 * it started and moves away again, and the reading is back as well. */
static bool begins_again(const struct wa_raw *raw, size_t count, size_t first, size_t i,
                         double farthest)
{
    if (i < first + WA_POINTS_NEEDED || i + WA_POINTS_NEEDED > count) {
        return false;
    }
    if (raw[i].new_label) {
        return true;
    }
    double start = raw[first].point.volume_mL;
    double away = fabs(raw[i].point.volume_mL - start);
    double before = fabs(raw[i - 1].point.volume_mL - start);
    if (!(farthest > 0) || away > 0.3 * farthest || before < 0.5 * farthest) {
        return false;
    }
    for (size_t k = i; k < i + 3; k++) {
        double here = fabs(raw[k].point.volume_mL - start);
        double next = fabs(raw[k + 1].point.volume_mL - start);
        if (!(next >= here)) {
            return false;
        }
    }
    bool at_start = away <= 0.02 * farthest;
    double reading_start = raw[first].point.reading;
    double reading_end = raw[i - 1].point.reading;
    double reading = raw[i].point.reading;
    bool reading_back = fabs(reading - reading_start) < fabs(reading - reading_end);
    return (at_start && reading_back) || (raw[i].after_words && (at_start || reading_back));
}

/* End of the run that begins at `first`. */
static size_t segment_end(const struct wa_raw *raw, size_t count, size_t first)
{
    double farthest = 0;
    for (size_t i = first + 1; i < count; i++) {
        if (begins_again(raw, count, first, i, farthest)) {
            return i;
        }
        farthest = fmax(farthest, fabs(raw[i].point.volume_mL - raw[first].point.volume_mL));
    }
    return count;
}

/* "volume reading" by an option, or by the last note above the run's end. */
static const char *volume_reading_word(const struct wa_reading *reading, uint32_t last_row)
{
    const char *word = NULL;
    for (size_t i = 0; i < reading->notes.count; i++) {
        char folded[128];
        const struct wa_found_note *note = &reading->notes.notes[i];
        wa_text_fold(note->name, strlen(note->name), folded, sizeof folded);
        const char *known = wa_note_known_name(folded);
        if (known != NULL && strcmp(known, "volume reading") == 0 &&
            (word == NULL || note->row <= last_row)) {
            word = note->text;
        }
    }
    for (size_t i = 0; i < reading->options->given_count; i++) {
        const char *name = reading->options->given[i].name;
        bool named = strcmp(name, "volume reading") == 0 || strcmp(name, "volume-reading") == 0;
        word = named ? reading->options->given[i].text : word;
    }
    return word;
}

static enum wa_status apply_word(const char *word, const char *name, const struct wa_raw *raw,
                                 size_t count, struct wa_volume_rule *rule, struct wa_error *error)
{
    char folded[64];
    wa_text_fold(word, strlen(word), folded, sizeof folded);
    rule->remark = NULL;
    bool falls = count > 1 && raw[count - 1].point.volume_mL < raw[0].point.volume_mL;
    if (strncmp(folded, "total", 5) == 0 || strncmp(folded, "cumulative", 10) == 0) {
        rule->kind = WA_VOLUME_TOTAL;
        rule->direction = 1;
    } else if (strncmp(folded, "buret", 5) == 0) {
        rule->kind = WA_VOLUME_BURETTE;
        rule->direction = falls ? -1 : 1;
    } else if (strncmp(folded, "increment", 9) == 0 || strncmp(folded, "addition", 8) == 0) {
        rule->kind = WA_VOLUME_INCREMENT;
        rule->direction = 1;
    } else {
        return wa_fail(error, WA_ERROR_INPUT, name, 0,
                       "The volume reading '%.40s' is not known; it is total, burette or "
                       "increment.",
                       word);
    }
    return WA_OK;
}

/* Rows without a volume leave the list; additions need every one of them. */
static size_t drop_without_volume(struct wa_raw *raw, size_t count, struct wa_raw *dropped,
                                  size_t *dropped_count)
{
    size_t kept = 0;
    *dropped_count = 0;
    for (size_t i = 0; i < count; i++) {
        if (isnan(raw[i].point.volume_mL)) {
            dropped[(*dropped_count)++] = raw[i];
        } else {
            raw[kept++] = raw[i];
        }
    }
    return kept;
}

/* One run on its way: its rows with a volume, and those without. */
struct making {
    struct wa_reading *reading;
    const struct wa_table_part *table;
    const struct wa_column_choice *choice;
    const struct wa_raw_list *list;
    struct wa_raw *raw;
    size_t count;
    struct wa_raw *dropped;
    size_t dropped_count;
    struct wa_volume_rule rule;
    struct wa_run run;
};

static enum wa_status decide_volumes(struct making *making, uint32_t last_row,
                                     struct wa_error *error)
{
    const char *name = making->reading->sheet.name;
    const struct wa_column *column = &making->table->columns[making->choice->volume];
    making->rule = wa_volume_decide(making->raw, making->count, column);
    const char *word = volume_reading_word(making->reading, last_row);
    if (word != NULL) {
        enum wa_status status =
            apply_word(word, name, making->raw, making->count, &making->rule, error);
        if (status != WA_OK) {
            return status;
        }
    }
    for (size_t i = 0; making->rule.kind == WA_VOLUME_INCREMENT && i < making->dropped_count; i++) {
        const struct wa_raw *row = &making->dropped[i];
        if (making->count > 0 && row->row > making->raw[0].row &&
            row->row < making->raw[making->count - 1].row) {
            return wa_fail(error, WA_ERROR_INPUT, name, row->point.line,
                           "The addition on this line is missing, so the totals after it are "
                           "unknown; fill it in.");
        }
    }
    return wa_volume_totals(making->raw, making->count, making->rule, error);
}

/* Rows that cannot be right: an error with --strict, and too many of them are no titration. */
static enum wa_status judge_rows(struct making *making, struct wa_error *error)
{
    size_t impossible = 0;
    const struct wa_raw *first = NULL;
    for (size_t i = 0; i < making->count; i++) {
        if (making->raw[i].impossible) {
            first = first == NULL ? &making->raw[i] : first;
            impossible++;
        }
    }
    if (first == NULL) {
        return WA_OK;
    }
    const char *name = making->reading->sheet.name;
    if (making->reading->options->strict) {
        return wa_fail(error, WA_ERROR_INPUT, name, first->point.line,
                       "%s Correct the row, or read without --strict to set it aside.",
                       first->wrong);
    }
    if (impossible * 4 > making->count && impossible > 2) {
        return wa_fail(error, WA_ERROR_INPUT, name, first->point.line,
                       "%zu of %zu rows cannot be right, so this is not read as a titration; the "
                       "first is here: %s If the burette was filled again, give running totals.",
                       impossible, making->count, first->wrong);
    }
    return WA_OK;
}

static enum wa_status set_rows_aside(struct making *making, struct wa_error *error)
{
    const struct wa_sheet *sheet = &making->reading->sheet;
    const struct wa_raw *lists[] = {making->dropped, making->raw};
    const size_t counts[] = {making->dropped_count, making->count};
    for (size_t k = 0; k < 2; k++) {
        for (size_t i = 0; i < counts[k]; i++) {
            const struct wa_raw *raw = &lists[k][i];
            const struct wa_row *row = &sheet->rows[raw->row];
            if (raw->wrong == NULL) {
                continue;
            }
            enum wa_status status =
                wa_run_set_aside(&making->run, raw->point.line, sheet->text + row->text_start,
                                 row->text_length, raw->wrong, error);
            if (status != WA_OK) {
                return status;
            }
        }
    }
    return WA_OK;
}

static enum wa_status keep_points(struct making *making, struct wa_error *error)
{
    struct wa_run *run = &making->run;
    size_t count = 0;
    for (size_t i = 0; i < making->count; i++) {
        count += making->raw[i].wrong == NULL;
    }
    run->points = malloc((count + 1) * sizeof *run->points);
    if (run->points == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < making->count; i++) {
        if (making->raw[i].wrong == NULL) {
            run->points[run->point_count++] = making->raw[i].point;
        }
    }
    return WA_OK;
}

/* Rank correlation of reading and order (Kendall 1938) on points spread over the run: a curve that
 * rises or falls is near 1 or -1 however noisy, numbers without order are near 0. */
static double trend_of(const struct wa_run *run)
{
    size_t stride = run->point_count / 150 + 1;
    long concordant = 0;
    long discordant = 0;
    for (size_t i = 0; i < run->point_count; i += stride) {
        for (size_t k = i + stride; k < run->point_count; k += stride) {
            concordant += run->points[k].reading > run->points[i].reading;
            discordant += run->points[k].reading < run->points[i].reading;
        }
    }
    long pairs = concordant + discordant;
    return pairs > 0 ? (double)(concordant - discordant) / (double)pairs : 0;
}

/* Too few points, or a reading or volume that never changes, is no titration. */
static enum wa_status judge_points(const struct making *making, struct wa_error *error)
{
    const struct wa_run *run = &making->run;
    const char *name = making->reading->sheet.name;
    long line = run->point_count > 0 ? run->points[0].line : 0;
    bool pH = run->reading_kind == WA_READING_PH;
    if (run->point_count < WA_POINTS_NEEDED) {
        bool range = making->count >= WA_POINTS_NEEDED && making->raw[0].impossible;
        return wa_fail(error, WA_ERROR_INPUT, name, range ? making->raw[0].point.line : line,
                       "Only %zu usable point%s; at least %d with a volume and a reading are "
                       "needed to show a curve.%s%s",
                       run->point_count, run->point_count == 1 ? "" : "s", WA_POINTS_NEEDED,
                       range ? " The first row that is not usable: " : "",
                       range ? making->raw[0].wrong : "");
    }
    double low = INFINITY;
    double high = -INFINITY;
    for (size_t i = 0; i < run->point_count; i++) {
        low = fmin(low, run->points[i].reading);
        high = fmax(high, run->points[i].reading);
    }
    if (high - low < (pH ? 0.1 : 5)) {
        return wa_fail(error, WA_ERROR_INPUT, name, line,
                       "The %s never changes (%g to %g), so there is no curve to read; check the "
                       "column and the electrode.",
                       pH ? "pH" : "potential", low, high);
    }
    if (run->point_count >= 8 && fabs(trend_of(run)) < 0.25) {
        return wa_fail(error, WA_ERROR_INPUT, name, line,
                       "The %s neither rises nor falls with the volume, so this is not a "
                       "titration curve; check which columns hold volume and reading.",
                       pH ? "pH" : "potential");
    }
    double span = run->points[run->point_count - 1].volume_mL - run->points[0].volume_mL;
    if (!(span > 0)) {
        return wa_fail(error, WA_ERROR_INPUT, name, line,
                       "The volume never changes, so there is no curve to read; check which "
                       "column holds the volume.");
    }
    return WA_OK;
}

static void describe(struct making *making)
{
    struct wa_run *run = &making->run;
    const struct wa_raw_list *list = making->list;
    const struct wa_reading *reading = making->reading;
    run->volume_kind = making->rule.kind;
    run->volume_direction = making->rule.direction;
    snprintf(run->encoding, sizeof run->encoding, "%s", reading->decoded.encoding);
    run->delimiter = reading->sheet.delimiter;
    run->decimal_mark = list->commas > list->dots ? ',' : '.';
    snprintf(run->volume_header, sizeof run->volume_header, "%s",
             making->table->columns[making->choice->volume].text);
    snprintf(run->reading_header, sizeof run->reading_header, "%s",
             making->table->columns[making->choice->reading].text);
    snprintf(run->volume_unit, sizeof run->volume_unit, "%s", wa_unit_name(list->volume_unit));
    snprintf(run->reading_unit, sizeof run->reading_unit, "%s", wa_unit_name(list->reading_unit));
    run->volume_decimals = list->volume_decimals;
    run->reading_decimals = list->reading_decimals;
}

static enum wa_status say_assumptions(struct making *making, struct wa_error *error)
{
    struct wa_run *run = &making->run;
    const struct wa_raw_list *list = making->list;
    enum wa_status status = WA_OK;
    const struct wa_column *volume = &making->table->columns[making->choice->volume];
    if (volume->header.equivalents) {
        status = wa_run_remark(run, error,
                               "The column '%s' counts equivalents; they are treated as if they "
                               "were mL, so volumes and amounts mean nothing here.",
                               volume->text);
    } else if (list->volume_unit_assumed) {
        status = wa_run_remark(run, error, "The volume has no unit; mL is assumed.");
    }
    if (status == WA_OK && list->reading_unit_assumed) {
        status = wa_run_remark(run, error, "The potential has no unit; %s is assumed.",
                               wa_unit_name(list->reading_unit));
    }
    if (status == WA_OK && making->rule.remark != NULL) {
        status = wa_run_remark(run, error, "%s", making->rule.remark);
    }
    if (status == WA_OK && list->dots > 0 && list->commas > 0) {
        status = wa_run_remark(run, error,
                               "Decimal points and decimal commas both occur; each is "
                               "read as a decimal mark.");
    }
    if (status == WA_OK && list->starred > 0) {
        status =
            wa_run_remark(run, error, "Values with a star (%zu) are read as if it were not there.",
                          list->starred);
    }
    return status;
}

/* A run that is none: kept as the refusal when it is the first, an error when rows are wrong. */
static enum wa_status refuse(struct making *making, const struct wa_error *why)
{
    if (making->reading->refusal.message[0] == '\0') {
        making->reading->refusal = *why;
    }
    return WA_OK;
}

static enum wa_status finish_run(struct making *making, size_t beside, struct wa_error *error)
{
    struct wa_reading *reading = making->reading;
    uint32_t first_row = making->raw[0].row;
    uint32_t last_row = making->raw[making->count - 1].row;
    making->count =
        drop_without_volume(making->raw, making->count, making->dropped, &making->dropped_count);
    struct wa_run *run = &making->run;
    run->reading_kind = making->choice->kind == WA_ROLE_PH ? WA_READING_PH : WA_READING_MV;
    enum wa_status status = decide_volumes(making, last_row, error);
    if (status == WA_OK) {
        status = wa_screen_readings(making->raw, making->count, run->reading_kind, error);
    }
    if (status == WA_OK) {
        status = keep_points(making, error);
    }
    if (status != WA_OK) {
        return status;
    }
    struct wa_error why;
    if (judge_points(making, &why) != WA_OK) {
        return refuse(making, &why);
    }
    status = judge_rows(making, error);
    if (status != WA_OK || reading->list.count == WA_RUNS_MAX) {
        return status != WA_OK
                   ? status
                   : wa_fail(error, WA_ERROR_INPUT, reading->sheet.name, 0,
                             "More than %d runs in one file; give them in several files.",
                             WA_RUNS_MAX);
    }
    describe(making);
    run->file = wa_text_copy(reading->sheet.name, strlen(reading->sheet.name));
    status = run->file == NULL ? wa_fail_memory(error) : set_rows_aside(making, error);
    if (status == WA_OK) {
        status = say_assumptions(making, error);
    }
    if (status == WA_OK) {
        reading->spans[reading->list.count] =
            (struct wa_span){.first_row = first_row,
                             .last_row = last_row,
                             .table = (size_t)(making->table - reading->tables),
                             .choice = *making->choice,
                             .beside = beside};
        reading->list.runs[reading->list.count++] = *run;
        *run = (struct wa_run){0};
    }
    return status;
}

/* Choices [0, joined) are one curve that goes on in further columns. */
static enum wa_status collect_all(const struct wa_reading *reading,
                                  const struct wa_table_part *table,
                                  const struct wa_column_choice *choices, size_t joined,
                                  bool several, struct wa_raw_list *list, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < joined; i++) {
        status = wa_raw_collect(&reading->sheet, table, &choices[i], several, list, error);
    }
    return status;
}

static enum wa_status say_first(struct making *making, const char *remark, size_t joined,
                                struct wa_error *error)
{
    const struct wa_reading *reading = making->reading;
    enum wa_status status = WA_OK;
    if (remark != NULL) {
        status = wa_run_remark(&making->run, error, "%s", remark);
    }
    if (status == WA_OK && reading->remark != NULL) {
        status = wa_run_remark(&making->run, error, "%s", reading->remark);
    }
    if (status == WA_OK && reading->markup) {
        status = wa_run_remark(&making->run, error,
                               "The file is the markup of a page; lines count the rows of its "
                               "tables.");
    }
    if (status == WA_OK && joined > 1) {
        status = wa_run_remark(&making->run, error,
                               "The curve goes on in further columns of the table; they are read "
                               "one after the other.");
    }
    return status;
}

static enum wa_status runs_of_choices(struct wa_reading *reading, const struct wa_table_part *table,
                                      const struct wa_column_choice *choices, size_t joined,
                                      bool several, size_t beside, const char *remark,
                                      struct wa_error *error)
{
    struct wa_raw_list list = {0};
    enum wa_status status = collect_all(reading, table, choices, joined, several, &list, error);
    struct wa_raw *dropped = malloc((list.count + 1) * sizeof *dropped);
    if (status == WA_OK && dropped == NULL) {
        status = wa_fail_memory(error);
    }
    for (size_t first = 0; status == WA_OK && first < list.count;) {
        size_t end = segment_end(list.raw, list.count, first);
        struct making making = {
            .reading = reading,
            .table = table,
            .choice = choices,
            .list = &list,
            .raw = list.raw + first,
            .count = end - first,
            .dropped = dropped,
        };
        status = say_first(&making, remark, joined, error);
        if (status == WA_OK) {
            status = finish_run(&making, beside, error);
        }
        wa_run_free(&making.run);
        first = end;
    }
    free(dropped);
    free(list.raw);
    return status;
}

/* How many of the choices go on where the one before ended, in volume columns of their own. */
static size_t choices_that_go_on(const struct wa_table_part *table,
                                 const struct wa_column_choice *choices, size_t count)
{
    size_t joined = 1;
    const struct wa_column *lead = &table->columns[choices[0].volume];
    double direction = lead->last - lead->first;
    for (; joined < count; joined++) {
        const struct wa_column_choice *before = &choices[joined - 1];
        const struct wa_column_choice *next = &choices[joined];
        const struct wa_column *volume = &table->columns[next->volume];
        const struct wa_column *reading = &table->columns[next->reading];
        const struct wa_column *reading_before = &table->columns[before->reading];
        double gap = volume->first - table->columns[before->volume].last;
        if (next->volume == before->volume || next->kind != before->kind ||
            !(gap * direction > 0) ||
            fabs(reading->first - reading_before->last) >=
                fabs(reading->first - reading_before->first)) {
            break;
        }
    }
    return joined;
}

enum wa_status wa_runs_of_table(struct wa_reading *reading, size_t t, struct wa_error *error)
{
    struct wa_table_part *table = &reading->tables[t];
    struct wa_column_choice choices[WA_CHOICES_MAX];
    struct wa_text remark = {0};
    size_t count;
    if (reading->list.runs == NULL) {
        reading->list.runs = calloc(WA_RUNS_MAX, sizeof *reading->list.runs);
        if (reading->list.runs == NULL) {
            return wa_fail_memory(error);
        }
    }
    enum wa_status status =
        wa_columns_choose(&reading->sheet, table, choices, &count, &remark, error);
    if (remark.length > 0) {
        remark.bytes[remark.length - 1] = '\0';
    }
    size_t joined = 1;
    for (size_t i = 0; status == WA_OK && i < count; i += joined) {
        joined = choices_that_go_on(table, &choices[i], count - i);
        status =
            runs_of_choices(reading, table, &choices[i], joined, count > 1, i, remark.bytes, error);
    }
    wa_text_free(&remark);
    return status;
}
