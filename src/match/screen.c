/* Screening: at each measured pH the charge balance is explicit, and linear in the amount. One
 * small linear system a form gives an evidence close enough to tell which forms deserve a full fit.
 */
#include "match/match_internal.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>

#include <math.h>
#include <stdlib.h>

static const double ln10 = 2.302585092994046;
static const size_t most_points = 96; /* a longer run is thinned evenly: this is a screening */
static const int rounds = 4;
static const double settled = 0.05;      /* in prior u, and in per cent of the amount */
static const double noise_trusted = 3.0; /* times its prior: beyond it the generic fit has failed */
static const double weight_trusted = 0.75; /* of all points: fewer than that, and it has failed */
static const double model_error = 0.005;   /* pH, so that no noiseless run screens too sharply */

/* Unknowns of one form: its amount, the electrode, the titrant, and its free constants. */
enum { AMOUNT, OFFSET, SLOPE, TITRANT, CARBONATE, EXCESS, CONSTANTS };

#define UNKNOWNS_MAX (CONSTANTS + WA_PARTS_MAX * WA_PROTONS_MAX)

/* One point: everything that does not depend on the form. */
struct station {
    double total_L;      /* volume in the vessel */
    double activity;     /* of H+, by the best generic fit's electrode */
    double gamma;        /* of a singly charged ion */
    double known;        /* mol of charge of all but the form: titrant, water, carbonate */
    double known_pH;     /* its derivative by pH */
    double by_titrant;   /* by ln of the titrant's concentration */
    double by_carbonate; /* by ln of the titrant's carbonate */
    double lever;        /* of the electrode's slope: pH less its pivot */
    double noise_charge; /* mol, by the noise of the volume */
    double weight;       /* probability of being no outlier */
};

struct screening {
    const struct wa_experiment *experiment;
    struct station *stations;
    size_t count;
    double noise_pH;
    double slope;          /* of the electrode */
    double u[CONSTANTS];   /* prior u of what all forms share; 0: none */
    double off[CONSTANTS]; /* prior mean less the value already used, in prior u */
};

/* One form on trial. */
struct trial {
    const struct wa_group *group; /* NULL: everything dissolves */
    bool saturated;               /* some station was beyond the solubility */
    const struct wa_sample_model *sample;
    struct wa_system systems[WA_PARTS_MAX];
    int count; /* unknowns */
    double ln_amount;
    double value[UNKNOWNS_MAX]; /* deviations from the prior means, in prior u */
    double matrix[UNKNOWNS_MAX * UNKNOWNS_MAX];
    double vector[UNKNOWNS_MAX];
    double square;    /* weighted sum of squared residuals */
    double log_scale; /* sum of ln (d reading / d charge) / sigma */
    double weight;    /* sum of the weights */
};

static double parameter_value(const struct wa_fit *fit, enum wa_parameter_kind kind,
                              double otherwise)
{
    const int index = wa_fit_find(fit, kind, 0, 0);
    return index >= 0 ? fit->parameters[index].value : otherwise;
}

/* Mean and variance of the protons lost. */
static double mean_lost(const double *fraction, int step_count, double *variance)
{
    double first = 0.0, second = 0.0;
    for (int i = 1; i <= step_count; i++) {
        first += fraction[i] * i;
        second += fraction[i] * i * i;
    }
    *variance = second - first * first;
    return first;
}

static void set_station(const struct wa_titration *t, double pH, double gamma, double added_L,
                        double noise_L, struct station *at)
{
    const double total_L = t->solution_volume_L + added_L;
    double titrant_charge = t->titrant_charge;
    at->total_L = total_L;
    at->activity = exp(-ln10 * pH);
    at->gamma = gamma;
    const double hydrogen = t->medium.density * at->activity / gamma;
    const double hydroxide = t->medium.density * exp(ln10 * (pH - t->medium.pKw)) / gamma;
    at->known = (hydrogen - hydroxide) * total_L + t->titrant_charge * added_L;
    at->known_pH = -ln10 * (hydrogen + hydroxide) * total_L;
    /* The first component is the generic acid that the form now stands in for. */
    for (int k = 1; k < t->component_count; k++) {
        const struct wa_titration_component *component = &t->components[k];
        double fraction[WA_PROTONS_MAX + 1], variance;
        wa_system_fractions(&component->system, at->activity, gamma, fraction);
        const double charge =
            component->system.charge - mean_lost(fraction, component->system.step_count, &variance);
        const double moles = component->sample_moles + component->titrant_concentration * added_L;
        at->known += moles * charge;
        at->known_pH -= ln10 * moles * variance;
        at->by_carbonate = component->titrant_concentration * charge * added_L;
        titrant_charge += component->titrant_concentration * charge;
    }
    at->by_titrant = titrant_charge * added_L;
    at->noise_charge = fabs(titrant_charge) * noise_L;
}

