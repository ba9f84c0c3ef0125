/* The pipeline: run, curve, fit, match, verdict. */
#include "identify/identify_internal.h"

#include "identify/cautions.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Most names that are fitted whatever their screening says. */
#define WANTED_MAX 64

static const double default_threshold = 0.95;
static const double default_amount_limit = 0.05;
static const double default_pKa_limit = 0.5;
static const double excess_taken_from = 0.8;
static const double search_missed = 20.0; /* ln of the evidence ratio */

static const struct wa_titrant *titrant_of(const struct wa_table *table, const struct wa_run *run)
{
    const char *words = run->conditions.titrant;
    const int index = words != NULL ? wa_table_find_titrant(table, words) : -1;
    return index >= 0 ? &table->titrants[index] : NULL;
}

/* Curve and experiment of every run. */
static enum wa_status collect(const struct wa_identification *work, struct wa_result *result,
                              struct wa_error *error)
{
    const size_t count = result->runs.count;
    result->curves = calloc(count, sizeof *result->curves);
    result->experiments = calloc(count, sizeof *result->experiments);
    if (result->curves == NULL || result->experiments == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t r = 0; r < count; r++) {
        const struct wa_run *run = &result->runs.runs[r];
        enum wa_status status = wa_curve_analyse(run, &result->curves[r], error);
        if (status == WA_OK) {
            status =
                wa_experiment_collect(run, &result->curves[r], work->table,
                                      titrant_of(work->table, run), &result->experiments[r], error);
        }
        if (status != WA_OK) {
            return status;
        }
    }
    return wa_link_replicates(result, error);
}

/* Charge of the acid's species as weighed: of the first acid system of the form. */
static int start_charge(const struct wa_table *table, const struct wa_form *form)
{
    for (int k = 0; k < form->part_count; k++) {
        const struct wa_form_part *part = &form->parts[k];
        if (part->acid != WA_PART_WATER) {
            return table->acids[part->acid].charge - part->lost / part->count;
        }
    }
    return 0;
}

/* Shares of the candidates by the charge that their acid starts from: the activity correction of a
 * constant depends on it, and the curve alone hardly tells. */
static void weigh_charges(struct wa_identification *work)
{
    const int middle = WA_START_CHARGES / 2;
    for (size_t i = 0; i < work->match.candidate_count; i++) {
        const struct wa_candidate *candidate = &work->match.candidates[i];
        const int charge = start_charge(work->table, &work->table->forms[candidate->form]);
        const int slot = charge < -middle ? 0 : charge > middle ? 2 * middle : charge + middle;
        work->charge_weight[slot] += candidate->probability;
    }
}

/* Generic acids, and whether one pure acid is the explanation that the data prefer. With strong
 * acid or base beside it, everything after this reckons with that. */
static enum wa_status explain(struct wa_identification *work, struct wa_experiment *experiment,
                              const struct wa_curve *curve, struct wa_error *error)
{
    enum wa_status status = wa_proton_study_run(experiment, curve, &work->study, error);
    if (status != WA_OK || work->study.count == 0) {
        return status;
    }
    status = wa_explanations_weigh(experiment, curve, &work->study, &work->explanations, error);
    if (status == WA_OK &&
        work->explanations.probability[WA_EXPLANATION_EXCESS] > excess_taken_from) {
        wa_proton_study_free(&work->study);
        experiment->excess_u = wa_excess_prior_u(experiment);
        status = wa_proton_study_run(experiment, curve, &work->study, error);
    }
    return status;
}

/* Names that are fitted whatever their screening says: those to be explained or compared. */
static size_t collect_wanted(struct wa_identification *work, const char *wanted[WANTED_MAX])
{
    size_t count = 0;
    if (work->options->explain != NULL) {
        wanted[count++] = work->options->explain;
    }
    for (int side = 0; side < 2; side++) {
        char *key = work->compared[side];
        while (key != NULL && key[0] != '\0' && count < WANTED_MAX) {
            char *comma = strchr(key, ',');
            wanted[count++] = key;
            if (comma != NULL) {
                *comma = '\0';
            }
            key = comma != NULL ? comma + 1 : NULL;
        }
    }
    return count;
}

static enum wa_status copy_compared(struct wa_identification *work, struct wa_error *error)
{
    for (int side = 0; side < 2; side++) {
        const char *keys = work->options->compare[side];
        work->compared[side] = keys != NULL ? strdup(keys) : NULL;
        if (keys != NULL && work->compared[side] == NULL) {
            return wa_fail_memory(error);
        }
    }
    return WA_OK;
}

static enum wa_status match(struct wa_identification *work, const struct wa_experiment *experiment,
                            const char *const *wanted, size_t wanted_count, struct wa_error *error)
{
    const struct wa_match_options options = {
        .among = work->options->among,
        .among_count = work->options->among_count,
        .prior = work->options->prior,
        .observed = work->options->observed,
        .observed_count = work->options->observed_count,
        .wanted = wanted,
        .wanted_count = wanted_count,
        .log_two_acids = work->explanations.log_two_acids,
    };
    const enum wa_status status = wa_match_run(experiment, &work->study, &work->mass, work->table,
                                               &options, &work->match, error);
    work->matched = status == WA_OK;
    return status;
}

