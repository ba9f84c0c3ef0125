/* Gran's lines (Gran 1952) at each jump, scaled so that a line falls from 1 to 0 at its
 * equivalence volume. */
#include "figure/figure_internal.h"

#include <math.h>
#include <stdlib.h>

/* Shares of the step on a side that may be drawn: the widest over which Gran's function is
 * straight, for near other steps it is not. */
static const double reaches[] = {0.5, 0.35, 0.25, 0.15, 0.1};
static const double most_drawn = 1.3;
static const double straight = 0.15; /* spread of the quartiles of its slope */

/* One side of one jump. */
struct side {
    const struct wa_experiment *experiment;
    double start_mL;             /* volume of the solution at the start */
    double previous, here, next; /* equivalence volumes, mL; next is NaN for the last */
    double edge;                 /* farthest volume that is drawn */
    bool after;
    bool free; /* proton or hydroxide ions stand free: the whole volume counts */
};

/* Gran's function at a point: rises from 0 at the equivalence volume. */
static double value_at(const struct side *side, size_t index)
{
    const double volume = side->experiment->volume_mL[index];
    const double pH = side->experiment->reading[index];
    const double exponent = side->experiment->titrant_is_base ? pH : 14.0 - pH;
    const double whole = side->start_mL + volume;
    if (side->after) {
        const double factor = side->free ? whole : side->next - volume;
        return factor * pow(10.0, exponent - 14.0);
    }
    const double factor = side->free ? whole : volume - side->previous;
    return factor * pow(10.0, -exponent);
}

static bool is_drawn(const struct side *side, size_t index)
{
    const double volume = side->experiment->volume_mL[index];
    return side->after ? volume > side->here && volume <= side->edge
                       : volume < side->here && volume >= side->edge && volume > side->previous;
}

