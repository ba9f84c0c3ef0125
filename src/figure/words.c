/* The figures in words: a title, what the marks mean, and what a reader who cannot see the figure
 * needs to know of it. */
#include "figure/figure_internal.h"

#include "base/clean.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

static const char *const titles[WA_FIGURE_KINDS] = {
    "Titration curve",
    "First derivative",
    "Gran's lines",
    "Residuals of the fit",
    "First and second candidate where they differ most",
    "Species fractions",
};

static const char *const captions[WA_FIGURE_KINDS] = {
    "Circles: measured, with the scatter that the fit found (bars, often smaller than the circle). "
    "Full line: fit. Dotted lines E1, E2 ...: equivalence points, diamonds with their standard "
    "uncertainty. Squares: half-equivalence points.",
    "Change of the reading per volume, smoothed; grey: standard uncertainty. Triangles: steepest "
    "slopes with their uncertainties. Dotted lines: equivalence points.",
    "Gran's functions, scaled from 1 to 0; each line meets zero at its equivalence volume "
    "(diamond, with standard uncertainty). Circles and full line: before the jump. Triangles and "
    "dashed line: after it. The points are drawn without the correction for carbonate that the "
    "intercepts have.",
    "Measured less fitted, in standard uncertainties; about two in three bars should touch zero.",
    "Above: the readings around the volume where the two candidates' own best fits differ most. "
    "Below: residuals of both over the whole run in standard uncertainties, cut at 8; the stretch "
    "shown above is shaded.",
    "Parts of the acid system in each state of protonation over the pH of this run.",
};

static void append_range(struct wa_text *text, const struct figure_points *points)
{
    if (points->count > 0) {
        const size_t last = points->count - 1;
        wa_text_append(text, "%zu points from %.4g mL at %s%.2f%s to %.4g mL at %s%.2f%s.",
                       points->count, points->volume_mL[0], points->in_mV ? "" : "pH ",
                       points->reading[0], points->in_mV ? " mV" : "", points->volume_mL[last],
                       points->in_mV ? "" : "pH ", points->reading[last],
                       points->in_mV ? " mV" : "");
    }
}

static void append_equivalence(struct wa_text *text, const struct wa_result *result)
{
    if (result->equivalence_count == 0) {
        wa_text_append(text, " No equivalence point was found.");
    }
    for (size_t i = 0; i < result->equivalence_count; i++) {
        const struct wa_result_equivalence *point = &result->equivalence_points[i];
        char volume[64];
        wa_quantity_format(volume, sizeof volume, point->volume_mL, point->u_mL);
        wa_text_append(text, " Equivalence point %zu at %s mL", i + 1, volume);
        if (isfinite(point->pH)) {
            wa_text_append(text, ", pH %.2f", point->pH);
        }
        wa_text_append(text, ".");
    }
}

static void append_slopes(struct wa_text *text, const struct wa_result *result)
{
    const struct wa_curve *curve = figure_curve_of(result);
    wa_text_append(text, "%zu %s.", curve->inflection_count,
                   curve->inflection_count == 1 ? "peak" : "peaks");
    for (size_t i = 0; i < curve->inflection_count; i++) {
        wa_text_append(text, " Steepest at %.4g mL with %.3g %s.", curve->inflections[i].volume_mL,
                       curve->inflections[i].slope, curve->in_mV ? "mV per mL" : "per mL");
    }
}

static void append_gran(struct wa_text *text, const struct wa_result *result)
{
    const struct wa_curve *curve = figure_curve_of(result);
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const struct wa_volume_estimate *const sides[] = {&curve->inflections[i].gran_before,
                                                          &curve->inflections[i].gran_after};
        for (int k = 0; k < 2; k++) {
            if (sides[k]->u_mL > 0.0) {
                char volume[64];
                wa_quantity_format(volume, sizeof volume, sides[k]->volume_mL, sides[k]->u_mL);
                wa_text_append(text, "%sJump %zu, line %s: %s mL.", text->length > 0 ? " " : "",
                               i + 1, k == 0 ? "before" : "after", volume);
            }
        }
    }
}

