/* The candidates that are listed, each with what a chemist can check. */
#include "identify/identify_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double least_listed = 1e-3; /* probability below which only the first few are listed */
static const size_t listed_at_least = 5;
static const double misses_from = 2.0;     /* combined u */
static const double excused_purity = 0.85; /* beyond two scales of "as found" */

static bool has_source(const struct wa_text *list, const char *source)
{
    return list->bytes != NULL && strstr(list->bytes, source) != NULL;
}

static void list_sources(const struct wa_table *table, int acid, struct wa_text *sources)
{
    for (size_t c = 0; c < table->constant_count; c++) {
        const struct wa_constant_row *row = &table->constants[c];
        if (row->acid == acid && !has_source(sources, row->source)) {
            wa_text_append(sources, "%s%s", sources->length > 0 ? "; " : "", row->source);
        }
    }
}

static void list_others(const struct wa_table *table, const struct wa_candidate *candidate,
                        struct wa_text *others)
{
    for (size_t i = 1; i < candidate->form_count; i++) {
        wa_text_append(others, "%s%s", others->length > 0 ? "; " : "",
                       table->forms[candidate->forms[i]].name);
    }
}

/* Measured molar mass less the form's, in combined uncertainties. */
static double mass_deviation(const struct wa_titrated_mass *mass,
                             const struct wa_candidate *candidate, double molar_mass)
{
    if (!mass->known) {
        return NAN;
    }
    const double measured = log(mass->mass_g) - candidate->ln_amount;
    const double u = hypot(hypot(candidate->ln_amount_u, mass->u_g / mass->mass_g), 0.004);
    return (measured - log(molar_mass)) / u;
}

static bool within_window(const struct wa_experiment *experiment, double pKa)
{
    double lowest = INFINITY, highest = -INFINITY;
    for (size_t p = 0; p < experiment->count; p++) {
        lowest = fmin(lowest, experiment->reading[p]);
        highest = fmax(highest, experiment->reading[p]);
    }
    return pKa > lowest - 1.0 && pKa < highest + 0.3;
}

double wa_constant_deviation(const struct wa_parameter *parameter, double table_u, double *alone,
                             double *alone_u)
{
    /* The fit's prior is taken out of its posterior; it may have been wider than the table's. */
    const double prior = 1.0 / (parameter->prior.u * parameter->prior.u);
    const double gained = 1.0 / (parameter->u * parameter->u) - prior;
    if (!(gained > 0.02 * prior)) {
        return NAN;
    }
    const double difference =
        (parameter->value - parameter->prior.mean) * (gained + prior) / gained;
    if (alone != NULL && alone_u != NULL) {
        *alone = parameter->prior.mean + difference;
        *alone_u = 1.0 / sqrt(gained);
    }
    return difference / sqrt(1.0 / gained + table_u * table_u);
}

static void fill_constants(const struct wa_table *table, const struct wa_candidate *candidate,
                           const struct wa_experiment *experiment,
                           struct wa_result_candidate *listed)
{
    const struct wa_acid *acid = &table->acids[candidate->acid];
    int part = 0;
    while (part < candidate->sample->part_count &&
           candidate->sample->parts[part].step_count != acid->step_count) {
        part++;
    }
    listed->step_count = acid->step_count;
    for (int i = 0; i < acid->step_count; i++) {
        const int index = wa_fit_find(candidate->fit, WA_PARAMETER_PK, part, i);
        listed->pKa[i] = acid->steps[i].pKa;
        listed->pKa_u[i] = acid->steps[i].u;
        listed->seen[i] = within_window(experiment, acid->steps[i].pKa);
        listed->pKa_deviation[i] =
            index >= 0 && listed->seen[i]
                ? wa_constant_deviation(&candidate->fit->parameters[index],
                                        candidate->sample->parts[part].pK_u[i], NULL, NULL)
                : NAN;
    }
}

/* Which constants fit and which miss, each by how much. */
static void append_constants(const struct wa_result_candidate *listed,
                             const struct wa_candidate *candidate, struct wa_text *text)
{
    int seen = 0, missing = 0;
    for (int i = 0; i < listed->step_count; i++) {
        const double off = listed->pKa_deviation[i];
        if (!listed->seen[i] || !isfinite(off)) {
            continue;
        }
        if (fabs(off) >= misses_from) {
            wa_text_append(text, "%spKa%d misses by %+.1f u", missing > 0 ? ", " : "", i + 1, off);
            missing++;
        }
        seen++;
    }
    if (seen == 0) {
        wa_text_append(text, "the curve says nothing about its constants");
    } else if (missing == 0) {
        wa_text_append(text, "%s", seen == 1 ? "its constant fits" : "its constants fit");
    } else if (seen > missing) {
        wa_text_append(text, ", the other%s fit%s", seen - missing > 1 ? "s" : "",
                       seen - missing > 1 ? "" : "s");
    }
    if (candidate->row_doubted) {
        wa_text_append(text, " (only with the table's uncertainties widened)");
    }
}

