/* Gran's linear functions (Gran 1952).
 *
 * Before the equivalence volume Ve of a weak acid, (V - Vp) 10^-pH is proportional to Ve - V, with
 * Vp the equivalence volume before this one (0 for the first); for a strong acid (V0 + V) 10^-pH
 * is. After it (V0 + V) 10^pH is proportional to V - Ve, or (Vn - V) 10^pH when a further step
 * with equivalence volume Vn follows. Written as a regression of the volume on these functions,
 *     V = Ve - b X_before + a X_after + f V g(pH),
 * both lines are fitted together, which also serves weak jumps where neither line stands alone;
 * f is the carbonate fraction of an alkaline titrant and g its part not yet used. All coefficients
 * are linear. A base titrated with acid is the same with pOH for pH. */
#include "curve/curve_internal.h"

#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdlib.h>

enum { COLUMNS_MAX = 4, ROUNDS = 8 };

/* Errors of the linear form itself (activity, electrode slope, hidden steps) grow with the distance
 * from the equivalence volume: this part of it. */
static const double form_error = 0.02;

enum lines { LINES_BEFORE = 1, LINES_AFTER = 2, LINES_BOTH = 3 };

struct geometry {
    double previous, here, next; /* mL; next is NaN for the last jump */
    double exponent;             /* pH (pOH for an acid titrant) at the jump */
    double free_share;           /* how far free hydrogen ions stand for the acid before the jump */
    double reach;                /* part of the step on both sides that is used */
};

struct gran_rows {
    double *storage;
    double *volume, *exponent, *slope, *weight, *residual, *matrix;
    size_t capacity, count, columns;
    double coefficient[COLUMNS_MAX];
    double covariance[COLUMNS_MAX][2]; /* with Ve and with f */
};

static bool rows_new(struct gran_rows *rows, size_t capacity)
{
    *rows = (struct gran_rows){.capacity = capacity};
    rows->storage = malloc((capacity + 1) * (6 + COLUMNS_MAX) * sizeof(double));
    if (rows->storage == NULL) {
        return false;
    }
    rows->volume = rows->storage;
    rows->exponent = rows->volume + capacity + 1;
    rows->slope = rows->exponent + capacity + 1;
    rows->weight = rows->slope + capacity + 1;
    rows->residual = rows->weight + capacity + 1;
    rows->matrix = rows->residual + 2 * (capacity + 1);
    return true;
}

/* pH of a point, or pOH when the titrant is an acid: rises with the volume in both cases. */
static double rising_exponent(const struct curve_context *context, double reading)
{
    const double exponent = curve_exponent(context, reading);
    return context->titrant_is_base ? exponent : 14.0 - exponent;
}

double curve_carbonate_unused(double pH)
{
    const double first = pow(10.0, 6.3 - pH), second = pow(10.0, 10.1 - pH);
    const double bound = (second + 2.0 * second * first) / (1.0 + second + second * first);
    return 1.0 - 0.5 * bound;
}

void curve_truncate(double centre, double width, double *mean, double *deviation)
{
    if (!(width > 0.0)) {
        *mean = fmax(centre, 0.0);
        *deviation = 0.0;
        return;
    }
    const double ratio = fmax(centre / width, -6.0);
    const double below = 0.5 * erfc(-ratio / sqrt(2.0));
    const double hazard = exp(-0.5 * ratio * ratio) / sqrt(2.0 * 3.14159265358979) / below;
    *mean = ratio * width + width * hazard;
    *deviation = width * sqrt(fmax(1.0 - hazard * (hazard + ratio), 1e-4));
}

static void regressors(const struct curve_context *context, const struct geometry *at,
                       enum lines lines, double volume, double exponent, double row[COLUMNS_MAX])
{
    const double step = at->here - at->previous;
    const double distance = exponent - at->exponent;
    size_t column = 0;
    row[column++] = 1.0;
    row[column++] = context->titrant_is_base ? volume * curve_carbonate_unused(exponent) : 0.0;
    if (lines & LINES_BEFORE) {
        const double bound = (volume - at->previous) / step;
        const double free = (context->start_volume + volume) / (context->start_volume + at->here);
        row[column++] =
            -(free * at->free_share + bound * (1.0 - at->free_share)) * pow(10.0, -distance);
    }
    if (lines & LINES_AFTER) {
        const double free = (context->start_volume + volume) / (context->start_volume + at->here);
        const double bound = isnan(at->next) ? free : (at->next - volume) / (at->next - at->here);
        row[column++] = bound * pow(10.0, distance);
    }
}

