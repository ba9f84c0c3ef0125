/* Simulated runs of a plan: how well constants and amount come out, and whether a rival is told. */
#include "bench/plan_internal.h"

#include "whichacid/match.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics.h>
#include <math.h>
#include <stdlib.h>

static const double purity_u = 0.005; /* of a sample whose mass is to tell its molar mass */
static const double enough = 0.95;    /* probability that counts as told */
static const double normal_over_median = 1.4826;
static const int power_trials = 15; /* with either candidate as the truth */
static const double usual_ionic_strength = 0.05;

/* Simulated readings at the volumes of an experiment: its priors are drawn from, but for what the
 * run is to find when `keep_sample` is set. */
static enum wa_status read_run(const struct plan_work *work, const struct wa_sample_model *truth,
                               bool keep_sample, gsl_rng *random, struct wa_experiment *experiment,
                               struct wa_error *error)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    double values[WA_PARAMETERS_MAX], nominal[WA_PLAN_ADDITIONS_MAX];
    const int count = wa_fit_parameters(experiment, truth, parameters);
    for (int i = 0; i < count; i++) {
        const bool sample =
            parameters[i].kind == WA_PARAMETER_PK || parameters[i].kind == WA_PARAMETER_LN_AMOUNT;
        values[i] = parameters[i].prior.mean;
        if (!sample || !keep_sample) {
            values[i] += gsl_ran_gaussian(random, parameters[i].prior.u);
        }
    }
    for (size_t p = 0; p < experiment->count; p++) {
        const double error_mL = gsl_ran_gaussian(random, work->options->noise_volume);
        nominal[p] = experiment->volume_mL[p];
        experiment->volume_mL[p] = p == 0 ? nominal[p] : fmax(nominal[p] + error_mL, 0.0);
    }
    const enum wa_status status =
        wa_fit_expect(experiment, truth, values, experiment->reading, NULL, NULL, NULL, error);
    for (size_t p = 0; p < experiment->count; p++) {
        experiment->volume_mL[p] = nominal[p];
        experiment->reading[p] += gsl_ran_gaussian(random, work->options->noise_reading);
    }
    return status;
}

/* Absolute errors of the runs so far: of each constant, then of the amount. */
struct errors {
    double *values[WA_PROTONS_MAX + 1]; /* `trials` each */
    int count;
};

static void add_errors(const struct wa_fit *fit, struct errors *errors)
{
    int pKa = 0;
    for (int i = 0; i < fit->parameter_count; i++) {
        const struct wa_parameter *parameter = &fit->parameters[i];
        const double off = fabs(parameter->value - parameter->prior.mean);
        if (!plan_finds(parameter)) {
            continue;
        }
        if (parameter->kind == WA_PARAMETER_PK && pKa < WA_PROTONS_MAX) {
            errors->values[pKa++][errors->count] = off;
        } else if (parameter->kind == WA_PARAMETER_LN_AMOUNT) {
            errors->values[WA_PROTONS_MAX][errors->count] = off;
        }
    }
    errors->count++;
}

/* The standard deviation that a normal distribution with this median error has: the few runs that
 * meet much carbonate do not decide what is usual. */
static double usual_error(double *values, int count)
{
    gsl_sort(values, 1, (size_t)count);
    return count > 0
               ? gsl_stats_median_from_sorted_data(values, 1, (size_t)count) * normal_over_median
               : (double)NAN;
}

static enum wa_status try_runs(struct plan_work *work, const double *volume_mL, gsl_rng *random,
                               struct errors *errors, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (int t = 0; t < work->options->trials && status == WA_OK; t++) {
        struct wa_experiment experiment;
        struct wa_fit fit;
        status = plan_experiment(&work->experiment, volume_mL, (size_t)work->plan->addition_count,
                                 &experiment, error);
        if (status != WA_OK) {
            return status;
        }
        status = read_run(work, &work->sample, true, random, &experiment, error);
        if (status == WA_OK &&
            wa_fit_run(&experiment, &work->sample, NULL, NULL, &fit, NULL) == WA_OK) {
            if (fit.converged) {
                add_errors(&fit, errors);
            }
            wa_fit_free(&fit);
        }
        wa_experiment_free(&experiment);
    }
    return status;
}

static enum wa_status try_design(struct plan_work *work, const double *volume_mL, gsl_rng *random,
                                 struct wa_plan_precision *precision, struct wa_error *error)
{
    const size_t trials = (size_t)work->options->trials;
    double *values = calloc(trials * (WA_PROTONS_MAX + 1), sizeof *values);
    struct errors errors = {.count = 0};
    if (values == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i <= WA_PROTONS_MAX; i++) {
        errors.values[i] = values + i * trials;
    }
    const enum wa_status status = try_runs(work, volume_mL, random, &errors, error);
    precision->converged = errors.count;
    for (int i = 0; i < work->plan->free_pKa_count; i++) {
        precision->pKa_error[i] = usual_error(errors.values[i], errors.count);
    }
    precision->amount_error = usual_error(errors.values[WA_PROTONS_MAX], errors.count);
    free(values);
    return status;
}

