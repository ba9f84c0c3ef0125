/* The first derivative of the reading by the volume, with its uncertainty as a band. */
#include "figure/figure_internal.h"

#include <math.h>

static void write_inflections(struct wa_text *script, const struct wa_curve *curve)
{
    wa_text_append(script, "$steepest << EOD\n");
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const struct wa_inflection *inflection = &curve->inflections[i];
        wa_text_append(script, "%.9g %.9g %.9g %.9g\n", inflection->volume_mL, inflection->slope,
                       inflection->u_mL > 0.0 ? inflection->u_mL : 0.0,
                       inflection->slope_u > 0.0 ? inflection->slope_u : 0.0);
    }
    wa_text_append(script, "EOD\n");
}

/* The range of what is drawn, zero in it, with room for names at the top. */
static void find_range(const struct wa_curve *curve, double *low, double *high)
{
    *low = 0.0;
    *high = 0.0;
    for (size_t i = 0; i < curve->point_count; i++) {
        if (isfinite(curve->first[i])) {
            *low = fmin(*low, curve->first[i]);
            *high = fmax(*high, curve->first[i]);
        }
    }
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const struct wa_inflection *steepest = &curve->inflections[i];
        *low = fmin(*low, steepest->slope - fmin(steepest->slope_u, fabs(steepest->slope)));
        *high = fmax(*high, steepest->slope + fmin(steepest->slope_u, fabs(steepest->slope)));
    }
    const double span = *high > *low ? *high - *low : 1.0;
    *low -= 0.06 * span;
    *high += 0.2 * span;
}

void figure_draw_derivative(struct wa_text *script, const struct wa_result *result)
{
    const struct wa_curve *curve = figure_curve_of(result);
    const struct figure_points points = {.count = curve->point_count,
                                         .volume_mL = curve->volume_mL,
                                         .reading = curve->reading,
                                         .in_mV = curve->in_mV};
    double low, high;
    find_range(curve, &low, &high);
    wa_text_append(script, "$first << EOD\n");
    for (size_t i = 0; i < curve->point_count; i++) {
        if (isfinite(curve->first[i])) {
            const double u = isfinite(curve->first_u[i]) ? curve->first_u[i] : 0.0;
            wa_text_append(script, "%.9g %.9g %.9g\n", curve->volume_mL[i], curve->first[i], u);
        }
    }
    wa_text_append(script, "EOD\n");
    write_inflections(script, curve);
    figure_equivalence(script, result, &points);
    figure_axes(script, "titrant volume / mL",
                curve->in_mV ? "(dE/dV) / (mV/mL)" : "(dpH/dV) / mL⁻¹");
    figure_volume_range(script, &points);
    wa_text_append(script,
                   "set yrange [%.9g:%.9g]\n"
                   "set style fill solid 1.0 noborder\n"
                   "plot $first using 1:($2-$3):($2+$3) with filledcurves lc rgb '#C8C8C8' "
                   "title 'standard uncertainty', "
                   "$first using 1:2 with linespoints ls 1 title 'first derivative'",
                   low, high);
    if (curve->inflection_count > 0) {
        wa_text_append(script,
                       ", $steepest using 1:2:3:4 with xyerrorbars ls 3 lw 1.5 dt 1 pt 10 ps 1.4 "
                       "title 'steepest slope'");
    }
    wa_text_append(script, "\n");
}