/* Let an unknown that all forms share vary about the value that the generic fit found. */
static void share(const struct wa_fit *best, int unknown, enum wa_parameter_kind kind,
                  struct screening *screening)
{
    const int index = wa_fit_find(best, kind, 0, 0);
    if (index >= 0) {
        const struct wa_parameter *parameter = &best->parameters[index];
        screening->u[unknown] = parameter->prior.u;
        screening->off[unknown] = (parameter->prior.mean - parameter->value) / parameter->prior.u;
    }
}

/* Share of the points that the generic fit takes for no outliers. */
static double share_within(const struct wa_experiment *experiment, const struct wa_fit *best)
{
    double sum = 0.0;
    for (size_t p = 0; p < experiment->count; p++) {
        sum += 1.0 - best->outlier[p];
    }
    return sum / (double)experiment->count;
}

static enum wa_status prepare(const struct wa_experiment *experiment, const struct wa_fit *best,
                              struct screening *screening, struct wa_error *error)
{
    const struct wa_titration *t = &best->titration;
    const size_t stride = (experiment->count + most_points - 1) / most_points;
    const double offset = parameter_value(best, WA_PARAMETER_OFFSET, experiment->offset.mean);
    *screening = (struct screening){.experiment = experiment};
    screening->slope = parameter_value(best, WA_PARAMETER_SLOPE, experiment->slope.mean);
    share(best, OFFSET, WA_PARAMETER_OFFSET, screening);
    share(best, SLOPE, WA_PARAMETER_SLOPE, screening);
    share(best, TITRANT, WA_PARAMETER_LN_TITRANT, screening);
    share(best, CARBONATE, WA_PARAMETER_LN_CARBONATE, screening);
    share(best, EXCESS, WA_PARAMETER_EXCESS, screening);
    const double excess = parameter_value(best, WA_PARAMETER_EXCESS, 0.0);
    const double noise_reading =
        fmin(best->noise_reading, noise_trusted * exp(experiment->ln_noise_reading.mean));
    const double noise_volume =
        fmin(best->noise_volume, noise_trusted * exp(experiment->ln_noise_volume.mean));
    const bool trusted = share_within(experiment, best) > weight_trusted;
    screening->noise_pH = hypot(noise_reading, model_error);
    screening->stations = calloc(experiment->count / stride + 1, sizeof *screening->stations);
    if (screening->stations == NULL) {
        return wa_fail_memory(error);
    }
    const double gamma =
        exp(ln10 * wa_davies_log10_gamma(best->ionic_strength, t->medium.debye_huckel_A,
                                         t->davies_coefficient));
    const double neutral = 7.0 + experiment->pivot;
    for (size_t p = 0; p < experiment->count; p += stride) {
        struct station *at = &screening->stations[screening->count++];
        const double pH = neutral + (experiment->reading[p] - neutral - offset) / screening->slope;
        set_station(t, pH, gamma, 1e-3 * experiment->volume_mL[p], 1e-3 * noise_volume, at);
        at->known -= excess;
        at->lever = pH - neutral;
        at->weight = trusted ? 1.0 - best->outlier[p] : 1.0;
    }
    return WA_OK;
}

static void set_systems(struct trial *trial)
{
    int unknown = CONSTANTS;
    for (int k = 0; k < trial->sample->part_count; k++) {
        const struct wa_model_part *part = &trial->sample->parts[k];
        double pK[WA_PROTONS_MAX];
        for (int i = 0; i < part->step_count; i++) {
            pK[i] = part->pK[i];
            if (part->pK_u[i] > 0.0) {
                pK[i] += trial->value[unknown++] * part->pK_u[i];
            }
        }
        wa_system_set(&trial->systems[k], part->charge, part->step_count, pK);
    }
    trial->count = unknown;
}

/* Charge of one mole of the form at a station, with its derivatives by pH and by each constant (in
 * prior u). */
static double form_charge(const struct trial *trial, const struct station *at, double *by_pH,
                          double *by_constant)
{
    double charge = trial->sample->spectator_charge[0];
    int unknown = 0;
    *by_pH = 0.0;
    for (int k = 0; k < trial->sample->part_count; k++) {
        const struct wa_model_part *part = &trial->sample->parts[k];
        double fraction[WA_PROTONS_MAX + 1], variance;
        double past = 1.0, past_lost;
        wa_system_fractions(&trial->systems[k], at->activity, at->gamma, fraction);
        const double lost = mean_lost(fraction, part->step_count, &variance);
        charge += part->count * (part->charge - lost);
        *by_pH -= ln10 * part->count * variance;
        past_lost = lost;
        for (int i = 0; i < part->step_count; i++) {
            /* Raising pK lowers the weight of every species past this step alike. */
            past -= fraction[i];
            past_lost -= fraction[i] * i;
            if (part->pK_u[i] > 0.0) {
                by_constant[unknown++] =
                    ln10 * part->count * (past_lost - past * lost) * part->pK_u[i];
            }
        }
    }
    return charge;
}

