/* Amounts as text and as JSON. */
#include "bench/bench_internal.h"
#include "whichacid/bench_report.h"

#include <stdio.h>

static void say_largest(struct wa_text *out, const struct wa_bench_budget *budget)
{
    char sentence[256];
    const struct wa_bench_input *largest = wa_bench_largest(budget);
    if (largest != NULL) {
        snprintf(sentence, sizeof sentence,
                 "The largest share, %.0f %%, is the %s: that is where more care pays.",
                 100.0 * largest->share, largest->name);
        wa_text_append(out, "\n");
        bench_paragraph(out, sentence, 2);
    }
}

static void candidates(struct wa_text *out, const struct wa_amount_result *result)
{
    if (result->candidate_count == 0) {
        wa_text_append(out, "\nNo form of the table has this equivalent mass.\n");
        return;
    }
    wa_text_append(out, "\nForms with this equivalent mass, within two standard uncertainties\n");
    for (size_t i = 0; i < result->candidate_count; i++) {
        const struct wa_mass_candidate *candidate = &result->candidates[i];
        wa_text_append(out, "  ");
        bench_cell(out, candidate->form->name, 44);
        wa_text_append(out, "%8.2f g/mol / %d   %+.1f u\n", candidate->form->molar_mass,
                       candidate->protons, candidate->deviation);
    }
    if (result->candidates_left_off > 0) {
        wa_text_append(out, "  and %zu more\n", result->candidates_left_off);
    }
    bench_paragraph(out,
                    "An end point by indicator tells nothing of the constants: a curve would tell "
                    "these apart.",
                    2);
}

enum wa_status wa_amount_text(const struct wa_amount_result *result, bool with_candidates,
                              char **text, struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    for (size_t i = 0; i < result->count; i++) {
        const struct wa_bench_budget *budget = &result->budgets[i];
        char value[64], expanded[64];
        wa_quantity_format(value, sizeof value, budget->value, budget->u);
        wa_quantity_format(expanded, sizeof expanded, budget->value, 2.0 * budget->u);
        wa_text_append(&out, "%s%s: %s %s\n  expanded (k = 2): %s\n", i > 0 ? "\n" : "",
                       budget->name, value, budget->unit, expanded);
        bench_budget_text(&out, budget, &result->monte_carlo[i]);
        say_largest(&out, budget);
    }
    if (with_candidates) {
        candidates(&out, result);
    }
    for (size_t i = 0; i < result->sentence_count; i++) {
        bench_paragraph(&out, result->sentences[i], 2);
    }
    if (out.failed) {
        wa_text_free(&out);
        return wa_fail_memory(error);
    }
    *text = out.bytes;
    return WA_OK;
}

static json_t *append(json_t *list, json_t *entry)
{
    if (list == NULL || json_array_append_new(list, entry) != 0) {
        json_decref(list);
        return NULL;
    }
    return list;
}

enum wa_status wa_amount_json(const struct wa_amount_result *result, char **text,
                              struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    json_t *results = json_array(), *forms = json_array(), *sentences = json_array();
    for (size_t i = 0; i < result->count; i++) {
        results = append(results,
                         json_pack("{s:o, s:o}", "budget", bench_budget_json(&result->budgets[i]),
                                   "monte_carlo", bench_monte_carlo_json(&result->monte_carlo[i])));
    }
    for (size_t i = 0; i < result->candidate_count; i++) {
        const struct wa_mass_candidate *candidate = &result->candidates[i];
        forms = append(forms, json_pack("{s:s, s:i, s:o}", "key", candidate->form->key, "protons",
                                        candidate->protons, "deviation_u",
                                        bench_number(candidate->deviation)));
    }
    for (size_t i = 0; i < result->sentence_count; i++) {
        sentences = append(sentences, json_string(result->sentences[i]));
    }
    json_t *json = json_pack("{s:s, s:o, s:o, s:I, s:o}", "kind", "amounts", "results", results,
                             "candidates", forms, "candidates_left_off",
                             (json_int_t)result->candidates_left_off, "remarks", sentences);
    const enum wa_status status = bench_dump(json, &out, error);
    if (status != WA_OK) {
        wa_text_free(&out);
        return status;
    }
    *text = out.bytes;
    return WA_OK;
}
