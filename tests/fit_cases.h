/* Titrations with known truth for the tests, the long runs and the benchmark of the fit: the
 * library's own model, its parameters drawn from their priors, its noise. */
#ifndef WHICHACID_TESTS_FIT_CASES_H
#define WHICHACID_TESTS_FIT_CASES_H

#include "fit/fit_internal.h"
#include "simulate/simulate_internal.h"
#include "whichacid/protons.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

/** An acid or base and how it is titrated. */
struct fit_case {
    const char *name;
    int charge, steps, lost;
    double pK[4];
    bool titrant_is_base;
};

/** What each case is for: one step, two that overlap (1.07 apart), three, a base, an ampholyte. */
static const struct fit_case fit_cases[] = {
    {"monoprotic", 0, 1, 0, {4.76}, true},
    {"diprotic", 0, 2, 0, {4.35, 5.42}, true},
    {"triprotic", 0, 3, 0, {3.13, 4.76, 6.40}, true},
    {"base", 1, 1, 1, {8.07}, false},
    {"ampholyte", 0, 2, 1, {2.95, 5.41}, true},
};

#define FIT_CASE_COUNT (sizeof fit_cases / sizeof fit_cases[0])

static const double case_moles = 1e-3;
static const double case_titrant = 0.1; /* mol/L */

/* The priors of a careful run: all that matters was noted. */
static inline void case_priors(struct wa_experiment *experiment)
{
    experiment->temperature_C = 25.0;
    experiment->temperature = (struct wa_prior){.mean = 25.0, .u = 0.1};
    experiment->ln_volume = (struct wa_prior){.mean = log(0.05), .u = 0.005};
    experiment->ln_titrant = (struct wa_prior){.mean = log(case_titrant), .u = 0.002};
    experiment->ln_carbonate = (struct wa_prior){.mean = log(0.005), .u = 0.5};
    experiment->ln_carbon_dioxide = (struct wa_prior){.mean = log(8e-6), .u = 0.8};
    experiment->slope = (struct wa_prior){.mean = 1.0, .u = 0.005};
    experiment->offset = (struct wa_prior){.mean = 0.0, .u = 0.02};
    experiment->davies =
        (struct wa_prior){.mean = WA_DAVIES_COEFFICIENT, .u = WA_DAVIES_COEFFICIENT_U};
    experiment->ln_noise_reading = (struct wa_prior){.mean = log(0.012), .u = 0.9};
    experiment->ln_noise_volume = (struct wa_prior){.mean = log(0.01), .u = 0.7};
}

/* Volumes as `simulate` places them, denser where the pH moves. */
static inline bool case_volumes(const struct fit_case *c, struct wa_experiment *experiment)
{
    const double equivalents = c->titrant_is_base ? c->steps - c->lost : c->lost;
    struct wa_simulation place = {
        .options = {.end_mL = 1.3e3 * equivalents * case_moles / case_titrant,
                    .point_count = (int)experiment->count},
        .titration = {.medium = wa_medium_at(25.0),
                      .davies_coefficient = WA_DAVIES_COEFFICIENT,
                      .solution_volume_L = 0.05,
                      .component_count = 1,
                      .sample_charge = (c->lost - c->charge) * case_moles,
                      .titrant_charge = experiment->titrant_charge * case_titrant,
                      .titrant_ionic = 0.5 * case_titrant},
    };
    place.titration.components[0] =
        (struct wa_titration_component){.sample_moles = case_moles, .solubility = INFINITY};
    wa_system_set(&place.titration.components[0].system, c->charge, c->steps, c->pK);
    struct wa_error error;
    const bool placed = wa_simulation_place(&place, &error) == WA_OK;
    if (placed) {
        memcpy(experiment->volume_mL, place.volume_mL, experiment->count * sizeof(double));
    }
    wa_simulation_free(&place);
    return placed;
}

/** An experiment without readings yet; free it with wa_experiment_free. */
static inline bool case_experiment(const struct fit_case *c, size_t count,
                                   struct wa_experiment *experiment)
{
    *experiment = (struct wa_experiment){
        .count = count,
        .titrant_is_base = c->titrant_is_base,
        .equivalents = 1.0,
        .titrant_charge = c->titrant_is_base ? 1.0 : -1.0,
    };
    experiment->volume_mL = calloc(count, sizeof *experiment->volume_mL);
    experiment->reading = calloc(count, sizeof *experiment->reading);
    experiment->line = calloc(count, sizeof *experiment->line);
    case_priors(experiment);
    return experiment->volume_mL != NULL && experiment->reading != NULL &&
           experiment->line != NULL && case_volumes(c, experiment);
}

