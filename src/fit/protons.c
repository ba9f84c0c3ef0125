#include "fit/generic_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Prior weight of n protons: the shares among the acids that laboratories meet, common practice. */
static const double prior_by_steps[WA_GENERIC_STEPS_MAX] = {0.50, 0.28, 0.13, 0.05, 0.025, 0.015};
static const double prior_already_lost = 0.25;
static const double hopeless_charge = 60.0; /* the charge alone moves it by less */
static const double hopeless = 12.0; /* ln of the evidence ratio at which more protons are vain */

/* A start nearer than this to another is the same. */
static const double same_start = 0.1;

/* Starts of one generic acid. */
#define STARTS_MAX (WA_INFLECTIONS_MAX * WA_GENERIC_STEPS_MAX + 2)

static void add_start(double *amount, int *count, double value)
{
    for (int i = 0; i < *count; i++) {
        if (fabs(amount[i] / value - 1.0) < same_start) {
            return;
        }
    }
    amount[(*count)++] = value;
}

/* Amounts worth starting from: each jump may end any number of the protons, or the titration stops
 * before the last. */
static int start_amounts(const struct wa_experiment *experiment, const struct wa_curve *curve,
                         int protons, double *amount)
{
    const double equivalents_per_mL =
        experiment->equivalents * exp(experiment->ln_titrant.mean) * 1e-3;
    const double last_mL = experiment->volume_mL[experiment->count - 1];
    int count = 0;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        for (int ended = protons; ended >= 1; ended--) {
            const double value = equivalents_per_mL * curve->inflections[i].volume_mL / ended;
            if (value * protons < 2.0 * equivalents_per_mL * last_mL) {
                add_start(amount, &count, value);
            }
        }
    }
    add_start(amount, &count, equivalents_per_mL * 1.3 * last_mL / protons);
    if (curve->inflection_count == 0) {
        add_start(amount, &count, equivalents_per_mL * 0.6 * last_mL / protons);
    }
    return count;
}

static enum wa_status fit_generic(const struct wa_experiment *experiment,
                                  const struct wa_curve *curve, struct wa_generic *generic,
                                  struct wa_error *error)
{
    const int protons =
        experiment->titrant_is_base ? generic->step_count - generic->lost : generic->lost;
    double amount[STARTS_MAX];
    const int starts = start_amounts(experiment, curve, protons, amount);
    struct wa_start_list list = {.count = 0};
    enum wa_status status = WA_OK;
    for (int s = 0; status == WA_OK && s < starts; s++) {
        struct wa_start start;
        status = wa_generic_start(experiment, &generic->sample, amount[s], 0.0, start.value, error);
        if (status == WA_OK) {
            status = wa_start_consider(experiment, &generic->sample, &start, &list, error);
        }
    }
    return status == WA_OK
               ? wa_fit_from_starts(experiment, &generic->sample, &list, &generic->fit, error)
               : status;
}

static int by_evidence(const void *a, const void *b)
{
    const struct wa_generic *first = a, *second = b;
    return (first->probability < second->probability) - (first->probability > second->probability);
}

static void weigh(const struct wa_experiment *experiment, struct wa_proton_study *study)
{
    double best = -INFINITY, sum = 0.0;
    for (int i = 0; i < study->count; i++) {
        best = fmax(best, study->generic[i].fit.log_evidence + study->generic[i].log_prior);
    }
    for (int i = 0; i < study->count; i++) {
        struct wa_generic *generic = &study->generic[i];
        generic->probability = exp(generic->fit.log_evidence + generic->log_prior - best);
        sum += generic->probability;
    }
    study->log_evidence = best + log(sum);
    memset(study->by_count, 0, sizeof study->by_count);
    for (int i = 0; i < study->count; i++) {
        struct wa_generic *generic = &study->generic[i];
        generic->probability /= sum;
        generic->shown =
            wa_generic_shown(experiment, &generic->fit, 0, generic->step_count, generic->lost);
        study->by_count[generic->shown] += generic->probability;
    }
    qsort(study->generic, (size_t)study->count, sizeof study->generic[0], by_evidence);
}

/* Prior weight of a generic acid. The constants of one acid are an unordered set under their prior:
 * n! orders are one. */
static double log_prior_of(int protons, bool hidden, int step_count)
{
    const int bounded = protons < WA_GENERIC_STEPS_MAX ? protons : WA_GENERIC_STEPS_MAX;
    return log(prior_by_steps[bounded - 1] * 0.5 *
               (hidden ? prior_already_lost : 1.0 - prior_already_lost)) +
           lgamma(step_count + 1.0);
}

/* Start where the same acid with another charge ended: the charge shifts the constants by activity
 * coefficients and nothing else. */
static enum wa_status fit_like_sibling(const struct wa_experiment *experiment,
                                       const struct wa_proton_study *study,
                                       struct wa_generic *generic, struct wa_error *error)
{
    const struct wa_generic *last = study->count > 0 ? &study->generic[study->count - 1] : NULL;
    double start[WA_PARAMETERS_MAX];
    if (last == NULL || last->step_count != generic->step_count || last->lost != generic->lost) {
        return WA_OK;
    }
    for (int i = 0; i < last->fit.parameter_count; i++) {
        start[i] = last->fit.parameters[i].value;
    }
    return wa_fit_run(experiment, &generic->sample, NULL, start, &generic->fit, error);
}

