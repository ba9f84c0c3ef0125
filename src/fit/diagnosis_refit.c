/* Refits with one fault more: the evidence with the fault against that without it. */
#include "fit/diagnosis_internal.h"

#include <math.h>
#include <stdlib.h>

static const double scatter_most = 0.06;      /* pH */
static const double runs_chance_least = 1e-6; /* of so few runs */
static const double outliers_most = 0.12;     /* of the points */

/* ln of the amount that a fit of this base would need if the strong acid or base beside it were
 * acid as well. */
static double ln_whole_amount(const struct wa_experiment *experiment, const struct wa_generic *base)
{
    const struct wa_fit *fit = &base->fit;
    const double ln_amount = fit->parameters[wa_fit_find(fit, WA_PARAMETER_LN_AMOUNT, 0, 0)].value;
    const int index = wa_fit_find(fit, WA_PARAMETER_EXCESS, 0, 0);
    const double excess = index >= 0 ? fit->parameters[index].value / base->step_count : 0.0;
    const double whole = exp(ln_amount) + (experiment->titrant_is_base ? excess : -excess);
    return whole > 0.0 ? log(whole) : ln_amount;
}

/* Values of the base's fit where the parameter exists there, else the prior mean. */
static void start_from(const struct wa_experiment *experiment, const struct wa_generic *base,
                       const struct wa_parameter *parameters, int count,
                       enum wa_parameter_kind kind, const struct wa_refit_start *start,
                       double *values)
{
    for (int i = 0; i < count; i++) {
        const struct wa_parameter *p = &parameters[i];
        const int index = wa_fit_find(&base->fit, p->kind, p->part, p->step);
        values[i] = index >= 0 ? base->fit.parameters[index].value : p->prior.mean;
        if (p->kind == kind && isfinite(start->value)) {
            values[i] = start->value;
        } else if (p->kind == WA_PARAMETER_PK) {
            values[i] += start->pK_shift;
        } else if (p->kind == WA_PARAMETER_LN_AMOUNT && !(experiment->excess_u > 0.0)) {
            values[i] = ln_whole_amount(experiment, base);
        }
    }
}

/* A fault is believed when the curve with it describes the run: with a modest scatter, nearly all
 * points, and residuals in random order. Otherwise something else is wrong as well, or instead. */
static bool explains(const struct wa_experiment *experiment, const struct wa_fit *fit)
{
    const struct wa_runs_test test = wa_runs_test(fit->residual, fit->outlier, experiment->count);
    double outliers = 0.0;
    for (size_t p = 0; p < experiment->count; p++) {
        outliers += fit->outlier[p];
    }
    return fit->noise_reading < scatter_most && test.chance > runs_chance_least &&
           outliers < outliers_most * (double)experiment->count;
}

enum wa_status wa_refit(const struct wa_inquiry *inquiry, const struct wa_experiment *experiment,
                        enum wa_parameter_kind kind, const struct wa_refit_start *start,
                        int iterations, struct wa_refit *refit, struct wa_error *error)
{
    const struct wa_fit_options options = {.most_iterations = iterations,
                                           .from_afar = iterations == 0};
    *refit = (struct wa_refit){.log_evidence = -INFINITY};
    const struct wa_generic *const *bases = start->solid ? inquiry->neutral : inquiry->bases;
    const int count_of_bases = start->solid ? inquiry->neutral_count : inquiry->base_count;
    for (int b = 0; b < count_of_bases; b++) {
        const struct wa_generic *base = bases[b];
        struct wa_parameter parameters[WA_PARAMETERS_MAX];
        double values[WA_PARAMETERS_MAX];
        struct wa_sample_model sample = base->sample;
        if (start->solid) {
            sample.parts[0].solid_species = base->lost;
        }
        const int count = wa_fit_parameters(experiment, &sample, parameters);
        start_from(experiment, base, parameters, count, kind, start, values);
        struct wa_fit fit;
        const enum wa_status status =
            wa_fit_run(experiment, &sample, &options, values, &fit, error);
        if (status != WA_OK) {
            return status;
        }
        const double evidence = fit.log_evidence + base->log_prior;
        const int index = wa_fit_find(&fit, kind, 0, 0);
        if ((fit.converged || iterations > 0) && fit.misfit > 0.0 && isfinite(evidence) &&
            evidence > refit->log_evidence) {
            *refit = (struct wa_refit){.log_evidence = evidence, .base = base};
            refit->value = index >= 0 ? fit.parameters[index].value : NAN;
            refit->u = index >= 0 ? fit.parameters[index].u : NAN;
            refit->explains = explains(experiment, &fit);
        }
        wa_fit_free(&fit);
    }
    return WA_OK;
}