/** True values in the order of wa_fit_parameters: nuisances drawn from their priors. */
static inline int case_truth(const struct fit_case *c, const struct wa_experiment *experiment,
                             const struct wa_sample_model *sample, gsl_rng *random,
                             struct wa_parameter parameters[WA_PARAMETERS_MAX], double *truth)
{
    const int count = wa_fit_parameters(experiment, sample, parameters);
    for (int i = 0; i < count; i++) {
        const struct wa_prior *prior = &parameters[i].prior;
        truth[i] = prior->mean + prior->u * gsl_ran_ugaussian(random);
        if (parameters[i].kind == WA_PARAMETER_PK) {
            truth[i] = c->pK[parameters[i].step];
        } else if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            truth[i] = log(case_moles);
        }
    }
    return count;
}

/** Where a fit starts: constants up to 0.3 off, the amount up to a tenth, the rest at the priors.
 */
static inline void case_start(const struct wa_parameter *parameters, const double *truth, int count,
                              gsl_rng *random, double *start)
{
    for (int i = 0; i < count; i++) {
        const double off = 2.0 * gsl_rng_uniform(random) - 1.0;
        start[i] = parameters[i].prior.mean;
        if (parameters[i].kind == WA_PARAMETER_PK) {
            start[i] = truth[i] + 0.3 * off;
        } else if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            start[i] = truth[i] + 0.1 * off;
        }
    }
}

/** Readings with noise in both coordinates, and the electrode's errors at the ends of its range. */
static inline bool case_readings(const struct wa_sample_model *sample,
                                 const struct wa_parameter *parameters, const double *truth,
                                 int count, const struct wa_noise *noise, gsl_rng *random,
                                 struct wa_experiment *experiment)
{
    struct wa_titration titration;
    struct wa_layout layout;
    double slope = 1.0, offset = 0.0;
    wa_model_titration(experiment, sample, parameters, truth, count, &titration, &layout);
    for (int i = 0; i < count; i++) {
        slope = parameters[i].kind == WA_PARAMETER_SLOPE ? truth[i] : slope;
        offset = parameters[i].kind == WA_PARAMETER_OFFSET ? truth[i] : offset;
    }
    for (size_t p = 0; p < experiment->count; p++) {
        struct wa_solution solution;
        struct wa_error error;
        /* Before the first drop there is no volume to misread. */
        const double deviate = gsl_ran_ugaussian(random);
        const double read = experiment->volume_mL[p];
        const double volume = read > 0.0 ? fmax(read + noise->volume * deviate, 0.0) : 0.0;
        if (wa_titration_pH(&titration, volume, 7.0, &solution, NULL, &error) != WA_OK) {
            return false;
        }
        const struct wa_point_model point = {.pH = solution.pH};
        const double u = sqrt(wa_noise_variance(noise, &point));
        experiment->reading[p] =
            7.0 + slope * (solution.pH - 7.0) + offset + u * gsl_ran_ugaussian(random);
    }
    return true;
}

/** One run as the checks against other programs use it: noise levels held by narrow priors, so that
 * the weights have nothing left to follow, and a poorly known volume, so that it is a parameter. */
static inline bool case_example(const struct fit_case *c, size_t points, unsigned long seed,
                                struct wa_experiment *experiment, struct wa_sample_model *sample,
                                double *start)
{
    static const struct wa_noise noise = {.reading = 0.01, .volume = 0.008};
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    double truth[WA_PARAMETERS_MAX];
    gsl_rng *random = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(random, seed);
    bool made = case_experiment(c, points, experiment);
    experiment->ln_noise_reading = (struct wa_prior){.mean = log(noise.reading), .u = 1e-6};
    experiment->ln_noise_volume = (struct wa_prior){.mean = log(noise.volume), .u = 1e-6};
    experiment->ln_volume.u = 0.03;
    wa_generic_sample(experiment, c->steps, c->lost, c->charge, sample);
    const int count = case_truth(c, experiment, sample, random, parameters, truth);
    made = made && case_readings(sample, parameters, truth, count, &noise, random, experiment);
    case_start(parameters, truth, count, random, start);
    gsl_rng_free(random);
    return made;
}

/** Weights as the fit freezes them, at given values and noise; `work` has room for the points. */
static inline bool case_precisions(const struct wa_experiment *experiment,
                                   const struct wa_sample_model *sample,
                                   const struct wa_parameter *parameters, const double *value,
                                   int count, const struct wa_noise *noise, bool outliers,
                                   struct wa_point_model *work, double *jacobian, double *precision)
{
    struct wa_error error;
    memset(work, 0, experiment->count * sizeof *work);
    if (wa_model_evaluate(experiment, sample, parameters, value, count, work, jacobian, &error) !=
        WA_OK) {
        return false;
    }
    for (size_t p = 0; p < experiment->count; p++) {
        const double variance = wa_noise_variance(noise, &work[p]);
        const double wide = variance + WA_OUTLIER_SPREAD * WA_OUTLIER_SPREAD;
        double inlier = 1.0;
        if (outliers) {
            wa_noise_log_likelihood(WA_OUTLIER_FRACTION, experiment->reading[p] - work[p].expected,
                                    variance, &inlier);
        }
        precision[p] = inlier / variance + (1.0 - inlier) / wide;
    }
    return true;
}

#endif
