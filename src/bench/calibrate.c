/* The line through buffer readings. */
#include "whichacid/bench_calibrate.h"

#include <math.h>
#include <stdio.h>

static const double neutral = 7.0;              /* isopotential point of a usual glass electrode */
static const double gas_constant = 8.314462618; /* J/(mol K), CODATA 2018 */
static const double faraday = 96485.33212;      /* C/mol */
static const double kelvin_offset = 273.15;
static const double least_apart = 1.0; /* pH between the outermost of two buffers */

struct wa_electrode_limits wa_electrode_limits_default(void)
{
    return (struct wa_electrode_limits){.name = "USP <791>",
                                        .slope_low = 0.90,
                                        .slope_high = 1.05,
                                        .offset_mV = 30.0,
                                        .check_pH = 0.05};
}

static double mV_per_pH(double temperature_C)
{
    return 1e3 * log(10.0) * gas_constant * (temperature_C + kelvin_offset) / faraday;
}

/* Weighted sums of a straight line. */
struct sums {
    double weight, x, y, xx, xy;
};

static struct sums sum_up(const struct wa_electrode *electrode, double reading_u, size_t without)
{
    struct sums s = {.weight = 0.0};
    for (size_t i = 0; i < electrode->count; i++) {
        const struct wa_buffer_reading *r = &electrode->readings[i];
        const double weight =
            i == without ? 0.0 : 1.0 / (reading_u * reading_u + r->pH_u * r->pH_u);
        const double x = r->pH - neutral, y = r->shown - neutral;
        s.weight += weight;
        s.x += weight * x;
        s.y += weight * y;
        s.xx += weight * x * x;
        s.xy += weight * x * y;
    }
    return s;
}

static double determinant(const struct sums *s)
{
    return s->weight * s->xx - s->x * s->x;
}

static double slope_by(const struct sums *s)
{
    return (s->weight * s->xy - s->x * s->y) / determinant(s);
}

static double offset_by(const struct sums *s)
{
    return (s->xx * s->y - s->x * s->xy) / determinant(s);
}

static double spread(const struct wa_electrode *electrode, size_t without)
{
    double low = INFINITY, high = -INFINITY;
    for (size_t i = 0; i < electrode->count; i++) {
        if (i != without) {
            low = fmin(low, electrode->readings[i].pH);
            high = fmax(high, electrode->readings[i].pH);
        }
    }
    return high - low;
}

/* One buffer, or several of one pH: the slope stays what electrodes usually have. */
static void offset_alone(struct wa_electrode *e, const struct sums *s)
{
    const double x = s->x / s->weight, y = s->y / s->weight;
    e->slope_assumed = true;
    e->slope = 1.0;
    e->slope_u = WA_DEFAULT_SLOPE_U;
    e->offset = y - x;
    e->offset_u = hypot(1.0 / sqrt(s->weight), x * e->slope_u);
    e->correlation = -x * e->slope_u / e->offset_u;
    e->birge = NAN;
}

static void line_through(struct wa_electrode *e, const struct sums *s, double reading_u)
{
    double square = 0.0;
    e->slope = slope_by(s);
    e->offset = offset_by(s);
    for (size_t i = 0; i < e->count; i++) {
        const struct wa_buffer_reading *r = &e->readings[i];
        const double residual = r->shown - neutral - e->offset - e->slope * (r->pH - neutral);
        square += residual * residual / (reading_u * reading_u + r->pH_u * r->pH_u);
    }
    e->birge = e->count > 2 ? sqrt(square / (double)(e->count - 2)) : (double)NAN;
    const double scale = e->count > 2 ? fmax(e->birge, 1.0) : 1.0;
    e->slope_u = scale * sqrt(s->weight / determinant(s));
    e->offset_u = scale * sqrt(s->xx / determinant(s));
    e->correlation = -s->x / sqrt(s->weight * s->xx);
}

