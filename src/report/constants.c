/* Equivalence points, dissociation constants, amount and molar mass. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static void fill_volume(struct report_table *table, size_t column,
                        const struct wa_volume_estimate *estimate)
{
    char figure[64];
    if (estimate->u_mL > 0.0 && isfinite(estimate->volume_mL)) {
        report_quantity(figure, sizeof figure, estimate->volume_mL, estimate->u_mL);
        report_cell(table, column, "%s", figure);
    } else {
        report_cell(table, column, "-");
    }
}

/* The uncertainty of a point's inflection stands with the curve's own analysis. */
static double inflection_u(const struct wa_result *result, double volume_mL)
{
    const struct wa_curve *curve =
        result->curves != NULL && result->runs.count > 0 ? &result->curves[0] : NULL;
    for (size_t i = 0; curve != NULL && i < curve->inflection_count; i++) {
        if (fabs(curve->inflections[i].volume_mL - volume_mL) < 1e-6) {
            return curve->inflections[i].u_mL;
        }
    }
    return NAN;
}

static void fill_inflection(struct report_table *table, const struct wa_result *result,
                            const struct wa_result_equivalence *point)
{
    if (!point->inflection_seen || !isfinite(point->inflection_mL)) {
        report_cell(table, 5, "none seen");
        report_cell(table, 6, "-");
        return;
    }
    double u = inflection_u(result, point->inflection_mL);
    char figure[64];
    report_quantity(figure, sizeof figure, point->inflection_mL, u);
    if (u > 0.0) {
        report_cell(table, 5, "%s", figure);
    } else {
        report_cell(table, 5, "%.2f", point->inflection_mL);
    }
    report_cell(table, 6, "%.1f", point->significance);
}

static void write_points(struct report_writer *writer, const struct wa_result *result)
{
    struct report_table table = {0};
    static const char *const heads[] = {"point", "volume / mL",     "pH",        "protons",
                                        "from",  "inflection / mL", "height / u"};
    report_row(&table);
    for (size_t i = 0; i < sizeof heads / sizeof heads[0]; i++) {
        report_cell(&table, i, "%s", heads[i]);
    }
    for (size_t i = 0; i < result->equivalence_count; i++) {
        const struct wa_result_equivalence *point = &result->equivalence_points[i];
        char figure[64];
        report_quantity(figure, sizeof figure, point->volume_mL, point->u_mL);
        report_row(&table);
        report_cell(&table, 0, "E%zu", i + 1);
        report_cell(&table, 1, "%s", figure);
        if (isfinite(point->pH)) {
            report_cell(&table, 2, "%.2f", point->pH);
        } else {
            report_cell(&table, 2, "-");
        }
        report_cell(&table, 3, point->protons > 0 ? "%d" : "not known", point->protons);
        report_cell(&table, 4, point->from_fit ? "fit" : "curve");
        fill_inflection(&table, result, point);
    }
    report_table_draw(writer, &table);
}

/* One row a method, one column a point: most runs have one or two points. */
static void write_methods(struct report_writer *writer, const struct wa_result *result)
{
    static const char *const names[] = {"steepest slope", "curvature zero", "Gran, before",
                                        "Gran, after", "whole curve"};
    struct report_table table = {0};
    report_row(&table);
    report_cell(&table, 0, "method");
    for (size_t i = 0; i < result->equivalence_count; i++) {
        report_cell(&table, i + 1, "E%zu / mL", i + 1);
    }
    for (size_t method = 0; method < sizeof names / sizeof names[0]; method++) {
        report_row(&table);
        report_cell(&table, 0, "%s", names[method]);
        for (size_t i = 0; i < result->equivalence_count; i++) {
            const struct wa_result_equivalence *point = &result->equivalence_points[i];
            const struct wa_volume_estimate *const estimates[] = {
                &point->first_derivative, &point->second_derivative, &point->gran_before,
                &point->gran_after, &point->fit};
            fill_volume(&table, i + 1, estimates[method]);
        }
    }
    report_table_draw(writer, &table);
}

