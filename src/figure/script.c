/* The parts of a script that all figures share. Colours are those of M. Okabe and K. Ito (Color
 * universal design, 2008), which stay apart for colour-blind readers; shape and dash say the same
 * again for print in black and white. */
#include "figure/figure_internal.h"

#include "base/clean.h"

#include <ctype.h>
#include <math.h>

/* Line styles by number: 1 points, 2 the model, 3 the runner-up, 4 thin guides, 5 half-equivalence,
 * 6 slips, 7 equivalence, 8 uncertainty bands. */
static const char styles[] = "set style line 1 lc rgb '#000000' lw 1 pt 6 ps 0.7\n"
                             "set style line 2 lc rgb '#0072B2' lw 2 dt 1 pt 7 ps 0.7\n"
                             "set style line 3 lc rgb '#D55E00' lw 2 dt (12,6) pt 8 ps 0.9\n"
                             "set style line 4 lc rgb '#555555' lw 1 dt (2,4)\n"
                             "set style line 5 lc rgb '#007D5A' lw 1.5 pt 4 ps 1.0\n"
                             "set style line 6 lc rgb '#D55E00' lw 2 pt 2 ps 1.4\n"
                             "set style line 7 lc rgb '#A0307A' lw 1.5 pt 13 ps 1.1\n"
                             "set style line 8 lc rgb '#C8C8C8' lw 1\n";

void figure_begin(struct wa_text *script, enum wa_figure_format format, int height)
{
    const double inch = 1.0 / 96.0;
    switch (format) {
    case WA_FIGURE_SVG:
        wa_text_append(script,
                       "set terminal svg size %d,%d font 'DejaVu Sans,12.5' noenhanced "
                       "background '#ffffff' name 'figure'\n",
                       FIGURE_WIDTH, height);
        break;
    case WA_FIGURE_PDF:
        wa_text_append(script,
                       "set terminal pdfcairo size %.3fin,%.3fin font 'DejaVu Sans,9.4' "
                       "fontscale 1 noenhanced linewidth 1 background '#ffffff'\n",
                       FIGURE_WIDTH * inch, height * inch);
        break;
    case WA_FIGURE_PNG:
        wa_text_append(script,
                       "set terminal pngcairo size %d,%d font 'DejaVu Sans,9.4' fontscale 2 "
                       "linewidth 2 pointscale 2 noenhanced background '#ffffff'\n",
                       2 * FIGURE_WIDTH, 2 * height);
        break;
    }
    wa_text_append(script,
                   "set encoding utf8\n%s"
                   "set border 3 lw 1 lc rgb '#000000'\n"
                   "set tics nomirror out scale 0.6 textcolor rgb '#000000'\n"
                   "set grid back lw 0.6 lc rgb '#E2E2E2' dt 1\n"
                   "set key above left Left reverse samplen 2.5 spacing 1.15 maxrows 3\n"
                   "set errorbars 0.6\n"
                   "set samples 2\n",
                   styles);
}

void figure_quote(struct wa_text *script, const char *text)
{
    struct wa_text clean = {0};
    wa_text_clean(&clean, text != NULL ? text : "", true);
    if (clean.failed) {
        script->failed = true;
        wa_text_free(&clean);
        return;
    }
    wa_text_append_bytes(script, "\"", 1);
    for (const unsigned char *at = (const unsigned char *)clean.bytes; *at != '\0'; at++) {
        if (*at < 0x80 && isalpha(*at)) {
            wa_text_append_bytes(script, (const char *)at, 1);
        } else {
            wa_text_append(script, "\\%03o", *at);
        }
    }
    wa_text_append_bytes(script, "\"", 1);
    wa_text_free(&clean);
}

void figure_axes(struct wa_text *script, const char *x, const char *y)
{
    wa_text_append(script, "set xlabel ");
    figure_quote(script, x);
    wa_text_append(script, "\nset ylabel ");
    figure_quote(script, y);
    wa_text_append(script, "\n");
}

void figure_volume_range(struct wa_text *script, const struct figure_points *points)
{
    const double first = points->volume_mL[0];
    const double last = points->volume_mL[points->count - 1];
    const double margin = last > first ? 0.02 * (last - first) : 1.0;
    wa_text_append(script, "set xrange [%.9g:%.9g]\n", first - margin, last + margin);
}

void figure_equivalence(struct wa_text *script, const struct wa_result *result,
                        const struct figure_points *points)
{
    struct wa_text rows = {0};
    for (size_t i = 0; i < result->equivalence_count; i++) {
        const struct wa_result_equivalence *point = &result->equivalence_points[i];
        const double between = figure_reading_at(points, point->volume_mL);
        const double reading = isfinite(point->pH) && !points->in_mV ? point->pH : between;
        if (isfinite(point->volume_mL) && isfinite(reading)) {
            wa_text_append(&rows, "%.9g %.9g %.9g\n", point->volume_mL,
                           point->u_mL > 0.0 ? point->u_mL : 0.0, reading);
        } else {
            wa_text_append(&rows, "NaN NaN NaN\n"); /* a row all the same: they go by number */
        }
        if (isfinite(point->volume_mL)) {
            wa_text_append(script,
                           "set arrow from first %.9g, graph 0 to first %.9g, graph 1 nohead ls 4\n"
                           "set label \"E%zu\" at first %.9g, graph 1 offset 0.4,-0.6 left front\n",
                           point->volume_mL, point->volume_mL, i + 1, point->volume_mL);
        }
    }
    script->failed = script->failed || rows.failed;
    wa_text_append(script, "$equivalence << EOD\n%sEOD\n", rows.bytes != NULL ? rows.bytes : "");
    wa_text_free(&rows);
}
