#include "curve/curve_internal.h"

#include <math.h>

struct range {
    size_t first, last;
};

/* Points among which the steepest slope is looked for: the steep window and as much again on each
 * side, without entering the flat windows. */
static struct range search_range(const struct wa_curve *curve, const struct curve_jump *jump)
{
    const size_t width = jump->steep.last - jump->steep.first + 1;
    struct range range;
    range.first = jump->steep.first > width ? jump->steep.first - width : 0;
    range.last = jump->steep.last + width;
    range.first = range.first < jump->before.last ? jump->before.last : range.first;
    range.last = range.last > jump->after.first ? jump->after.first : range.last;
    range.last = range.last >= curve->point_count ? curve->point_count - 1 : range.last;
    range.first = range.first > jump->steep.first ? jump->steep.first : range.first;
    range.last = range.last < jump->steep.last ? jump->steep.last : range.last;
    return range;
}

static size_t steepest_point(const struct wa_curve *curve, struct range range)
{
    size_t best = range.first;
    for (size_t i = range.first; i <= range.last; i++) {
        if (curve->direction * curve->first[i] > curve->direction * curve->first[best]) {
            best = i;
        }
    }
    if (best == 0) {
        return 1;
    }
    return best + 1 == curve->point_count ? best - 1 : best;
}

/* What the sampling alone leaves open: the volume may lie anywhere in its gap (rectangular). */
static double gap_u(const struct wa_curve *curve, double volume)
{
    size_t i = curve_index_below(curve, volume);
    i = i + 1 == curve->point_count ? i - 1 : i;
    return (curve->volume_mL[i + 1] - curve->volume_mL[i]) / sqrt(12.0);
}

/* Where the noise leaves several points the steepest, the volume may be that of any of them. */
static double plateau_u(const struct wa_curve *curve, struct range range, size_t top)
{
    const double least = fabs(curve->first[top]) - curve->first_u[top];
    size_t first = top, last = top;
    for (size_t i = range.first; i <= range.last; i++) {
        if (curve->direction * curve->first[i] + curve->first_u[i] >= least) {
            first = i < first ? i : first;
            last = i > last ? i : last;
        }
    }
    return 0.5 * (curve->volume_mL[last] - curve->volume_mL[first]) / sqrt(12.0);
}

static double noise_u(const struct wa_curve *curve, size_t i)
{
    const double third = fabs(curve->second[i + 1] - curve->second[i - 1]) /
                         (curve->volume_mL[i + 1] - curve->volume_mL[i - 1]);
    const double span = curve->volume_mL[i + 1] - curve->volume_mL[i - 1];
    return third > 0.0 ? fmin(curve->second_u[i] / third, span) : span;
}

/* Top of the parabola through the three steepest first derivatives. */
static struct wa_volume_estimate first_derivative_maximum(const struct wa_curve *curve, size_t i)
{
    const double *x = curve->volume_mL, *y = curve->first;
    const double left = (y[i] - y[i - 1]) / (x[i] - x[i - 1]);
    const double right = (y[i + 1] - y[i]) / (x[i + 1] - x[i]);
    double volume = x[i];
    if (curve->direction * (right - left) < 0.0) {
        const double x_left = 0.5 * (x[i] + x[i - 1]), x_right = 0.5 * (x[i] + x[i + 1]);
        volume = x_left + (x_right - x_left) * left / (left - right);
    }
    volume = fmin(fmax(volume, x[i - 1]), x[i + 1]);
    return (struct wa_volume_estimate){volume, hypot(gap_u(curve, volume), noise_u(curve, i))};
}

/* Where the second derivative passes zero, on the straight line between its neighbours. */
static struct wa_volume_estimate second_derivative_zero(const struct wa_curve *curve, size_t i)
{
    const double *x = curve->volume_mL, *y = curve->second;
    for (size_t step = 0; step < 2; step++) {
        const size_t a = (curve->direction * y[i] >= 0.0) == (step == 0) ? i : i - 1;
        const double high = curve->direction * y[a], low = curve->direction * y[a + 1];
        if (high >= 0.0 && low < 0.0) {
            const double volume = x[a] + (x[a + 1] - x[a]) * high / (high - low);
            return (struct wa_volume_estimate){volume,
                                               hypot(gap_u(curve, volume), noise_u(curve, i))};
        }
    }
    return (struct wa_volume_estimate){0.0, 0.0};
}

static struct wa_volume_estimate combine(struct wa_volume_estimate a, struct wa_volume_estimate b)
{
    if (!(b.u_mL > 0.0)) {
        return a;
    }
    const double weight_a = 1.0 / (a.u_mL * a.u_mL), weight_b = 1.0 / (b.u_mL * b.u_mL);
    struct wa_volume_estimate both;
    both.volume_mL = (a.volume_mL * weight_a + b.volume_mL * weight_b) / (weight_a + weight_b);
    /* Both come from the same points: no gain from having two. */
    both.u_mL = hypot(fmin(a.u_mL, b.u_mL), 0.5 * fabs(a.volume_mL - b.volume_mL));
    return both;
}

static void add_buffer(struct wa_curve *curve, size_t first, size_t last)
{
    size_t best = first;
    for (size_t i = first; i <= last; i++) {
        best = fabs(curve->first[i]) < fabs(curve->first[best]) ? i : best;
    }
    curve->buffers[curve->buffer_count++] =
        (struct wa_buffer_region){curve->volume_mL[best], curve->smooth[best], curve->first[best]};
}

static void place_one(struct curve_context *context, const struct curve_jump *jump)
{
    struct wa_curve *curve = context->curve;
    struct wa_inflection *inflection = &curve->inflections[curve->inflection_count++];
    const struct range range = search_range(curve, jump);
    const size_t top = steepest_point(curve, range);
    *inflection = (struct wa_inflection){0};
    inflection->first_derivative = first_derivative_maximum(curve, top);
    inflection->second_derivative = second_derivative_zero(curve, top);
    const struct wa_volume_estimate both =
        combine(inflection->first_derivative, inflection->second_derivative);
    inflection->volume_mL = both.volume_mL;
    inflection->u_mL = hypot(fmax(both.u_mL, gap_u(curve, both.volume_mL)), context->volume_u);
    inflection->u_mL = fmax(inflection->u_mL, plateau_u(curve, range, top));
    inflection->reading = curve_reading_at(context, both.volume_mL, NULL);
    inflection->slope = curve->first[top];
    inflection->slope_u = curve->first_u[top];
    inflection->significance = jump->significance;
    const size_t before = (jump->before.first + jump->before.last) / 2;
    const size_t after = (jump->after.first + jump->after.last) / 2;
    inflection->jump = fabs(curve->smooth[after] - curve->smooth[before]);
}

void curve_place_inflections(struct curve_context *context, const struct curve_jump *jumps,
                             size_t count)
{
    struct wa_curve *curve = context->curve;
    size_t start = 0;
    for (size_t i = 0; i < count; i++) {
        place_one(context, &jumps[i]);
        add_buffer(curve, start, jumps[i].steep.first);
        start = jumps[i].steep.last;
    }
    if (count > 0) {
        add_buffer(curve, start, curve->point_count - 1);
    }
}
