/* The page's tables of what was found: candidates, equivalence points, constants, amounts. */
#include "report/html_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static bool is_given(const char *text)
{
    return text != NULL && text[0] != '\0';
}

static void write_small(struct wa_text *page, const char *before, const char *text)
{
    if (is_given(text)) {
        html_raw(page, "<span class=\"small\">");
        html_format(page, "%s%s", before, text);
        html_raw(page, "</span>");
    }
}

/* Each constant of the table with the measured one's distance from it. */
static void write_steps(struct wa_text *page, const struct wa_result_candidate *candidate)
{
    html_raw(page, "<td class=\"number\">");
    for (int i = 0; i < candidate->step_count && i < WA_PROTONS_MAX; i++) {
        char figure[64], off[32];
        report_quantity(figure, sizeof figure, candidate->pKa[i], candidate->pKa_u[i]);
        report_deviation(off, sizeof off, candidate->seen[i] ? candidate->pKa_deviation[i] : NAN);
        html_raw(page, "%s", i > 0 ? "<br>" : "");
        html_format(page, "%s (%s)", figure,
                    !candidate->seen[i] ? "not seen"
                    : off[0] != '\0'    ? off
                                        : "not compared");
    }
    html_raw(page, "%s</td>", candidate->step_count > 0 ? "" : "–");
}

static void write_mass(struct wa_text *page, const struct wa_result_candidate *candidate)
{
    char off[32];
    report_deviation(off, sizeof off, candidate->molar_mass_deviation);
    html_raw(page, "<td class=\"number\">");
    if (isfinite(candidate->molar_mass) && candidate->molar_mass > 0.0) {
        html_format(page, "%.2f", candidate->molar_mass);
        html_raw(page, "<br>");
        html_format(page, "(%s)", off[0] != '\0' ? off : "none measured");
    } else {
        html_raw(page, "–");
    }
    html_raw(page, "</td>");
}

static void write_candidate(struct wa_text *page, const struct wa_result_candidate *candidate,
                            bool leads)
{
    char share[32], misfit[32] = "–";
    report_probability(share, sizeof share, candidate->probability);
    if (isfinite(candidate->misfit) && candidate->misfit > 0.0) {
        snprintf(misfit, sizeof misfit, "%.2f", candidate->misfit);
    }
    html_raw(page, "<tr%s><td class=\"number\">%d</td><th scope=\"row\">",
             leads ? " class=\"first\"" : "", candidate->rank);
    html_text(page, is_given(candidate->form_name) ? candidate->form_name : candidate->acid_name);
    write_small(page, "", candidate->why);
    write_small(page, "cannot be told here from: ", candidate->others);
    write_small(page, "constants from: ", candidate->sources);
    html_raw(page, "</th>");
    html_number(page, share);
    write_steps(page, candidate);
    write_mass(page, candidate);
    html_number(page, misfit);
    html_raw(page, "</tr>\n");
}

void html_candidates(struct wa_text *page, const struct wa_result *result,
                     const struct wa_page_options *options)
{
    static const char *const headings[] = {"Rank",
                                           "Substance",
                                           "Probability",
                                           "p<i>K</i><sub>a</sub> of the table",
                                           "Molar mass<br>/ (g/mol)",
                                           "Misfit / <i>u</i>",
                                           NULL};
    html_section(page, "candidates", "Candidates");
    if (result->verdict.kind == WA_VERDICT_UNFIT) {
        html_raw(page, "<p>The data are unfit for an answer: this list is a hint and no more."
                       "</p>\n");
    }
    html_table(page, "Forms of the table, the most probable first", headings);
    for (size_t i = 0; i < result->candidate_count; i++) {
        write_candidate(page, &result->candidates[i],
                        i == 0 && result->verdict.kind != WA_VERDICT_UNFIT);
    }
    char share[32];
    report_probability(share, sizeof share, result->not_in_table);
    html_raw(page, "<tr><td>–</td><th scope=\"row\">something that is not in the table</th>");
    html_number(page, share);
    html_raw(page, "<td>–</td><td>–</td><td>–</td></tr>\n");
    html_table_end(page);
    html_raw(page, "<p class=\"small\">In brackets: measured less table, in standard uncertainties "
                   "<i>u</i> of both; beyond 2 <i>u</i> is doubtful, beyond 3 <i>u</i> hardly the "
                   "same substance. The table's constants hold at 25 °C and zero ionic strength. "
                   "Misfit: root mean square distance of a point from the best curve in its own "
                   "<i>u</i>; 1 is expected.</p>\n");
    html_figure(page, options, WA_FIGURE_RUNNER_UP);
    html_section_end(page);
}

