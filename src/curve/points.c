#include "curve/curve_internal.h"

#include <math.h>
#include <stdlib.h>

static int compare_doubles(const void *left, const void *right)
{
    const double a = *(const double *)left, b = *(const double *)right;
    return (a > b) - (a < b);
}

/* Which points of a run are used: finite ones; volumes that do not grow are merged by averaging. */
static size_t merge_equal_volumes(const struct wa_run *run, double *volume, double *reading)
{
    size_t count = 0;
    double weight = 0.0;
    for (size_t i = 0; i < run->point_count; i++) {
        const double v = run->points[i].volume_mL, r = run->points[i].reading;
        if (!isfinite(v) || !isfinite(r)) {
            continue;
        }
        if (count > 0 && v <= volume[count - 1] + 1e-6) {
            weight += 1.0;
            reading[count - 1] += (r - reading[count - 1]) / weight;
            continue;
        }
        volume[count] = v;
        reading[count] = r;
        weight = 1.0;
        count++;
    }
    return count;
}

/* Long runs are averaged in groups of neighbours, so that the analysis costs the same for a million
 * points as for a few thousand. */
static size_t average_groups(double *volume, double *reading, size_t count, size_t *group)
{
    *group = (count + CURVE_POINTS_MAX - 1) / CURVE_POINTS_MAX;
    if (*group < 2) {
        *group = 1;
        return count;
    }
    size_t kept = 0;
    for (size_t start = 0; start < count; start += *group) {
        const size_t end = start + *group < count ? start + *group : count;
        double volume_sum = 0.0, reading_sum = 0.0;
        for (size_t i = start; i < end; i++) {
            volume_sum += volume[i];
            reading_sum += reading[i];
        }
        volume[kept] = volume_sum / (double)(end - start);
        reading[kept] = reading_sum / (double)(end - start);
        kept++;
    }
    return kept;
}

static int compare_volumes(const void *left, const void *right)
{
    const double a = ((const struct wa_point *)left)->volume_mL;
    const double b = ((const struct wa_point *)right)->volume_mL;
    return (a > b) - (a < b);
}

/* A copy in order of volume; the reader hands over ordered runs, other callers may not. */
static struct wa_point *ordered_points(const struct wa_run *run)
{
    struct wa_point *points = malloc((run->point_count + 1) * sizeof *points);
    if (points == NULL) {
        return NULL;
    }
    bool ordered = true;
    size_t count = 0;
    for (size_t i = 0; i < run->point_count; i++) {
        points[i] = run->points[i];
        if (!isfinite(points[i].volume_mL)) {
            points[i].volume_mL = HUGE_VAL;
        }
        ordered = ordered && (count == 0 || points[i].volume_mL >= points[i - 1].volume_mL);
        count++;
    }
    if (!ordered) {
        qsort(points, count, sizeof *points, compare_volumes);
    }
    return points;
}

static bool allocate_columns(struct wa_curve *curve, size_t count)
{
    double **columns[] = {&curve->volume_mL, &curve->reading, &curve->smooth, &curve->smooth_u,
                          &curve->first,     &curve->first_u, &curve->second, &curve->second_u};
    for (size_t i = 0; i < sizeof columns / sizeof columns[0]; i++) {
        *columns[i] = calloc(count + 1, sizeof(double));
        if (*columns[i] == NULL) {
            return false;
        }
    }
    return true;
}

/* +1 when the readings of the last quarter lie above those of the first. */
static int direction_of(const struct wa_curve *curve)
{
    const size_t quarter = curve->point_count / 4 + 1;
    double difference = 0.0;
    for (size_t i = 0; i < quarter; i++) {
        difference += curve->reading[curve->point_count - 1 - i] - curve->reading[i];
    }
    return difference >= 0.0 ? 1 : -1;
}

/* mV become pH when a calibration is at hand: E = -k (pH_read - 7), pH_read = 7 + s (pH - 7) + b.
 */
