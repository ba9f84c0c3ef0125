/* The page's record: conditions, rows set aside, the fit, provenance, lines to sign, every point.
 */
#include "report/html_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* A page is for reading; beyond these, the JSON has the rest. */
#define POINTS_SHOWN 400
#define ROWS_SHOWN 200

static const double slip_probability = 0.5;

static void write_note(struct wa_text *page, const struct wa_run *run, const char *name,
                       const char *text)
{
    const struct wa_note *note = wa_run_find_note(run, name);
    if (text == NULL) {
        return;
    }
    html_row(page, name);
    html_cell(page, text);
    html_cell(page, "–");
    if (note != NULL) {
        html_origin(page, note->origin, note->line);
    } else {
        html_cell(page, "–");
    }
    html_raw(page, "</tr>\n");
}

static void write_condition(struct wa_text *page, const struct report_condition *condition)
{
    const struct wa_quantity *quantity = &condition->noted->quantity;
    const bool per_cent = condition->dimension == WA_DIMENSION_FRACTION;
    const double scale = per_cent ? 100.0 : 1.0;
    const char *unit = per_cent ? "%" : wa_dimension_unit(condition->dimension);
    html_row(page, condition->name);
    html_quantity(page, scale * quantity->value, quantity->has_u ? scale * quantity->u : NAN);
    html_cell(page, unit[0] != '\0' ? unit : "–");
    html_origin(page, condition->noted->origin, condition->noted->line);
    html_raw(page, "</tr>\n");
}

static void write_points_row(struct wa_text *page, const struct wa_run *run)
{
    static const char *const kinds[] = {"", "; written as burette readings",
                                        "; written as increments"};
    html_row(page, "points");
    html_raw(page, "<td>");
    html_format(page, "%zu", run->point_count);
    if (run->point_count > 0) {
        const struct wa_point *first = &run->points[0];
        const struct wa_point *last = &run->points[run->point_count - 1];
        const bool in_mV = run->reading_kind == WA_READING_MV;
        html_format(page, "; %.6g to %.6g mL; %s%.6g to %.6g%s", first->volume_mL, last->volume_mL,
                    in_mV ? "" : "pH ", first->reading, last->reading, in_mV ? " mV" : "");
    }
    html_format(page, "%s", (size_t)run->volume_kind < 3 ? kinds[run->volume_kind] : "");
    html_raw(page, "</td><td>–</td><td>measured</td></tr>\n");
}

static void write_run(struct wa_text *page, const struct wa_result *result, size_t index)
{
    static const char *const headings[] = {"Quantity", "Value", "Unit", "From", NULL};
    const struct wa_run *run = &result->runs.runs[index];
    char caption[48];
    snprintf(caption, sizeof caption, "Run %zu of %zu", index + 1, result->runs.count);
    html_table(page, caption, headings);
    html_row(page, "file");
    html_raw(page, "<td>");
    html_format(page, "%s%s%s", run->file != NULL ? run->file : "(no file)",
                run->heading != NULL ? ", " : "", run->heading != NULL ? run->heading : "");
    html_raw(page, "</td><td>–</td><td>–</td></tr>\n");
    write_points_row(page, run);
    write_note(page, run, "sample", run->conditions.sample);
    write_note(page, run, "titrant", run->conditions.titrant);
    write_note(page, run, "solvent", run->conditions.solvent);
    struct report_condition list[16];
    const size_t count = report_conditions(&run->conditions, list);
    for (size_t i = 0; i < count; i++) {
        if (list[i].noted->known) {
            write_condition(page, &list[i]);
        }
    }
    for (size_t i = 0; i < run->note_count; i++) {
        const char *name = report_note_name(&run->notes[i]);
        if (!report_is_condition(name) && wa_run_find_note(run, name) == &run->notes[i]) {
            write_note(page, run, name, run->notes[i].text);
        }
    }
    html_table_end(page);
}

void html_measured(struct wa_text *page, const struct wa_result *result)
{
    if (result->runs.count == 0) {
        return;
    }
    html_section(page, "measured", "What was measured and noted");
    for (size_t i = 0; i < result->runs.count; i++) {
        write_run(page, result, i);
    }
    html_section_end(page);
}

void html_set_aside(struct wa_text *page, const struct wa_result *result)
{
    static const char *const headings[] = {"Line", "Row as written", "Why", NULL};
    size_t total = 0, shown = 0;
    for (size_t i = 0; i < result->runs.count; i++) {
        total += result->runs.runs[i].set_aside_count;
    }
    html_section(page, "aside", "Set aside");
    if (total == 0) {
        html_raw(page, "<p>No row was set aside.</p>\n");
        html_section_end(page);
        return;
    }
    html_table(page, "Rows that are not used", headings);
    for (size_t i = 0; i < result->runs.count; i++) {
        const struct wa_run *run = &result->runs.runs[i];
        for (size_t k = 0; k < run->set_aside_count && shown < ROWS_SHOWN; k++, shown++) {
            char line[32];
            snprintf(line, sizeof line, "%ld", run->set_aside[k].line);
            html_row(page, line);
            html_cell(page, run->set_aside[k].text);
            html_cell(page, run->set_aside[k].reason);
            html_raw(page, "</tr>\n");
        }
    }
    html_table_end(page);
    if (total > shown) {
        html_raw(page, "<p>%zu more rows are not listed here.</p>\n", total - shown);
    }
    html_section_end(page);
}

