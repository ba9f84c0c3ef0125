/* Which rises of the slope are more than noise.
 *
 * The least-squares slope over a window is a weighted mean of the true derivative inside it, with
 * weights that are nowhere negative. So when three windows in a row that do not overlap have slopes
 * low, high, low, the true derivative has a maximum among them, whatever the spacing of the points
 * and however wide the windows are: a test built on such triples cannot be deceived by a change of
 * bandwidth, only by noise. Windows of many sizes are tried, so that a sharp jump and a faint wide
 * one are both seen. */
#include "curve/curve_internal.h"

#include <math.h>
#include <stdlib.h>

/* A rise of the slope smaller than this part of it is left to drift and electrode response. */
static const double least_contrast = 0.10;

static const size_t sizes[] = {2, 3, 4, 6, 8, 12, 16, 24, 32, 48, 64, 96, 128, 192, 256};

static struct curve_window window_slope(const struct curve_context *context, size_t first,
                                        size_t last)
{
    const struct wa_curve *curve = context->curve;
    const double *x = curve->volume_mL, *y = curve->reading;
    const double count = (double)(last - first + 1);
    double mean_x = 0.0, mean_y = 0.0, sxx = 0.0, sxy = 0.0, variance = 0.0;
    for (size_t i = first; i <= last; i++) {
        mean_x += x[i] / count;
        mean_y += y[i] / count;
    }
    for (size_t i = first; i <= last; i++) {
        sxx += (x[i] - mean_x) * (x[i] - mean_x);
        sxy += (x[i] - mean_x) * (y[i] - mean_y);
        variance += pow((x[i] - mean_x) * context->point_u[i], 2.0);
    }
    return (struct curve_window){first, last, curve->direction * sxy / sxx, sqrt(variance) / sxx};
}

/* Standard uncertainties between a maximum and its minima. The more windows there are, the more
 * often chance alone makes one stand out, hence the logarithm; uncertain noise widens the limit as
 * Student's t does. */
static double separation(const struct wa_curve *curve)
{
    const double limit = 4.2 + 0.35 * log(fmax((double)curve->point_count / 20.0, 1.0));
    return limit * (1.0 + 2.0 / fmax(curve->noise_degrees_of_freedom, 2.0));
}

static bool clearly_above(const struct curve_window *high, const struct curve_window *low,
                          double limit)
{
    /* Windows with a common point are not independent: their uncertainties add in full. */
    const bool apart = high->first > low->last || low->first > high->last;
    const double u = apart ? hypot(high->u, low->u) : high->u + low->u;
    return high->slope - low->slope > limit * u &&
           high->slope > (1.0 + least_contrast) * low->slope;
}

struct search {
    struct curve_window before; /* flattest window since the last jump */
    struct curve_window steep;  /* steepest window since then */
    size_t earliest;            /* first point that a flat window may hold: end of the last jump */
    bool have_before, rising;
    double limit;
};

/* Feed one window, in order of its end. Returns true when it closes a jump, written to *jump. */
static bool feed(struct search *search, const struct curve_window *window, struct curve_jump *jump)
{
    const double limit = search->limit;
    if (!search->have_before) {
        search->before = *window;
        search->have_before = true;
        return false;
    }
    if (!search->rising) {
        if (window->first >= search->before.last && clearly_above(window, &search->before, limit)) {
            search->steep = *window;
            search->rising = true;
        } else if (window->first >= search->earliest &&
                   window->slope + limit * window->u <
                       search->before.slope + limit * search->before.u) {
            search->before = *window;
        }
        return false;
    }
    if (window->first >= search->steep.last && clearly_above(&search->steep, window, limit)) {
        *jump = (struct curve_jump){search->before, search->steep, *window, 0.0};
        search->earliest = search->steep.last;
        search->before = *window;
        search->rising = false;
        return true;
    }
    if (window->slope - limit * window->u > search->steep.slope - limit * search->steep.u &&
        window->first >= search->before.last) {
        search->steep = *window;
    }
    return false;
}

static double significance_of(const struct curve_jump *jump)
{
    const struct curve_window *sides[2] = {&jump->before, &jump->after};
    double least = HUGE_VAL;
    for (int i = 0; i < 2; i++) {
        const double u = hypot(jump->steep.u, sides[i]->u);
        least = fmin(least, (jump->steep.slope - sides[i]->slope) / u);
    }
    return least;
}

/* After a jump is closed the flattest window beyond it is still being looked for: the next jump's
 * `before` is this one's final `after`. */