static void convert_readings(const struct wa_run *run, struct curve_context *context)
{
    struct wa_curve *curve = context->curve;
    const double theory = 0.19842 * (context->temperature_C + 273.15);
    curve->in_mV = false;
    context->per_decade = 1.0;
    if (run->reading_kind != WA_READING_MV) {
        return;
    }
    const struct wa_conditions *conditions = &run->conditions;
    const bool calibrated = conditions->electrode_slope.known &&
                            conditions->electrode_slope.origin != WA_ORIGIN_DEFAULT &&
                            conditions->electrode_offset.known &&
                            conditions->electrode_offset.origin != WA_ORIGIN_DEFAULT &&
                            fabs(context->slope) > 0.01;
    if (!calibrated) {
        curve->in_mV = true;
        context->per_decade = theory;
        return;
    }
    for (size_t i = 0; i < curve->point_count; i++) {
        const double read = -curve->reading[i] / theory;
        curve->reading[i] = 7.0 + (read - context->offset) / context->slope;
    }
    context->offset_u /= fabs(context->slope);
    context->slope_u /= fabs(context->slope);
    context->offset = 0.0;
    context->slope = 1.0;
}

/* Nobody stated the volume error: who doses in small steps doses with a finer tool. A twentieth of
 * the usual step, between 3 and 30 microlitres. */
static enum wa_status assume_volume_u(struct curve_context *context, struct wa_error *error)
{
    const struct wa_curve *curve = context->curve;
    if (context->volume_u > 0.0) {
        return WA_OK;
    }
    double *gaps = malloc(curve->point_count * sizeof *gaps);
    if (gaps == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i + 1 < curve->point_count; i++) {
        gaps[i] = curve->volume_mL[i + 1] - curve->volume_mL[i];
    }
    qsort(gaps, curve->point_count - 1, sizeof *gaps, compare_doubles);
    context->volume_u = fmin(fmax(0.05 * gaps[(curve->point_count - 1) / 2], 0.003), 0.03);
    free(gaps);
    return WA_OK;
}

enum wa_status curve_collect(const struct wa_run *run, struct curve_context *context,
                             struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    struct wa_run ordered = *run;
    ordered.points = ordered_points(run);
    context->point_u = calloc(run->point_count + 1, sizeof(double));
    if (ordered.points == NULL || context->point_u == NULL ||
        !allocate_columns(curve, run->point_count)) {
        free(ordered.points);
        return wa_fail_memory(error);
    }
    curve->point_count = merge_equal_volumes(&ordered, curve->volume_mL, curve->reading);
    free(ordered.points);
    if (curve->point_count < 5) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, 0,
                       "The points have %zu different volumes, too few for a curve; "
                       "measure at least a dozen points.",
                       curve->point_count);
    }
    const enum wa_status status = assume_volume_u(context, error);
    if (status != WA_OK) {
        return status;
    }
    size_t group;
    curve->point_count =
        average_groups(curve->volume_mL, curve->reading, curve->point_count, &group);
    context->volume_u /= sqrt((double)group);
    convert_readings(run, context);
    curve->direction = direction_of(curve);
    context->titrant_is_base = curve->in_mV ? curve->direction < 0 : curve->direction > 0;
    if (group > 1) {
        return curve_remark(curve, error,
                            "The run is long: %zu neighbouring points at a time were averaged.",
                            group);
    }
    return WA_OK;
}

/* One contrast of five points spaced `lag` apart, scaled so that a cubic gives zero and independent
 * errors of unit variance give unit variance (a divided difference). */
static double contrast(const double *volume, const double *reading, size_t start, size_t lag)
{
    double sum = 0.0, squares = 0.0;
    for (size_t i = 0; i < 5; i++) {
        double weight = 1.0;
        for (size_t j = 0; j < 5; j++) {
            if (j != i) {
                weight /= volume[start + i * lag] - volume[start + j * lag];
            }
        }
        sum += weight * reading[start + i * lag];
        squares += weight * weight;
    }
    return sum / sqrt(squares);
}

