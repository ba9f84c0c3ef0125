/* From weighed models to probabilities. */
#include "match/match_internal.h"

#include <math.h>
#include <stdlib.h>

struct wa_match_storage {
    struct wa_group_list list;
};

const struct wa_group_list *wa_match_groups(const struct wa_match *match)
{
    return &match->storage->list;
}

static double log_not_in_table(const struct wa_experiment *experiment,
                               const struct wa_proton_study *study,
                               const struct wa_titrated_mass *mass)
{
    double sum = -INFINITY;
    for (int i = 0; i < study->count; i++) {
        const struct wa_generic *generic = &study->generic[i];
        const int index = wa_fit_find(&generic->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
        const struct wa_parameter *amount = &generic->fit.parameters[index];
        sum =
            wa_log_sum(sum, generic->fit.log_evidence + generic->log_prior +
                                wa_log_stray_electrode(experiment, &generic->fit) +
                                wa_log_mass_evidence_generic(mass, amount->value, &amount->prior));
    }
    return sum;
}

/* What speaks against every single substance of the table: one that is not in it, or two acids. */
static double log_unknown(const struct wa_experiment *experiment, const struct wa_table *table,
                          const struct wa_group_list *list, const struct wa_proton_study *study,
                          const struct wa_titrated_mass *mass,
                          const struct wa_match_options *options)
{
    const struct wa_generic *best = &study->generic[0];
    const int index = wa_fit_find(&best->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &best->fit.parameters[index];
    const struct wa_purity purity = wa_purity_default();
    const double any = log(1.0 - WA_RELATIVE_SHARE) + log_not_in_table(experiment, study, mass);
    const double relative =
        log(WA_RELATIVE_SHARE) + wa_groups_log_relatives(table, mass, &purity, list);
    const double one = log(list->not_in_table) + wa_log_sum(any, relative) + list->unknown_observed;
    if (options == NULL || options->log_two_acids == 0.0) {
        return one;
    }
    return wa_log_sum(one, options->log_two_acids + list->unknown_observed +
                               wa_log_mass_evidence_generic(mass, amount->value, &amount->prior));
}

static int by_log_weight(const void *a, const void *b)
{
    const struct wa_candidate *x = a, *y = b;
    return (x->log_weight < y->log_weight) - (x->log_weight > y->log_weight);
}

static void normalise(struct wa_match *match)
{
    double total = match->log_unknown;
    for (size_t i = 0; i < match->candidate_count; i++) {
        total = wa_log_sum(total, match->candidates[i].log_weight);
    }
    for (size_t i = 0; i < match->candidate_count; i++) {
        match->candidates[i].probability =
            isfinite(total) ? exp(match->candidates[i].log_weight - total) : 0.0;
    }
    match->not_in_table = isfinite(match->log_unknown) ? exp(match->log_unknown - total) : 0.0;
}

/* A titrant that nobody named may not be the strong one assumed: no candidate can be sure then. */
static void doubt_titrant(struct wa_match *match)
{
    match->not_in_table = 1.0 - (1.0 - WA_TITRANT_DOUBT) * (1.0 - match->not_in_table);
    for (size_t i = 0; i < match->candidate_count; i++) {
        match->candidates[i].probability *= 1.0 - WA_TITRANT_DOUBT;
    }
}

enum wa_status wa_match_run(const struct wa_experiment *experiment,
                            const struct wa_proton_study *study,
                            const struct wa_titrated_mass *mass, const struct wa_table *table,
                            const struct wa_match_options *options, struct wa_match *match,
                            struct wa_error *error)
{
    const struct wa_fit *best = &study->generic[0].fit;
    const struct wa_purity purity = wa_purity_default();
    *match = (struct wa_match){.candidate_count = 0};
    match->storage = calloc(1, sizeof *match->storage);
    if (match->storage == NULL) {
        return wa_fail_memory(error);
    }
    struct wa_group_list *list = &match->storage->list;
    enum wa_status status =
        wa_groups_collect(table, experiment, best->ionic_strength,
                          &study->generic[0].sample.ln_amount[0], options, list, error);
    if (status == WA_OK) {
        status = wa_groups_screen(experiment, best, list, error);
    }
    if (status == WA_OK) {
        status = wa_groups_fit(experiment, best, table, mass, options, list, &match->models_fitted,
                               error);
    }
    if (status == WA_OK) {
        status = wa_groups_candidates(table, mass, &purity, list, match, error);
    }
    if (status != WA_OK) {
        wa_match_free(match);
        return status;
    }
    match->not_in_table_prior = list->not_in_table;
    match->log_unknown = list->not_in_table > 0.0
                             ? log_unknown(experiment, table, list, study, mass, options)
                             : -INFINITY;
    normalise(match);
    if (experiment->titrant_assumed && list->not_in_table > 0.0) {
        doubt_titrant(match);
    }
    qsort(match->candidates, match->candidate_count, sizeof *match->candidates, by_log_weight);
    match->forms_considered = list->form_count;
    match->models_considered = list->count;
    return WA_OK;
}

void wa_match_free(struct wa_match *match)
{
    if (match != NULL) {
        if (match->storage != NULL) {
            wa_groups_free(&match->storage->list);
            free(match->storage);
        }
        free(match->candidates);
        *match = (struct wa_match){.candidate_count = 0};
    }
}
