/* What a model expects, for planning: readings and their derivatives without any data. */
#include "fit/fit_internal.h"

#include <stdlib.h>

enum wa_status wa_fit_expect(const struct wa_experiment *experiment,
                             const struct wa_sample_model *sample, const double *values,
                             double *reading, double *slope, double *jacobian,
                             struct wa_titration *titration, struct wa_error *error)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    double means[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(experiment, sample, parameters);
    for (int i = 0; i < count; i++) {
        means[i] = values != NULL ? values[i] : parameters[i].prior.mean;
    }
    if (titration != NULL) {
        struct wa_layout layout;
        wa_model_titration(experiment, sample, parameters, means, count, titration, &layout);
    }
    struct wa_point_model *points = calloc(experiment->count + 1, sizeof *points);
    if (points == NULL) {
        return wa_fail_memory(error);
    }
    const enum wa_status status =
        wa_model_evaluate(experiment, sample, parameters, means, count, points, jacobian, error);
    for (size_t p = 0; status == WA_OK && p < experiment->count; p++) {
        if (reading != NULL) {
            reading[p] = points[p].expected;
        }
        if (slope != NULL) {
            slope[p] = points[p].slope;
        }
    }
    free(points);
    return status;
}
