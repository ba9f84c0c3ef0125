/* Residuals of the fit in standard uncertainties. */
#include "figure/figure_internal.h"

#include <math.h>

/* Beyond this a residual is drawn at the edge with its figure, so that one slip does not press all
 * others flat. */
static const double most_drawn = 6.0;

void figure_draw_residuals(struct wa_text *script, const struct wa_result *result)
{
    const struct figure_points points = figure_points_of(result);
    double most = 3.2;
    for (size_t i = 0; i < points.count; i++) {
        const double size = fabs(result->best.residual[i]);
        most = isfinite(size) ? fmax(most, fmin(size + 1.2, most_drawn + 0.8)) : most;
    }
    wa_text_append(script, "$residuals << EOD\n");
    for (size_t i = 0; i < points.count; i++) {
        const double residual = result->best.residual[i];
        if (isfinite(residual) && fabs(residual) <= most_drawn) {
            wa_text_append(script, "%.9g %.9g\n", points.volume_mL[i], residual);
        }
    }
    size_t beyond = 0;
    wa_text_append(script, "EOD\n$beyond << EOD\n");
    for (size_t i = 0; i < points.count; i++) {
        const double residual = result->best.residual[i];
        if (isfinite(residual) && fabs(residual) > most_drawn) {
            wa_text_append(script, "%.9g %.9g\n", points.volume_mL[i],
                           copysign(most_drawn, residual));
            beyond++;
        }
    }
    wa_text_append(script, "EOD\n");
    for (size_t i = 0; i < points.count && beyond <= 8; i++) {
        const double residual = result->best.residual[i];
        if (isfinite(residual) && fabs(residual) > most_drawn) {
            wa_text_append(
                script, "set label \"%+.0f\" at first %.9g, first %.9g offset 0.8,0 left front\n",
                residual, points.volume_mL[i], copysign(most_drawn, residual));
        }
    }
    figure_equivalence(script, result, &points);
    figure_axes(script, "titrant volume / mL", "(measured − fit) / u");
    figure_volume_range(script, &points);
    wa_text_append(script,
                   "set yrange [%.9g:%.9g]\nset ytics 2\n"
                   "plot 0 with lines lc rgb '#000000' lw 1 notitle, "
                   "2 with lines ls 4 dt (8,5) title 'two standard uncertainties', "
                   "-2 with lines ls 4 dt (8,5) notitle, "
                   "$residuals using 1:2:(1) with yerrorbars ls 1 title 'residual ± u'",
                   -most, most);
    if (beyond > 0) {
        wa_text_append(script, ", $beyond using 1:2 with points ls 6 title 'beyond the scale'");
    }
    wa_text_append(script, "\n");
}