static void append_residuals(struct wa_text *text, const struct wa_result *result)
{
    const struct figure_points points = figure_points_of(result);
    double most = 0.0;
    size_t beyond = 0, where = 0;
    for (size_t i = 0; i < points.count; i++) {
        const double size = fabs(result->best.residual[i]);
        beyond += size > 2.0 ? 1 : 0;
        if (size > most) {
            most = size;
            where = i;
        }
    }
    wa_text_append(text,
                   "%zu points, root mean square %.2f u. %zu beyond two standard uncertainties; "
                   "the largest is %.1f u at %.4g mL.",
                   points.count, result->best.misfit, beyond, most,
                   points.count > 0 ? points.volume_mL[where] : 0.0);
}

static void append_runner_up(struct wa_text *text, const struct wa_result *result)
{
    const size_t widest = figure_widest_difference(result);
    const double first = result->candidate_traces[0].residual[widest];
    const double second = result->candidate_traces[1].residual[widest];
    wa_text_append(text,
                   "%s and %s differ most at %.4g mL, where they miss the reading by %+.1f u and "
                   "%+.1f u.",
                   figure_candidate_name(figure_traced(result, 0)),
                   figure_candidate_name(figure_traced(result, 1)),
                   result->experiments[0].volume_mL[widest], first, second);
    if (fabs(first - second) < 1.0) {
        wa_text_append(text, " They differ by less than u everywhere: the shape of this curve "
                             "cannot tell them apart.");
    }
}

static void append_species(struct wa_text *text, const struct wa_result *result)
{
    const char *name;
    const struct wa_trace *trace = figure_species_of(result, &name);
    wa_text_append(text, "%s%s%d dissociation %s, pH %.2f to %.2f.", name,
                   name[0] != '\0' ? ": " : "", trace->step_count,
                   trace->step_count == 1 ? "step" : "steps", trace->pH[0],
                   trace->pH[trace->count - 1]);
}

static void append_alternative(struct wa_text *text, const struct wa_result *result,
                               enum wa_figure_kind kind)
{
    const struct figure_points points = figure_points_of(result);
    switch (kind) {
    case WA_FIGURE_CURVE:
        append_range(text, &points);
        append_equivalence(text, result);
        break;
    case WA_FIGURE_DERIVATIVE:
        append_slopes(text, result);
        break;
    case WA_FIGURE_GRAN:
        append_gran(text, result);
        break;
    case WA_FIGURE_RESIDUALS:
        append_residuals(text, result);
        break;
    case WA_FIGURE_RUNNER_UP:
        append_runner_up(text, result);
        break;
    case WA_FIGURE_SPECIES:
        append_species(text, result);
        break;
    }
}

static void append_caption(struct wa_text *text, const struct wa_result *result,
                           enum wa_figure_kind kind)
{
    wa_text_append(text, "%s", captions[kind]);
    const char *name = "";
    if (kind == WA_FIGURE_SPECIES) {
        (void)figure_species_of(result, &name);
        wa_text_append(text, " A stands for the residue of %s.",
                       name[0] != '\0' ? name
                                       : "the fitted acid, which is no substance of the table");
    }
    if (kind == WA_FIGURE_RUNNER_UP) {
        wa_text_append(text, " ");
        append_runner_up(text, result);
    }
    if (result->runs.count > 1) {
        wa_text_append(text, " Run 1 of %zu.", result->runs.count);
    }
}

enum wa_status wa_figure_describe(const struct wa_result *result, enum wa_figure_kind kind,
                                  struct wa_figure_words *words, struct wa_error *error)
{
    if (!wa_figure_is_possible(result, kind)) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The result does not hold what the figure '%s' shows.",
                       wa_figure_word(kind));
    }
    struct wa_text raw = {0}, caption = {0}, alternative = {0};
    append_alternative(&raw, result, kind);
    if (!raw.failed) {
        wa_text_clean(&alternative, raw.bytes != NULL ? raw.bytes : "", true);
    }
    bool failed = raw.failed;
    wa_text_free(&raw);
    append_caption(&raw, result, kind);
    if (!raw.failed) {
        wa_text_clean(&caption, raw.bytes, true);
    }
    failed = failed || raw.failed || caption.failed || alternative.failed;
    wa_text_free(&raw);
    if (failed) {
        wa_text_free(&caption);
        wa_text_free(&alternative);
        return wa_fail_memory(error);
    }
    *words = (struct wa_figure_words){
        .title = titles[kind], .caption = caption.bytes, .alternative = alternative.bytes};
    return WA_OK;
}

void wa_figure_words_free(struct wa_figure_words *words)
{
    if (words != NULL) {
        free(words->caption);
        free(words->alternative);
        *words = (struct wa_figure_words){.title = NULL};
    }
}