static int by_value(const void *one, const void *other)
{
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Slope of the line through the known intercept: the median over the points, and the spread of the
 * quartiles in parts of it. Returns 0 when there are too few points. */
static double slope_of(const struct side *side, double *spread)
{
    double *ratios = calloc(side->experiment->count, sizeof *ratios);
    size_t count = 0;
    double slope = 0.0;
    *spread = INFINITY;
    for (size_t i = 0; ratios != NULL && i < side->experiment->count; i++) {
        if (is_drawn(side, i)) {
            ratios[count++] = value_at(side, i) / fabs(side->experiment->volume_mL[i] - side->here);
        }
    }
    if (count >= 3) {
        qsort(ratios, count, sizeof *ratios, by_value);
        slope = ratios[count / 2];
        *spread = (ratios[3 * count / 4] - ratios[count / 4]) / slope;
    }
    free(ratios);
    return slope > 0.0 && isfinite(slope) ? slope : 0.0;
}

/* Slope of the straighter of the two forms of Gran's function over the stretch that is set. */
static double choose_form(struct side *side, double *spread)
{
    double slope = 0.0, spread_free;
    *spread = INFINITY;
    side->free = false;
    if (!side->after || isfinite(side->next)) {
        slope = slope_of(side, spread);
    }
    side->free = true;
    const double slope_free = slope_of(side, &spread_free);
    if (slope > 0.0 && *spread <= spread_free) {
        side->free = false;
        return slope;
    }
    *spread = spread_free;
    return slope_free;
}

/* Set the stretch that is drawn, `step` being the whole side. Returns the slope, 0 for none. */
static double choose_stretch(struct side *side, double step)
{
    const size_t count = sizeof reaches / sizeof reaches[0];
    const double first = side->experiment->volume_mL[0];
    const double last = side->experiment->volume_mL[side->experiment->count - 1];
    double best = 0.0, best_spread = INFINITY;
    struct side chosen = *side;
    for (size_t i = 0; i < count && !(best_spread < straight); i++) {
        double spread;
        side->edge = side->after ? fmin(side->here + reaches[i] * step, last)
                                 : fmax(side->here - reaches[i] * step, first);
        const double slope = choose_form(side, &spread);
        if (slope > 0.0 && spread < best_spread) {
            best = slope;
            best_spread = spread;
            chosen = *side;
        }
    }
    *side = chosen;
    return best;
}

/* The points of a side and its line. */
static void write_side(struct wa_text *points, struct wa_text *lines, struct side *side,
                       double step)
{
    const double slope = choose_stretch(side, step);
    if (!(slope > 0.0)) {
        return;
    }
    const double scale = 1.0 / (slope * fabs(side->edge - side->here));
    for (size_t i = 0; i < side->experiment->count; i++) {
        const double value = scale * value_at(side, i);
        if (is_drawn(side, i) && value < most_drawn) {
            wa_text_append(points, "%.9g %.9g\n", side->experiment->volume_mL[i], value);
        }
    }
    wa_text_append(lines, "%.9g 1\n%.9g 0\n\n", side->edge, side->here);
}

bool figure_gran_is_known(const struct wa_inflection *inflection)
{
    return inflection->gran_before.u_mL > 0.0 || inflection->gran_after.u_mL > 0.0;
}

/* The texts of the data blocks under construction. */
struct blocks {
    struct wa_text before, after, before_lines, after_lines, intercepts;
};

static void write_jump(struct blocks *blocks, const struct wa_result *result, size_t index)
{
    const struct wa_curve *curve = figure_curve_of(result);
    const struct wa_experiment *experiment = figure_experiment_of(result);
    const struct wa_inflection *jump = &curve->inflections[index];
    const bool last = index + 1 >= curve->inflection_count;
    struct side side = {
        .experiment = experiment, .start_mL = 1e3 * exp(experiment->ln_volume.mean), .next = NAN};
    const struct wa_volume_estimate *const known[] = {&jump->gran_before, &jump->gran_after};
    side.previous = index > 0 ? curve->inflections[index - 1].equivalence.volume_mL
                              : fmin(0.0, experiment->volume_mL[0]);
    side.next = last ? NAN : curve->inflections[index + 1].equivalence.volume_mL;
    for (int k = 0; k < 2; k++) {
        if (!(known[k]->u_mL > 0.0)) {
            continue;
        }
        side.after = k == 1;
        side.here = known[k]->volume_mL;
        const double step = side.after && !last ? side.next - side.here : side.here - side.previous;
        write_side(side.after ? &blocks->after : &blocks->before,
                   side.after ? &blocks->after_lines : &blocks->before_lines, &side, step);
        wa_text_append(&blocks->intercepts, "%.9g 0 %.9g\n", known[k]->volume_mL, known[k]->u_mL);
    }
}

static void write_block(struct wa_text *script, const char *name, struct wa_text *rows)
{
    script->failed = script->failed || rows->failed;
    wa_text_append(script, "$%s << EOD\n%sEOD\n", name, rows->bytes != NULL ? rows->bytes : "");
    wa_text_free(rows);
}

void figure_draw_gran(struct wa_text *script, const struct wa_result *result)
{
    const struct wa_curve *curve = figure_curve_of(result);
    const struct figure_points points = figure_points_of(result);
    struct blocks blocks = {.before = {0}};
    for (size_t i = 0; i < curve->inflection_count; i++) {
        write_jump(&blocks, result, i);
    }
    const bool before = blocks.before.length > 0, after = blocks.after.length > 0;
    write_block(script, "before", &blocks.before);
    write_block(script, "after", &blocks.after);
    write_block(script, "before_lines", &blocks.before_lines);
    write_block(script, "after_lines", &blocks.after_lines);
    write_block(script, "intercepts", &blocks.intercepts);
    figure_equivalence(script, result, &points);
    figure_axes(script, "titrant volume / mL", "Gran's function, scaled");
    figure_volume_range(script, &points);
    wa_text_append(script, "set yrange [-0.08:1.35]\nset key maxrows 1\nplot ");
    if (before) {
        wa_text_append(script, "$before_lines using 1:2 with lines ls 2 notitle, "
                               "$before using 1:2 with points ls 1 title 'before the jump', ");
    }
    if (after) {
        wa_text_append(script,
                       "$after_lines using 1:2 with lines ls 3 notitle, "
                       "$after using 1:2 with points ls 1 pt 8 ps 0.9 title 'after the jump', ");
    }
    wa_text_append(script, "$intercepts using 1:2:3 with xerrorbars ls 7 "
                           "title 'intercept ± u'\n");
}