void report_equivalence(struct report_writer *writer, const struct wa_result *result)
{
    report_heading(writer, "EQUIVALENCE POINTS");
    if (result->equivalence_count == 0) {
        report_paragraph(writer, "  ", 2, "None was found.");
    } else {
        write_points(writer, result);
        wa_text_append(&writer->text, "\n");
        write_methods(writer, result);
    }
    const char *spacing =
        result->curves != NULL && result->runs.count > 0 ? result->curves[0].spacing : "";
    if (spacing[0] != '\0' &&
        !report_has_sentence(result->findings, result->finding_count, spacing)) {
        report_paragraph(writer, "  ", 2, "%s", spacing);
    }
    char share[32];
    if (result->proton_count > 0) {
        report_probability(share, sizeof share, result->proton_probability);
        report_paragraph(writer, "  ", 2, "Protons that this run shows: %d (probability %s).",
                         result->proton_count, share);
    }
    for (size_t i = 0; i < result->proton_alternative_count; i++) {
        const struct wa_proton_count *other = &result->proton_alternatives[i];
        if (other->count != result->proton_count && other->probability >= 0.01) {
            report_probability(share, sizeof share, other->probability);
            report_paragraph(writer, "  ", 2, "It may also be %d (probability %s).", other->count,
                             share);
        }
    }
    if (result->unseen != NULL && result->unseen[0] != '\0') {
        report_paragraph(writer, "  ", 2, "%s", result->unseen);
    }
}

static void fill_pKa(struct report_table *table, const struct wa_result_pKa *pKa)
{
    char figure[64];
    report_cell(table, 0, "pKa %d", pKa->step);
    const char *nothing = "-";
    report_quantity(figure, sizeof figure, pKa->half_equivalence, pKa->half_equivalence_u);
    report_cell(table, 1, "%s", isfinite(pKa->half_equivalence) ? figure : nothing);
    if (pKa->is_bound) {
        report_cell(table, 2, "%s", pKa->bound);
        report_cell(table, 3, "%s", nothing);
        return;
    }
    report_quantity(figure, sizeof figure, pKa->value, pKa->u);
    report_cell(table, 2, "%s", isfinite(pKa->value) ? figure : nothing);
    report_quantity(figure, sizeof figure, pKa->apparent, pKa->apparent_u);
    report_cell(table, 3, "%s", isfinite(pKa->apparent) ? figure : nothing);
    report_cell(table, 4, isfinite(pKa->ionic_strength) ? "%.2g" : "-", pKa->ionic_strength);
}

void report_pKa(struct report_writer *writer, const struct wa_result *result)
{
    report_heading(writer, "DISSOCIATION CONSTANTS");
    if (result->pKa_count == 0) {
        report_paragraph(writer, "  ", 2, "None could be read from this run.");
        return;
    }
    struct report_table table = {0};
    report_row(&table);
    report_cell(&table, 0, "step");
    report_cell(&table, 1, "half-equivalence");
    report_cell(&table, 2, "refined, at I = 0");
    report_cell(&table, 3, "refined, in this run");
    report_cell(&table, 4, "I / (mol/L)");
    for (size_t i = 0; i < result->pKa_count; i++) {
        report_row(&table);
        fill_pKa(&table, &result->pKa[i]);
    }
    report_table_draw(writer, &table);
    char where[48] = "";
    if (isfinite(result->pKa[0].temperature_C)) {
        snprintf(where, sizeof where, " All hold at %.1f °C.", result->pKa[0].temperature_C);
    }
    report_paragraph(writer, "  ", 2,
                     "Half-equivalence: apparent, read off the curve. Refined: from every point; "
                     "at I = 0 the thermodynamic constant, in this run the apparent one at its "
                     "ionic strength I (pH on the activity scale).%s",
                     where);
}

void report_amount(struct report_writer *writer, const struct wa_result *result)
{
    const struct {
        const char *label;
        double value, u;
        const char *unit;
    } lines[] = {
        {"amount", result->amount_mol * 1e3, result->amount_u * 1e3, "mmol"},
        {"molar mass", result->molar_mass, result->molar_mass_u, "g/mol"},
        {"equivalent mass", result->equivalent_mass, result->equivalent_mass_u, "g/mol"},
    };
    report_heading(writer, "AMOUNT AND MOLAR MASS");
    for (size_t i = 0; i < sizeof lines / sizeof lines[0]; i++) {
        char figure[64];
        report_quantity(figure, sizeof figure, lines[i].value, lines[i].u);
        bool known = isfinite(lines[i].value);
        report_item(writer, lines[i].label, "%s%s%s", figure, known ? " " : "",
                    known ? lines[i].unit : "");
    }
    if (isfinite(result->molar_mass) && result->molar_mass_assumes != NULL &&
        result->molar_mass_assumes[0] != '\0') {
        report_item(writer, "assuming", "%s", result->molar_mass_assumes);
    }
    if (!isfinite(result->molar_mass)) {
        report_paragraph(writer, "  ", 2,
                         "A molar mass needs the sample mass and the titrant concentration.");
    }
}
