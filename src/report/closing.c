/* The fit's parameters, then what follows from it all: findings, next steps, cautions, hazards. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static void fill_parameter(struct report_table *table, const struct wa_result_parameter *parameter)
{
    char figure[64];
    const char *unit = parameter->unit != NULL ? parameter->unit : "";
    report_row(table);
    report_cell(table, 0, "%s%s%s", parameter->name != NULL ? parameter->name : "",
                unit[0] != '\0' ? " / " : "", unit);
    report_origin(figure, sizeof figure, parameter->origin, parameter->line);
    report_cell(table, 1, "%s", figure);
    bool has_prior = isfinite(parameter->prior);
    report_quantity(figure, sizeof figure, parameter->prior, parameter->prior_u);
    report_cell(table, 2, "%s", has_prior ? figure : "none");
    report_quantity(figure, sizeof figure, parameter->value, parameter->u);
    report_cell(table, 3, "%s", figure);
    if (has_prior && parameter->prior_u > 0.0 && isfinite(parameter->value)) {
        report_deviation(figure, sizeof figure,
                         (parameter->value - parameter->prior) / parameter->prior_u);
        report_cell(table, 4, "%s", figure);
    } else {
        report_cell(table, 4, "-");
    }
}

void report_fit(struct report_writer *writer, const struct wa_result *result)
{
    if (!result->fitted && result->parameter_count == 0) {
        return;
    }
    report_heading(writer, "FIT OF THE WHOLE CURVE");
    if (result->parameter_count > 0) {
        struct report_table table = {0};
        static const char *const heads[] = {"parameter", "from", "before the fit", "after the fit",
                                            "moved by"};
        report_row(&table);
        for (size_t i = 0; i < sizeof heads / sizeof heads[0]; i++) {
            report_cell(&table, i, "%s", heads[i]);
        }
        for (size_t i = 0; i < result->parameter_count; i++) {
            fill_parameter(&table, &result->parameters[i]);
        }
        report_table_draw(writer, &table);
        report_paragraph(writer, "  ", 2,
                         "moved by: in standard uncertainties u of the value before the fit.");
    }
    if (result->fitted) {
        report_paragraph(writer, "  ", 2,
                         "Misfit %.2f u a point (1 is expected); scatter %.2g pH of a reading and "
                         "%.2g mL of a volume; mean ionic strength %.2g mol/L.",
                         result->best.misfit, result->best.noise_reading, result->best.noise_volume,
                         result->best.ionic_strength);
    }
}

static void write_next(struct report_writer *writer, const struct wa_result *result)
{
    for (size_t i = 0; i < result->next_test_count; i++) {
        if (i == 0) {
            report_heading(writer, "WHAT TO DO NEXT");
        }
        const struct wa_result_next *next = &result->next_tests[i];
        const char *last = i > 0 ? result->next_tests[i - 1].separates : NULL;
        bool separates = next->separates != NULL && next->separates[0] != '\0' &&
                         (last == NULL || strcmp(last, next->separates) != 0);
        struct wa_text keys = {.bytes = NULL};
        if (separates) {
            report_keys(&keys, next->separates);
            writer->text.failed = writer->text.failed || keys.failed;
        }
        const bool told = separates && !keys.failed;
        report_paragraph(writer, "  - ", 4, "%s%s%s%s",
                         next->sentence != NULL ? next->sentence : "", told ? " (separates: " : "",
                         told ? keys.bytes : "", told ? ")" : "");
        wa_text_free(&keys);
    }
}

/* Hazards stand apart from the general cautions: they depend on which candidate it is. */
static bool is_of_candidate(const struct wa_result_sentence *caution)
{
    return caution->code != NULL && strncmp(caution->code, "candidate-", 10) == 0;
}

static void write_cautions(struct report_writer *writer, const struct wa_result *result,
                           const char *heading, bool of_candidates)
{
    bool headed = false;
    for (size_t i = 0; i < result->caution_count; i++) {
        const struct wa_result_sentence *caution = &result->cautions[i];
        if (is_of_candidate(caution) == of_candidates && caution->sentence != NULL) {
            if (!headed) {
                report_heading(writer, heading);
                headed = true;
            }
            report_paragraph(writer, "  - ", 4, "%s", caution->sentence);
        }
    }
}

/* Findings, and what the curve's own analysis remarked besides. */
static void write_findings(struct report_writer *writer, const struct wa_result *result)
{
    static const char heading[] = "FINDINGS";
    report_sentences(writer, heading, result->findings, result->finding_count);
    bool headed = result->finding_count > 0;
    for (size_t i = 0; i < result->runs.count && result->curves != NULL; i++) {
        for (size_t k = 0; k < result->curves[i].remark_count; k++) {
            const char *remark = result->curves[i].remarks[k];
            if (!report_has_sentence(result->findings, result->finding_count, remark)) {
                if (!headed) {
                    report_heading(writer, heading);
                    headed = true;
                }
                report_paragraph(writer, "  - ", 4, "Run %zu: %s", i + 1, remark);
            }
        }
    }
}

void report_closing(struct report_writer *writer, const struct wa_result *result)
{
    write_findings(writer, result);
    write_next(writer, result);
    write_cautions(writer, result, "CAUTIONS", false);
    write_cautions(writer, result, "HAZARDS, IF IT IS ONE OF THE CANDIDATES", true);
}