enum wa_status plan_trials(struct plan_work *work, struct wa_error *error)
{
    gsl_rng *random = gsl_rng_alloc(gsl_rng_mt19937);
    if (random == NULL) {
        return wa_fail_memory(error);
    }
    gsl_rng_set(random, work->options->seed);
    enum wa_status status =
        try_design(work, work->plan->additions_mL, random, &work->plan->design, error);
    if (status == WA_OK) {
        status = try_design(work, work->plan->even_mL, random, &work->plan->even, error);
    }
    gsl_rng_free(random);
    return status;
}

/* A candidate as identify would try it: its constants as the table has them, its amount by the
 * mass. */
static void candidate(const struct plan_work *work, const struct wa_form *form,
                      struct wa_sample_model *sample)
{
    const struct wa_prior amount = {
        .mean = log(work->plan->mass_g / form->molar_mass),
        .u = hypot(purity_u, work->options->mass_u / work->plan->mass_g)};
    wa_match_sample(work->table, form, &work->experiment, usual_ionic_strength, &amount, sample);
}

/* Whether one simulated run tells the truth (candidate 0) from the other. */
static enum wa_status told(const struct plan_work *work,
                           const struct wa_sample_model *const both[2], size_t readings,
                           gsl_rng *random, bool *is_told, struct wa_error *error)
{
    double volume_mL[WA_PLAN_ADDITIONS_MAX], evidence[2] = {0.0, 0.0};
    struct wa_experiment experiment;
    for (size_t p = 0; p < readings; p++) {
        volume_mL[p] = work->plan->end_mL * (double)p / (double)(readings - 1);
    }
    enum wa_status status =
        plan_experiment(&work->experiment, volume_mL, readings, &experiment, error);
    if (status != WA_OK) {
        return status;
    }
    status = read_run(work, both[0], false, random, &experiment, error);
    bool fitted = status == WA_OK;
    for (int k = 0; k < 2 && fitted; k++) {
        struct wa_fit fit;
        fitted = wa_fit_run(&experiment, both[k], NULL, NULL, &fit, NULL) == WA_OK;
        if (fitted) {
            evidence[k] = fit.log_evidence;
            wa_fit_free(&fit);
        }
    }
    *is_told = fitted && evidence[0] - evidence[1] >= log(enough / (1.0 - enough));
    wa_experiment_free(&experiment);
    return status;
}

/* A form by its name, or the one that brings an acid alone and whole. */
static const struct wa_form *find_form(const struct wa_table *table, const char *name)
{
    const int form = wa_table_find_form(table, name);
    const int acid = wa_table_find_acid(table, name);
    if (form >= 0) {
        return table->forms[form].modelled ? &table->forms[form] : NULL;
    }
    for (size_t f = 0; acid >= 0 && f < table->form_count; f++) {
        const struct wa_form *known = &table->forms[f];
        if (known->modelled && known->part_count == 1 && known->parts[0].acid == acid &&
            known->parts[0].lost == 0) {
            return known;
        }
    }
    return NULL;
}

static enum wa_status find_rival(struct plan_work *work, struct wa_error *error)
{
    if (work->plan->form == NULL) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "To tell two candidates apart, name the first as the sample.");
    }
    work->plan->rival = find_form(work->table, work->options->rival);
    return work->plan->rival != NULL
               ? WA_OK
               : wa_fail(error, WA_ERROR_CALL, NULL, 0,
                         "The table has no form '%.80s' with a model; 'whichacid table list' shows "
                         "the keys.",
                         work->options->rival);
}

enum wa_status plan_power(struct plan_work *work, struct wa_error *error)
{
    static const int readings[] = {8, 15, 30, 60};
    struct wa_sample_model sample[2];
    enum wa_status status = find_rival(work, error);
    gsl_rng *random = status == WA_OK ? gsl_rng_alloc(gsl_rng_mt19937) : NULL;
    if (random == NULL) {
        return status == WA_OK ? wa_fail_memory(error) : status;
    }
    gsl_rng_set(random, work->options->seed);
    candidate(work, work->plan->form, &sample[0]);
    candidate(work, work->plan->rival, &sample[1]);
    for (size_t i = 0; i < sizeof readings / sizeof readings[0] && status == WA_OK; i++) {
        int count = 0;
        for (int t = 0; t < 2 * power_trials && status == WA_OK; t++) {
            const struct wa_sample_model *const both[2] = {&sample[t % 2], &sample[1 - t % 2]};
            bool is_told = false;
            status = told(work, both, (size_t)readings[i], random, &is_told, error);
            count += is_told;
        }
        struct wa_plan_power *power = &work->plan->power[work->plan->power_count++];
        *power = (struct wa_plan_power){readings[i], count / (2.0 * power_trials)};
        work->plan->rival_told = work->plan->rival_told || power->share >= 0.9;
    }
    gsl_rng_free(random);
    return status;
}