static void keep(const struct wa_inquiry *inquiry, const struct wa_refit *refit,
                 enum wa_parameter_kind kind, struct wa_suspicion *suspicion)
{
    const double odds = refit->log_evidence - inquiry->log_evidence;
    if (isfinite(odds) && (!suspicion->weighed || odds > suspicion->statistic)) {
        suspicion->weighed = true;
        suspicion->statistic = odds;
        suspicion->log_evidence = odds;
        suspicion->value = refit->value;
        suspicion->u = refit->u;
        suspicion->explains = refit->explains;
        suspicion->parameter = kind;
    }
}

/* Where strong acid or base was taken to be beside the acid, the fault may be the whole reason for
 * it: it is tried with that and without. */
static enum wa_status weigh_refit(const struct wa_inquiry *inquiry,
                                  const struct wa_experiment *experiment,
                                  enum wa_parameter_kind kind, const struct wa_refit_start *start,
                                  struct wa_suspicion *suspicion, struct wa_error *error)
{
    struct wa_experiment pure = *experiment;
    struct wa_refit refit;
    enum wa_status status = wa_refit(inquiry, experiment, kind, start, 0, &refit, error);
    if (status == WA_OK) {
        keep(inquiry, &refit, kind, suspicion);
    }
    if (status == WA_OK && experiment->excess_u > 0.0) {
        pure.excess_u = 0.0;
        status = wa_refit(inquiry, &pure, kind, start, 0, &refit, error);
        if (status == WA_OK) {
            keep(inquiry, &refit, kind, suspicion);
        }
    }
    return status;
}

/* Priors of the faults: how large they are when they happen (our own choice, common practice). */
static const double wrong_offset_u = 0.4;
static const double wrong_slope = 0.92; /* a worn electrode falls short, it does not exceed */
static const double wrong_slope_u = 0.04;
static const struct wa_prior much_carbonate = {.mean = -2.8, .u = 0.5};   /* about 6 % */
static const struct wa_prior little_carbonate = {.mean = -4.6, .u = 0.4}; /* about 1 % */
static const double drift_u = 0.3;
static const double uptake_of_titrant = 0.04;
static const double ln_uptake_u = 0.7;
static const double dissolves = 0.3; /* of the sample, when it does not all dissolve */
static const double ln_dissolves_u = 0.6;
static const size_t alkaline_at_least = 5;

/* Every parameter where the base left it. */
static const struct wa_refit_start as_fitted = {.value = NAN};

static enum wa_status weigh_electrode(const struct wa_inquiry *inquiry,
                                      struct wa_suspicion *suspicion, struct wa_error *error)
{
    if (inquiry->experiment->uncalibrated) {
        return WA_OK;
    }
    struct wa_experiment offset = *inquiry->experiment, slope = *inquiry->experiment;
    offset.offset.u = hypot(offset.offset.u, wrong_offset_u);
    slope.slope.mean *= wrong_slope;
    slope.slope.u = hypot(slope.slope.u, wrong_slope_u);
    const enum wa_status status =
        weigh_refit(inquiry, &offset, WA_PARAMETER_OFFSET, &as_fitted, suspicion, error);
    return status == WA_OK
               ? weigh_refit(inquiry, &slope, WA_PARAMETER_SLOPE, &as_fitted, suspicion, error)
               : status;
}

/* The ordinary prior leaves a long tail towards much carbonate, so that here much is weighed
 * against what a titrant kept with care holds, both stated. */