static void compare_each(struct wa_electrode *e, double reading_u)
{
    for (size_t i = 0; i < e->count; i++) {
        struct wa_buffer_reading *r = &e->readings[i];
        r->residual = r->shown - neutral - e->offset - e->slope * (r->pH - neutral);
        r->against_others = NAN;
        if (e->count > 2 && spread(e, i) >= least_apart) {
            const struct sums others = sum_up(e, reading_u, i);
            r->against_others =
                neutral + (r->shown - neutral - offset_by(&others)) / slope_by(&others) - r->pH;
        }
    }
}

enum wa_status wa_electrode_calibrate(struct wa_electrode *e, double reading_u,
                                      struct wa_error *error)
{
    const double u = reading_u > 0.0 ? reading_u : WA_DEFAULT_BUFFER_READING_U;
    if (e->count == 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0, "There is no buffer reading.");
    }
    e->temperature_C = 0.0;
    for (size_t i = 0; i < e->count; i++) {
        struct wa_buffer_reading *r = &e->readings[i];
        e->temperature_C += r->temperature_C / (double)e->count;
        r->shown = e->in_mV ? neutral - r->reading / mV_per_pH(r->temperature_C) : r->reading;
    }
    const struct sums s = sum_up(e, u, e->count);
    e->slope_assumed = spread(e, e->count) < least_apart;
    if (e->slope_assumed) {
        offset_alone(e, &s);
    } else {
        line_through(e, &s, u);
    }
    if (!(e->slope > 0.5 && e->slope < 1.3)) {
        return wa_fail(
            error, WA_ERROR_INPUT, NULL, 0,
            "The buffers give a slope of %.0f %% of theory, which is not possible; check "
            "the readings, their sign and the names of the buffers.",
            100.0 * e->slope);
    }
    const double covariance = e->correlation * e->slope_u * e->offset_u;
    const double shift = -covariance / (e->slope_u * e->slope_u);
    e->offset_mV = -e->offset * mV_per_pH(e->temperature_C);
    e->pivot = neutral + shift;
    e->pivot_offset = e->offset + (e->slope - 1.0) * shift;
    e->pivot_offset_u = e->offset_u * sqrt(fmax(1.0 - e->correlation * e->correlation, 0.0));
    compare_each(e, u);
    return WA_OK;
}

struct wa_electrode_drift wa_electrode_compare(const struct wa_electrode *before,
                                               const struct wa_electrode *after)
{
    struct wa_electrode_drift drift = {
        .slope = after->slope - before->slope,
        .slope_u = hypot(after->slope_u, before->slope_u),
        .offset = after->offset - before->offset,
        .offset_u = hypot(after->offset_u, before->offset_u),
    };
    drift.significant =
        fabs(drift.slope) > 2.0 * drift.slope_u || fabs(drift.offset) > 2.0 * drift.offset_u;
    return drift;
}

bool wa_electrode_accepted(const struct wa_electrode *electrode,
                           const struct wa_electrode_limits *limits, char *why, size_t size)
{
    double worst = 0.0;
    for (size_t i = 0; i < electrode->count; i++) {
        const double apart = fabs(electrode->readings[i].against_others);
        worst = apart > worst ? apart : worst; /* NaN compares as not larger */
    }
    why[0] = '\0';
    if (electrode->slope_assumed) {
        snprintf(why, size, "one buffer leaves the slope unmeasured; read a second one");
    } else if (electrode->slope < limits->slope_low || electrode->slope > limits->slope_high) {
        snprintf(why, size, "the slope, %.1f %%, is outside %.0f %% to %.0f %%",
                 100.0 * electrode->slope, 100.0 * limits->slope_low, 100.0 * limits->slope_high);
    } else if (fabs(electrode->offset_mV) > limits->offset_mV) {
        snprintf(why, size, "the potential at pH 7, %.1f mV, is beyond %.0f mV",
                 electrode->offset_mV, limits->offset_mV);
    } else if (worst > limits->check_pH) {
        snprintf(why, size,
                 "a buffer is off the line through the others by %.2f pH, more than %.2f", worst,
                 limits->check_pH);
    }
    return why[0] == '\0';
}
