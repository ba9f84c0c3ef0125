#include "whichacid/explanations.h"

#include "fit/generic_internal.h"

#include <math.h>
#include <stdlib.h>

/* Protons of the acid that has strong acid beside it, and of each of two acids. */
static const int excess_protons_max = 3;
static const int two_protons_max = 2;
static const double prior_by_protons[3] = {0.6, 0.3, 0.1};
static const double excess_share = 0.5; /* prior u of the excess, of the titrant used in all */

static double equivalents_per_mL(const struct wa_experiment *experiment)
{
    return experiment->equivalents * exp(experiment->ln_titrant.mean) * 1e-3;
}

double wa_excess_prior_u(const struct wa_experiment *experiment)
{
    return excess_share * equivalents_per_mL(experiment) *
           experiment->volume_mL[experiment->count - 1];
}

static double log_sum(double a, double b)
{
    const double high = fmax(a, b);
    return isfinite(high) ? high + log1p(exp(fmin(a, b) - high)) : high;
}

/* The state in which a generic acid or base of so many protons starts. */
static void fresh_sample(const struct wa_experiment *experiment, int protons,
                         struct wa_sample_model *sample)
{
    const int lost = experiment->titrant_is_base ? 0 : protons;
    const int charge = experiment->titrant_is_base ? 0 : protons;
    wa_generic_sample(experiment, protons, lost, charge, sample);
}

/* One acid of `protons` between two jumps, with what comes before the first as strong acid (or,
 * when the titrant is an acid, strong base); and the reverse, part of the acid already used up. */
static enum wa_status excess_starts(const struct wa_experiment *experiment,
                                    const struct wa_curve *curve,
                                    const struct wa_sample_model *sample, int protons,
                                    struct wa_start_list *list, struct wa_error *error)
{
    const double per_mL = equivalents_per_mL(experiment);
    const double sign = experiment->titrant_is_base ? 1.0 : -1.0;
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        for (size_t j = i; status == WA_OK && j < curve->inflection_count; j++) {
            const double first = curve->inflections[i].volume_mL;
            const double last = curve->inflections[j].volume_mL;
            const double share[3] = {i == j ? 0.0 : first / last, 0.3, -0.3};
            for (int k = 0; status == WA_OK && k < 3; k++) {
                const double excess = share[k] * last * per_mL;
                struct wa_start start;
                status = wa_generic_start(experiment, sample, (last * per_mL - excess) / protons,
                                          sign * excess, start.value, error);
                if (status == WA_OK) {
                    status = wa_start_consider(experiment, sample, &start, list, error);
                }
            }
        }
    }
    return status;
}

static enum wa_status weigh_excess(const struct wa_experiment *experiment,
                                   const struct wa_curve *curve,
                                   struct wa_explanations *explanations, double *log_evidence,
                                   struct wa_error *error)
{
    struct wa_experiment with_excess = *experiment;
    double best = -INFINITY;
    enum wa_status status = WA_OK;
    with_excess.excess_u = wa_excess_prior_u(experiment);
    *log_evidence = -INFINITY;
    for (int protons = 1; status == WA_OK && protons <= excess_protons_max; protons++) {
        struct wa_sample_model sample;
        struct wa_start_list list = {.count = 0};
        struct wa_fit fit = {.parameter_count = 0};
        fresh_sample(&with_excess, protons, &sample);
        status = excess_starts(&with_excess, curve, &sample, protons, &list, error);
        if (status == WA_OK) {
            status = wa_fit_from_starts(&with_excess, &sample, &list, &fit, error);
        }
        if (status == WA_OK && fit.converged) {
            const double weight =
                fit.log_evidence + log(prior_by_protons[protons - 1]) + lgamma(protons + 1.0);
            const int index = wa_fit_find(&fit, WA_PARAMETER_EXCESS, 0, 0);
            *log_evidence = log_sum(*log_evidence, weight);
            if (weight > best) {
                best = weight;
                explanations->excess_mol = fit.parameters[index].value;
                explanations->excess_u = fit.parameters[index].u;
            }
        }
        wa_fit_free(&fit);
    }
    return status;
}

/* Two generic acids, the stronger first. */
static void two_sample(const struct wa_experiment *experiment, int first, int second,
                       struct wa_sample_model *sample)
{
    struct wa_sample_model other;
    fresh_sample(experiment, first, sample);
    fresh_sample(experiment, second, &other);
    sample->parts[1] = other.parts[0];
    sample->parts[1].substance = 1;
    sample->part_count = 2;
    sample->substance_count = 2;
    sample->spectator_charge[1] = other.spectator_charge[0];
    sample->spectator_z2[1] = other.spectator_z2[0];
    sample->ln_amount[1] = other.ln_amount[0];
}

static double reading_at(const struct wa_curve *curve, double volume_mL)
{
    size_t p = 0;
    while (p + 1 < curve->point_count && curve->volume_mL[p + 1] < volume_mL) {
        p++;
    }
    return curve->smooth[p];
}