/* Whether a substance of the table describes the curve far better than every generic acid: the
 * search for the latter has then missed. */
static bool search_has_missed(const struct wa_identification *work)
{
    return work->match.candidate_count > 0 &&
           work->match.candidates[0].log_curve >
               work->study.generic[0].fit.log_evidence + search_missed;
}

static enum wa_status compute(struct wa_identification *work, struct wa_result *result,
                              struct wa_error *error)
{
    struct wa_experiment *experiment = &result->experiments[0];
    work->mass = wa_titrated_mass_of(&result->runs.runs[0].conditions);
    enum wa_status status = explain(work, experiment, &result->curves[0], error);
    if (status == WA_OK) {
        status = wa_check_replicates(work, result, error);
    }
    if (status == WA_OK && work->replicate_left_out) {
        wa_proton_study_free(&work->study);
        wa_explanations_free(&work->explanations);
        work->mass = wa_titrated_mass_of(&result->runs.runs[0].conditions);
        status = explain(work, experiment, &result->curves[0], error);
    }
    if (status != WA_OK || work->study.count == 0) {
        return status;
    }
    /* What is beside the acid weighs too: the mass says nothing of the acid's molar mass then. */
    work->mass.known = work->mass.known && !(experiment->excess_u > 0.0);
    const char *wanted[WANTED_MAX];
    const size_t wanted_count = collect_wanted(work, wanted);
    status = match(work, experiment, wanted, wanted_count, error);
    if (status == WA_OK && search_has_missed(work)) {
        /* The search is taken up from that substance, and the match done again. */
        const struct wa_candidate *best = &work->match.candidates[0];
        status = wa_proton_study_seed(experiment, best->sample, best->fit, &work->study, error);
        if (status == WA_OK) {
            wa_match_free(&work->match);
            status = match(work, experiment, wanted, wanted_count, error);
        }
    }
    if (status == WA_OK) {
        weigh_charges(work);
    }
    return status;
}

static enum wa_status fill(struct wa_identification *work, struct wa_result *result,
                           struct wa_error *error)
{
    enum wa_status (*const steps[])(const struct wa_identification *, struct wa_result *,
                                    struct wa_error *) = {
        wa_fill_protons,  wa_fill_equivalence, wa_fill_hydrogen_carbonate, wa_fill_candidates,
        wa_fill_findings, wa_fill_observed,    wa_fill_comparison,         wa_fill_explanation,
        wa_fill_mixture,  wa_fill_verdict,     wa_fill_next_tests,         wa_fill_parameters,
        wa_fill_traces,
    };
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < sizeof steps / sizeof steps[0]; i++) {
        status = steps[i](work, result, error);
    }
    return status == WA_OK ? wa_identify_cautions(work->table, result, error) : status;
}

/* Hand the best generic fit over to the result. */
static void take_best(struct wa_identification *work, struct wa_result *result)
{
    if (work->study.count > 0) {
        result->best = work->study.generic[0].fit;
        result->fitted = true;
        work->study.generic[0].fit = (struct wa_fit){.parameter_count = 0};
    }
}

enum wa_status wa_identify(struct wa_run_list *runs, const struct wa_table *table,
                           const struct wa_identify_options *options, struct wa_result *result,
                           struct wa_error *error)
{
    static const struct wa_identify_options defaults = {.threshold = 0.0};
    struct wa_identification work = {.table = table,
                                     .options = options != NULL ? options : &defaults};
    work.threshold = work.options->threshold > 0.0 ? work.options->threshold : default_threshold;
    work.amount_limit =
        work.options->amount_limit > 0.0 ? work.options->amount_limit : default_amount_limit;
    work.pKa_limit = work.options->pKa_limit > 0.0 ? work.options->pKa_limit : default_pKa_limit;
    *result = (struct wa_result){.runs = *runs};
    *runs = (struct wa_run_list){.count = 0};
    snprintf(result->table_version, sizeof result->table_version, "%s", table->version);
    result->overlaid_count = table->overlaid_count;
    enum wa_status status = result->runs.count > 0 ? collect(&work, result, error)
                                                   : wa_fail(error, WA_ERROR_CALL, NULL, 0,
                                                             "There is no run to identify.");
    if (status == WA_OK) {
        status = copy_compared(&work, error);
    }
    if (status == WA_OK) {
        status = compute(&work, result, error);
    }
    if (status == WA_OK) {
        status = fill(&work, result, error);
    }
    take_best(&work, result);
    free(work.compared[0]);
    free(work.compared[1]);
    wa_match_free(&work.match);
    wa_explanations_free(&work.explanations);
    wa_proton_study_free(&work.study);
    if (status != WA_OK) {
        wa_result_free(result);
    }
    return status;
}