static void write_volume(struct wa_text *page, const struct wa_volume_estimate *estimate)
{
    html_quantity(page, estimate->u_mL > 0.0 ? estimate->volume_mL : NAN, estimate->u_mL);
}

/* One row a method and a point: the caption's columns stay the same for any number of points. */
static void write_methods(struct wa_text *page, const struct wa_result *result)
{
    static const char *const headings[] = {
        "Point", "Steepest slope", "Curvature zero", "Gran, before", "Gran, after", "Whole curve",
        NULL};
    html_table(page, "Equivalence volume / mL by each method", headings);
    for (size_t i = 0; i < result->equivalence_count; i++) {
        const struct wa_result_equivalence *point = &result->equivalence_points[i];
        char name[24];
        snprintf(name, sizeof name, "E%zu", i + 1);
        html_row(page, name);
        write_volume(page, &point->first_derivative);
        write_volume(page, &point->second_derivative);
        write_volume(page, &point->gran_before);
        write_volume(page, &point->gran_after);
        write_volume(page, &point->fit);
        html_raw(page, "</tr>\n");
    }
    html_table_end(page);
}

static void write_point(struct wa_text *page, const struct wa_result_equivalence *point,
                        size_t index)
{
    char text[64];
    snprintf(text, sizeof text, "E%zu", index + 1);
    html_row(page, text);
    html_quantity(page, point->volume_mL, point->u_mL);
    snprintf(text, sizeof text, isfinite(point->pH) ? "%.2f" : "–", point->pH);
    html_number(page, text);
    snprintf(text, sizeof text, point->protons > 0 ? "%d" : "not known", point->protons);
    html_number(page, text);
    html_cell(page, point->from_fit ? "whole-curve fit" : "curve alone");
    if (point->inflection_seen && isfinite(point->inflection_mL)) {
        snprintf(text, sizeof text, "%.2f mL, %.1f u high", point->inflection_mL,
                 point->significance);
        html_cell(page, text);
    } else {
        html_cell(page, "none seen");
    }
    html_raw(page, "</tr>\n");
}

static void write_protons(struct wa_text *page, const struct wa_result *result)
{
    for (size_t i = 0; i < result->proton_alternative_count; i++) {
        const struct wa_proton_count *other = &result->proton_alternatives[i];
        if (other->count != result->proton_count && other->probability >= 0.01) {
            char share[32];
            report_probability(share, sizeof share, other->probability);
            html_raw(page, "<p>");
            html_format(page, "The run may also show %d protons (probability %s).", other->count,
                        share);
            html_raw(page, "</p>\n");
        }
    }
    if (is_given(result->unseen)) {
        html_raw(page, "<p>");
        html_text(page, result->unseen);
        html_raw(page, "</p>\n");
    }
}

void html_equivalence(struct wa_text *page, const struct wa_result *result,
                      const struct wa_page_options *options)
{
    static const char *const headings[] = {"Point", "Volume / mL", "pH", "Protons so far",
                                           "From",  "Inflection",  NULL};
    html_section(page, "equivalence", "Equivalence points");
    if (result->equivalence_count == 0) {
        html_raw(page, "<p>None was found.</p>\n");
    } else {
        html_table(page, "Equivalence points", headings);
        for (size_t i = 0; i < result->equivalence_count; i++) {
            write_point(page, &result->equivalence_points[i], i);
        }
        html_table_end(page);
        write_methods(page, result);
    }
    if (result->curves != NULL && result->runs.count > 0 && result->curves[0].spacing[0] != '\0') {
        html_raw(page, "<p>");
        html_text(page, result->curves[0].spacing);
        html_raw(page, "</p>\n");
    }
    write_protons(page, result);
    html_figure(page, options, WA_FIGURE_DERIVATIVE);
    html_figure(page, options, WA_FIGURE_GRAN);
    html_section_end(page);
}