/* The points that the lines are drawn through. */
static void gather(const struct curve_context *context, const struct geometry *at, enum lines lines,
                   struct gran_rows *rows)
{
    const struct wa_curve *curve = context->curve;
    const double back = at->here - at->previous;
    const double forth = isnan(at->next) ? back : at->next - at->here;
    rows->count = 0;
    rows->columns = lines == LINES_BOTH ? 4 : 3;
    for (size_t i = 0; i < curve->point_count; i++) {
        const double volume = curve->volume_mL[i];
        const double exponent = rising_exponent(context, curve->reading[i]);
        const bool near = volume >= at->here - at->reach * back &&
                          volume <= at->here + at->reach * forth && volume > at->previous;
        const bool side =
            lines == LINES_BOTH ||
            (lines == LINES_BEFORE ? exponent < at->exponent - 1.0 : exponent > at->exponent + 1.0);
        if (!near || !side) {
            continue;
        }
        rows->volume[rows->count] = volume;
        rows->exponent[rows->count] = exponent;
        rows->slope[rows->count] =
            context->per_decade / fmax(fabs(curve->first[i]), 1e-3 * context->per_decade);
        rows->residual[rows->count] = 0.0;
        rows->count++;
    }
}

/* Weighted rows of the design, and the prior on the carbonate as one row more. */
static void fill(const struct curve_context *context, const struct geometry *at, enum lines lines,
                 struct gran_rows *rows, double *right)
{
    const double reading_u = context->curve->noise / context->per_decade;
    for (size_t i = 0; i < rows->count; i++) {
        double row[COLUMNS_MAX];
        regressors(context, at, lines, rows->volume[i], rows->exponent[i], row);
        const double form = form_error * (rows->volume[i] - at->here);
        const double u = sqrt(context->volume_u * context->volume_u +
                              pow(reading_u * rows->slope[i], 2.0) + form * form);
        const double size = fabs(rows->residual[i]);
        rows->weight[i] = (size > 2.5 ? sqrt(2.5 / size) : 1.0) / u;
        for (size_t j = 0; j < rows->columns; j++) {
            rows->matrix[i * rows->columns + j] = row[j] * rows->weight[i];
        }
        right[i] = rows->volume[i] * rows->weight[i];
    }
    const double width = context->carbonate_width > 0.0 ? context->carbonate_width : 1e-5;
    for (size_t j = 0; j < rows->columns; j++) {
        rows->matrix[rows->count * rows->columns + j] = j == 1 ? 1.0 / width : 0.0;
    }
    right[rows->count] = context->carbonate_centre / width;
}

/* Covariances of all coefficients with Ve and f, from the triangle R: (R' R)^-1. */
static bool covariances(const gsl_matrix *triangle, struct gran_rows *rows)
{
    double inverse[COLUMNS_MAX][COLUMNS_MAX] = {{0.0}};
    for (size_t row = 0; row < rows->columns; row++) {
        for (size_t j = row; j < rows->columns; j++) {
            double sum = j == row ? 1.0 : 0.0;
            for (size_t k = row; k < j; k++) {
                sum -= inverse[row][k] * gsl_matrix_get(triangle, k, j);
            }
            const double diagonal = gsl_matrix_get(triangle, j, j);
            if (!(fabs(diagonal) > 0.0)) {
                return false;
            }
            inverse[row][j] = sum / diagonal;
        }
    }
    for (size_t row = 0; row < rows->columns; row++) {
        for (size_t with = 0; with < 2; with++) {
            rows->covariance[row][with] = 0.0;
            for (size_t k = 0; k < rows->columns; k++) {
                rows->covariance[row][with] += inverse[row][k] * inverse[with][k];
            }
        }
    }
    return isfinite(rows->covariance[0][0]) && isfinite(rows->covariance[1][1]);
}