/* Amount by least squares with the constants as they stand; false when no positive one fits. Where
 * a solid may have been, only the last quarter of the points is sure to have everything dissolved.
 */
static bool first_amount(const struct screening *screening, struct trial *trial)
{
    double cross = 0.0, square = 0.0;
    const size_t first = trial->group != NULL ? screening->count - (screening->count + 3) / 4 : 0;
    for (size_t p = first; p < screening->count; p++) {
        const struct station *at = &screening->stations[p];
        double by_pH, by_constant[UNKNOWNS_MAX];
        const double charge = form_charge(trial, at, &by_pH, by_constant);
        const double noise = hypot(at->noise_charge, at->known_pH * 0.05);
        const double weight = at->weight / (noise * noise + 1e-300);
        cross -= weight * charge * at->known;
        square += weight * charge * charge;
    }
    if (!(cross > 0.0) || !(square > 0.0)) {
        return false;
    }
    trial->ln_amount = log(cross / square);
    return isfinite(trial->ln_amount);
}

/* Where the form's uncharged species is beyond its solubility, what is dissolved follows from the
 * solubility and not from the amount: replace charge and derivatives by that. The constants' part
 * is left out, which a screening can bear. */
static void saturate(struct trial *trial, const struct station *at, double amount, double *charge,
                     double *by_pH, double *row)
{
    const struct wa_group *group = trial->group;
    const struct wa_model_part *part = &trial->sample->parts[0];
    double fraction[WA_PROTONS_MAX + 1], variance;
    if (group == NULL) {
        return;
    }
    wa_system_fractions(&trial->systems[0], at->activity, at->gamma, fraction);
    const double dissolved = group->solubility * at->total_L / fraction[group->solid_species];
    if (amount * part->count <= dissolved) {
        return;
    }
    trial->saturated = true;
    const double lost = mean_lost(fraction, part->step_count, &variance);
    const double mean = part->charge - lost;
    const double spectators = amount * trial->sample->spectator_charge[0];
    *charge = dissolved * mean + spectators;
    *by_pH = -ln10 * dissolved * (variance + mean * (group->solid_species - lost));
    row[AMOUNT] = spectators;
    for (int i = CONSTANTS; i < trial->count; i++) {
        row[i] = 0.0;
    }
}

static void add_station(const struct screening *screening, const struct station *at,
                        struct trial *trial)
{
    double by_pH, row[UNKNOWNS_MAX];
    const double amount = exp(trial->ln_amount);
    double charge = amount * form_charge(trial, at, &by_pH, &row[CONSTANTS]);
    by_pH *= amount;
    row[AMOUNT] = charge;
    for (int i = CONSTANTS; i < trial->count; i++) {
        row[i] *= amount;
    }
    saturate(trial, at, amount, &charge, &by_pH, row);
    const double total_pH = by_pH + at->known_pH;
    row[OFFSET] = -total_pH / screening->slope * screening->u[OFFSET];
    row[SLOPE] = -total_pH * at->lever / screening->slope * screening->u[SLOPE];
    row[TITRANT] = at->by_titrant * screening->u[TITRANT];
    row[CARBONATE] = at->by_carbonate * screening->u[CARBONATE];
    row[EXCESS] = -screening->u[EXCESS];
    /* What all forms share acts linearly; the constants and the amount are in the charge. */
    double residual = charge + at->known;
    for (int i = OFFSET; i < CONSTANTS; i++) {
        residual += row[i] * (trial->value[i] + screening->off[i]);
    }
    const double sigma = hypot(total_pH * screening->noise_pH, at->noise_charge);
    const double weight = at->weight / (sigma * sigma);
    trial->square += weight * residual * residual;
    trial->log_scale += at->weight * log(fabs(total_pH) / sigma);
    trial->weight += at->weight;
    for (int i = 0; i < trial->count; i++) {
        trial->vector[i] -= weight * row[i] * residual;
        for (int j = 0; j <= i; j++) {
            trial->matrix[i * trial->count + j] += weight * row[i] * row[j];
        }
    }
}

