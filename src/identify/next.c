/* What to do next: the observation that would separate what is left. */
#include "identify/identify_internal.h"

#include "base/text.h"
#include "whichacid/expected.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* An observation is worth a line from this share of the missing bits, and from so many bits. */
static const double told_from = 0.1;
static const double least_bits = 0.03;
static const double worth_asking = 0.3; /* bits missing */
static const size_t suggested_most = 5;

static enum wa_status add_next(struct wa_result *result, char *sentence, const char *separates,
                               struct wa_error *error)
{
    struct wa_result_next *larger =
        sentence != NULL
            ? realloc(result->next_tests, (result->next_test_count + 1) * sizeof *larger)
            : NULL;
    char *copy = wa_text_copy(separates, strlen(separates));
    if (larger == NULL || copy == NULL) {
        if (larger != NULL) {
            result->next_tests = larger;
        }
        free(sentence);
        free(copy);
        return wa_fail_memory(error);
    }
    result->next_tests = larger;
    larger[result->next_test_count++] = (struct wa_result_next){
        .sentence = sentence, .separates = copy, .expected_bits = NAN, .expected_set = NAN};
    return WA_OK;
}

/* What to do, without what it is expected to bring. */
static char *task_of(const struct wa_expected *expected)
{
    switch (expected->kind) {
    case WA_EXPECTED_MASS:
        return wa_sentence("Weigh the sample, for its molar mass");
    case WA_EXPECTED_POINTS:
        return wa_sentence("Take %d more points between pH %.1f and %.1f (%.2f to %.2f mL)",
                           expected->points, expected->pH[0], expected->pH[1],
                           expected->volume_mL[0], expected->volume_mL[1]);
    case WA_EXPECTED_CONCENTRATED:
        return wa_sentence("Titrate again with sample and titrant five times as concentrated");
    case WA_EXPECTED_TEMPERATURE:
        return wa_sentence("Titrate again at %.0f \u00b0C", expected->temperature_C);
    case WA_EXPECTED_IONIC_STRENGTH:
        return wa_sentence("Titrate again in 0.3 mol/L potassium chloride");
    case WA_EXPECTED_OBSERVATION:
        break;
    }
    const char *name = wa_observation_name(expected->observation);
    return expected->observation == WA_OBSERVED_MELTING_POINT
               ? wa_sentence(
                     "Take the melting point (then --observed \"melting point: ... \u00b1 1 "
                     "\u00b0C\")")
           : expected->observation == WA_OBSERVED_LOSS_ON_DRYING
               ? wa_sentence("Dry a weighed part to constant mass (then --observed \"loss on "
                             "drying: ... \u00b1 0.2 %%\")")
               : wa_sentence("Make the spot test for %s (then --observed \"%s: yes\" or no)", name,
                             name);
}

static enum wa_status add_expected(const struct wa_expectations *all,
                                   const struct wa_expected *expected, struct wa_result *result,
                                   struct wa_error *error)
{
    char *task = task_of(expected);
    if (task == NULL) {
        return wa_fail_memory(error);
    }
    char *sentence =
        wa_sentence("%s: expected to bring %.2f of the %.2f bits that are missing, and to leave "
                    "about %.1f of %.0f possibilities.",
                    task, expected->bits, all->bits, expected->set_size, all->set_size);
    free(task);
    const enum wa_status status = add_next(
        result, sentence, result->verdict.form_count > 1 ? result->verdict.forms : "", error);
    if (status == WA_OK) {
        struct wa_result_next *next = &result->next_tests[result->next_test_count - 1];
        next->expected_bits = expected->bits;
        next->expected_set = expected->set_size;
    }
    return status;
}

/* The observations that are expected to tell most; one spot test is enough at a time. */
static enum wa_status suggest_expected(const struct wa_identification *work,
                                       struct wa_result *result, struct wa_error *error)
{
    struct wa_expectations expectations;
    bool spot = false;
    enum wa_status status =
        wa_match_expect(&result->experiments[0], &work->study, &work->mass, work->table,
                        &work->match, work->threshold, &expectations, error);
    if (status != WA_OK) {
        return status;
    }
    result->missing_bits = expectations.bits;
    if (expectations.bits < worth_asking) {
        return WA_OK;
    }
    const size_t first = result->next_test_count;
    for (size_t i = 0; status == WA_OK && i < expectations.count &&
                       result->next_test_count < first + suggested_most;
         i++) {
        const struct wa_expected *expected = &expectations.list[i];
        const bool is_spot = expected->kind == WA_EXPECTED_OBSERVATION &&
                             expected->observation >= WA_OBSERVED_SODIUM;
        if (expected->bits < told_from * expectations.bits || expected->bits < least_bits ||
            (is_spot && spot)) {
            continue;
        }
        spot = spot || is_spot;
        status = add_expected(&expectations, expected, result, error);
    }
    return status;
}

static enum wa_status suggest_for_unfit(const struct wa_identification *work,
                                        struct wa_result *result, struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    if (wa_runs_against_titrant(&result->curves[0], experiment)) {
        return add_next(result,
                        wa_sentence("Note the titrant that was in the burette, and see with "
                                    "`whichacid inspect` whether the columns were read rightly."),
                        "", error);
    }
    if (!result->runs.runs[0].conditions.titrant_concentration.known) {
        return add_next(result,
                        wa_sentence("Note the titrant concentration (`# titrant concentration: "
                                    "0.1000 \u00b1 0.0005 mol/L`)."),
                        "", error);
    }
    if (result->curves[0].inflection_count == 0) {
        return add_next(result,
                        wa_sentence("Titrate further, past %.1f mL, or use a more concentrated "
                                    "sample and titrant, until a jump shows.",
                                    experiment->volume_mL[experiment->count - 1]),
                        "", error);
    }
    (void)work;
    return add_next(result,
                    wa_sentence("Repeat with smaller additions about the jump, and let the reading "
                                "settle before each."),
                    "", error);
}

enum wa_status wa_fill_next_tests(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error)
{
    const struct wa_verdict *verdict = &result->verdict;
    enum wa_status status = WA_OK;
    result->missing_bits = NAN;
    if (verdict->kind == WA_VERDICT_UNFIT) {
        return suggest_for_unfit(work, result, error);
    }
    if (result->experiments[0].uncalibrated) {
        status = add_next(result,
                          wa_sentence("Calibrate the electrode in two buffers and note them: the "
                                      "constants then count."),
                          "", error);
    }
    if (status == WA_OK && work->matched) {
        status = suggest_expected(work, result, error);
    }
    if (status == WA_OK) {
        status = add_next(result,
                          wa_sentence("Confirm by a test that is no titration, such as an infrared "
                                      "spectrum or a melting point with an authentic sample."),
                          "", error);
    }
    return status;
}