static bool solve(const struct curve_context *context, const struct geometry *at, enum lines lines,
                  struct gran_rows *rows)
{
    double *right = rows->residual + rows->capacity + 1;
    double tau_values[COLUMNS_MAX];
    fill(context, at, lines, rows, right);
    gsl_matrix_view design = gsl_matrix_view_array(rows->matrix, rows->count + 1, rows->columns);
    gsl_vector_view right_view = gsl_vector_view_array(right, rows->count + 1);
    gsl_vector_view residual = gsl_vector_view_array(rows->residual, rows->count + 1);
    gsl_vector_view solution = gsl_vector_view_array(rows->coefficient, rows->columns);
    gsl_vector_view tau = gsl_vector_view_array(tau_values, rows->columns);
    gsl_linalg_QR_decomp(&design.matrix, &tau.vector);
    if (!covariances(&design.matrix, rows)) {
        return false;
    }
    gsl_linalg_QR_lssolve(&design.matrix, &tau.vector, &right_view.vector, &solution.vector,
                          &residual.vector);
    const double ten = log(10.0);
    for (size_t i = 0; i < rows->count; i++) {
        /* Back to plain standardized residuals: the weight may have been lowered. */
        double row[COLUMNS_MAX];
        regressors(context, at, lines, rows->volume[i], rows->exponent[i], row);
        double slope = 0.0;
        for (size_t j = 2; j < rows->columns; j++) {
            slope += ten * fabs(row[j] * rows->coefficient[j]);
        }
        rows->slope[i] = fmax(slope, 1e-9);
        const double size = fabs(rows->residual[i]);
        rows->residual[i] = size > 2.5 ? size * size / 2.5 : size;
    }
    return isfinite(rows->coefficient[0]);
}

/* Ve and its uncertainty: scatter, and the carbonate cut off below zero. */
static struct wa_volume_estimate estimate_of(const struct curve_context *context,
                                             const struct gran_rows *rows)
{
    double square = 0.0, weight = 0.0;
    for (size_t i = 0; i < rows->count; i++) {
        const double size = fmin(rows->residual[i], 3.0);
        square += size * size;
        weight += 1.0;
    }
    const double freedom = fmax(weight - (double)rows->columns + 1.0, 0.0);
    const double trust = context->volume_u_noted ? 8.0 : 4.0;
    const double scale = sqrt((trust + square) / (trust + freedom));
    double volume = rows->coefficient[0];
    double variance = rows->covariance[0][0] * fmax(scale * scale, 0.09);
    if (context->titrant_is_base && context->carbonate_width > 0.0) {
        const double f_variance = rows->covariance[1][1];
        const double gain = rows->covariance[0][1] / f_variance;
        double mean, deviation;
        curve_truncate(rows->coefficient[1], sqrt(f_variance), &mean, &deviation);
        volume += gain * (mean - rows->coefficient[1]);
        const double free = rows->covariance[0][0] - gain * gain * f_variance;
        variance = fmax(free, 0.0) * fmax(scale * scale, 0.09) + pow(gain * deviation, 2.0);
    }
    return (struct wa_volume_estimate){volume, sqrt(variance)};
}

static struct wa_volume_estimate draw_lines(const struct curve_context *context, struct geometry at,
                                            enum lines lines, struct gran_rows *rows)
{
    const struct wa_volume_estimate nothing = {0.0, 0.0};
    gather(context, &at, lines, rows);
    size_t before = 0;
    for (size_t i = 0; i < rows->count; i++) {
        before += rows->exponent[i] < at.exponent;
    }
    const size_t after = rows->count - before;
    const bool enough =
        lines == LINES_BOTH ? before >= 2 && after >= 2 && rows->count >= 5 : rows->count >= 3;
    if (!enough) {
        return nothing;
    }
    for (int round = 0; round < ROUNDS; round++) {
        if (!solve(context, &at, lines, rows)) {
            return nothing;
        }
    }
    for (size_t j = 2; j < rows->columns; j++) {
        if (!(rows->coefficient[j] > 0.0)) {
            return nothing;
        }
    }
    return estimate_of(context, rows);
}

/* Part of the acid before the jump that is free hydrogen ion (hydroxide for a base): from the
 * amounts when titrant and solution are known, else from the shape of the buffer, which is half as
 * steep between 30 and 70 per cent when all of it is free. */
static double free_share(const struct curve_context *context, const struct geometry *at)
{
    const double step = at->here - at->previous;
    const double low = at->previous + 0.3 * step, high = at->previous + 0.7 * step;
    const double exponent = rising_exponent(context, curve_reading_at(context, high, NULL));
    if (isfinite(context->titrant) && !context->curve->in_mV) {
        const double free = pow(10.0, -exponent) / 0.8 * (context->start_volume + high);
        return fmin(free / (context->titrant * 0.3 * step), 1.0);
    }
    const double rise = exponent - rising_exponent(context, curve_reading_at(context, low, NULL));
    return fmin(fmax((0.736 - rise) / (0.736 - 0.42), 0.0), 1.0);
}

/* The lines are drawn through a narrow stretch first and through wider ones as long as the result
 * stays the same within its uncertainty: the linear range is chosen by the data. */
