/* What to do next: the observation that would separate what is left. */
#include "identify/identify_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

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

/* Two listed candidates with different melting points, far enough apart to be told. */
static enum wa_status suggest_melting(const struct wa_identification *work,
                                      struct wa_result *result, struct wa_error *error)
{
    for (size_t i = 0; i < work->match.candidate_count && i < 5; i++) {
        for (size_t j = i + 1; j < work->match.candidate_count && j < 5; j++) {
            const struct wa_candidate *x = &work->match.candidates[i];
            const struct wa_candidate *y = &work->match.candidates[j];
            const struct wa_form *a = &work->table->forms[x->form];
            const struct wa_form *b = &work->table->forms[y->form];
            if (y->probability < 0.02 || !(fabs(a->melting_point_C - b->melting_point_C) > 5.0)) {
                continue;
            }
            char separates[160];
            snprintf(separates, sizeof separates, "%s; %s", a->key, b->key);
            return add_next(result,
                            wa_sentence("Take a melting point: %s melts at about %.0f \u00b0C, "
                                        "%s at about %.0f \u00b0C.",
                                        a->name, a->melting_point_C, b->name, b->melting_point_C),
                            separates, error);
        }
    }
    return WA_OK;
}

static enum wa_status suggest_for_unfit(const struct wa_identification *work,
                                        struct wa_result *result, struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
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
    if (verdict->kind == WA_VERDICT_UNFIT) {
        return suggest_for_unfit(work, result, error);
    }
    if (result->experiments[0].uncalibrated) {
        status = add_next(result,
                          wa_sentence("Calibrate the electrode in two buffers and note them: the "
                                      "constants then count."),
                          "", error);
    }
    if (status == WA_OK && !work->mass.known) {
        status = add_next(result,
                          wa_sentence("Weigh the sample: its molar mass separates most acids of "
                                      "like pKa, and salts and hydrates from the free acid."),
                          verdict->forms, error);
    }
    if (status == WA_OK && verdict->kind == WA_VERDICT_NARROWED) {
        status = suggest_melting(work, result, error);
    }
    if (status == WA_OK) {
        status = add_next(result,
                          wa_sentence("Confirm by a test that is no titration, such as an infrared "
                                      "spectrum or a melting point with an authentic sample."),
                          "", error);
    }
    return status;
}
