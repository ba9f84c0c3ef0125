/* What was measured, what was left out and what was assumed. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Most runs and rows that the text names one by one; JSON has them all. */
#define RUNS_SHOWN 8
#define ROWS_SHOWN 15
#define OUTLIER_PROBABILITY 0.5

static void write_points(struct report_writer *writer, const struct wa_run *run)
{
    static const char *const kinds[] = {"", ", written as burette readings",
                                        ", written as increments"};
    char span[160] = "";
    if (run->point_count > 0) {
        const struct wa_point *first = &run->points[0];
        const struct wa_point *last = &run->points[run->point_count - 1];
        bool mV = run->reading_kind == WA_READING_MV;
        snprintf(span, sizeof span, ", %.6g to %.6g mL, %s%.6g to %.6g%s", first->volume_mL,
                 last->volume_mL, mV ? "" : "pH ", first->reading, last->reading, mV ? " mV" : "");
    }
    const char *kind = (size_t)run->volume_kind < 3 ? kinds[run->volume_kind] : "";
    report_item(writer, "run", "%s%s%s: %zu points%s%s",
                run->file != NULL ? run->file : "(no file)", run->heading != NULL ? ", " : "",
                run->heading != NULL ? run->heading : "", run->point_count, span, kind);
}

/* Where a value came from; of an option also which note of the file it overrides. */
static void describe_origin(char *text, size_t size, const struct wa_run *run, const char *name,
                            enum wa_origin origin, long line)
{
    report_origin(text, size, origin, line);
    for (size_t i = 0; i < run->note_count && origin == WA_ORIGIN_OPTION; i++) {
        const struct wa_note *note = &run->notes[i];
        if (note->origin == WA_ORIGIN_NOTE && strcmp(report_note_name(note), name) == 0) {
            snprintf(text, size, "option, in place of line %ld", note->line);
            return;
        }
    }
}

static void write_text(struct report_writer *writer, const struct wa_run *run, const char *name,
                       const char *text)
{
    const struct wa_note *note = wa_run_find_note(run, name);
    if (text == NULL) {
        return;
    }
    if (note == NULL) {
        report_item(writer, name, "%s", text);
        return;
    }
    char origin[64];
    describe_origin(origin, sizeof origin, run, name, note->origin, note->line);
    report_item(writer, name, "%s (%s)", text, origin);
}

static bool same_noted(const struct wa_noted *one, const struct wa_noted *other)
{
    return one->known == other->known && one->origin == other->origin &&
           one->quantity.value == other->quantity.value &&
           one->quantity.has_u == other->quantity.has_u &&
           (!one->quantity.has_u || one->quantity.u == other->quantity.u);
}

static void write_quantity(struct report_writer *writer, const struct wa_run *run,
                           const struct report_condition *condition)
{
    const struct wa_quantity *quantity = &condition->noted->quantity;
    bool per_cent = condition->dimension == WA_DIMENSION_FRACTION;
    double scale = per_cent ? 100.0 : 1.0;
    char figure[64];
    report_quantity(figure, sizeof figure, scale * quantity->value,
                    quantity->has_u ? scale * quantity->u : NAN);
    const char *unit = per_cent ? "%" : wa_dimension_unit(condition->dimension);
    char origin[64];
    describe_origin(origin, sizeof origin, run, condition->name, condition->noted->origin,
                    condition->noted->line);
    report_item(writer, condition->name, "%s%s%s (%s)", figure, unit[0] != '\0' ? " " : "", unit,
                origin);
}

/* What was noted; of a replicate only what differs from the first run. */
static void write_conditions(struct report_writer *writer, const struct wa_run *run,
                             const struct wa_run *first)
{
    struct report_condition list[16];
    struct report_condition before[16];
    size_t count = report_conditions(&run->conditions, list);
    report_conditions(&first->conditions, before);
    if (run == first) {
        write_text(writer, run, "sample", run->conditions.sample);
        write_text(writer, run, "titrant", run->conditions.titrant);
        write_text(writer, run, "solvent", run->conditions.solvent);
    }
    for (size_t i = 0; i < count; i++) {
        if (list[i].noted->known && (run == first || !same_noted(list[i].noted, before[i].noted))) {
            write_quantity(writer, run, &list[i]);
        }
    }
    for (size_t i = 0; i < run->note_count && run == first; i++) {
        const struct wa_note *note = &run->notes[i];
        const char *name = report_note_name(note);
        if (!report_is_condition(name) && wa_run_find_note(run, name) == note) {
            write_text(writer, run, name, note->text);
        }
    }
}

