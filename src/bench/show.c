/* Tables and bars of characters, and their JSON, for every result of the room. */
#include "bench/bench_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const size_t page = 80;

void bench_cell(struct wa_text *out, const char *text, size_t columns)
{
    const size_t width = wa_text_columns(text);
    wa_text_append(out, "%s%*s", text, width < columns ? (int)(columns - width) : 1, "");
}

void bench_bar(struct wa_text *out, double share, size_t columns)
{
    static const char *const parts[] = {"", "▏", "▎", "▍", "▌", "▋", "▊", "▉"};
    const double bounded = fmin(fmax(share, 0.0), 1.0);
    const long eighths = lround(bounded * 8.0 * (double)columns);
    for (long i = 0; i < eighths / 8; i++) {
        wa_text_append(out, "█");
    }
    wa_text_append(out, "%s", parts[eighths % 8]);
}

void bench_paragraph(struct wa_text *out, const char *text, size_t indent)
{
    size_t column = 0;
    while (*text != '\0') {
        const size_t length = strcspn(text, " ");
        char *word = wa_text_copy(text, length);
        if (word == NULL) {
            out->failed = true;
            return;
        }
        const size_t width = wa_text_columns(word);
        if (column > 0 && column + 1 + width > page) {
            wa_text_append(out, "\n");
            column = 0;
        }
        wa_text_append(out, "%*s%s", column == 0 ? (int)indent : 1, "", word);
        column += width + (column == 0 ? indent : 1);
        free(word);
        text += length;
        text += *text == ' ';
    }
    wa_text_append(out, "\n");
}

static void number_cell(struct wa_text *out, const char *format, double value, size_t columns)
{
    char text[48];
    snprintf(text, sizeof text, format, value);
    bench_cell(out, text, columns);
}

static void input_row(struct wa_text *out, const struct wa_bench_input *input)
{
    char name[96];
    snprintf(name, sizeof name, "%s%s%s%s", input->name, input->unit[0] != '\0' ? " (" : "",
             input->unit, input->unit[0] != '\0' ? ")" : "");
    wa_text_append(out, "  ");
    bench_cell(out, name, 33);
    number_cell(out, "%.7g", input->value, 11);
    number_cell(out, "%.2g", input->u, 9);
    if (input->value != 0.0) {
        number_cell(out, "%.2g", input->u / fabs(input->value), 9);
    } else {
        bench_cell(out, "-", 9);
    }
    bench_cell(out, input->type == WA_TYPE_A ? "A" : "B", 3);
    wa_text_append(out, "%.3g\n", input->sensitivity);
}

static void bars(struct wa_text *out, const struct wa_bench_budget *budget)
{
    wa_text_append(out, "\nShare of the variance:\n");
    for (size_t i = 0; i < budget->input_count; i++) {
        const struct wa_bench_input *input = &budget->inputs[i];
        if (input->u > 0.0) {
            wa_text_append(out, "  ");
            bench_cell(out, input->name, 33);
            wa_text_append(out, "%5.1f %% ", 100.0 * input->share);
            bench_bar(out, input->share, 36);
            wa_text_append(out, "\n");
        }
    }
}

static void monte_carlo_text(struct wa_text *out, const struct wa_bench_budget *budget,
                             const struct wa_monte_carlo *mc)
{
    char sentence[512];
    const double half = budget->k95 * budget->u;
    wa_text_append(out, "\n95 %% intervals (%s)\n", budget->unit);
    wa_text_append(out, "  by the budget (factor %.2f):        %.7g to %.7g\n", budget->k95,
                   budget->value - half, budget->value + half);
    wa_text_append(out, "  by Monte Carlo (%zu trials):    %.7g to %.7g\n", mc->trials, mc->low,
                   mc->high);
    snprintf(
        sentence, sizeof sentence,
        "The ends differ by %.2g and %.2g. Allowed are %.2g (JCGM 101, 8.1) and the scatter of "
        "the Monte Carlo figures themselves, %.1g: %s.",
        mc->low_difference, mc->high_difference, mc->tolerance, mc->scatter,
        mc->agrees ? "the budget stands"
                   : "the budget is not confirmed, use the Monte Carlo interval");
    bench_paragraph(out, sentence, 2);
}

