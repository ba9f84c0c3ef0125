/* The verdict, with the reasons when the data cannot support an answer. */
#include "identify/identify_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double usable_noise = 0.25;  /* pH; beyond it no model describes the readings */
static const double jump_strength = 1e-8; /* K times c, common practice */
static const double dilute = 2e-3;        /* mol/L; more sample would help below it */
static const double share_least = 0.85;   /* of the mass weighed; below it an impurity is much */
static const double share_most = 1.03;    /* above it no impurity explains it */
static const size_t points_wanted = 4;
static const size_t named_at_most = 4; /* forms spelled out in the sentence */

/* The last proton that the run shows: its constant against the titrant, and the concentration at
 * its equivalence point. */
static void say_no_jump(const struct wa_experiment *experiment, const struct wa_generic *best,
                        const struct wa_volume_estimate *end, struct wa_text *reasons)
{
    const bool base = experiment->titrant_is_base;
    const int shown = best->shown > 0 ? best->shown : 1;
    const int step = base ? best->lost + shown - 1 : best->lost - shown;
    const int constant = wa_fit_find(&best->fit, WA_PARAMETER_PK, 0, step);
    const int amount = wa_fit_find(&best->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    if (constant < 0 || amount < 0) {
        wa_text_append(reasons, ": the curve shows no jump");
        return;
    }
    const double pKa = best->fit.parameters[constant].value;
    const double pKw = best->fit.titration.medium.pKw;
    const double total_L = exp(experiment->ln_volume.mean) + 1e-3 * end->volume_mL;
    const double concentration = exp(best->fit.parameters[amount].value) / total_L;
    const double strength = concentration * pow(10.0, base ? -pKa : pKa - pKw);
    wa_text_append(reasons, ": the curve shows no jump");
    if (strength < jump_strength) {
        wa_text_append(reasons,
                       ". K times c is about %.0e (pKa about %.1f, %.1e mol/L at the equivalence "
                       "point), and a jump needs about %.0e: %s",
                       strength, pKa, concentration, jump_strength,
                       concentration < dilute ? "take more sample and a stronger titrant"
                       : base                 ? "the acid is too weak to be titrated in water"
                                              : "the base is too weak to be titrated in water");
    } else {
        wa_text_append(reasons, ", though the constants found would allow one: the points are too "
                                "far apart or scatter too much");
    }
}

/* Stopped early: at least as many protons as the titrant has met are there, which is a number only
 * when its concentration was noted. */
static void say_stopped(const struct wa_identification *work, bool noted,
                        const struct wa_experiment *experiment, struct wa_text *reasons)
{
    const double last_mL = experiment->volume_mL[experiment->count - 1];
    const double met = experiment->equivalents * exp(experiment->ln_titrant.mean) * 1e-3 * last_mL;
    wa_text_append(reasons, ": the titration stops at %.2f mL, before the first equivalence point",
                   last_mL);
    if (noted) {
        wa_text_append(reasons, ". What still follows: the sample holds more than %.3g mmol of %s",
                       1e3 * met, experiment->titrant_is_base ? "acidic protons" : "base");
    }
    if (noted && work->mass.known) {
        wa_text_append(reasons, ", its equivalent mass is below %.0f g/mol",
                       work->mass.mass_g / met);
    }
    wa_text_append(reasons, "; go on until the pH has jumped and settled");
}

static size_t points_about(const struct wa_experiment *experiment, double volume_mL)
{
    size_t count = 0;
    for (size_t p = 0; p < experiment->count; p++) {
        count += fabs(experiment->volume_mL[p] - volume_mL) < 0.1 * volume_mL ? 1 : 0;
    }
    return count;
}

bool wa_runs_against_titrant(const struct wa_curve *curve, const struct wa_experiment *experiment)
{
    const double rise = experiment->reading[experiment->count - 1] - experiment->reading[0];
    return !curve->in_mV && (experiment->titrant_is_base ? rise < -1.0 : rise > 1.0);
}

/* Why the data are unfit, appended as half sentences; nothing when they are fit. */
static void unfit_reasons(const struct wa_identification *work, const struct wa_result *result,
                          struct wa_text *reasons)
{
    if (work->replicates_disagree) {
        wa_text_append(reasons, "the replicates contradict each other");
        return;
    }
    const struct wa_curve *curve = &result->curves[0];
    const struct wa_experiment *experiment = &result->experiments[0];
    if (work->study.count == 0) {
        wa_text_append(reasons, "no acid-base model can be fitted to these points");
        return;
    }
    const struct wa_generic *best = &work->study.generic[0];
    const struct wa_fit *fit = &best->fit;
    /* A run that does not get as far as half of its first proton shows none: that one counts. */
    const struct wa_volume_estimate end =
        wa_equivalence_by_fit(experiment, fit, best->shown > 0 ? best->shown : 1);
    const double u = end.u_mL / end.volume_mL;
    if (fit->noise_reading > usable_noise && wa_runs_against_titrant(curve, experiment)) {
        wa_text_append(reasons,
                       "the pH %s although the titrant is taken for %s; check the note "
                       "'titrant' and the columns",
                       experiment->titrant_is_base ? "falls" : "rises",
                       experiment->titrant_is_base ? "a base" : "an acid");
    } else if (fit->noise_reading > usable_noise) {
        wa_text_append(reasons,
                       "the readings scatter by %.2f pH about the best model, so that this is "
                       "perhaps no acid-base titration or the columns were misread",
                       fit->noise_reading);
    } else if (u > work->amount_limit) {
        wa_text_append(reasons, "the equivalence volume is only known to %.0f %%", 100.0 * u);
        const double last = experiment->volume_mL[experiment->count - 1];
        const size_t about = points_about(experiment, end.volume_mL);
        if (curve->inflection_count == 0 && end.volume_mL > last) {
            say_stopped(work, result->runs.runs[0].conditions.titrant_concentration.known,
                        experiment, reasons);
        } else if (about < points_wanted) {
            wa_text_append(reasons,
                           ": only %zu of the %zu points lie within 10 %% of it (%.2f mL); add "
                           "readings there",
                           about, experiment->count, end.volume_mL);
        } else if (curve->inflection_count == 0) {
            say_no_jump(experiment, best, &end, reasons);
        } else {
            wa_text_append(reasons, ": the readings scatter too much about the jump at %.2f mL",
                           end.volume_mL);
        }
    }
}

static char *unfit_sentence(const struct wa_identification *work, const struct wa_result *result)
{
    struct wa_text reasons = {.bytes = NULL};
    char *sentence = NULL;
    unfit_reasons(work, result, &reasons);
    if (!reasons.failed && reasons.length > 0) {
        sentence = wa_sentence("The data cannot support an answer: %s.", reasons.bytes);
    }
    const bool failed = reasons.failed;
    wa_text_free(&reasons);
    return failed ? NULL : sentence;
}

static bool is_unfit(const struct wa_identification *work, const struct wa_result *result)
{
    struct wa_text reasons = {.bytes = NULL};
    unfit_reasons(work, result, &reasons);
    const bool unfit = reasons.length > 0;
    wa_text_free(&reasons);
    return unfit;
}

/* A probability in a sentence; what is nearly certain is not called certain. */
static void format_share(char *text, size_t size, double share)
{
    if (share > 0.999) {
        snprintf(text, size, "more than 99.9 %%");
    } else {
        snprintf(text, size, share > 0.99 ? "%.1f %%" : "%.0f %%", 100.0 * share);
    }
}

/* How a candidate is called: with the forms that cannot be told from it. */
static void append_name(const struct wa_identification *work, const struct wa_candidate *candidate,
                        struct wa_text *text)
{
    const struct wa_form *form = &work->table->forms[candidate->form];
    if (!work->mass.known && candidate->form_count > 1 && candidate->acid >= 0) {
        wa_text_append(text, "%s (in one of %zu forms)", work->table->acids[candidate->acid].name,
                       candidate->form_count);
        return;
    }
    wa_text_append(text, "%s", form->name);
    if (candidate->form_count > 1) {
        wa_text_append(text, " (or %s", work->table->forms[candidate->forms[1]].name);
        if (candidate->form_count > 2) {
            wa_text_append(text, " and %zu more that weigh the same", candidate->form_count - 2);
        }
        wa_text_append(text, ")");
    }
}

/* Keys of the first `count` candidates. */
static char *keys_of(const struct wa_identification *work, size_t count)
{
    struct wa_text text = {.bytes = NULL};
    for (size_t i = 0; i < count; i++) {
        const struct wa_candidate *candidate = &work->match.candidates[i];
        for (size_t f = 0; f < candidate->form_count; f++) {
            wa_text_append(&text, "%s%s", text.length > 0 ? "; " : "",
                           work->table->forms[candidate->forms[f]].key);
        }
    }
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes != NULL ? text.bytes : wa_text_copy("", 0);
}

/* The share of the mass weighed that the best candidate would be, NaN without a mass. */
static double share_of_mass(const struct wa_identification *work)
{
    const struct wa_candidate *first = &work->match.candidates[0];
    return work->mass.known ? work->table->forms[first->form].molar_mass * exp(first->ln_amount) /
                                  work->mass.mass_g
                            : NAN;
}

/* A curve may be that of one substance and no other, and the mass still contradict it: that is no
 * identification. */
static bool mass_contradicts(const struct wa_identification *work)
{
    const double share = share_of_mass(work);
    return share < share_least || share > share_most;
}

static char *identified_sentence(const struct wa_identification *work)
{
    struct wa_text text = {.bytes = NULL};
    const struct wa_candidate *first = &work->match.candidates[0];
    wa_text_append(&text, "The curve is that of ");
    append_name(work, first, &text);
    wa_text_append(&text, ", with a probability of %.1f %% among the substances considered.",
                   fmin(100.0 * first->probability, 99.9));
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes;
}

static char *contradicted_sentence(const struct wa_identification *work)
{
    struct wa_text text = {.bytes = NULL};
    wa_text_append(&text, "The curve is like that of ");
    append_name(work, &work->match.candidates[0], &text);
    wa_text_append(
        &text,
        ", but the mass contradicts it: the amount titrated would be %.0f %% of the mass "
        "weighed. Check the mass, the aliquot and the titrant.",
        100.0 * share_of_mass(work));
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes;
}

static char *narrowed_sentence(const struct wa_identification *work, size_t count, double share,
                               double threshold)
{
    struct wa_text text = {.bytes = NULL};
    wa_text_append(&text, "%s",
                   count == 1 ? "The data point to " : "The data cannot tell these apart: ");
    for (size_t i = 0; i < count && i < named_at_most; i++) {
        wa_text_append(&text, "%s", i == 0 ? "" : i + 1 == count ? " and " : ", ");
        append_name(work, &work->match.candidates[i], &text);
    }
    if (count > named_at_most) {
        wa_text_append(&text, " and %zu more", count - named_at_most);
    }
    char held[32];
    format_share(held, sizeof held, share);
    wa_text_append(&text, "%s%s", count == 1 ? ", but only with " : "; together they hold ", held);
    if (count > 1 && share < threshold) {
        wa_text_append(&text, ", less than the %.3g %% asked for", 100.0 * threshold);
    }
    if (work->match.not_in_table > 1.0 - threshold) {
        wa_text_append(&text, ", and %.0f %% stays with a substance that is not in the table",
                       100.0 * work->match.not_in_table);
    }
    wa_text_append(&text, ".");
    return text.failed ? NULL : text.bytes;
}

static char *not_in_table_sentence(const struct wa_identification *work, double threshold)
{
    const struct wa_match *match = &work->match;
    char share[32];
    format_share(share, sizeof share, match->not_in_table);
    if (match->not_in_table >= threshold || match->candidate_count == 0) {
        return wa_sentence("No substance in the table explains these data well: with a probability "
                           "of %s it is one that is not in the table.",
                           share);
    }
    return wa_sentence("The substance is probably one that is not in the table (%s); of those in "
                       "it, %s comes first with %.0f %%.",
                       share, work->table->forms[match->candidates[0].form].name,
                       100.0 * match->candidates[0].probability);
}

/* Smallest set of candidates that holds the threshold, or as much as there is beside "not in the
 * table". */
static size_t smallest_set(const struct wa_match *match, double threshold, double *share)
{
    size_t count = 0;
    *share = 0.0;
    while (count < match->candidate_count && *share < threshold * (1.0 - match->not_in_table) &&
           match->candidates[count].probability > 1e-6) {
        *share += match->candidates[count++].probability;
    }
    return count;
}

enum wa_status wa_fill_verdict(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error)
{
    const struct wa_match *match = &work->match;
    struct wa_verdict *verdict = &result->verdict;
    double share;
    const size_t count = smallest_set(match, work->threshold, &share);
    verdict->threshold = work->threshold;
    if (is_unfit(work, result)) {
        verdict->kind = WA_VERDICT_UNFIT;
        verdict->sentence = unfit_sentence(work, result);
        verdict->forms = wa_text_copy("", 0);
    } else if (count == 0 || match->not_in_table > 0.5) {
        verdict->kind = WA_VERDICT_NOT_IN_TABLE;
        verdict->probability = match->not_in_table;
        verdict->sentence = not_in_table_sentence(work, work->threshold);
        verdict->forms = wa_text_copy("", 0);
    } else if (mass_contradicts(work)) {
        verdict->kind = WA_VERDICT_NARROWED;
        verdict->probability = share;
        verdict->form_count = count;
        verdict->forms = keys_of(work, count);
        verdict->sentence = contradicted_sentence(work);
    } else if (match->candidates[0].probability >= work->threshold) {
        verdict->kind = WA_VERDICT_IDENTIFIED;
        verdict->probability = match->candidates[0].probability;
        verdict->form_count = 1;
        verdict->forms = keys_of(work, 1);
        verdict->sentence = identified_sentence(work);
    } else {
        verdict->kind = WA_VERDICT_NARROWED;
        verdict->probability = share;
        verdict->form_count = count;
        verdict->forms = keys_of(work, count);
        verdict->sentence = narrowed_sentence(work, count, share, work->threshold);
    }
    return verdict->sentence != NULL && verdict->forms != NULL ? WA_OK : wa_fail_memory(error);
}
