/* Water and other samples that hold hydrogen carbonate, titrated with acid in an open vessel:
 * carbon dioxide escapes, which bends the curve before the end but not the line of free acid after
 * it (Gran 1952; common practice for the alkalinity of waters). */
#include "identify/identify_internal.h"

#include <gsl/gsl_fit.h>

#include <math.h>
#include <stdlib.h>

static const double carbonic_low = 5.7, carbonic_high = 6.9; /* apparent pKa taken for carbonic */
static const double free_acid_pH = 4.4;                      /* hydrogen carbonate is gone below */
static const double contradiction = 0.02;                    /* of the volume */
static const size_t least_points = 3;

/* Where the line of free acid against volume meets zero. */
static bool line_of_free_acid(const struct wa_experiment *experiment,
                              struct wa_volume_estimate *end, struct wa_error *error,
                              enum wa_status *status)
{
    const double start_mL = 1e3 * exp(experiment->ln_volume.mean);
    double *x = calloc(experiment->count, sizeof *x);
    double *y = calloc(experiment->count, sizeof *y);
    size_t count = 0;
    bool found = false;
    *status = x != NULL && y != NULL ? WA_OK : wa_fail_memory(error);
    for (size_t p = 0; *status == WA_OK && p < experiment->count; p++) {
        if (experiment->reading[p] < free_acid_pH) {
            x[count] = experiment->volume_mL[p];
            y[count] = (start_mL + x[count]) * pow(10.0, -experiment->reading[p]);
            count++;
        }
    }
    if (*status == WA_OK && count >= least_points) {
        double intercept, slope, c00, c01, c11, square;
        gsl_fit_linear(x, 1, y, 1, count, &intercept, &slope, &c00, &c01, &c11, &square);
        end->volume_mL = -intercept / slope;
        const double v = end->volume_mL;
        end->u_mL = sqrt(fmax(c00 + 2.0 * v * c01 + v * v * c11, 0.0)) / fabs(slope);
        found = slope > 0.0 && v > 0.0 && v < experiment->volume_mL[experiment->count - 1];
    }
    free(x);
    free(y);
    return found;
}

enum wa_status wa_fill_hydrogen_carbonate(const struct wa_identification *work,
                                          struct wa_result *result, struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    if (experiment->titrant_is_base || experiment->uncalibrated || work->study.count == 0 ||
        result->equivalence_count == 0 || result->pKa_count == 0) {
        return WA_OK;
    }
    struct wa_result_equivalence *last = &result->equivalence_points[result->equivalence_count - 1];
    const double apparent = result->pKa[result->pKa_count - 1].apparent;
    struct wa_volume_estimate line;
    enum wa_status status = WA_OK;
    if (apparent < carbonic_low || apparent > carbonic_high ||
        !line_of_free_acid(experiment, &line, error, &status)) {
        return status;
    }
    const double difference = fabs(line.volume_mL - last->volume_mL);
    if (difference < contradiction * line.volume_mL || difference < 2.0 * line.u_mL) {
        return WA_OK;
    }
    status = wa_add_sentence(
        &result->findings, &result->finding_count, "hydrogen-carbonate",
        wa_sentence("This looks like hydrogen carbonate: carbon dioxide may have escaped, which "
                    "bends the curve before the end. The end is taken from the line of free acid "
                    "after it (Gran 1952), %.3f mL; the whole curve would give %.3f mL.",
                    line.volume_mL, last->volume_mL),
        error);
    last->volume_mL = line.volume_mL;
    last->u_mL = fmax(line.u_mL, 0.5 * difference);
    last->from_fit = false;
    return status;
}
