/* From a run and its notes to an experiment: points in pH, and one prior for each thing that the
 * analyst noted or that a stated default stands in for. */
#include "fit/fit_internal.h"

#include <math.h>
#include <stdlib.h>

static const double nernst_mV = 59.159; /* ln10 R T / F at 25 degree Celsius, CODATA 2018 */
static const double kelvin_offset = 273.15;
static const double reference_K = 298.15;

/* Defaults for what nobody noted. */
static const double default_volume_mL = 50.0;
static const double default_ln_volume_u = 0.6;
static const double noted_volume_u = 0.01; /* relative, when the note states none */
static const double default_concentration = 0.1;
static const double default_ln_concentration_u = 0.7;
static const double noted_concentration_u = 0.005; /* relative */
static const double default_carbon_dioxide = 8e-6; /* mol/L; air gives 1.3e-5 */
static const double default_ln_carbon_dioxide_u = 0.8;
static const double default_reading_noise = 0.012; /* pH */
static const double default_ln_reading_noise_u = 0.9;
static const double default_ln_volume_noise_u = 0.7;
static const double noted_ln_noise_u = 0.25;
static const size_t most_points = 600;
static const double uncalibrated_offset_u = 1.0; /* pH */
static const double carbonate_ln_u = 0.8;        /* root mean square about twice the median */

static struct wa_prior prior_from(const struct wa_noted *noted, double mean, double u)
{
    return (struct wa_prior){.mean = mean, .u = u, .origin = noted->origin, .line = noted->line};
}

static double relative_u(const struct wa_noted *noted, double otherwise)
{
    const struct wa_quantity *q = &noted->quantity;
    return q->has_u && q->u > 0.0 ? q->u / fabs(q->value) : otherwise;
}

static struct wa_prior volume_prior(const struct wa_conditions *conditions)
{
    const struct wa_noted *noted = &conditions->solution_volume;
    if (noted->known && noted->quantity.value > 0.0) {
        return prior_from(noted, log(1e-3 * noted->quantity.value),
                          relative_u(noted, noted_volume_u));
    }
    return (struct wa_prior){log(1e-3 * default_volume_mL), default_ln_volume_u, WA_ORIGIN_DEFAULT,
                             0};
}

static struct wa_prior titrant_prior(const struct wa_conditions *conditions)
{
    const struct wa_noted *noted = &conditions->titrant_concentration;
    if (noted->known && noted->quantity.value > 0.0) {
        return prior_from(noted, log(noted->quantity.value),
                          fmax(relative_u(noted, noted_concentration_u), 1e-5));
    }
    return (struct wa_prior){log(default_concentration), default_ln_concentration_u,
                             WA_ORIGIN_DEFAULT, 0};
}

/* A positive unknown with a stated value or a stated one-sided width: log-normal. The root mean
 * square of the log-normal equals the width when no value is stated. */
static struct wa_prior carbonate_prior(const struct wa_conditions *conditions)
{
    const struct wa_noted *noted = &conditions->titrant_carbonate;
    const double value = noted->known ? noted->quantity.value : 0.0;
    const double u = noted->known && noted->quantity.has_u ? noted->quantity.u : 0.015;
    if (value > 0.0) {
        const double ln_u = fmin(fmax(noted->quantity.has_u ? u / value : 0.3, 0.02), 1.0);
        return prior_from(noted, log(value), ln_u);
    }
    return prior_from(noted, log(fmax(u, 1e-5)) - carbonate_ln_u * carbonate_ln_u, carbonate_ln_u);
}

static struct wa_prior noise_prior(const struct wa_noted *noted, double scale, double otherwise,
                                   double otherwise_u)
{
    if (noted->known && noted->quantity.value > 0.0) {
        return prior_from(noted, log(noted->quantity.value * scale), noted_ln_noise_u);
    }
    return (struct wa_prior){log(otherwise), otherwise_u, WA_ORIGIN_DEFAULT, 0};
}