void bench_budget_text(struct wa_text *out, const struct wa_bench_budget *budget,
                       const struct wa_monte_carlo *monte_carlo)
{
    wa_text_append(out, "\nUncertainty budget (Eurachem/CITAC CG 4; JCGM 100)\n  ");
    bench_cell(out, "contribution", 33);
    bench_cell(out, "value", 11);
    bench_cell(out, "u", 9);
    bench_cell(out, "u/value", 9);
    wa_text_append(out, "   sensitivity\n");
    for (size_t i = 0; i < budget->input_count; i++) {
        input_row(out, &budget->inputs[i]);
    }
    bars(out, budget);
    if (monte_carlo != NULL) {
        monte_carlo_text(out, budget, monte_carlo);
    }
}

json_t *bench_number(double value)
{
    return isfinite(value) ? json_real(value) : json_null();
}

json_t *bench_words(const char *text)
{
    return text != NULL ? json_string(text) : json_null();
}

static const char *distribution_word(enum wa_distribution distribution)
{
    static const char *const words[] = {"normal", "rectangular", "triangular", "t"};
    return words[distribution];
}

json_t *bench_budget_json(const struct wa_bench_budget *budget)
{
    json_t *lines = json_array();
    for (size_t i = 0; i < budget->input_count && lines != NULL; i++) {
        const struct wa_bench_input *input = &budget->inputs[i];
        const double relative = input->value != 0.0 ? input->u / fabs(input->value) : (double)NAN;
        json_t *line = json_pack(
            "{s:s, s:s, s:o, s:o, s:o, s:s, s:s, s:o, s:o, s:o, s:o}", "name", input->name, "unit",
            input->unit, "value", bench_number(input->value), "u", bench_number(input->u),
            "relative_u", bench_number(relative), "type", input->type == WA_TYPE_A ? "A" : "B",
            "distribution", distribution_word(input->distribution), "degrees_of_freedom",
            input->degrees_of_freedom > 0.0 ? json_real(input->degrees_of_freedom) : json_null(),
            "sensitivity", bench_number(input->sensitivity), "effect", bench_number(input->effect),
            "share", bench_number(input->share));
        if (json_array_append_new(lines, line) != 0) {
            json_decref(lines);
            lines = NULL;
        }
    }
    return lines == NULL
               ? NULL
               : json_pack("{s:s, s:s, s:o, s:o, s:o, s:o, s:o, s:o}", "name", budget->name, "unit",
                           budget->unit, "value", bench_number(budget->value), "u",
                           bench_number(budget->u), "expanded_u_k2", bench_number(2.0 * budget->u),
                           "degrees_of_freedom", bench_number(budget->degrees_of_freedom),
                           "factor_95", bench_number(budget->k95), "contributions", lines);
}

json_t *bench_monte_carlo_json(const struct wa_monte_carlo *mc)
{
    return json_pack(
        "{s:I, s:o, s:o, s:[o, o], s:o, s:o, s:[o, o], s:b, s:b}", "trials", (json_int_t)mc->trials,
        "mean", bench_number(mc->mean), "u", bench_number(mc->u), "interval_95",
        bench_number(mc->low), bench_number(mc->high), "tolerance", bench_number(mc->tolerance),
        "scatter", bench_number(mc->scatter), "differences", bench_number(mc->low_difference),
        bench_number(mc->high_difference), "agrees", mc->agrees, "settled", mc->settled);
}

enum wa_status bench_dump(json_t *json, struct wa_text *out, struct wa_error *error)
{
    char *text = json != NULL ? json_dumps(json, JSON_INDENT(2) | JSON_PRESERVE_ORDER) : NULL;
    json_decref(json);
    if (text == NULL) {
        return wa_fail_memory(error);
    }
    wa_text_append(out, "%s\n", text);
    free(text);
    return out->failed ? wa_fail_memory(error) : WA_OK;
}