static struct wa_volume_estimate widest_lines(const struct curve_context *context,
                                              struct geometry at, enum lines lines,
                                              struct gran_rows *rows)
{
    static const double reaches[] = {0.12, 0.2, 0.3, 0.45, 0.6};
    struct wa_volume_estimate best = {0.0, 0.0};
    double wander = 0.0;
    for (size_t i = 0; i < sizeof reaches / sizeof reaches[0]; i++) {
        at.reach = reaches[i];
        const struct wa_volume_estimate next = draw_lines(context, at, lines, rows);
        if (!(next.u_mL > 0.0)) {
            continue;
        }
        const double change = fabs(next.volume_mL - best.volume_mL);
        if (best.u_mL > 0.0 && change > 1.5 * best.u_mL + 0.3 * context->volume_u) {
            break;
        }
        wander = best.u_mL > 0.0 ? fmax(wander, change) : 0.0;
        best = next;
    }
    if (best.u_mL > 0.0) {
        best.u_mL = hypot(best.u_mL, 0.4 * wander);
    }
    return best;
}

static struct wa_volume_estimate from_inflection(const struct curve_context *context,
                                                 const struct wa_inflection *inflection)
{
    const double unused = context->titrant_is_base
                              ? curve_carbonate_unused(curve_exponent(context, inflection->reading))
                              : 0.0;
    const double width = inflection->jump / fmax(fabs(inflection->slope), 1e-12);
    struct wa_volume_estimate estimate;
    estimate.volume_mL = inflection->volume_mL * (1.0 - context->carbonate * unused);
    estimate.u_mL = hypot(hypot(inflection->u_mL, 0.05 * width),
                          inflection->volume_mL * context->carbonate_u * fmax(unused, 0.3));
    return estimate;
}

/* Random-walk error of a volume that is a sum of increments. */
static double walked_u(const struct curve_context *context, double volume)
{
    const double steps = (double)curve_index_below(context->curve, volume);
    return context->increments ? context->volume_u * sqrt(steps) : 0.0;
}

static void settle(const struct curve_context *context, struct wa_inflection *inflection,
                   struct wa_volume_estimate both, double step)
{
    const struct wa_volume_estimate rough = from_inflection(context, inflection);
    const double difference = fabs(both.volume_mL - rough.volume_mL);
    const bool usable = both.u_mL > 0.0 && difference < 0.15 * step + 3.0 * rough.u_mL;
    inflection->equivalence = rough;
    if (usable) {
        const double together = hypot(both.u_mL, rough.u_mL);
        inflection->methods_disagree = difference > 3.0 * together;
        if (both.u_mL < rough.u_mL || !inflection->methods_disagree) {
            inflection->equivalence = both;
        }
        if (inflection->methods_disagree) {
            inflection->equivalence.u_mL = hypot(inflection->equivalence.u_mL, 0.5 * difference);
        }
    }
    inflection->equivalence.u_mL =
        hypot(inflection->equivalence.u_mL, walked_u(context, inflection->equivalence.volume_mL));
}

static double blank_of(const struct curve_context *context)
{
    return isfinite(context->blank_mL) ? context->blank_mL : 0.0;
}

enum wa_status curve_equivalence_volumes(struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    struct gran_rows rows;
    if (!rows_new(&rows, curve->point_count)) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < curve->inflection_count; i++) {
        curve->inflections[i].equivalence = from_inflection(context, &curve->inflections[i]);
    }
    for (int round = 0; round < 2; round++) {
        for (size_t i = 0; i < curve->inflection_count; i++) {
            struct wa_inflection *inflection = &curve->inflections[i];
            struct geometry at = {.next = NAN};
            at.here = inflection->equivalence.volume_mL;
            at.previous = i > 0 ? curve->inflections[i - 1].equivalence.volume_mL
                                : fmin(blank_of(context), curve->volume_mL[0]);
            if (i + 1 < curve->inflection_count) {
                at.next = curve->inflections[i + 1].equivalence.volume_mL;
            }
            at.exponent = rising_exponent(context, inflection->reading);
            if (!(at.here > at.previous)) {
                continue;
            }
            at.free_share = free_share(context, &at);
            inflection->gran_before = widest_lines(context, at, LINES_BEFORE, &rows);
            inflection->gran_after = widest_lines(context, at, LINES_AFTER, &rows);
            settle(context, inflection, widest_lines(context, at, LINES_BOTH, &rows),
                   at.here - at.previous);
        }
    }
    free(rows.storage);
    return WA_OK;
}