/* Slope and offset from one calibration are correlated. About one pH they are not: there the offset
 * has its least uncertainty, and two independent priors say all that is known. */
static void set_pivot(const struct wa_noted *correlation, struct wa_experiment *experiment)
{
    const double r = correlation->known ? correlation->quantity.value : 0.0;
    struct wa_prior *offset = &experiment->offset;
    experiment->pivot = -r * offset->u / experiment->slope.u;
    offset->mean += (experiment->slope.mean - 1.0) * experiment->pivot;
    offset->u *= sqrt(fmax(1.0 - r * r, 1e-6));
}

static void set_priors(const struct wa_run *run, double last_volume_mL, double mV_per_pH,
                       struct wa_experiment *experiment)
{
    const struct wa_conditions *c = &run->conditions;
    experiment->temperature_C = c->temperature.known ? c->temperature.quantity.value : 25.0;
    experiment->temperature = prior_from(&c->temperature, experiment->temperature_C,
                                         c->temperature.quantity.has_u ? c->temperature.quantity.u
                                         : c->temperature.origin == WA_ORIGIN_DEFAULT ? 2.0
                                                                                      : 0.2);
    experiment->ln_volume = volume_prior(c);
    experiment->ln_titrant = titrant_prior(c);
    experiment->ln_carbonate = carbonate_prior(c);
    experiment->ln_carbon_dioxide = (struct wa_prior){
        log(default_carbon_dioxide), default_ln_carbon_dioxide_u, WA_ORIGIN_DEFAULT, 0};
    experiment->slope = prior_from(
        &c->electrode_slope, c->electrode_slope.known ? c->electrode_slope.quantity.value : 1.0,
        c->electrode_slope.quantity.has_u ? fmax(c->electrode_slope.quantity.u, 1e-5) : 0.012);
    experiment->offset = prior_from(
        &c->electrode_offset, c->electrode_offset.known ? c->electrode_offset.quantity.value : 0.0,
        c->electrode_offset.quantity.has_u ? fmax(c->electrode_offset.quantity.u, 1e-5) : 0.06);
    set_pivot(&c->electrode_correlation, experiment);
    experiment->davies =
        (struct wa_prior){WA_DAVIES_COEFFICIENT, WA_DAVIES_COEFFICIENT_U, WA_ORIGIN_DEFAULT, 0};
    experiment->ln_noise_reading = noise_prior(&c->reading_uncertainty, 1.0 / mV_per_pH,
                                               default_reading_noise, default_ln_reading_noise_u);
    /* A burette is chosen to suit the volume: a microburette is read finer than a large one. */
    const double volume_noise = fmin(fmax(1e-3 * last_volume_mL, 3e-4), 0.012);
    experiment->ln_noise_volume =
        noise_prior(&c->volume_uncertainty, 1.0, volume_noise, default_ln_volume_noise_u);
    experiment->background = c->background.known ? fmax(c->background.quantity.value, 0.0) : 0.0;
}

static void set_titrant(const struct wa_table *table, const struct wa_titrant *titrant,
                        bool is_base, struct wa_experiment *experiment)
{
    experiment->titrant_is_base = is_base;
    experiment->titrant_assumed = titrant == NULL;
    experiment->equivalents = titrant != NULL && titrant->protons > 0 ? titrant->protons : 1;
    experiment->titrant_charge = is_base ? experiment->equivalents : -experiment->equivalents;
    experiment->titrant_is_weak = titrant != NULL && table != NULL && titrant->acid >= 0;
    if (experiment->titrant_is_weak) {
        const struct wa_acid *acid = &table->acids[titrant->acid];
        experiment->weak_charge = acid->charge;
        experiment->weak_step_count = acid->step_count;
        for (int i = 0; i < acid->step_count; i++) {
            experiment->weak_pK[i] =
                wa_step_pKa_at(&acid->steps[i], experiment->temperature_C, NULL);
        }
        /* Its own ions carry the charge; the spectators follow from neutrality as added. */
        experiment->titrant_charge = titrant->lost - acid->charge * titrant->count;
        experiment->weak_count = titrant->count;
    }
}