static enum wa_status weigh_carbonate(const struct wa_inquiry *inquiry,
                                      struct wa_suspicion *suspicion, struct wa_error *error)
{
    struct wa_experiment much = *inquiry->experiment, little = *inquiry->experiment;
    if (!much.titrant_is_base || much.titrant_is_weak) {
        return WA_OK;
    }
    much.ln_carbonate.mean = fmax(much_carbonate.mean, much.ln_carbonate.mean + 1.0);
    much.ln_carbonate.u = much_carbonate.u;
    little.ln_carbonate.mean = fmax(little_carbonate.mean, little.ln_carbonate.mean);
    little.ln_carbonate.u = little_carbonate.u;
    const struct wa_refit_start from_much = {.value = much.ln_carbonate.mean};
    const struct wa_refit_start from_little = {.value = little.ln_carbonate.mean};
    struct wa_suspicion without = {.weighed = false};
    enum wa_status status =
        weigh_refit(inquiry, &much, WA_PARAMETER_LN_CARBONATE, &from_much, suspicion, error);
    if (status == WA_OK) {
        status =
            weigh_refit(inquiry, &little, WA_PARAMETER_LN_CARBONATE, &from_little, &without, error);
    }
    suspicion->statistic -= without.statistic;
    suspicion->weighed = suspicion->weighed && without.weighed;
    return status;
}

static enum wa_status weigh_uptake(const struct wa_inquiry *inquiry, struct wa_suspicion *suspicion,
                                   struct wa_error *error)
{
    struct wa_experiment with = *inquiry->experiment;
    if (inquiry->alkaline < alkaline_at_least || with.ln_carbon_dioxide.u <= 0.0) {
        return WA_OK;
    }
    const double titrant_mol = exp(with.ln_titrant.mean) * 1e-3 * with.volume_mL[with.count - 1];
    const struct wa_fault fault = {
        .ln_uptake = {.mean = log(uptake_of_titrant * titrant_mol), .u = ln_uptake_u},
        .uptake = inquiry->uptake};
    with.fault = &fault;
    enum wa_status status = WA_OK;
    for (int i = 0; status == WA_OK && i < 2; i++) {
        /* From nearly none: a start with too much carbonate finds no way back. */
        const struct wa_refit_start start = {.value = fault.ln_uptake.mean - (i == 0 ? 3.0 : 0.7)};
        status = weigh_refit(inquiry, &with, WA_PARAMETER_LN_UPTAKE, &start, suspicion, error);
    }
    return status;
}

static enum wa_status weigh_drift(const struct wa_inquiry *inquiry, struct wa_suspicion *suspicion,
                                  struct wa_error *error)
{
    struct wa_experiment with = *inquiry->experiment;
    const struct wa_fault fault = {.drift = {.mean = 0.0, .u = drift_u}, .course = inquiry->course};
    with.fault = &fault;
    return weigh_refit(inquiry, &with, WA_PARAMETER_DRIFT, &as_fitted, suspicion, error);
}

static enum wa_status weigh_precipitate(const struct wa_inquiry *inquiry,
                                        struct wa_suspicion *suspicion, struct wa_error *error)
{
    static const double dissolved[] = {0.35, 0.35, 0.6};
    static const double pK_shift[] = {0.0, 0.4, -0.4};
    struct wa_experiment with = *inquiry->experiment;
    if (inquiry->neutral_count == 0) {
        return WA_OK;
    }
    const double ln_concentration =
        ln_whole_amount(&with, inquiry->neutral[0]) - with.ln_volume.mean;
    const struct wa_fault fault = {
        .ln_solubility = {.mean = ln_concentration + log(dissolves), .u = ln_dissolves_u}};
    with.fault = &fault;
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < sizeof dissolved / sizeof dissolved[0]; i++) {
        const struct wa_refit_start start = {
            .value = ln_concentration + log(dissolved[i]), .pK_shift = pK_shift[i], .solid = true};
        status = weigh_refit(inquiry, &with, WA_PARAMETER_LN_SOLUBILITY, &start, suspicion, error);
    }
    return status;
}

enum wa_status wa_weigh_whole_run(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                                  struct wa_error *error)
{
    static const struct {
        enum wa_fault_kind kind;
        enum wa_status (*weigh)(const struct wa_inquiry *, struct wa_suspicion *,
                                struct wa_error *);
    } all[] = {
        {WA_FAULT_ELECTRODE, weigh_electrode},     {WA_FAULT_CARBONATE, weigh_carbonate},
        {WA_FAULT_UPTAKE, weigh_uptake},           {WA_FAULT_DRIFT, weigh_drift},
        {WA_FAULT_PRECIPITATE, weigh_precipitate},
    };
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < sizeof all / sizeof all[0]; i++) {
        status = all[i].weigh(inquiry, &diagnosis->suspicions[all[i].kind], error);
    }
    return status;
}