/* Normal equations with the priors: a broad one for the amount, one u for each other unknown. */
static void linearise(const struct screening *screening, struct trial *trial)
{
    const struct wa_prior *ln_amount = &trial->sample->ln_amount[0];
    set_systems(trial);
    for (int i = 0; i < trial->count * trial->count; i++) {
        trial->matrix[i] = 0.0;
    }
    const double precision = 1.0 / (ln_amount->u * ln_amount->u);
    trial->vector[AMOUNT] = (ln_amount->mean - trial->ln_amount) * precision;
    trial->matrix[AMOUNT * trial->count + AMOUNT] = precision;
    for (int i = OFFSET; i < trial->count; i++) {
        trial->vector[i] = -trial->value[i];
        trial->matrix[i * trial->count + i] = 1.0;
    }
    trial->square = 0.0;
    trial->log_scale = 0.0;
    trial->weight = 0.0;
    for (size_t p = 0; p < screening->count; p++) {
        add_station(screening, &screening->stations[p], trial);
    }
}

/* Solve for the step and take it; returns ln of the determinant, or NaN. */
static double step(struct trial *trial, double *move)
{
    const size_t count = (size_t)trial->count;
    gsl_matrix_view matrix = gsl_matrix_view_array(trial->matrix, count, count);
    gsl_vector_view vector = gsl_vector_view_array(trial->vector, count);
    if (gsl_linalg_cholesky_decomp1(&matrix.matrix) != GSL_SUCCESS ||
        gsl_linalg_cholesky_svx(&matrix.matrix, &vector.vector) != GSL_SUCCESS) {
        return NAN;
    }
    double log_determinant = 0.0;
    for (size_t i = 0; i < count; i++) {
        log_determinant += 2.0 * log(trial->matrix[i * count + i]);
    }
    trial->ln_amount += fmin(fmax(trial->vector[AMOUNT], -1.0), 1.0);
    *move = 100.0 * fabs(trial->vector[AMOUNT]);
    for (int i = OFFSET; i < trial->count; i++) {
        trial->value[i] += trial->vector[i];
        *move = fmax(*move, fabs(trial->vector[i]));
    }
    return log_determinant;
}

static double screen_once(const struct screening *screening, const struct wa_group *group,
                          bool with_solid, double *ln_amount, bool *saturated)
{
    struct trial trial = {.group = with_solid ? group : NULL, .sample = &group->sample};
    double log_determinant = NAN, move = INFINITY;
    set_systems(&trial);
    if (!first_amount(screening, &trial)) {
        return -INFINITY;
    }
    for (int round = 0; round < rounds && move > settled; round++) {
        linearise(screening, &trial);
        log_determinant = step(&trial, &move);
        if (!isfinite(log_determinant)) {
            return -INFINITY;
        }
    }
    linearise(screening, &trial);
    /* A full fit would raise the noise to meet a misfit; this is what that costs. */
    const double excess = trial.square / trial.weight;
    double sum = trial.log_scale - 0.5 * trial.weight * (excess > 1.0 ? 1.0 + log(excess) : excess);
    double strain = 0.0;
    for (int i = OFFSET; i < trial.count; i++) {
        const double square = trial.value[i] * trial.value[i];
        sum -= i < CONSTANTS ? 0.5 * square : 0.0;
        strain += i < CONSTANTS ? 0.0 : square;
    }
    sum += wa_log_strain(strain, trial.count - CONSTANTS);
    *ln_amount = trial.ln_amount;
    *saturated = trial.saturated;
    sum -= 0.5 * log_determinant;
    return isfinite(sum) ? sum : -INFINITY;
}

/* Screened as dissolved and, where the table tells a solubility, with a solid: the better counts.
 */
static double screen_group(const struct screening *screening, struct wa_group *group)
{
    bool saturated = false;
    double with_ln_amount;
    const double dissolved = screen_once(screening, group, false, &group->ln_amount, &saturated);
    if (!isfinite(group->solubility) || group->sample.part_count == 0) {
        return dissolved;
    }
    const double solid = screen_once(screening, group, true, &with_ln_amount, &saturated);
    if (saturated && solid > dissolved) {
        group->ln_amount = with_ln_amount;
        return solid;
    }
    return dissolved;
}

enum wa_status wa_groups_screen(const struct wa_experiment *experiment, const struct wa_fit *best,
                                struct wa_group_list *list, struct wa_error *error)
{
    struct screening screening;
    const enum wa_status status = prepare(experiment, best, &screening, error);
    if (status != WA_OK) {
        return status;
    }
    for (size_t g = 0; g < list->count; g++) {
        list->groups[g].screened = screen_group(&screening, &list->groups[g]);
    }
    free(screening.stations);
    return WA_OK;
}