/* Robust scale of the contrasts over the quieter part of the curve: windows are ranked by their
 * mean slope and only the flatter 60 % are used, because a jump is no noise. `scratch` holds two
 * numbers for each window. */
static double robust_scale(const struct wa_curve *curve, size_t lag, double *scratch, size_t *used)
{
    const size_t span = 4 * lag;
    const size_t windows = curve->point_count > span ? curve->point_count - span : 0;
    *used = 0;
    if (windows == 0) {
        return 0.0;
    }
    double *slopes = scratch, *sizes = scratch + windows;
    for (size_t i = 0; i < windows; i++) {
        slopes[i] = fabs(curve->reading[i + span] - curve->reading[i]) /
                    (curve->volume_mL[i + span] - curve->volume_mL[i]);
        sizes[i] = slopes[i];
    }
    qsort(sizes, windows, sizeof *sizes, compare_doubles);
    const double steepest = sizes[(windows - 1) * 6 / 10];
    for (size_t i = 0; i < windows; i++) {
        if (slopes[i] <= steepest) {
            sizes[(*used)++] = fabs(contrast(curve->volume_mL, curve->reading, i, lag));
        }
    }
    qsort(sizes, *used, sizeof *sizes, compare_doubles);
    const double median =
        (*used % 2 == 1) ? sizes[*used / 2] : 0.5 * (sizes[*used / 2 - 1] + sizes[*used / 2]);
    return median / 0.6745;
}

/* Standard deviation that rounding to the last written digit adds. */
static double rounding_u(const struct wa_curve *curve)
{
    double step = 1.0;
    for (int digits = 0; digits < 5; digits++) {
        bool fits = true;
        for (size_t i = 0; i < curve->point_count && fits; i++) {
            const double scaled = curve->reading[i] / step;
            fits = fabs(scaled - round(scaled)) < 1e-6;
        }
        if (fits) {
            return step / sqrt(12.0);
        }
        step /= 10.0;
    }
    return 0.0;
}

/* The noise as the curve shows it is pooled with what the analyst states, which counts as a few
 * observations: a curve of a dozen points says little about its own noise. */
enum wa_status curve_estimate_noise(const struct wa_run *run, struct curve_context *context,
                                    struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    double *scratch = malloc(2 * curve->point_count * sizeof *scratch);
    if (scratch == NULL) {
        return wa_fail_memory(error);
    }
    size_t used;
    double noise = robust_scale(curve, 1, scratch, &used);
    for (size_t lag = 4; 40 * lag <= curve->point_count && lag <= 16; lag *= 2) {
        size_t lag_used;
        const double slow = robust_scale(curve, lag, scratch, &lag_used);
        noise = slow > 1.3 * noise && slow < 4.0 * noise ? slow : noise;
    }
    free(scratch);
    /* A median has 0.37 of the efficiency of a root mean square, and neighbouring contrasts share
     * four points of five. */
    const double seen = 0.37 * (double)used / 2.0;
    const struct wa_noted *noted = &run->conditions.reading_uncertainty;
    const double fallback = curve->in_mV ? 0.6 : 0.01;
    double stated = noted->known && noted->quantity.value > 0.0 ? noted->quantity.value : fallback;
    if (run->reading_kind == WA_READING_MV && !curve->in_mV) {
        stated /= 0.19842 * (context->temperature_C + 273.15);
    }
    const double believed = noted->known && noted->origin != WA_ORIGIN_DEFAULT ? 8.0 : 2.0;
    noise = sqrt((seen * noise * noise + believed * stated * stated) / (seen + believed));
    if (used < 8) {
        noise = fmin(noise, 5.0 * stated);
    }
    const double finest = rounding_u(curve);
    curve->noise = fmax(noise, fmax(finest, 1e-6 * context->per_decade));
    curve->noise_degrees_of_freedom = seen + believed;
    return WA_OK;
}