static void settle_sides(struct curve_jump *jumps, size_t count, const struct search *search)
{
    for (size_t i = 0; i < count; i++) {
        jumps[i].after = i + 1 < count ? jumps[i + 1].before : search->before;
        jumps[i].significance = significance_of(&jumps[i]);
    }
}

/* The carbonate of an alkaline titrant can split one jump in two, a few per cent of the volume
 * apart, with the hydrogencarbonate buffer (pK 6.3) between. Such twins are one equivalence. */
static bool carbonate_twins(const struct curve_context *context, const struct curve_jump *left,
                            const struct curve_jump *right)
{
    const struct wa_curve *curve = context->curve;
    const double v1 =
        0.5 * (curve->volume_mL[left->steep.first] + curve->volume_mL[left->steep.last]);
    const double v2 =
        0.5 * (curve->volume_mL[right->steep.first] + curve->volume_mL[right->steep.last]);
    const size_t between = (right->before.first + right->before.last) / 2;
    const double exponent = curve_exponent(context, curve->reading[between]);
    return context->titrant_is_base && v2 - v1 < 0.035 * v2 &&
           (curve->in_mV || (exponent > 5.3 && exponent < 7.8));
}

static size_t join_twins(const struct curve_context *context, struct curve_jump *jumps,
                         size_t count)
{
    size_t kept = 0;
    for (size_t i = 0; i < count; i++) {
        if (kept > 0 && carbonate_twins(context, &jumps[kept - 1], &jumps[i])) {
            struct curve_jump *left = &jumps[kept - 1];
            const struct curve_window before = left->before;
            if (jumps[i].steep.slope > left->steep.slope) {
                *left = jumps[i];
            }
            left->before = before;
            left->after = jumps[i].after;
            left->significance = significance_of(left);
            continue;
        }
        jumps[kept++] = jumps[i];
    }
    return kept;
}

/* Rise of the reading beyond what the flatter neighbourhood would give over the same volume. A
 * single misread volume or a slow electrode gives a step of a few tenths between two points; a real
 * jump between two points is larger and a faint real one extends over many. */
static bool substantial(const struct curve_context *context, const struct curve_jump *jump)
{
    const double *volume = context->curve->volume_mL;
    const double points = (double)(jump->steep.last - jump->steep.first + 1);
    const double width = volume[jump->steep.last] - volume[jump->steep.first];
    const double base = fmax(jump->before.slope, jump->after.slope);
    const double least = (0.08 + 0.6 / points) * context->per_decade;
    return (jump->steep.slope - base) * width > least;
}

static size_t drop_slight(const struct curve_context *context, struct curve_jump *jumps,
                          size_t count)
{
    size_t kept = 0;
    for (size_t i = 0; i < count; i++) {
        if (substantial(context, &jumps[i])) {
            jumps[kept++] = jumps[i];
        } else if (kept > 0 && jumps[i].after.slope < jumps[kept - 1].after.slope) {
            jumps[kept - 1].after = jumps[i].after;
        }
    }
    return kept;
}

static size_t keep_strongest(struct curve_jump *jumps, size_t count, size_t capacity)
{
    while (count > capacity) {
        size_t weakest = 0;
        for (size_t i = 1; i < count; i++) {
            weakest = jumps[i].significance < jumps[weakest].significance ? i : weakest;
        }
        for (size_t i = weakest; i + 1 < count; i++) {
            jumps[i] = jumps[i + 1];
        }
        count--;
    }
    return count;
}

enum wa_status curve_find_jumps(const struct curve_context *context, struct curve_jump *jumps,
                                size_t capacity, size_t *count, struct wa_error *error)
{
    const struct wa_curve *curve = context->curve;
    const size_t most = curve->point_count / 2 + 1;
    struct curve_jump *found = malloc(most * sizeof *found);
    if (found == NULL) {
        return wa_fail_memory(error);
    }
    struct search search = {.limit = separation(curve)};
    size_t found_count = 0;
    for (size_t last = 1; last < curve->point_count; last++) {
        for (size_t s = 0; s < sizeof sizes / sizeof sizes[0]; s++) {
            if (sizes[s] > last + 1 || 3 * sizes[s] > curve->point_count + 3) {
                break;
            }
            const struct curve_window window = window_slope(context, last + 1 - sizes[s], last);
            if (found_count < most && feed(&search, &window, &found[found_count])) {
                found_count++;
            }
        }
    }
    settle_sides(found, found_count, &search);
    found_count = join_twins(context, found, found_count);
    found_count = drop_slight(context, found, found_count);
    found_count = keep_strongest(found, found_count, capacity);
    for (size_t i = 0; i < found_count; i++) {
        jumps[i] = found[i];
    }
    *count = found_count;
    free(found);
    return WA_OK;
}
