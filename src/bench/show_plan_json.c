/* A plan as JSON. */
#include "bench/bench_internal.h"
#include "whichacid/bench_report.h"

/* Append, or give up the whole list when memory is out. */
static json_t *append(json_t *list, json_t *entry)
{
    if (list == NULL || json_array_append_new(list, entry) != 0) {
        json_decref(list);
        return NULL;
    }
    return list;
}

static json_t *steps_json(const struct wa_plan *plan)
{
    json_t *list = json_array();
    for (int i = 0; i < plan->step_count; i++) {
        const struct wa_plan_step *s = &plan->steps[i];
        list = append(list, json_pack("{s:o, s:o, s:o, s:o, s:o, s:o, s:o, s:o, s:b, s:b}", "pKa",
                                      bench_number(s->pKa), "volume_mL", bench_number(s->volume_mL),
                                      "reaction_constant", bench_number(s->K), "unconverted",
                                      bench_number(s->unconverted), "pH", bench_number(s->pH),
                                      "jump_0_1_percent", bench_number(s->jump), "jump_1_percent",
                                      bench_number(s->wide_jump), "slope_per_mL",
                                      bench_number(s->steepness), "complete", s->complete,
                                      "end_point", s->visible));
    }
    return list;
}

static json_t *indicators_json(const struct wa_plan *plan)
{
    json_t *list = json_array();
    for (int i = 0; i < plan->indicator_count; i++) {
        const struct wa_plan_indicator *found = &plan->indicators[i];
        list = append(list, json_pack("{s:s, s:s, s:s, s:s, s:o, s:o, s:o, s:b}", "key",
                                      found->indicator->key, "name", found->indicator->name,
                                      "colour_acid", found->indicator->colour_acid, "colour_base",
                                      found->indicator->colour_base, "pH", bench_number(found->pH),
                                      "error_mL", bench_number(found->error_mL), "spread_mL",
                                      bench_number(found->spread_mL), "suits", found->within));
    }
    return list;
}

static json_t *numbers(const double *values, int count)
{
    json_t *list = json_array();
    for (int i = 0; i < count; i++) {
        list = append(list, bench_number(values[i]));
    }
    return list;
}

static json_t *precision_json(const struct wa_plan *plan, const struct wa_plan_precision *p,
                              bool tried)
{
    return json_pack("{s:o, s:o, s:o, s:o, s:i}", "pKa_u", numbers(p->pKa_u, plan->free_pKa_count),
                     "amount_relative_u", bench_number(p->amount_u), "simulated_pKa_error",
                     tried ? numbers(p->pKa_error, plan->free_pKa_count) : json_null(),
                     "simulated_amount_relative_error",
                     tried ? bench_number(p->amount_error) : json_null(), "simulated_runs",
                     p->converged);
}

static json_t *rival_json(const struct wa_plan *plan)
{
    if (plan->rival == NULL) {
        return json_null();
    }
    json_t *list = json_array();
    for (int i = 0; i < plan->power_count; i++) {
        list = append(list, json_pack("{s:i, s:o}", "readings", plan->power[i].readings, "share",
                                      bench_number(plan->power[i].share)));
    }
    return json_pack("{s:s, s:b, s:o}", "key", plan->rival->key, "told", plan->rival_told, "power",
                     list);
}

enum wa_status wa_plan_json(const struct wa_plan *plan, const struct wa_plan_options *options,
                            char **text, struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    const bool tried = options->trials > 0;
    json_t *design = json_pack("{s:o, s:o, s:o, s:o, s:o, s:o}", "additions_mL",
                               numbers(plan->additions_mL, plan->addition_count), "expected_pH",
                               numbers(plan->expected_pH, plan->addition_count), "free_pKa",
                               numbers(plan->free_pKa, plan->free_pKa_count), "precision",
                               precision_json(plan, &plan->design, tried), "even_spacing_precision",
                               precision_json(plan, &plan->even, tried), "molar_mass_u",
                               bench_number(plan->molar_mass_u));
    json_t *json = json_pack(
        "{s:s, s:o, s:s, s:o, s:b, s:o, s:o, s:o, s:o, s:o, s:o, s:o}", "kind", "plan", "form",
        bench_words(plan->form != NULL ? plan->form->key : NULL), "titrant", plan->titrant->key,
        "concentration_mol_L", bench_number(plan->concentration), "works", plan->chosen >= 0,
        "end_point", plan->chosen >= 0 ? json_integer(plan->chosen + 1) : json_null(), "mass_g",
        bench_number(plan->mass_g), "end_point_volumes_mL",
        plan->form != NULL
            ? json_null()
            : json_pack("[o, o]", bench_number(plan->volume_low), bench_number(plan->volume_high)),
        "steps", steps_json(plan), "indicators", indicators_json(plan), "design", design, "rival",
        rival_json(plan));
    const enum wa_status status = bench_dump(json, &out, error);
    if (status != WA_OK) {
        wa_text_free(&out);
        return status;
    }
    *text = out.bytes;
    return WA_OK;
}
