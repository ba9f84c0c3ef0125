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

/* Activity coefficient of the free ions; the lines' slopes are free, so that it hardly matters. */
static const double free_gamma = 0.8;

/* No curve pins a step better than this part of it: burette scale within the run, evaporation,
 * carbon dioxide from the air. */
static const double finest_part = 3e-4;

enum lines { LINES_BEFORE = 1, LINES_AFTER = 2, LINES_BOTH = 3 };

struct geometry {
    double previous, here, next; /* mL; next is NaN for the last jump */
    double exponent;             /* pH (pOH for an acid titrant) at the jump */
    double free_share;           /* how far free hydrogen ions stand for the acid before the jump */
    double hidden;               /* part of the step taken by hidden earlier protons */
    double reach;                /* part of the step on both sides that is used */
    double stretch;              /* electrode slope tried, 1 as a rule */
    double carbonate_shift;      /* error tried in the carbonate's constants */
    double saturation; /* exponent at which an unseen acid would take over, NaN for none */
};

struct gran_rows {
    double *storage;
    double *volume, *exponent, *slope, *weight, *residual, *right, *left, *matrix;
    size_t capacity, count, columns;
    double volume_u; /* mL, error of one volume as the scatter about the lines tells */
    double coefficient[COLUMNS_MAX];
    double covariance[COLUMNS_MAX][2]; /* with Ve and with f */
};

