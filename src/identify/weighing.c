/* What was asked for besides the candidates: other observations, a comparison, an explanation. */
#include "identify/identify_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double ln10 = 2.302585092994046;
static const double misses_from = 2.0; /* combined u */

/* Verbal equivalents of a likelihood ratio: ENFSI Guideline for Evaluative Reporting in Forensic
 * Science (2015), from lg of the ratio on. */
static const struct {
    double from;
    const char *words;
} scale[] = {
    {6.0, "extremely strong support"},  {4.0, "very strong support"}, {3.0, "strong support"},
    {2.0, "moderately strong support"}, {1.0, "moderate support"},    {0.30103, "weak support"},
};

static const char *support_of(double log10_ratio)
{
    for (size_t i = 0; i < sizeof scale / sizeof scale[0]; i++) {
        if (log10_ratio >= scale[i].from) {
            return scale[i].words;
        }
    }
    return "no support";
}

enum wa_status wa_fill_observed(const struct wa_identification *work, struct wa_result *result,
                                struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t k = 0; status == WA_OK && k < work->options->observed_count; k++) {
        const struct wa_observation *observed = &work->options->observed[k];
        const char *name = wa_observation_name(observed->kind);
        const bool melting = observed->kind == WA_OBSERVED_MELTING_POINT;
        const double factor = melting ? 1.0 : 100.0;
        char figure[64];
        wa_quantity_format(figure, sizeof figure, factor * observed->quantity.value,
                           factor * observed->quantity.u);
        char *sentence = observed->kind < WA_OBSERVED_SODIUM
                             ? wa_sentence("%s: %s %s. %s", name, figure, melting ? "\u00b0C" : "%",
                                           wa_observation_assumption(observed->kind))
                             : wa_sentence("%s: %s. %s", name, observed->positive ? "yes" : "no",
                                           wa_observation_assumption(observed->kind));
        status = wa_add_sentence(&result->observed, &result->observed_count, name, sentence, error);
    }
    return status;
}

/* The sentence of a comparison, from the side that the evidence supports. */
static char *comparison_sentence(const struct wa_comparison *found, const char *first,
                                 const char *second, const char **support)
{
    const bool turned = found->log10_ratio < 0.0;
    const double ratio = fabs(found->log10_ratio);
    const double low = turned ? -found->log10_high : found->log10_low;
    const double high = turned ? -found->log10_low : found->log10_high;
    *support = support_of(low);
    return wa_sentence(
        "The data are 10^%.1f times (from 10^%.1f to 10^%.1f as the assumptions vary) more "
        "probable if the sample is %s than if it is %s: %s for the first proposition over the "
        "second by the scale of the ENFSI Guideline for Evaluative Reporting in Forensic Science "
        "(2015), at the end of the range that is nearer to none. It says nothing of how probable "
        "either is in itself.",
        ratio, low, high, turned ? second : first, turned ? first : second, *support);
}

static char *named(const char *keys)
{
    return strcmp(keys, WA_WEIGHT_REST) == 0 ? wa_sentence("anything else")
           : strchr(keys, ',') != NULL       ? wa_sentence("one of %s", keys)
                                             : wa_sentence("%s", keys);
}

enum wa_status wa_fill_comparison(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error)
{
    const char *const *asked = work->options->compare;
    if (asked[0] == NULL || asked[1] == NULL || !work->matched) {
        return WA_OK;
    }
    struct wa_comparison found;
    const enum wa_status status =
        wa_match_compare(&result->experiments[0], &work->study, &work->mass, work->table,
                         &work->match, asked[0], asked[1], &found, error);
    if (status != WA_OK) {
        return status;
    }
    struct wa_result_comparison *comparison = &result->comparison;
    struct wa_text sensitivity = {.bytes = NULL};
    comparison->given = true;
    comparison->log10_ratio = found.log10_ratio;
    comparison->log10_low = found.log10_low;
    comparison->log10_high = found.log10_high;
    for (int i = 0; i < 3; i++) {
        wa_text_append(&sensitivity, "%s%s 10^%.1f to 10^%.1f", i > 0 ? "; " : "",
                       found.ranges[i].assumption, found.ranges[i].low, found.ranges[i].high);
    }
    comparison->sensitivity = sensitivity.failed ? NULL : sensitivity.bytes;
    comparison->first = named(asked[0]);
    comparison->second = named(asked[1]);
    if (comparison->first != NULL && comparison->second != NULL) {
        comparison->sentence = comparison_sentence(&found, comparison->first, comparison->second,
                                                   &comparison->support);
    }
    return comparison->sentence != NULL && comparison->sensitivity != NULL ? WA_OK
                                                                           : wa_fail_memory(error);
}

static enum wa_status say(struct wa_result *result, const char *code, char *sentence,
                          struct wa_error *error)
{
    return wa_add_sentence(&result->explanation, &result->explanation_count, code, sentence, error);
}