static void write_parameter(struct wa_text *page, const struct wa_result_parameter *parameter)
{
    char off[32] = "–";
    html_row(page, parameter->name);
    html_cell(page, parameter->unit != NULL && parameter->unit[0] != '\0' ? parameter->unit : "–");
    html_quantity(page, parameter->prior, parameter->prior_u);
    html_origin(page, parameter->origin, parameter->line);
    html_quantity(page, parameter->value, parameter->u);
    if (parameter->prior_u > 0.0 && isfinite(parameter->value)) {
        report_deviation(off, sizeof off,
                         (parameter->value - parameter->prior) / parameter->prior_u);
    }
    html_number(page, off[0] != '\0' ? off : "–");
    html_raw(page, "</tr>\n");
}

void html_fit(struct wa_text *page, const struct wa_result *result,
              const struct wa_page_options *options)
{
    static const char *const headings[] = {
        "Parameter", "Unit", "Before the fit", "From", "After the fit", "Moved by", NULL};
    if (!result->fitted && result->parameter_count == 0) {
        return;
    }
    html_section(page, "fit", "Fit of the whole curve");
    if (result->parameter_count > 0) {
        html_table(page, "Parameters of the best fit", headings);
        for (size_t i = 0; i < result->parameter_count; i++) {
            write_parameter(page, &result->parameters[i]);
        }
        html_table_end(page);
    }
    if (result->fitted) {
        html_raw(page, "<p>");
        html_format(page,
                    "Misfit %.2f u a point (1 is expected); scatter %.2g pH of a reading and %.2g "
                    "mL of a volume; mean ionic strength %.2g mol/L.",
                    result->best.misfit, result->best.noise_reading, result->best.noise_volume,
                    result->best.ionic_strength);
        html_raw(page, "</p>\n");
    }
    html_figure(page, options, WA_FIGURE_RESIDUALS);
    html_section_end(page);
}

void html_provenance(struct wa_text *page, const struct wa_result *result,
                     const struct wa_page_options *options)
{
    static const char *const headings[] = {"File", "Runs", "SHA-256 of its bytes", NULL};
    html_section(page, "provenance", "Provenance");
    if (result->input_count > 0) {
        html_table(page, "Input files", headings);
        for (size_t i = 0; i < result->input_count; i++) {
            char runs[32];
            snprintf(runs, sizeof runs, "%zu", result->inputs[i].runs);
            html_row(page, result->inputs[i].file);
            html_number(page, runs);
            html_raw(page, "<td class=\"code\">");
            html_text(page, result->inputs[i].sha256);
            html_raw(page, "</td></tr>\n");
        }
        html_table_end(page);
    }
    html_raw(page, "<p>");
    const char *version = options != NULL && options->version != NULL ? options->version : "";
    html_format(page, "Program whichacid %s; reference table version %s%s.", version,
                result->table_version[0] != '\0' ? result->table_version : "not known",
                result->overlaid_count > 0 ? ", with rows of your own laid over it" : "");
    html_raw(page, "</p>\n");
    html_section_end(page);
}

void html_signatures(struct wa_text *page)
{
    static const char *const lines[] = {"Analyst",  "Signature", "Date",
                                        "Reviewer", "Signature", "Date"};
    html_section(page, "sign", "Signatures");
    html_raw(page, "<div class=\"sign\">\n");
    for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
        html_raw(page, "<p><span>%s</span></p>\n", lines[i]);
    }
    html_raw(page, "</div>\n");
    html_section_end(page);
}

static void write_fitted_point(struct wa_text *page, const struct wa_result *result, size_t index)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    const struct wa_fit *fit = &result->best;
    const bool slip = fit->outlier != NULL && fit->outlier[index] > slip_probability;
    char text[64];
    snprintf(text, sizeof text, "%ld", experiment->line[index]);
    html_raw(page, "<tr%s><th scope=\"row\">%s</th>", slip ? " class=\"slip\"" : "", text);
    snprintf(text, sizeof text, "%.6g", experiment->volume_mL[index]);
    html_number(page, text);
    snprintf(text, sizeof text, "%.6g", experiment->reading[index]);
    html_number(page, text);
    snprintf(text, sizeof text, fit->model != NULL ? "%.3f" : "–",
             fit->model != NULL ? fit->model[index] : 0.0);
    html_number(page, text);
    const double residual = fit->residual != NULL ? fit->residual[index] : NAN;
    snprintf(text, sizeof text, isfinite(residual) ? "%+.2f" : "–", residual);
    html_number(page, text);
    html_cell(page, slip ? "taken for a slip" : "used");
    html_raw(page, "</tr>\n");
}

void html_points(struct wa_text *page, const struct wa_result *result)
{
    static const char *const headings[] = {
        "Line", "Volume / mL", "Reading as pH", "Fit", "Residual / <i>u</i>", "Use", NULL};
    if (!result->fitted || result->experiments == NULL || result->experiments[0].count == 0) {
        return;
    }
    const size_t count = result->experiments[0].count;
    html_raw(page, "<div class=\"points\">\n");
    html_section(page, "points", "Every point");
    html_table(page, "Points of run 1 with the best fit", headings);
    for (size_t i = 0; i < count && i < POINTS_SHOWN; i++) {
        write_fitted_point(page, result, i);
    }
    html_table_end(page);
    if (count > POINTS_SHOWN) {
        html_raw(page, "<p>%zu more points are in the JSON answer.</p>\n", count - POINTS_SHOWN);
    }
    html_section_end(page);
    html_raw(page, "</div>\n");
}
