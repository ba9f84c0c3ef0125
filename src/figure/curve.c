/* The curve with its points, the fit, equivalence and half-equivalence points. */
#include "figure/figure_internal.h"

#include <math.h>
#include <stdio.h>

static void write_points(struct wa_text *script, const struct figure_points *points, bool slips)
{
    wa_text_append(script, "$%s << EOD\n", slips ? "slips" : "points");
    for (size_t i = 0; i < points->count; i++) {
        if (figure_is_slip(points, i) == slips && isfinite(points->reading[i])) {
            wa_text_append(script, "%.9g %.9g\n", points->volume_mL[i], points->reading[i]);
        }
    }
    wa_text_append(script, "EOD\n");
}

static size_t count_slips(const struct figure_points *points)
{
    size_t count = 0;
    for (size_t i = 0; i < points->count; i++) {
        count += figure_is_slip(points, i) ? 1 : 0;
    }
    return count;
}

/* The fit as a smooth line; the model at the points when there is no trace. */
static bool write_fit(struct wa_text *script, const struct wa_result *result,
                      const struct figure_points *points)
{
    const struct wa_trace *trace = &result->best_trace;
    if (!points->fitted || (trace->count == 0 && result->best.model == NULL)) {
        return false;
    }
    wa_text_append(script, "$fit << EOD\n");
    for (size_t i = 0; i < trace->count; i++) {
        wa_text_append(script, "%.9g %.9g\n", trace->volume_mL[i], trace->reading[i]);
    }
    for (size_t i = 0; i < points->count && trace->count == 0; i++) {
        wa_text_append(script, "%.9g %.9g\n", points->volume_mL[i], result->best.model[i]);
    }
    wa_text_append(script, "EOD\n");
    return true;
}

/* Half-equivalence points, named by the step they tell. */
static size_t write_halves(struct wa_text *script, const struct wa_result *result,
                           const struct figure_points *points)
{
    const struct wa_curve *curve = figure_curve_of(result);
    size_t count = 0;
    wa_text_append(script, "$halves << EOD\n");
    for (size_t i = 0; curve != NULL && i < curve->half_count; i++) {
        const double pH = curve->halves[i].pH;
        if (isfinite(curve->halves[i].volume_mL) && isfinite(pH) && !points->in_mV) {
            wa_text_append(script, "%.9g %.9g %.9g\n", curve->halves[i].volume_mL, pH,
                           curve->halves[i].u > 0.0 ? curve->halves[i].u : 0.0);
            count++;
        }
    }
    wa_text_append(script, "EOD\n");
    for (size_t i = 0; count > 0 && i < curve->half_count; i++) {
        const struct wa_half_equivalence *half = &curve->halves[i];
        if (isfinite(half->volume_mL) && isfinite(half->pH)) {
            char number[8] = "";
            snprintf(number, sizeof number, "%d", half->step);
            wa_text_append(script,
                           "set label \"%s%s\" at first %.9g, first %.9g offset 0,%s center front "
                           "tc rgb '#00563E'\n",
                           half->merged ? "merged steps" : "pKa ", half->merged ? "" : number,
                           half->volume_mL, half->pH, curve->direction >= 0 ? "-1.4" : "1.4");
        }
    }
    return count;
}

/* Legend entries that carry the figures of the equivalence points, without a mark of their own. */
static void name_equivalence(struct wa_text *script, const struct wa_result *result,
                             const struct figure_points *points)
{
    for (size_t i = 0; i < result->equivalence_count && i < 4; i++) {
        const struct wa_result_equivalence *point = &result->equivalence_points[i];
        if (!isfinite(point->volume_mL)) {
            continue;
        }
        char quantity[64], entry[128];
        wa_quantity_format(quantity, sizeof quantity, point->volume_mL, point->u_mL);
        snprintf(entry, sizeof entry, "E%zu: %s mL%s", i + 1, quantity,
                 isfinite(figure_reading_at(points, point->volume_mL)) ? "" : " (beyond the run)");
        wa_text_append(script,
                       ", $equivalence every ::%zu::%zu using 1:3:2 with xerrorbars ls 7 title ", i,
                       i);
        figure_quote(script, entry);
    }
}

void figure_draw_curve(struct wa_text *script, const struct wa_result *result)
{
    const struct figure_points points = figure_points_of(result);
    const bool fit = write_fit(script, result, &points);
    write_points(script, &points, false);
    write_points(script, &points, true);
    const size_t halves = write_halves(script, result, &points);
    figure_equivalence(script, result, &points);
    figure_axes(script, "titrant volume / mL", figure_reading_label(&points));
    figure_volume_range(script, &points);
    wa_text_append(script, "set errorbars 0\nset offsets 0,0,graph 0.04,graph 0.04\nplot ");
    if (fit) {
        wa_text_append(script, "$fit using 1:2 with lines ls 2 title 'fit', ");
    }
    wa_text_append(script, "$points using 1:2:(%.9g):(%.9g) with xyerrorbars ls 1 title 'measured'",
                   points.u_volume, points.u_reading);
    if (count_slips(&points) > 0) {
        wa_text_append(script, ", $slips using 1:2 with points ls 6 title 'taken for a slip'");
    }
    if (halves > 0) {
        wa_text_append(script, ", $halves using 1:2:3 with yerrorbars ls 5 "
                               "title 'half-equivalence'");
    }
    name_equivalence(script, result, &points);
    wa_text_append(script, "\n");
}
