/* Simulated runs of a plan: how well constants and amount come out, and whether a rival is told. */
#include "bench/plan_internal.h"

#include "whichacid/match.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <math.h>
#include <string.h>

static const double purity_u = 0.005; /* of a sample whose mass is to tell its molar mass */
static const double enough = 0.95;    /* probability that counts as told */
static const int power_trials = 15;   /* with either candidate as the truth */
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

/* Squares of the errors of one run, added up. */
static bool add_errors(const struct wa_fit *fit, double *pKa_square, double *amount_square)
{
    int pKa = 0;
    if (!fit->converged) {
        return false;
    }
    for (int i = 0; i < fit->parameter_count; i++) {
        const struct wa_parameter *parameter = &fit->parameters[i];
        const double off = parameter->value - parameter->prior.mean;
        if (parameter->kind == WA_PARAMETER_PK && pKa < WA_PROTONS_MAX) {
            pKa_square[pKa++] += off * off;
        } else if (parameter->kind == WA_PARAMETER_LN_AMOUNT) {
            *amount_square += off * off;
        }
    }
    return true;
}

static enum wa_status try_design(struct plan_work *work, const double *volume_mL, gsl_rng *random,
                                 struct wa_plan_precision *precision, struct wa_error *error)
{
    double pKa_square[WA_PROTONS_MAX] = {0.0}, amount_square = 0.0;
    enum wa_status status = WA_OK;
    for (int t = 0; t < work->options->trials && status == WA_OK; t++) {
        struct wa_experiment experiment;
        struct wa_fit fit = {.parameter_count = 0};
        status = plan_experiment(&work->experiment, volume_mL, (size_t)work->plan->addition_count,
                                 &experiment, error);
        if (status != WA_OK) {
            return status;
        }
        status = read_run(work, &work->sample, true, random, &experiment, error);
        if (status == WA_OK &&
            wa_fit_run(&experiment, &work->sample, NULL, NULL, &fit, NULL) == WA_OK) {
            precision->converged += add_errors(&fit, pKa_square, &amount_square);
            wa_fit_free(&fit);
        }
        wa_experiment_free(&experiment);
    }
    const double n = precision->converged > 0 ? precision->converged : (double)NAN;
    for (int i = 0; i < work->plan->free_pKa_count; i++) {
        precision->pKa_rms[i] = sqrt(pKa_square[i] / n);
    }
    precision->amount_rms = sqrt(amount_square / n);
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

static enum wa_status find_rival(struct plan_work *work, struct wa_error *error)
{
    const int form = wa_table_find_form(work->table, work->options->rival);
    if (form < 0 || !work->table->forms[form].modelled || work->plan->form == NULL) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       work->plan->form == NULL
                           ? "To tell two candidates apart, name both."
                           : "The table has no form '%.80s' with a model; `whichacid table list` "
                             "shows all.",
                       work->options->rival);
    }
    work->plan->rival = &work->table->forms[form];
    return WA_OK;
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
