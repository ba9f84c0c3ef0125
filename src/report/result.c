/* Owning and releasing a result. */
#include "whichacid/result.h"

#include <stdlib.h>
#include <string.h>

static void free_candidate(struct wa_result_candidate *candidate)
{
    free(candidate->acid_name);
    free(candidate->form_name);
    free(candidate->key);
    free(candidate->others);
    free(candidate->why);
    free(candidate->hazards);
    free(candidate->care);
    free(candidate->sources);
}

static void free_sentences(struct wa_result_sentence *sentences, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        free(sentences[i].sentence);
    }
    free(sentences);
}

/* Curves and experiments have one entry a run, so they go before the runs. */
static void free_runs(struct wa_result *result)
{
    for (size_t i = 0; i < result->runs.count; i++) {
        if (result->curves != NULL) {
            wa_curve_free(&result->curves[i]);
        }
        if (result->experiments != NULL) {
            wa_experiment_free(&result->experiments[i]);
        }
    }
    free(result->curves);
    free(result->experiments);
    wa_run_list_free(&result->runs);
}

static void free_lists(struct wa_result *result)
{
    for (size_t i = 0; i < result->input_count; i++) {
        free(result->inputs[i].file);
    }
    free(result->inputs);
    for (size_t i = 0; i < result->parameter_count; i++) {
        free(result->parameters[i].name);
    }
    free(result->parameters);
    free_sentences(result->findings, result->finding_count);
    free_sentences(result->assumptions, result->assumption_count);
    free_sentences(result->cautions, result->caution_count);
    free_sentences(result->observed, result->observed_count);
    free_sentences(result->explanation, result->explanation_count);
    free(result->explained);
    free(result->comparison.first);
    free(result->comparison.second);
    free(result->comparison.sentence);
    free(result->comparison.sensitivity);
    for (size_t i = 0; i < result->next_test_count; i++) {
        free(result->next_tests[i].sentence);
        free(result->next_tests[i].separates);
    }
    free(result->next_tests);
}

void wa_result_free(struct wa_result *result)
{
    if (result == NULL) {
        return;
    }
    free_runs(result);
    free_lists(result);
    wa_fit_free(&result->best);
    wa_trace_free(&result->best_trace);
    wa_trace_free(&result->candidate_traces[0]);
    wa_trace_free(&result->candidate_traces[1]);
    free(result->equivalence_points);
    free(result->unseen);
    free(result->molar_mass_assumes);
    for (size_t i = 0; i < result->candidate_count; i++) {
        free_candidate(&result->candidates[i]);
    }
    free(result->verdict.forms);
    free(result->verdict.sentence);
    free(result->table_folder);
    *result = (struct wa_result){0};
}

enum wa_status wa_result_add_input(struct wa_result *result, const char *file, const char *sha256,
                                   size_t runs, struct wa_error *error)
{
    struct wa_result_input *input = NULL;
    for (size_t i = 0; i < result->input_count && input == NULL; i++) {
        if (strcmp(result->inputs[i].file, file) == 0 && result->inputs[i].sha256[0] == '\0') {
            input = &result->inputs[i];
        }
    }
    if (input == NULL) {
        struct wa_result_input *longer =
            realloc(result->inputs, (result->input_count + 1) * sizeof *longer);
        if (longer == NULL) {
            return wa_fail_memory(error);
        }
        result->inputs = longer;
        input = &longer[result->input_count];
        *input = (struct wa_result_input){.file = strdup(file)};
        if (input->file == NULL) {
            return wa_fail_memory(error);
        }
        result->input_count++;
    }
    input->runs = runs;
    strncpy(input->sha256, sha256, sizeof input->sha256 - 1);
    return WA_OK;
}