/* Constants read at the middle of each proton's share of the volume. */
static void two_start(const struct wa_experiment *experiment, const struct wa_curve *curve,
                      const struct wa_sample_model *sample, double first_mL, double last_mL,
                      double *value)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(experiment, sample, parameters);
    const double per_mL = equivalents_per_mL(experiment);
    const bool base = experiment->titrant_is_base;
    for (int i = 0; i < count; i++) {
        const struct wa_parameter *parameter = &parameters[i];
        const double from = parameter->part == 0 ? 0.0 : first_mL;
        const double to = parameter->part == 0 ? first_mL : last_mL;
        value[i] = parameter->prior.mean;
        if (parameter->kind == WA_PARAMETER_LN_AMOUNT) {
            value[i] = log((to - from) * per_mL / sample->parts[parameter->part].step_count);
        } else if (parameter->kind == WA_PARAMETER_PK) {
            const int steps = sample->parts[parameter->part].step_count;
            /* A base takes up its protons in the order in which an acid would lose them last. */
            const int order = base ? parameter->step : steps - 1 - parameter->step;
            value[i] = reading_at(curve, from + (to - from) * (order + 0.5) / steps);
        }
    }
}

static enum wa_status fit_two(const struct wa_experiment *experiment, const struct wa_curve *curve,
                              const struct wa_sample_model *sample, struct wa_fit *fit,
                              struct wa_error *error)
{
    struct wa_start_list list = {.count = 0};
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        for (size_t j = i + 1; status == WA_OK && j < curve->inflection_count; j++) {
            struct wa_start start;
            two_start(experiment, curve, sample, curve->inflections[i].volume_mL,
                      curve->inflections[j].volume_mL, start.value);
            status = wa_start_consider(experiment, sample, &start, &list, error);
        }
    }
    *fit = (struct wa_fit){.parameter_count = 0};
    return status == WA_OK ? wa_fit_from_starts(experiment, sample, &list, fit, error) : status;
}

static enum wa_status weigh_two(const struct wa_experiment *experiment,
                                const struct wa_curve *curve, struct wa_explanations *explanations,
                                double *log_evidence, struct wa_error *error)
{
    double best = -INFINITY;
    enum wa_status status = WA_OK;
    *log_evidence = -INFINITY;
    for (int first = 1; first <= two_protons_max; first++) {
        for (int second = 1; status == WA_OK && second <= two_protons_max; second++) {
            struct wa_sample_model sample;
            struct wa_fit fit;
            two_sample(experiment, first, second, &sample);
            status = fit_two(experiment, curve, &sample, &fit, error);
            if (status != WA_OK || !fit.converged) {
                wa_fit_free(&fit);
                continue;
            }
            const double weight = fit.log_evidence + log(prior_by_protons[first - 1]) +
                                  log(prior_by_protons[second - 1]) + lgamma(first + 1.0) +
                                  lgamma(second + 1.0);
            *log_evidence = log_sum(*log_evidence, weight);
            if (weight > best) {
                best = weight;
                wa_fit_free(&explanations->two_fit);
                explanations->two_fit = fit;
                explanations->two_sample = sample;
            } else {
                wa_fit_free(&fit);
            }
        }
    }
    return status;
}

enum wa_status wa_explanations_weigh(const struct wa_experiment *experiment,
                                     const struct wa_curve *curve,
                                     const struct wa_proton_study *study,
                                     struct wa_explanations *explanations, struct wa_error *error)
{
    double weight[3] = {study->log_evidence, -INFINITY, -INFINITY};
    *explanations = (struct wa_explanations){.preferred = WA_EXPLANATION_ONE_ACID};
    enum wa_status status = weigh_excess(experiment, curve, explanations, &weight[1], error);
    if (status == WA_OK && curve->inflection_count > 1) {
        status = weigh_two(experiment, curve, explanations, &weight[2], error);
    }
    if (status != WA_OK) {
        wa_explanations_free(explanations);
        return status;
    }
    weight[0] += log(1.0 - WA_EXCESS_PRIOR - WA_TWO_ACIDS_PRIOR);
    weight[1] += log(WA_EXCESS_PRIOR);
    weight[2] += log(WA_TWO_ACIDS_PRIOR);
    explanations->log_two_acids = weight[2];
    const double total = log_sum(log_sum(weight[0], weight[1]), weight[2]);
    for (int kind = 0; kind < 3; kind++) {
        explanations->probability[kind] = exp(weight[kind] - total);
        if (weight[kind] > weight[explanations->preferred]) {
            explanations->preferred = (enum wa_explanation_kind)kind;
        }
    }
    return WA_OK;
}

void wa_explanations_free(struct wa_explanations *explanations)
{
    if (explanations != NULL) {
        wa_fit_free(&explanations->two_fit);
    }
}