static void write_constant(struct wa_text *page, const struct wa_result_pKa *pKa)
{
    char text[80];
    snprintf(text, sizeof text, "step %d", pKa->step);
    html_row(page, text);
    html_quantity(page, pKa->half_equivalence, pKa->half_equivalence_u);
    if (pKa->is_bound) {
        html_number(page, pKa->bound);
        html_number(page, "–");
    } else {
        html_quantity(page, pKa->value, pKa->u);
        html_quantity(page, pKa->apparent, pKa->apparent_u);
    }
    snprintf(text, sizeof text, isfinite(pKa->ionic_strength) ? "%.2g" : "–", pKa->ionic_strength);
    html_number(page, text);
    snprintf(text, sizeof text, isfinite(pKa->temperature_C) ? "%.1f" : "–", pKa->temperature_C);
    html_number(page, text);
    html_raw(page, "</tr>\n");
}

void html_constants(struct wa_text *page, const struct wa_result *result,
                    const struct wa_page_options *options)
{
    static const char *const headings[] = {"Step",
                                           "Half-equivalence",
                                           "Refined, <i>I</i> = 0",
                                           "Refined, in this run",
                                           "<i>I</i> / (mol/L)",
                                           "Temperature / °C",
                                           NULL};
    html_section(page, "constants", "Dissociation constants");
    if (result->pKa_count == 0) {
        html_raw(page, "<p>None could be read from this run.</p>\n");
    } else {
        html_table(page, "pKa of the sample", headings);
        for (size_t i = 0; i < result->pKa_count; i++) {
            write_constant(page, &result->pKa[i]);
        }
        html_table_end(page);
        html_raw(
            page,
            "<p class=\"small\">Half-equivalence: apparent, read off the curve. Refined: from "
            "every point; at <i>I</i> = 0 the thermodynamic constant, in this run the apparent "
            "one at its ionic strength <i>I</i> (pH on the activity scale).</p>\n");
    }
    html_figure(page, options, WA_FIGURE_SPECIES);
    html_section_end(page);
}

void html_amounts(struct wa_text *page, const struct wa_result *result)
{
    static const char *const headings[] = {"Quantity", "Value", "Unit", NULL};
    const struct {
        const char *name;
        double value, u;
        const char *unit;
    } rows[] = {
        {"amount", 1e3 * result->amount_mol, 1e3 * result->amount_u, "mmol"},
        {"molar mass", result->molar_mass, result->molar_mass_u, "g/mol"},
        {"equivalent mass", result->equivalent_mass, result->equivalent_mass_u, "g/mol"},
    };
    html_section(page, "amounts", "Amount and molar mass");
    html_table(page, "Amount and molar mass of the sample", headings);
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        html_row(page, rows[i].name);
        if (isfinite(rows[i].value)) {
            html_quantity(page, rows[i].value, rows[i].u);
            html_cell(page, rows[i].unit);
        } else {
            html_cell(page, "not known");
            html_cell(page, "–");
        }
        html_raw(page, "</tr>\n");
    }
    html_table_end(page);
    html_raw(page, "<p class=\"small\">");
    if (!isfinite(result->molar_mass)) {
        html_raw(page, "A molar mass needs the sample mass and the titrant concentration.");
    } else if (is_given(result->molar_mass_assumes)) {
        html_format(page, "The molar mass assumes: %s", result->molar_mass_assumes);
    }
    html_raw(page, "</p>\n");
    html_section_end(page);
}
