/* Replicates of one sample: linked into a series, and asked whether they agree. */
#include "identify/identify_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double disagreement = -5.0; /* ln of the evidence for agreeing over not */

/* How a replicate is called in a sentence. */
static const char *name_of(const struct wa_run *run)
{
    return run->heading != NULL && run->heading[0] != '\0' ? run->heading : run->file;
}

enum wa_status wa_link_replicates(struct wa_result *result, struct wa_error *error)
{
    struct wa_experiment *last = NULL;
    if (result->runs.count > WA_SERIES_MAX) {
        return wa_fail(
            error, WA_ERROR_INPUT, NULL, 0,
            "%zu runs are too many for replicates of one sample (%d at most); use --each "
            "if they are different samples.",
            result->runs.count, WA_SERIES_MAX);
    }
    for (size_t r = 0; r < result->runs.count; r++) {
        struct wa_experiment *experiment = &result->experiments[r];
        const struct wa_titrated_mass mass = wa_titrated_mass_of(&result->runs.runs[r].conditions);
        experiment->ln_mass = mass.known ? log(mass.mass_g) : NAN;
        if (last != NULL && experiment->titrant_is_base != result->experiments[0].titrant_is_base) {
            return wa_fail(error, WA_ERROR_INPUT, result->runs.runs[r].file, 0,
                           "This run is titrated with %s and the first with %s: they cannot be "
                           "replicates; identify them one by one.",
                           experiment->titrant_is_base ? "base" : "acid",
                           experiment->titrant_is_base ? "acid" : "base");
        }
        if (last != NULL) {
            last->next = experiment;
        }
        last = experiment;
    }
    return WA_OK;
}

/* The series with one run at its end: copies, so that the result's own order stays. */
static size_t reorder(const struct wa_result *result, size_t last, struct wa_experiment *series)
{
    size_t count = 0;
    for (size_t r = 0; r < result->runs.count; r++) {
        if (r != last) {
            series[count++] = result->experiments[r];
        }
    }
    series[count++] = result->experiments[last];
    for (size_t r = 0; r < count; r++) {
        series[r].next = r + 1 < count ? &series[r + 1] : NULL;
    }
    return count;
}

/* ln of the evidence that a run agrees with all the others, over that it stands alone. */
static enum wa_status agreement(const struct wa_identification *work,
                                const struct wa_result *result, size_t run,
                                struct wa_experiment *series, double *log_ratio,
                                struct wa_error *error)
{
    const struct wa_generic *best = &work->study.generic[0];
    const struct wa_fit_options afar = {.from_afar = true};
    double start[WA_PARAMETERS_MAX];
    struct wa_fit joint = {.parameter_count = 0}, alone = {.parameter_count = 0};
    for (int i = 0; i < best->fit.parameter_count; i++) {
        start[i] = best->fit.parameters[i].value;
    }
    const size_t count = reorder(result, run, series);
    enum wa_status status = wa_fit_run(series, &best->sample, &afar, start, &joint, error);
    if (status == WA_OK) {
        status = wa_fit_run(&series[count - 1], &best->sample, &afar, start, &alone, error);
    }
    *log_ratio = 0.0;
    if (status == WA_OK && joint.converged && alone.converged) {
        *log_ratio = joint.log_evidence_of[count - 1] - alone.log_evidence;
    }
    wa_fit_free(&joint);
    wa_fit_free(&alone);
    return status;
}

/* What the answer is with every run, as the end of a sentence. */
static enum wa_status answer_with_all(const struct wa_identification *work,
                                      const struct wa_result *result, char **answer,
                                      struct wa_error *error)
{
    struct wa_match match = {.candidate_count = 0};
    const struct wa_match_options options = {.among = work->options->among,
                                             .among_count = work->options->among_count,
                                             .prior = work->options->prior};
    const enum wa_status status = wa_match_run(&result->experiments[0], &work->study, &work->mass,
                                               work->table, &options, &match, error);
    if (status == WA_OK) {
        *answer =
            match.candidate_count > 0
                ? wa_sentence("with it the most probable would be %s (%.0f %%), and %.0f %% would "
                              "stay with what is not in the table",
                              work->table->forms[match.candidates[0].form].name,
                              100.0 * match.candidates[0].probability, 100.0 * match.not_in_table)
                : wa_sentence("with it there would be no answer");
        wa_match_free(&match);
    }
    return status == WA_OK && *answer == NULL ? wa_fail_memory(error) : status;
}

/* Take a run out of the series. The result's first run is the one that everything is told in terms
 * of, so that one that is left out goes to the end. */
static void leave_out(struct wa_result *result, size_t run)
{
    const size_t last = result->runs.count - 1;
    const struct wa_run kept_run = result->runs.runs[last];
    const struct wa_curve kept_curve = result->curves[last];
    const struct wa_experiment kept_experiment = result->experiments[last];
    result->runs.runs[last] = result->runs.runs[run];
    result->curves[last] = result->curves[run];
    result->experiments[last] = result->experiments[run];
    result->runs.runs[run] = kept_run;
    result->curves[run] = kept_curve;
    result->experiments[run] = kept_experiment;
    for (size_t r = 0; r <= last; r++) {
        result->experiments[r].next = r + 1 < last ? &result->experiments[r + 1] : NULL;
    }
}

static enum wa_status say_disagreement(struct wa_identification *work, struct wa_result *result,
                                       size_t run, struct wa_error *error)
{
    if (result->runs.count == 2) {
        work->replicates_disagree = true;
        return wa_add_sentence(&result->findings, &result->finding_count, "replicates-disagree",
                               wa_sentence("The two replicates do not agree within what they share "
                                           "and their own noise; look at each, and repeat."),
                               error);
    }
    char *answer = NULL;
    const enum wa_status status = answer_with_all(work, result, &answer, error);
    if (status != WA_OK) {
        return status;
    }
    char *sentence = wa_sentence("The replicate %s does not agree with the others and is left out "
                                 "of the answer; %s.",
                                 name_of(&result->runs.runs[run]), answer);
    free(answer);
    leave_out(result, run);
    work->replicate_left_out = true;
    return wa_add_sentence(&result->findings, &result->finding_count, "replicates-disagree",
                           sentence, error);
}

enum wa_status wa_check_replicates(struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error)
{
    if (result->runs.count < 2 || work->study.count == 0) {
        return WA_OK;
    }
    struct wa_experiment *series = calloc(result->runs.count, sizeof *series);
    enum wa_status status = series != NULL ? WA_OK : wa_fail_memory(error);
    double worst = INFINITY;
    size_t worst_run = 0;
    for (size_t r = 0; status == WA_OK && r < result->runs.count; r++) {
        double log_ratio;
        status = agreement(work, result, r, series, &log_ratio, error);
        if (status == WA_OK && log_ratio < worst) {
            worst = log_ratio;
            worst_run = r;
        }
    }
    free(series);
    if (status == WA_OK && worst < disagreement) {
        status = say_disagreement(work, result, worst_run, error);
    }
    return status == WA_OK
               ? wa_add_sentence(
                     &result->assumptions, &result->assumption_count, "replicates",
                     wa_sentence("%zu replicates are fitted jointly: constants, titrant, carbonate "
                                 "and electrode are shared, and the amount per mass where masses "
                                 "are noted; volumes, additions and noise are each run's own. What "
                                 "is shown is the joint fit, in terms of %s.",
                                 result->runs.count - (work->replicate_left_out ? 1 : 0),
                                 name_of(&result->runs.runs[0])),
                     error)
               : status;
}