/* What the mass says: a molar mass that is too high is excused by an impurity, up to a point. */
static void append_mass(const struct wa_titrated_mass *mass, const struct wa_candidate *candidate,
                        const struct wa_result_candidate *listed, struct wa_text *text)
{
    if (!mass->known) {
        return;
    }
    const double measured = mass->mass_g / exp(candidate->ln_amount);
    const double purity = listed->molar_mass / measured;
    const double off = listed->molar_mass_deviation;
    if (fabs(off) < misses_from) {
        wa_text_append(text, "; molar mass fits by %+.1f u", off);
    } else if (off > 0.0 && purity > excused_purity) {
        wa_text_append(text, "; molar mass fits a purity of %.1f %%", 100.0 * purity);
    } else if (off > 0.0) {
        wa_text_append(text, "; molar mass misses by %+.1f u: %s %.0f %% would be the substance",
                       off, purity < 0.01 ? "less than" : "only", fmax(100.0 * purity, 1.0));
    } else {
        wa_text_append(text,
                       "; molar mass misses by %+.1f u, and no impurity of other substances "
                       "makes it too low",
                       off);
    }
}

/* One line that a chemist can check. */
static char *reasons(const struct wa_titrated_mass *mass, const struct wa_result_candidate *listed,
                     const struct wa_candidate *candidate)
{
    struct wa_text text = {.bytes = NULL};
    append_constants(listed, candidate, &text);
    append_mass(mass, candidate, listed, &text);
    if (candidate->fit->misfit > 1.3) {
        wa_text_append(&text, "; the curve scatters about it %.1f times its noise",
                       candidate->fit->misfit);
    }
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes;
}

static char *copy_text(const char *text)
{
    return wa_text_copy(text, strlen(text));
}

/* Take the text over; an empty one becomes "". */
static char *take(struct wa_text *text)
{
    if (text->failed) {
        wa_text_free(text);
        return NULL;
    }
    return text->bytes != NULL ? text->bytes : copy_text("");
}

static enum wa_status list_candidate(const struct wa_identification *work,
                                     const struct wa_candidate *candidate, struct wa_result *result,
                                     struct wa_error *error)
{
    const struct wa_table *table = work->table;
    const struct wa_form *form = &table->forms[candidate->form];
    struct wa_result_candidate *listed = &result->candidates[result->candidate_count];
    struct wa_text sources = {.bytes = NULL}, others = {.bytes = NULL};
    *listed = (struct wa_result_candidate){
        .rank = (int)result->candidate_count + 1,
        .acid = candidate->acid,
        .form = candidate->form,
        .probability = candidate->probability,
        .misfit = candidate->fit->misfit,
        .molar_mass = form->molar_mass,
        .molar_mass_deviation = mass_deviation(&work->mass, candidate, form->molar_mass),
    };
    result->candidate_count++;
    if (candidate->acid >= 0) {
        fill_constants(table, candidate, &result->experiments[0], listed);
        list_sources(table, candidate->acid, &sources);
    }
    list_others(table, candidate, &others);
    listed->acid_name =
        copy_text(candidate->acid >= 0 ? table->acids[candidate->acid].name : form->name);
    listed->form_name = copy_text(form->name);
    listed->key = copy_text(form->key);
    listed->others = take(&others);
    listed->sources = take(&sources);
    listed->why = reasons(&work->mass, listed, candidate);
    return listed->acid_name != NULL && listed->form_name != NULL && listed->key != NULL &&
                   listed->others != NULL && listed->sources != NULL && listed->why != NULL
               ? WA_OK
               : wa_fail_memory(error);
}

enum wa_status wa_fill_candidates(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error)
{
    enum wa_status status = WA_OK;
    result->not_in_table = work->match.not_in_table;
    result->forms_considered = work->match.forms_considered;
    result->forms_fitted = work->match.models_fitted;
    /* Of runs that contradict each other the joint fit means nothing. */
    for (size_t i = 0;
         status == WA_OK && !work->replicates_disagree && i < work->match.candidate_count &&
         result->candidate_count < WA_CANDIDATES_MAX;
         i++) {
        const struct wa_candidate *candidate = &work->match.candidates[i];
        if (i >= listed_at_least && candidate->probability < least_listed) {
            break;
        }
        status = list_candidate(work, candidate, result, error);
    }
    return status;
}