void report_measured(struct report_writer *writer, const struct wa_result *result)
{
    const struct wa_run_list *runs = &result->runs;
    if (runs->count == 0) {
        return;
    }
    report_heading(writer, "WHAT WAS MEASURED");
    for (size_t i = 0; i < runs->count && i < RUNS_SHOWN; i++) {
        write_points(writer, &runs->runs[i]);
        write_conditions(writer, &runs->runs[i], &runs->runs[0]);
    }
    if (runs->count > RUNS_SHOWN) {
        report_paragraph(writer, "  ", 4, "... and %zu more runs of the same sample.",
                         runs->count - RUNS_SHOWN);
    }
}

/* Slips that the fit found and that no finding names already. */
static bool has_outliers(const struct wa_result *result)
{
    if (!result->fitted || result->best.outlier == NULL || result->experiments == NULL) {
        return false;
    }
    for (size_t i = 0; i < result->finding_count; i++) {
        if (strcmp(result->findings[i].code, "outlier") == 0) {
            return false;
        }
    }
    for (size_t i = 0; i < result->experiments[0].count; i++) {
        if (result->best.outlier[i] > OUTLIER_PROBABILITY) {
            return true;
        }
    }
    return false;
}

static void write_outliers(struct report_writer *writer, const struct wa_result *result)
{
    const struct wa_fit *fit = &result->best;
    if (!has_outliers(result)) {
        return;
    }
    const struct wa_experiment *experiment = &result->experiments[0];
    for (size_t i = 0; i < experiment->count; i++) {
        if (fit->outlier[i] > OUTLIER_PROBABILITY) {
            char share[32];
            report_probability(share, sizeof share, fit->outlier[i]);
            report_paragraph(writer, "  ", 4,
                             "line %ld: %.6g mL, reading %.6g: used, but the fit takes it for a "
                             "slip with probability %s and gives it almost no weight.",
                             experiment->line[i], experiment->volume_mL[i], experiment->reading[i],
                             share);
        }
    }
}

void report_set_aside(struct report_writer *writer, const struct wa_result *result)
{
    size_t total = 0;
    for (size_t i = 0; i < result->runs.count; i++) {
        total += result->runs.runs[i].set_aside_count;
    }
    if (total == 0 && !has_outliers(result)) {
        return;
    }
    report_heading(writer, "SET ASIDE");
    size_t shown = 0;
    for (size_t i = 0; i < result->runs.count; i++) {
        const struct wa_run *run = &result->runs.runs[i];
        for (size_t k = 0; k < run->set_aside_count && shown < ROWS_SHOWN; k++, shown++) {
            const struct wa_set_aside *row = &run->set_aside[k];
            report_paragraph(writer, "  ", 4, "%s%sline %ld: \"%s\": %s",
                             result->runs.count > 1 && run->file != NULL ? run->file : "",
                             result->runs.count > 1 ? ", " : "", row->line, row->text, row->reason);
        }
    }
    if (total > shown) {
        report_paragraph(writer, "  ", 4, "... and %zu more rows; `whichacid inspect` lists all.",
                         total - shown);
    }
    write_outliers(writer, result);
}

/* Whether this remark was said by a sentence of the list or by an earlier remark. */
static bool said_before(const struct wa_result *result, size_t run, size_t remark)
{
    const char *sentence = result->runs.runs[run].remarks[remark];
    if (report_has_sentence(result->assumptions, result->assumption_count, sentence)) {
        return true;
    }
    for (size_t i = 0; i <= run; i++) {
        const struct wa_run *other = &result->runs.runs[i];
        size_t count = i < run ? other->remark_count : remark;
        for (size_t k = 0; k < count; k++) {
            if (strcmp(other->remarks[k], sentence) == 0) {
                return true;
            }
        }
    }
    return false;
}

void report_assumed(struct report_writer *writer, const struct wa_result *result)
{
    static const char heading[] = "ASSUMED";
    report_sentences(writer, heading, result->assumptions, result->assumption_count);
    bool headed = result->assumption_count > 0;
    for (size_t i = 0; i < result->runs.count; i++) {
        for (size_t k = 0; k < result->runs.runs[i].remark_count; k++) {
            if (!said_before(result, i, k)) {
                if (!headed) {
                    report_heading(writer, heading);
                    headed = true;
                }
                report_paragraph(writer, "  - ", 4, "%s", result->runs.runs[i].remarks[k]);
            }
        }
    }
}
