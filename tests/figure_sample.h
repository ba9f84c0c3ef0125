/* A result of a demo curve with the candidates' curves, for the tests of figures and pages. */
#ifndef WHICHACID_TESTS_FIGURE_SAMPLE_H
#define WHICHACID_TESTS_FIGURE_SAMPLE_H

#include "base/process.h"
#include "whichacid/figure.h"
#include "whichacid/identify.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Traces as the pipeline would make them, for results that have none: the best fit stands for both
 * candidates, the second one a little off. */
static inline void sample_traces(struct wa_result *result)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    struct wa_trace *all[] = {&result->best_trace, &result->candidate_traces[0],
                              &result->candidate_traces[1]};
    for (size_t i = 0; i < 3; i++) {
        if (all[i]->count == 0) {
            assert_int_equal(wa_trace_fit(experiment, &result->best, all[i], NULL), WA_OK);
        }
    }
    struct wa_trace *second = &result->candidate_traces[1];
    if (result->traced_candidates[1] == 0) {
        result->traced_candidates[1] = 1;
        second->residual[second->point_count / 2] += 3.0;
    }
}

/* The first demo curve, identified. */
static inline void demo_result(struct wa_result *result)
{
    struct wa_table table = {0};
    struct wa_run_list runs = {0};
    const struct wa_reader_options options = {0};
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, NULL), WA_OK);
    assert_int_equal(
        wa_read_file(WHICHACID_REFERENCE_DIR "/../demo/jar-07.csv", &options, &runs, NULL), WA_OK);
    assert_int_equal(wa_identify(&runs, &table, NULL, result, NULL), WA_OK);
    wa_table_free(&table);
    sample_traces(result);
}

/* What a checking program from Debian prints about some bytes; the test fails when it complains. */
static inline char *checked_by(const char *const *arguments, const char *bytes, size_t size)
{
    struct wa_process_output output;
    struct wa_error error;
    if (wa_process_run(arguments, bytes, size, 60, &output, &error) != WA_OK) {
        fail_msg("%s %s: %s", arguments[0], arguments[1], error.message);
    }
    return output.bytes;
}

#endif
