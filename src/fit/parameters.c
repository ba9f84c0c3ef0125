/* Which parameters a fit has, and their priors. */
#include "fit/fault.h"
#include "fit/fit_internal.h"

#include <math.h>

/* What is known better than this is held: it could not move any figure of the report. */
static const double negligible_ln_volume = 0.02;
static const double negligible_temperature = 0.3;

static void add(struct wa_parameter *parameters, int *count, enum wa_parameter_kind kind, int part,
                int step, struct wa_prior prior)
{
    parameters[*count] = (struct wa_parameter){.kind = kind,
                                               .part = part,
                                               .step = step,
                                               .prior = prior,
                                               .value = prior.mean,
                                               .u = prior.u};
    (*count)++;
}

static void add_nuisances(const struct wa_experiment *experiment, struct wa_parameter *parameters,
                          int *count)
{
    add(parameters, count, WA_PARAMETER_LN_TITRANT, 0, 0, experiment->ln_titrant);
    add(parameters, count, WA_PARAMETER_OFFSET, 0, 0, experiment->offset);
    add(parameters, count, WA_PARAMETER_SLOPE, 0, 0, experiment->slope);
    add(parameters, count, WA_PARAMETER_DAVIES, 0, 0, experiment->davies);
    if (experiment->titrant_is_base && !experiment->titrant_is_weak) {
        add(parameters, count, WA_PARAMETER_LN_CARBONATE, 0, 0, experiment->ln_carbonate);
    }
    if (experiment->ln_carbon_dioxide.u > 0.0) {
        add(parameters, count, WA_PARAMETER_LN_CARBON_DIOXIDE, 0, 0, experiment->ln_carbon_dioxide);
    }
    if (experiment->ln_volume.u > negligible_ln_volume) {
        add(parameters, count, WA_PARAMETER_LN_VOLUME, 0, 0, experiment->ln_volume);
    }
    if (experiment->temperature.u > negligible_temperature) {
        add(parameters, count, WA_PARAMETER_TEMPERATURE, 0, 0, experiment->temperature);
    }
    if (experiment->excess_u > 0.0) {
        const struct wa_prior none = {.mean = 0.0, .u = experiment->excess_u};
        add(parameters, count, WA_PARAMETER_EXCESS, 0, 0, none);
    }
}

static void add_fault(const struct wa_fault *fault, struct wa_parameter *parameters, int *count)
{
    const struct {
        enum wa_parameter_kind kind;
        const struct wa_prior *prior;
    } all[] = {
        {WA_PARAMETER_DRIFT, &fault->drift},
        {WA_PARAMETER_LN_UPTAKE, &fault->ln_uptake},
        {WA_PARAMETER_VOLUME_STEP, &fault->volume_step},
        {WA_PARAMETER_LN_SOLUBILITY, &fault->ln_solubility},
    };
    for (size_t i = 0; i < sizeof all / sizeof all[0]; i++) {
        if (all[i].prior->u > 0.0) {
            add(parameters, count, all[i].kind, 0, 0, *all[i].prior);
        }
    }
}

struct wa_fault_share wa_fault_share(const struct wa_fault *fault, size_t point)
{
    struct wa_fault_share share = {.course = 0.0};
    if (fault != NULL) {
        share.course = fault->drift.u > 0.0 ? fault->course[point] : 0.0;
        share.uptake = fault->ln_uptake.u > 0.0 ? fault->uptake[point] : 0.0;
        share.step =
            fault->volume_step.u > 0.0 && point >= fault->step_row && point < fault->step_end;
    }
    return share;
}

int wa_fit_parameters(const struct wa_experiment *experiment, const struct wa_sample_model *sample,
                      struct wa_parameter parameters[WA_PARAMETERS_MAX])
{
    int count = 0;
    for (int k = 0; k < sample->part_count; k++) {
        const struct wa_model_part *part = &sample->parts[k];
        for (int i = 0; i < part->step_count; i++) {
            if (part->pK_u[i] > 0.0) {
                const struct wa_prior prior = {.mean = part->pK[i], .u = part->pK_u[i]};
                add(parameters, &count, WA_PARAMETER_PK, k, i, prior);
            }
        }
    }
    for (int k = 0; k < sample->part_count; k++) {
        const struct wa_model_part *part = &sample->parts[k];
        if (isfinite(part->solubility) && part->ln_solubility_u > 0.0) {
            const struct wa_prior prior = {.mean = log(part->solubility),
                                           .u = part->ln_solubility_u};
            add(parameters, &count, WA_PARAMETER_LN_SOLUBILITY, k, 0, prior);
        }
    }
    for (int a = 0; a < sample->substance_count; a++) {
        add(parameters, &count, WA_PARAMETER_LN_AMOUNT, a, 0, sample->ln_amount[a]);
    }
    add_nuisances(experiment, parameters, &count);
    if (experiment->fault != NULL) {
        add_fault(experiment->fault, parameters, &count);
    }
    return count;
}

int wa_fit_find(const struct wa_fit *fit, enum wa_parameter_kind kind, int part, int step)
{
    for (int i = 0; i < fit->parameter_count; i++) {
        if (fit->parameters[i].kind == kind && fit->parameters[i].part == part &&
            fit->parameters[i].step == step) {
            return i;
        }
    }
    return -1;
}