/* Each constant that the run shows, and the curve's own value for it. */
static enum wa_status explain_constants(const struct wa_candidate *candidate,
                                        struct wa_result *result, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (int i = 0; status == WA_OK && i < candidate->fit->parameter_count; i++) {
        const struct wa_parameter *parameter = &candidate->fit->parameters[i];
        if (parameter->kind != WA_PARAMETER_PK) {
            continue;
        }
        const double table_u = candidate->sample->parts[parameter->part].pK_u[parameter->step];
        double alone, alone_u;
        const double off = wa_constant_deviation(parameter, table_u, &alone, &alone_u);
        if (isfinite(off)) {
            status = say(result, "constant",
                         wa_sentence("The curve asks for a constant of %.2f \u00b1 %.2f where the "
                                     "table has %.2f \u00b1 %.2f: %s by %+.1f u.",
                                     alone, alone_u, parameter->prior.mean, table_u,
                                     fabs(off) < misses_from ? "it fits" : "it misses", off),
                         error);
        }
    }
    return status;
}

static enum wa_status explain_mass(const struct wa_identification *work,
                                   const struct wa_candidate *candidate, struct wa_result *result,
                                   struct wa_error *error)
{
    if (!work->mass.known) {
        return say(result, "mass",
                   wa_sentence("No mass was noted, so that its molar mass says nothing."), error);
    }
    const double molar_mass = work->table->forms[candidate->form].molar_mass;
    const double measured = work->mass.mass_g / exp(candidate->ln_amount);
    const double u = measured * hypot(candidate->ln_amount_u, work->mass.u_g / work->mass.mass_g);
    return say(result, "mass",
               wa_sentence("The molar mass measured with its model is %.2f \u00b1 %.2f g/mol, its "
                           "own is %.2f g/mol: a purity of %.1f %% would be needed.",
                           measured, u, molar_mass, 100.0 * molar_mass / measured),
               error);
}

static enum wa_status explain_candidate(const struct wa_identification *work, size_t index,
                                        struct wa_result *result, struct wa_error *error)
{
    const struct wa_candidate *candidate = &work->match.candidates[index];
    const struct wa_candidate *first = &work->match.candidates[0];
    const struct wa_form *form = &work->table->forms[candidate->form];
    enum wa_status status;
    if (index == 0) {
        status = say(result, "rank",
                     wa_sentence("%s is the first of the candidates (%.3g %%).", form->name,
                                 100.0 * candidate->probability),
                     error);
    } else {
        status = say(
            result, "rank",
            wa_sentence("%s is number %zu of the %zu fitted: all in all it is 10^%.1f times "
                        "less probable than %s (by the curve 10^%+.1f, by the mass 10^%+.1f, by "
                        "other observations 10^%+.1f).",
                        form->name, index + 1, work->match.candidate_count,
                        (first->log_weight - candidate->log_weight) / ln10,
                        work->table->forms[first->form].name,
                        (candidate->log_curve - first->log_curve) / ln10,
                        (candidate->log_mass - first->log_mass) / ln10,
                        (candidate->log_observed - first->log_observed) / ln10),
            error);
    }
    if (status == WA_OK) {
        status = explain_constants(candidate, result, error);
    }
    if (status == WA_OK) {
        status = explain_mass(work, candidate, result, error);
    }
    if (status == WA_OK && candidate->fit->misfit > 1.3) {
        status = say(result, "misfit",
                     wa_sentence("The points scatter about its best curve %.1f times their noise.",
                                 candidate->fit->misfit),
                     error);
    }
    return status;
}

static bool is_meant(const struct wa_identification *work, int form, const char *key)
{
    const int acid = wa_table_find_acid(work->table, key);
    if (wa_table_find_form(work->table, key) == form) {
        return true;
    }
    const struct wa_form *row = &work->table->forms[form];
    for (int k = 0; acid >= 0 && k < row->part_count; k++) {
        if (row->parts[k].acid != WA_PART_WATER) {
            return row->parts[k].acid == acid;
        }
    }
    return false;
}

enum wa_status wa_fill_explanation(const struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error)
{
    const char *key = work->options->explain;
    if (key == NULL || !work->matched) {
        return WA_OK;
    }
    result->explained = wa_text_copy(key, strlen(key));
    if (result->explained == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < work->match.candidate_count; i++) {
        const struct wa_candidate *candidate = &work->match.candidates[i];
        for (size_t f = 0; f < candidate->form_count; f++) {
            if (is_meant(work, candidate->forms[f], key)) {
                return explain_candidate(work, i, result, error);
            }
        }
    }
    const int form = wa_table_find_form(work->table, key);
    const bool unmodelled = form >= 0 && !work->table->forms[form].modelled;
    return say(result, "not-compared",
               unmodelled
                   ? wa_sentence("The table says that %s cannot be modelled (it hydrolyses or "
                                 "precipitates), so that it was not compared.",
                                 key)
               : work->options->among_count > 0
                   ? wa_sentence("%s is not in the closed set that was compared.", key)
                   : wa_sentence("No positive amount of %s explains the charge balance at these "
                                 "readings: the titrant adds to it what it already holds, or its "
                                 "model could not be fitted.",
                                 key),
               error);
}