static double reading_of(const struct wa_run *run, const struct wa_point *point, double mV_per_pH,
                         double mV_sign)
{
    return run->reading_kind == WA_READING_MV ? 7.0 - mV_sign * point->reading / mV_per_pH
                                              : point->reading;
}

/* Neighbours are averaged in groups when there are more points than a fit can use: a group spans
 * far less volume than any feature of the curve. */
static void set_points(const struct wa_run *run, double mV_per_pH, double mV_sign,
                       struct wa_experiment *experiment)
{
    const struct wa_noted *blank = &run->conditions.blank;
    const double blank_mL = blank->known ? blank->quantity.value : 0.0;
    for (size_t p = 0; p < experiment->count; p++) {
        const size_t first = p * experiment->grouping;
        const size_t rest = run->point_count - first;
        const size_t size = rest < experiment->grouping ? rest : experiment->grouping;
        double volume = 0.0, reading = 0.0;
        for (size_t i = first; i < first + size; i++) {
            volume += run->points[i].volume_mL;
            reading += reading_of(run, &run->points[i], mV_per_pH, mV_sign);
        }
        experiment->volume_mL[p] = fmax(volume / (double)size - blank_mL, 0.0);
        experiment->reading[p] = reading / (double)size;
        experiment->line[p] = run->points[first].line;
    }
    experiment->ln_noise_reading.mean -= 0.5 * log((double)experiment->grouping);
    experiment->ln_noise_volume.mean -= 0.5 * log((double)experiment->grouping);
}

enum wa_status wa_experiment_collect(const struct wa_run *run, const struct wa_curve *curve,
                                     const struct wa_table *table, const struct wa_titrant *titrant,
                                     struct wa_experiment *experiment, struct wa_error *error)
{
    const size_t grouping = (run->point_count + most_points - 1) / most_points;
    const size_t count = grouping > 0 ? (run->point_count + grouping - 1) / grouping : 0;
    *experiment = (struct wa_experiment){.count = count, .grouping = grouping, .ln_mass = NAN};
    experiment->volume_mL = calloc(count, sizeof *experiment->volume_mL);
    experiment->reading = calloc(count, sizeof *experiment->reading);
    experiment->line = calloc(count, sizeof *experiment->line);
    if (experiment->volume_mL == NULL || experiment->reading == NULL || experiment->line == NULL) {
        wa_experiment_free(experiment);
        return wa_fail_memory(error);
    }
    const bool in_mV = run->reading_kind == WA_READING_MV;
    const double temperature =
        run->conditions.temperature.known ? run->conditions.temperature.quantity.value : 25.0;
    const double mV_per_pH = nernst_mV * (temperature + kelvin_offset) / reference_K;
    const double last = count > 0 ? run->points[run->point_count - 1].volume_mL : 0.0;
    set_priors(run, last, in_mV ? mV_per_pH : 1.0, experiment);
    /* A glass electrode's potential falls as the pH rises; some instruments show it reversed, as
     * the titrant tells. */
    const bool base = titrant != NULL ? titrant->is_base : (curve->direction < 0) == in_mV;
    const double mV_sign = base == (curve->direction < 0) ? 1.0 : -1.0;
    set_titrant(table, titrant, base, experiment);
    set_points(run, mV_per_pH, mV_sign, experiment);
    experiment->uncalibrated =
        in_mV && run->conditions.electrode_offset.origin == WA_ORIGIN_DEFAULT;
    if (experiment->uncalibrated) {
        experiment->offset.u = uncalibrated_offset_u;
    }
    return WA_OK;
}

void wa_experiment_free(struct wa_experiment *experiment)
{
    if (experiment != NULL) {
        free(experiment->volume_mL);
        free(experiment->reading);
        free(experiment->line);
        *experiment = (struct wa_experiment){.count = 0};
    }
}
