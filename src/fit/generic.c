/* Generic acids: the model of an acid that nobody named, and where a fit of it starts. */
#include "fit/generic_internal.h"

#include <math.h>
#include <stdlib.h>

static const double ln10 = 2.302585092994046;
static const double start_ionic_strength = 0.05;
static const double amount_ln_u = 1.5;
static const double start_pK_low = -1.0;
static const double start_pK_high = 13.5;

void wa_generic_sample(const struct wa_experiment *experiment, int step_count, int lost, int charge,
                       struct wa_sample_model *sample)
{
    *sample = (struct wa_sample_model){.part_count = 1, .substance_count = 1, .alike_sites = true};
    struct wa_model_part *part = &sample->parts[0];
    part->charge = charge;
    part->step_count = step_count;
    part->count = 1.0;
    part->solubility = INFINITY;
    for (int i = 0; i < step_count; i++) {
        part->pK[i] = WA_GENERIC_PK_MEAN;
        part->pK_u[i] = WA_GENERIC_PK_U;
    }
    sample->spectator_charge[0] = lost - charge;
    sample->spectator_z2[0] = abs(lost - charge);
    /* About one equivalent at the middle of the burette, within a factor of some twenty. */
    const double half_mL = 0.5 * experiment->volume_mL[experiment->count - 1];
    const double equivalents =
        experiment->equivalents * exp(experiment->ln_titrant.mean) * 1e-3 * fmax(half_mL, 1e-6);
    sample->ln_amount[0] = (struct wa_prior){.mean = log(equivalents), .u = amount_ln_u};
}

/* Protons lost per molecule at a point, from the charge balance at the measured pH. */
static double protons_lost(const struct wa_experiment *experiment,
                           const struct wa_sample_model *sample, double amount, double excess,
                           size_t point)
{
    const struct wa_medium medium = wa_medium_at(experiment->temperature_C);
    const double log10_gamma =
        wa_davies_log10_gamma(start_ionic_strength, medium.debye_huckel_A, WA_DAVIES_COEFFICIENT);
    const double pH = experiment->reading[point] - experiment->offset.mean;
    const double added_L = 1e-3 * experiment->volume_mL[point];
    const double total_L = exp(experiment->ln_volume.mean) + added_L;
    const double hydrogen = exp(-ln10 * (pH + log10_gamma));
    const double hydroxide = exp(ln10 * (pH - medium.pKw - log10_gamma));
    const double titrant = (experiment->titrant_is_base ? 1.0 : -1.0) * experiment->equivalents *
                           exp(experiment->ln_titrant.mean);
    return sample->parts[0].charge + sample->spectator_charge[0] +
           (titrant * added_L - excess + (hydrogen - hydroxide) * total_L) / amount;
}

/* pH at which the protons lost pass `level`: between two points, or beyond the ends by the
 * mass-action law of that one step. */
static double crossing(const struct wa_experiment *experiment, const double *lost, double level)
{
    const size_t count = experiment->count;
    const double *pH = experiment->reading;
    for (size_t p = 0; p + 1 < count; p++) {
        const double a = lost[p] - level;
        const double b = lost[p + 1] - level;
        if (a * b <= 0.0 && a != b) {
            return pH[p] + (pH[p + 1] - pH[p]) * a / (a - b);
        }
    }
    const bool rises = lost[count - 1] > lost[0];
    const bool beyond_end = rises == (lost[count - 1] < level);
    const size_t end = beyond_end ? count - 1 : 0;
    const double in_step = fmin(fmax(lost[end] - (level - 0.5), 0.02), 0.98);
    return pH[end] + log10((1.0 - in_step) / in_step);
}

enum wa_status wa_generic_start(const struct wa_experiment *experiment,
                                const struct wa_sample_model *sample, double amount, double excess,
                                double *value, struct wa_error *error)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(experiment, sample, parameters);
    double *lost = malloc(experiment->count * sizeof *lost);
    if (lost == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t p = 0; p < experiment->count; p++) {
        lost[p] = protons_lost(experiment, sample, amount, excess, p);
    }
    for (int i = 0; i < count; i++) {
        value[i] = parameters[i].prior.mean;
        if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            value[i] = log(amount);
        } else if (parameters[i].kind == WA_PARAMETER_EXCESS) {
            value[i] = excess;
        } else if (parameters[i].kind == WA_PARAMETER_PK) {
            const double pK = crossing(experiment, lost, parameters[i].step + 0.5);
            value[i] = fmin(fmax(pK, start_pK_low), start_pK_high);
            if (i > 0 && parameters[i - 1].kind == WA_PARAMETER_PK) {
                /* Crossings can fall together; the model needs an order to begin with. */
                value[i] = fmax(value[i], value[i - 1] + 0.3);
            }
        }
    }
    free(lost);
    return WA_OK;
}
