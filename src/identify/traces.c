/* The curves of the best fit, of the winner and of the runner-up, for figures. */
#include "identify/identify_internal.h"

/* The next candidate of another acid system, else the next one; count when there is none. */
static size_t runner_up(const struct wa_match *match, size_t count)
{
    for (size_t i = 1; i < count; i++) {
        if (match->candidates[i].acid != match->candidates[0].acid) {
            return i;
        }
    }
    return count > 1 ? 1 : count;
}

enum wa_status wa_fill_traces(const struct wa_identification *work, struct wa_result *result,
                              struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    enum wa_status status = WA_OK;
    if (work->study.count > 0) {
        status = wa_trace_fit(experiment, &work->study.generic[0].fit, &result->best_trace, error);
    }
    const size_t chosen[2] = {0, runner_up(&work->match, result->candidate_count)};
    for (int i = 0; i < 2 && status == WA_OK && chosen[i] < result->candidate_count; i++) {
        result->traced_candidates[i] = chosen[i];
        status = wa_trace_fit(experiment, work->match.candidates[chosen[i]].fit,
                              &result->candidate_traces[i], error);
    }
    return status;
}
