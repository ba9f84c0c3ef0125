/* Shared by the sources that simulate further observations. */
#ifndef WHICHACID_MATCH_EXPECTED_INTERNAL_H
#define WHICHACID_MATCH_EXPECTED_INTERNAL_H

#include "match/match_internal.h"
#include "whichacid/expected.h"

#define OUTLOOK_FORMS_MAX 64
#define OUTLOOK_RUNS_MAX 4

/** One form that may be the sample; `form` -1: what the table lacks. */
struct wa_outlook_form {
    int form;
    double molar_mass;
    double probability;
    const struct wa_fit *fit;
    const struct wa_sample_model *sample;
};

/** All of them; the probabilities add up to 1. */
struct wa_outlook {
    struct wa_outlook_form entities[OUTLOOK_FORMS_MAX];
    size_t count;
};

/** Draw an observation as if `truth` were the sample, and give ln of its likelihood under each. */
typedef void wa_outlook_draw(const struct wa_outlook *outlook, size_t truth, uint64_t *state,
                             void *context, double *log_likelihood);

/** Fill expected->bits and set_size by simulation. */
void wa_outlook_simulate(const struct wa_outlook *outlook, double threshold, wa_outlook_draw *draw,
                         void *context, struct wa_expected *expected);

/** Further titration: the best window for more points, a concentrated run, another temperature,
 * added salt. */
enum wa_status wa_outlook_runs(const struct wa_experiment *experiment,
                               const struct wa_outlook *outlook, double threshold,
                               struct wa_expected runs[OUTLOOK_RUNS_MAX], size_t *count,
                               struct wa_error *error) WA_MUST_USE;

#endif
