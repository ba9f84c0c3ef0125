#include "curve/curve_internal.h"

#include <math.h>

size_t curve_index_below(const struct wa_curve *curve, double volume)
{
    size_t low = 0, high = curve->point_count;
    while (high - low > 1) {
        const size_t middle = low + (high - low) / 2;
        if (curve->volume_mL[middle] <= volume) {
            low = middle;
        } else {
            high = middle;
        }
    }
    return low;
}

/* Smoothed values between points: each neighbour's parabola, blended linearly. */
double curve_reading_at(const struct curve_context *context, double volume, double *u)
{
    const struct wa_curve *curve = context->curve;
    const size_t last = curve->point_count - 1;
    size_t i = curve_index_below(curve, volume);
    i = i == last ? last - 1 : i;
    const double gap = curve->volume_mL[i + 1] - curve->volume_mL[i];
    const double left = fmin(fmax((volume - curve->volume_mL[i]) / gap, 0.0), 1.0);
    if (u != NULL) {
        *u = fmax(curve->smooth_u[i], curve->smooth_u[i + 1]);
    }
    return curve->smooth[i] + left * (curve->smooth[i + 1] - curve->smooth[i]);
}

double curve_exponent(const struct curve_context *context, double reading)
{
    if (context->curve->in_mV) {
        return 7.0 - reading / context->per_decade;
    }
    return 7.0 + (reading - 7.0 - context->offset) / context->slope;
}

struct window_fit {
    double value[3];
    double factor[3];
    double variance; /* of one reading, volume error included */
    bool agrees;     /* residuals no larger than the noise allows */
};

/* A parabola over 2 h + 1 points around point i, moved inwards at the ends. */
static bool fit_window(const struct curve_context *context, struct curve_polynomial *polynomial,
                       size_t i, size_t half, struct window_fit *fit)
{
    const struct wa_curve *curve = context->curve;
    const size_t count = curve->point_count;
    const size_t width = 2 * half + 1;
    if (width > count) {
        return false;
    }
    size_t first = i > half ? i - half : 0;
    first = first + width > count ? count - width : first;
    double square;
    if (!curve_polynomial_fit(polynomial, curve->volume_mL, curve->reading, first,
                              first + width - 1, curve->volume_mL[i], 2, fit->value, fit->factor,
                              &square)) {
        return false;
    }
    fit->variance = curve->noise * curve->noise + pow(fit->value[1] * context->volume_u, 2.0);
    const double freedom = (double)width - 3.0;
    fit->agrees =
        freedom < 1.0 || square / fit->variance <= freedom + 2.0 * sqrt(2.0 * freedom) + 1.0;
    return true;
}

/* The widest window whose parabola still describes the points, searched from the one that served
 * the neighbour: the bandwidth follows the sampling and the shape, at a cost that is linear in the
 * number of points (the idea of Lepski 1990: enlarge while the bias stays below the noise). */
static bool widest_fit(const struct curve_context *context, struct curve_polynomial *polynomial,
                       size_t i, size_t *half, struct window_fit *fit)
{
    size_t trial = *half;
    if (!fit_window(context, polynomial, i, trial, fit)) {
        return false;
    }
    while (!fit->agrees && trial > 1) {
        trial -= trial > 8 ? trial / 4 : 1;
        if (!fit_window(context, polynomial, i, trial, fit)) {
            return false;
        }
    }
    struct window_fit wider;
    const size_t larger = trial + (trial > 8 ? trial / 4 : 1);
    if (trial >= *half && larger <= CURVE_HALF_WIDTH_MAX &&
        4 * larger <= context->curve->point_count &&
        fit_window(context, polynomial, i, larger, &wider) && wider.agrees) {
        *fit = wider;
        trial = larger;
    }
    *half = trial;
    return true;
}

/* A volume error acts through the true slope, which two close points can badly misjudge: the
 * steepest smoothed slope of the neighbourhood stands for it. */
static void spread_volume_errors(struct curve_context *context)
{
    const struct wa_curve *curve = context->curve;
    for (size_t i = 0; i < curve->point_count; i++) {
        const size_t first = i > 2 ? i - 2 : 0;
        const size_t last = i + 2 < curve->point_count ? i + 2 : curve->point_count - 1;
        double steepest = 0.0;
        for (size_t j = first; j <= last; j++) {
            steepest = fmax(steepest, fabs(curve->first[j]));
        }
        context->point_u[i] = hypot(curve->noise, steepest * context->volume_u);
    }
}

enum wa_status curve_smooth(struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    struct curve_polynomial *polynomial = curve_polynomial_new(2 * CURVE_HALF_WIDTH_MAX + 1);
    if (polynomial == NULL) {
        return wa_fail_memory(error);
    }
    size_t half = 1;
    for (size_t i = 0; i < curve->point_count; i++) {
        struct window_fit fit;
        if (!widest_fit(context, polynomial, i, &half, &fit)) {
            curve_polynomial_free(polynomial);
            return wa_fail(error, WA_ERROR_NUMERIC, NULL, 0,
                           "The points near %.3f mL lie too close together to be smoothed.",
                           curve->volume_mL[i]);
        }
        curve->smooth[i] = fit.value[0];
        curve->first[i] = fit.value[1];
        curve->second[i] = fit.value[2];
        curve->smooth_u[i] = sqrt(fit.variance * fit.factor[0]);
        curve->first_u[i] = sqrt(fit.variance * fit.factor[1]);
        curve->second_u[i] = sqrt(fit.variance * fit.factor[2]);
    }
    curve_polynomial_free(polynomial);
    spread_volume_errors(context);
    return WA_OK;
}
