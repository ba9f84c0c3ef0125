/* Fractions of the species of the acid system over the pH that the run covers. */
#include "figure/figure_internal.h"

#include <math.h>

static const double least_shown = 0.01; /* a species that never reaches this is left out */

static const char *const colours[] = {"#0072B2", "#D55E00", "#007D5A", "#A0307A",
                                      "#000000", "#9A6A00", "#3A87B8"};
static const char *const dashes[] = {"1",     "(14,5)",         "(4,4)", "(14,4,3,4)",
                                     "(2,3)", "(18,4,3,4,3,4)", "(8,3)"};

static double fraction_of(const struct wa_trace *trace, size_t row, int lost)
{
    return trace->fraction[row * (size_t)(trace->step_count + 1) + (size_t)lost];
}

static size_t largest(const struct wa_trace *trace, int lost)
{
    size_t best = 0;
    for (size_t i = 1; i < trace->count; i++) {
        if (fraction_of(trace, i, lost) > fraction_of(trace, best, lost)) {
            best = i;
        }
    }
    return best;
}

static void write_fractions(struct wa_text *script, const struct wa_trace *trace)
{
    wa_text_append(script, "$fractions << EOD\n");
    for (size_t i = 0; i < trace->count; i++) {
        wa_text_append(script, "%.9g", trace->pH[i]);
        for (int lost = 0; lost <= trace->step_count; lost++) {
            wa_text_append(script, " %.6g", fraction_of(trace, i, lost));
        }
        wa_text_append(script, "\n");
    }
    wa_text_append(script, "EOD\n");
}

void figure_draw_species(struct wa_text *script, const struct wa_result *result)
{
    const char *name;
    const struct wa_trace *trace = figure_species_of(result, &name);
    write_fractions(script, trace);
    struct wa_text curves = {0};
    size_t shown = 0;
    for (int lost = 0; lost <= trace->step_count; lost++) {
        const size_t peak = largest(trace, lost);
        const double most = fraction_of(trace, peak, lost);
        if (!(most >= least_shown)) {
            continue;
        }
        char label[48];
        figure_species_label(label, sizeof label, trace->step_count, trace->charge, lost);
        wa_text_append(&curves, "%s$fractions using 1:%d with lines lw 2 lc rgb '%s' dt %s title ",
                       shown > 0 ? ", " : "", lost + 2, colours[shown % 7], dashes[shown % 7]);
        figure_quote(&curves, label);
        const bool at_start = peak<trace->count / 20, at_end = peak + 2> trace->count;
        /* At an edge half-way up, other curves cross just there: the legend has to do. */
        if ((!at_start && !at_end) || most > 0.75) {
            wa_text_append(script, "set label ");
            figure_quote(script, label);
            wa_text_append(script, " at first %.9g, first %.9g offset %s,0.8 %s front\n",
                           trace->pH[peak], most,
                           at_start ? "0.3"
                           : at_end ? "-0.3"
                                    : "0",
                           at_start ? "left"
                           : at_end ? "right"
                                    : "center");
        }
        shown++;
    }
    figure_axes(script, "pH", "fraction of the acid system");
    wa_text_append(script,
                   "set yrange [0:1.12]\nset ytics 0.2\nset offsets 0.1,0.1,0,0\n"
                   "set key above left maxrows 1 samplen 4\nplot %s\n",
                   curves.bytes != NULL ? curves.bytes : "0 notitle");
    script->failed = script->failed || curves.failed;
    wa_text_free(&curves);
}