static bool rows_new(struct gran_rows *rows, size_t capacity)
{
    *rows = (struct gran_rows){.capacity = capacity};
    rows->storage = malloc((capacity + 1) * (7 + COLUMNS_MAX) * sizeof(double));
    if (rows->storage == NULL) {
        return false;
    }
    rows->volume = rows->storage;
    rows->exponent = rows->volume + capacity + 1;
    rows->slope = rows->exponent + capacity + 1;
    rows->weight = rows->slope + capacity + 1;
    rows->residual = rows->weight + capacity + 1;
    rows->right = rows->residual + capacity + 1;
    rows->left = rows->right + capacity + 1;
    rows->matrix = rows->left + capacity + 1;
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

/* Acid's anion (or base's cation) at a point as part of the step: what was added, and what gave off
 * its proton by itself. */
static double bound_share(const struct curve_context *context, const struct geometry *at,
                          double volume, double exponent)
{
    const double step = at->here - at->previous;
    double formed = volume - at->previous;
    if (isfinite(context->titrant) && !context->curve->in_mV) {
        formed +=
            pow(10.0, -exponent) / free_gamma * (context->start_volume + volume) / context->titrant;
    }
    const double share = (formed / step - at->hidden) / (1.0 - at->hidden);
    return fmin(fmax(share, 0.0), 1.2);
}

static void regressors(const struct curve_context *context, const struct geometry *at,
                       enum lines lines, double volume, double exponent, double row[COLUMNS_MAX])
{
    const double distance = (exponent - at->exponent) * at->stretch;
    const double free = (context->start_volume + volume) / (context->start_volume + at->here);
    size_t column = 0;
    row[column++] = 1.0;
    row[column++] = context->titrant_is_base
                        ? volume * curve_carbonate_unused(exponent + at->carbonate_shift)
                        : 0.0;
    if (lines & LINES_BEFORE) {
        const double bound = bound_share(context, at, volume, exponent);
        row[column++] =
            -(free * at->free_share + bound * (1.0 - at->free_share)) * pow(10.0, -distance);
    }
    if (lines & LINES_AFTER) {
        double share = isnan(at->next) ? free : (at->next - volume) / (at->next - at->here);
        if (!isnan(at->saturation)) {
            share /= 1.0 + pow(10.0, exponent - at->saturation);
        }
        row[column++] = share * pow(10.0, distance);
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
                 struct gran_rows *rows)
{
    const double reading_u = context->curve->noise / context->per_decade;
    for (size_t i = 0; i < rows->count; i++) {
        double row[COLUMNS_MAX];
        regressors(context, at, lines, rows->volume[i], rows->exponent[i], row);
        const double form = form_error * (rows->volume[i] - at->here);
        const double u = sqrt(rows->volume_u * rows->volume_u +
                              pow(reading_u * rows->slope[i], 2.0) + form * form);
        const double size = fabs(rows->residual[i]);
        rows->weight[i] = (size > 2.5 ? sqrt(2.5 / size) : 1.0) / u;
        for (size_t j = 0; j < rows->columns; j++) {
            rows->matrix[i * rows->columns + j] = row[j] * rows->weight[i];
        }
        rows->right[i] = rows->volume[i] * rows->weight[i];
    }
    const double width = context->carbonate_width > 0.0 ? context->carbonate_width : 1e-5;
    for (size_t j = 0; j < rows->columns; j++) {
        rows->matrix[rows->count * rows->columns + j] = j == 1 ? 1.0 / width : 0.0;
    }
    rows->right[rows->count] = context->carbonate_centre / width;
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
    double tau_values[COLUMNS_MAX];
    fill(context, at, lines, rows);
    gsl_matrix_view design = gsl_matrix_view_array(rows->matrix, rows->count + 1, rows->columns);
    gsl_vector_view right = gsl_vector_view_array(rows->right, rows->count + 1);
    gsl_vector_view left = gsl_vector_view_array(rows->left, rows->count + 1);
    gsl_vector_view solution = gsl_vector_view_array(rows->coefficient, rows->columns);
    gsl_vector_view tau = gsl_vector_view_array(tau_values, rows->columns);
    gsl_linalg_QR_decomp(&design.matrix, &tau.vector);
    if (!covariances(&design.matrix, rows)) {
        return false;
    }
    gsl_linalg_QR_lssolve(&design.matrix, &tau.vector, &right.vector, &solution.vector,
                          &left.vector);
    return isfinite(rows->coefficient[0]);
}

/* One step of expectation and maximisation (Dempster, Laird, Rubin 1977) for the variance of the
 * volumes beside that of the readings. What was noted, or the default, counts as some observations
 * too: a dozen points cannot tell. */
static void update_volume_u(const struct curve_context *context, struct gran_rows *rows)
{
    const double own = rows->volume_u * rows->volume_u;
    const double count = (double)rows->count;
    const double spare = fmax(count - (double)rows->columns + 1.0, 1.0);
    const double prior = context->volume_u_noted ? 20.0 : 2.0;
    double sum = prior * context->volume_u * context->volume_u;
    for (size_t i = 0; i < rows->count; i++) {
        const double variance = 1.0 / (rows->weight[i] * rows->weight[i]);
        const double part = fmin(own / variance, 1.0);
        const double square = fmin(pow(rows->left[i], 2.0), 9.0) * variance * count / spare;
        sum += part * part * square + own * (1.0 - part);
    }
    rows->volume_u = sqrt(sum / (prior + count));
}

/* Slopes dV/dpH and standardized residuals of the last solution, for the weights of the next. */
static void reweight(const struct curve_context *context, const struct geometry *at,
                     enum lines lines, struct gran_rows *rows)
{
    for (size_t i = 0; i < rows->count; i++) {
        double row[COLUMNS_MAX], slope = 0.0;
        regressors(context, at, lines, rows->volume[i], rows->exponent[i], row);
        for (size_t j = 2; j < rows->columns; j++) {
            slope += log(10.0) * fabs(row[j] * rows->coefficient[j]);
        }
        rows->slope[i] = fmax(slope, 1e-9);
        /* A lowered weight is undone, so that the residual is the plain one. */
        const double size = fabs(rows->left[i]);
        rows->residual[i] = size > 2.5 ? size * size / 2.5 : size;
    }
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
    /* Few points to spare: widened, as Student's t would. */
    const double scale = sqrt((trust + square) / (trust + freedom)) * (1.0 + 1.2 / (freedom + 1.0));
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
    rows->volume_u = context->volume_u;
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
        update_volume_u(context, rows);
        reweight(context, &at, lines, rows);
    }
    for (size_t j = 2; j < rows->columns; j++) {
        if (!(rows->coefficient[j] > 0.0)) {
            return nothing;
        }
    }
    return estimate_of(context, rows);
}

/* Part of the acid just before the jump that is free hydrogen ion (hydroxide for a base): from the
 * amounts when titrant and solution are known, else from the shape of the buffer, which is half as
 * steep between 30 and 70 per cent when all of it is free. */
static double free_share(const struct curve_context *context, const struct geometry *at)
{
    const double step = at->here - at->previous;
    const double low = at->previous + 0.3 * step, high = at->previous + 0.7 * step;
    const double exponent = rising_exponent(context, curve_reading_at(context, high, NULL));
    if (isfinite(context->titrant) && !context->curve->in_mV) {
        const double per_activity =
            (context->start_volume + high) / (context->titrant * free_gamma);
        const double left = 0.3 * step * pow(10.0, exponent);
        const double bound = bound_share(context, at, high, exponent);
        const double constant = fmax(left - per_activity, 0.0) / fmax(bound, 0.1);
        const double at_end = (context->start_volume + at->here) / (context->titrant * free_gamma);
        return at_end / (at_end + constant);
    }
    const double rise = exponent - rising_exponent(context, curve_reading_at(context, low, NULL));
    return fmin(fmax((0.736 - rise) / (0.736 - 0.42), 0.0), 1.0);
}

/* A lone step rises by 0.95 from a quarter to three quarters; a steeper one holds earlier protons
 * that are not seen as a jump. */
static double hidden_part(const struct curve_context *context, const struct geometry *at)
{
    const double step = at->here - at->previous;
    const double rise =
        rising_exponent(context, curve_reading_at(context, at->previous + 0.75 * step, NULL)) -
        rising_exponent(context, curve_reading_at(context, at->previous + 0.25 * step, NULL));
    return 0.55 * fmin(fmax((rise - 1.05) / 0.3, 0.0), 1.0);
}

/* What the result owes to assumptions on the form of the lines: each is varied by about one
 * standard uncertainty, at the weights that are there, and the shifts are added as squares. */
static double form_u(const struct curve_context *context, const struct geometry *at,
                     enum lines lines, double volume, struct gran_rows *rows)
{
    struct geometry trials[] = {*at, *at, *at, *at, *at};
    const bool counted = isfinite(context->titrant) && !context->curve->in_mV;
    const double share_u = counted ? 0.05 : 0.15;
    const bool lone = at->hidden <= 0.0;
    trials[0].stretch = 1.0 + context->slope_u;
    trials[1].carbonate_shift = 0.1;
    trials[2].hidden = lone ? 0.03 : at->hidden - 0.1;
    trials[3].free_share += at->free_share > 0.5 ? -share_u : share_u;
    trials[4].saturation = 13.0;
    double square = 0.0;
    for (size_t i = 0; i < sizeof trials / sizeof trials[0]; i++) {
        if (solve(context, &trials[i], lines, rows)) {
            square += pow(estimate_of(context, rows).volume_mL - volume, 2.0);
        }
    }
    return sqrt(square);
}

/* The lines are drawn through a narrow stretch first and through wider ones as long as the result
 * stays the same within its uncertainty: the linear range is chosen by the data. Of these the one
 * with the least uncertainty, that of the form included, is kept. */
static struct wa_volume_estimate best_lines(const struct curve_context *context, struct geometry at,
                                            enum lines lines, struct gran_rows *rows)
{
    static const double reaches[] = {0.12, 0.2, 0.3, 0.45, 0.6};
    struct wa_volume_estimate best = {0.0, 0.0}, last = {0.0, 0.0};
    for (size_t i = 0; i < sizeof reaches / sizeof reaches[0]; i++) {
        at.reach = reaches[i];
        const struct wa_volume_estimate next = draw_lines(context, at, lines, rows);
        if (!(next.u_mL > 0.0)) {
            continue;
        }
        const double change = fabs(next.volume_mL - last.volume_mL);
        if (last.u_mL > 0.0 && change > 1.5 * last.u_mL + 0.3 * context->volume_u) {
            break;
        }
        const double total = hypot(next.u_mL, form_u(context, &at, lines, next.volume_mL, rows));
        if (!(best.u_mL > 0.0) || total < best.u_mL) {
            best = (struct wa_volume_estimate){next.volume_mL, total};
        }
        last = next;
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

/* How far the two lines lie apart beyond what their uncertainties allow: a sign that the curve is
 * no sharp equilibrium curve (slow reaction, drifting electrode, mixture). */
static double rift(const struct wa_inflection *inflection)
{
    const struct wa_volume_estimate *before = &inflection->gran_before;
    const struct wa_volume_estimate *after = &inflection->gran_after;
    const double apart = fabs(before->volume_mL - after->volume_mL);
    const bool both = before->u_mL > 0.0 && after->u_mL > 0.0;
    return both && apart > 3.0 * hypot(before->u_mL, after->u_mL) ? apart : 0.0;
}

static void settle(const struct curve_context *context, struct wa_inflection *inflection,
                   struct wa_volume_estimate both, double step)
{
    const struct wa_volume_estimate rough = from_inflection(context, inflection);
    const double difference = fabs(both.volume_mL - rough.volume_mL);
    const double apart = rift(inflection);
    const bool usable = both.u_mL > 0.0 && difference < 0.15 * step + 3.0 * rough.u_mL;
    inflection->equivalence = rough;
    inflection->methods_disagree = apart > 0.0;
    if (usable) {
        const double together = hypot(both.u_mL, rough.u_mL);
        inflection->methods_disagree |= difference > 2.5 * together;
        if (!inflection->methods_disagree) {
            inflection->equivalence = both;
            inflection->equivalence.u_mL = hypot(both.u_mL, finest_part * step);
        } else {
            inflection->equivalence.u_mL =
                hypot(fmin(rough.u_mL, both.u_mL), fmax(0.5 * difference, 0.25 * apart));
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
            struct geometry at = {.next = NAN, .saturation = NAN, .stretch = 1.0};
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
            at.hidden = hidden_part(context, &at);
            at.free_share = free_share(context, &at);
            inflection->gran_before = best_lines(context, at, LINES_BEFORE, &rows);
            inflection->gran_after = best_lines(context, at, LINES_AFTER, &rows);
            settle(context, inflection, best_lines(context, at, LINES_BOTH, &rows),
                   at.here - at.previous);
        }
    }
    free(rows.storage);
    return WA_OK;
}
