/* The winner's curve against the runner-up's: the readings where the two differ most, and below
 * the residuals of both over the whole run. */
#include "figure/figure_internal.h"

#include <math.h>

/* Share of the run on each side of the widest difference that the upper panel shows. */
enum { points_around = 3 };
static const double half_window = 0.12;
static const double most_drawn = 8.0;

const struct wa_result_candidate *figure_traced(const struct wa_result *result, int which)
{
    return &result->candidates[result->traced_candidates[which]];
}

size_t figure_widest_difference(const struct wa_result *result)
{
    const struct wa_trace *traces = result->candidate_traces;
    size_t widest = 0;
    double most = -1.0;
    for (size_t i = 0; i < traces[0].point_count && i < traces[1].point_count; i++) {
        const double difference = fabs(traces[0].residual[i] - traces[1].residual[i]);
        if (difference > most) {
            most = difference;
            widest = i;
        }
    }
    return widest;
}

static void write_trace(struct wa_text *script, const char *name, const struct wa_trace *trace,
                        double low, double high)
{
    wa_text_append(script, "$%s << EOD\n", name);
    for (size_t i = 0; i < trace->count; i++) {
        const double before = i > 0 ? trace->volume_mL[i - 1] : trace->volume_mL[i];
        const double after = i + 1 < trace->count ? trace->volume_mL[i + 1] : trace->volume_mL[i];
        if (after >= low && before <= high) {
            wa_text_append(script, "%.9g %.9g\n", trace->volume_mL[i], trace->reading[i]);
        }
    }
    wa_text_append(script, "EOD\n");
}

static void write_residuals(struct wa_text *script, const struct wa_result *result,
                            const struct figure_points *points)
{
    const struct wa_trace *traces = result->candidate_traces;
    wa_text_append(script, "$both << EOD\n");
    for (size_t i = 0; i < points->count && i < traces[0].point_count; i++) {
        double shown[2];
        for (int k = 0; k < 2; k++) {
            const double residual = i < traces[k].point_count ? traces[k].residual[i] : NAN;
            shown[k] = isfinite(residual) ? fmax(fmin(residual, most_drawn), -most_drawn) : 0.0;
        }
        wa_text_append(script, "%.9g %.9g %.9g\n", points->volume_mL[i], shown[0], shown[1]);
    }
    wa_text_append(script, "EOD\n");
}

/* "acetic acid (93.1 %)", cut so that two stand side by side. */
static void write_name(struct wa_text *script, const struct wa_result_candidate *candidate)
{
    struct wa_text name = {0};
    wa_text_append(&name, "%.60s (rank %d)", figure_candidate_name(candidate), candidate->rank);
    script->failed = script->failed || name.failed;
    figure_quote(script, name.bytes != NULL ? name.bytes : "");
    wa_text_free(&name);
}

static void draw_window(struct wa_text *script, const struct wa_result *result,
                        const struct figure_points *points, double low, double high)
{
    wa_text_append(script, "$points << EOD\n");
    for (size_t i = 0; i < points->count; i++) {
        if (points->volume_mL[i] >= low && points->volume_mL[i] <= high) {
            wa_text_append(script, "%.9g %.9g\n", points->volume_mL[i], points->reading[i]);
        }
    }
    wa_text_append(script, "EOD\nset xrange [%.9g:%.9g]\n", low, high);
    wa_text_append(script, "set offsets 0,0,graph 0.05,graph 0.05\n");
    figure_axes(script, "titrant volume / mL", figure_reading_label(points));
    wa_text_append(script, "plot $winner using 1:2 with lines ls 2 title ");
    write_name(script, figure_traced(result, 0));
    wa_text_append(script, ", $second using 1:2 with lines ls 3 title ");
    write_name(script, figure_traced(result, 1));
    wa_text_append(script,
                   ", $points using 1:2:(%.9g):(%.9g) with xyerrorbars ls 1 title 'measured'\n",
                   points->u_volume, points->u_reading);
}

static void draw_residuals(struct wa_text *script, const struct figure_points *points, double low,
                           double high)
{
    figure_axes(script, "titrant volume / mL", "residual / u");
    figure_volume_range(script, points);
    wa_text_append(script,
                   "unset offsets\nset key above left maxrows 1\n"
                   "set yrange [-8.5:8.5]\nset ytics 4\n"
                   "set object rectangle from first %.9g, graph 0 to first %.9g, graph 1 behind "
                   "fc rgb '#EFEFEF' fs solid noborder\n"
                   "plot 0 with lines lc rgb '#000000' lw 1 notitle, "
                   "$both using 1:2 with points ls 2 title 'first', "
                   "$both using 1:3 with points ls 3 lw 1.2 title 'second'\n",
                   low, high);
}

/* The stretch around a point, wide enough to hold a few points on both sides. */
static void choose_window(const struct figure_points *points, size_t centre, double *low,
                          double *high)
{
    const double first = points->volume_mL[0], last = points->volume_mL[points->count - 1];
    const size_t left = centre >= points_around ? centre - points_around : 0;
    const size_t right =
        centre + points_around < points->count ? centre + points_around : points->count - 1;
    const double half = half_window * (last - first);
    const double here = points->volume_mL[centre];
    *low = fmax(fmin(here - half, points->volume_mL[left]), first);
    *high = fmin(fmax(here + half, points->volume_mL[right]), last);
}

void figure_draw_runner_up(struct wa_text *script, const struct wa_result *result)
{
    const struct figure_points points = figure_points_of(result);
    double low, high;
    choose_window(&points, figure_widest_difference(result), &low, &high);
    write_trace(script, "winner", &result->candidate_traces[0], low, high);
    write_trace(script, "second", &result->candidate_traces[1], low, high);
    write_residuals(script, result, &points);
    wa_text_append(script, "set errorbars 0\nset multiplot\nset lmargin 9\nset rmargin 2\n"
                           "set origin 0,0.38\nset size 1,0.62\nset key maxrows 3\n");
    draw_window(script, result, &points, low, high);
    wa_text_append(script, "set origin 0,0\nset size 1,0.38\n");
    draw_residuals(script, &points, low, high);
    wa_text_append(script, "unset multiplot\n");
}