/* Fit one generic acid and keep it when it converged. */
static enum wa_status try_generic(const struct wa_experiment *experiment,
                                  const struct wa_curve *curve, int step_count, int lost,
                                  int charge, struct wa_proton_study *study, double *log_evidence,
                                  struct wa_error *error)
{
    struct wa_generic *generic = &study->generic[study->count];
    *generic = (struct wa_generic){.step_count = step_count, .lost = lost, .charge = charge};
    const int protons = experiment->titrant_is_base ? step_count - lost : lost;
    generic->log_prior = log_prior_of(protons, step_count > protons, step_count);
    wa_generic_sample(experiment, step_count, lost, charge, &generic->sample);
    enum wa_status status = fit_like_sibling(experiment, study, generic, error);
    if (status == WA_OK && !generic->fit.converged) {
        wa_fit_free(&generic->fit);
        status = fit_generic(experiment, curve, generic, error);
    }
    *log_evidence = -INFINITY;
    if (status == WA_OK && generic->fit.converged) {
        *log_evidence = generic->fit.log_evidence + generic->log_prior;
        study->count++;
    } else {
        wa_fit_free(&generic->fit);
    }
    return status;
}

enum wa_status wa_proton_study_run(const struct wa_experiment *experiment,
                                   const struct wa_curve *curve, struct wa_proton_study *study,
                                   struct wa_error *error)
{
    const bool base = experiment->titrant_is_base;
    double best = -INFINITY;
    int vain = 0;
    *study = (struct wa_proton_study){.count = 0};
    for (int protons = 1; protons <= WA_GENERIC_STEPS_MAX; protons++) {
        double best_here = -INFINITY;
        for (int hidden = 0; hidden <= 1 && protons + hidden <= WA_GENERIC_STEPS_MAX; hidden++) {
            /* By base the acid is titrated from `hidden` protons lost; by acid the base takes up
             * `protons` and may hold `hidden` more at the start. */
            const int steps = protons + hidden;
            const int lost = base ? hidden : protons;
            for (int charged = 0; charged <= 1; charged++) {
                const int charge = charged == 0 ? 0 : (base ? 1 : steps);
                double evidence;
                const enum wa_status status =
                    try_generic(experiment, curve, steps, lost, charge, study, &evidence, error);
                if (status != WA_OK) {
                    wa_proton_study_free(study);
                    return status;
                }
                best_here = fmax(best_here, evidence);
                if (evidence < best - hopeless_charge) {
                    break;
                }
            }
        }
        /* One count may be worse than both its neighbours; two in a row end the search. */
        vain = best_here < best - hopeless ? vain + 1 : 0;
        if (vain == 2) {
            break;
        }
        best = fmax(best, best_here);
    }
    if (study->count > 0) {
        weigh(experiment, study);
    }
    return WA_OK;
}

/* Protons that the spectators of a sample model tell to be missing at the start. */
static int lost_of(const struct wa_sample_model *sample)
{
    return sample->parts[0].charge + (int)lround(sample->spectator_charge[0]);
}

enum wa_status wa_proton_study_seed(const struct wa_experiment *experiment,
                                    const struct wa_sample_model *sample, const struct wa_fit *fit,
                                    struct wa_proton_study *study, struct wa_error *error)
{
    const struct wa_model_part *part = &sample->parts[0];
    const int lost = lost_of(sample);
    const int protons = experiment->titrant_is_base ? part->step_count - lost : lost;
    if (study->count >= WA_GENERIC_MAX || sample->part_count != 1 || part->count != 1.0 ||
        protons < 1) {
        return WA_OK;
    }
    struct wa_generic *generic = &study->generic[study->count];
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    double start[WA_PARAMETERS_MAX];
    *generic =
        (struct wa_generic){.step_count = part->step_count, .lost = lost, .charge = part->charge};
    generic->log_prior = log_prior_of(protons, part->step_count > protons, part->step_count);
    wa_generic_sample(experiment, part->step_count, lost, part->charge, &generic->sample);
    const int count = wa_fit_parameters(experiment, &generic->sample, parameters);
    for (int i = 0; i < count; i++) {
        const int index =
            wa_fit_find(fit, parameters[i].kind, parameters[i].part, parameters[i].step);
        start[i] = index >= 0                              ? fit->parameters[index].value
                   : parameters[i].kind == WA_PARAMETER_PK ? part->pK[parameters[i].step]
                                                           : parameters[i].prior.mean;
    }
    const enum wa_status status =
        wa_fit_run(experiment, &generic->sample, NULL, start, &generic->fit, error);
    if (status == WA_OK && generic->fit.converged) {
        study->count++;
        weigh(experiment, study);
    } else {
        wa_fit_free(&generic->fit);
    }
    return status;
}

void wa_proton_study_free(struct wa_proton_study *study)
{
    if (study != NULL) {
        for (int i = 0; i < study->count; i++) {
            wa_fit_free(&study->generic[i].fit);
        }
        study->count = 0;
    }
}
