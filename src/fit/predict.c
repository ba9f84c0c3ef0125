/* New readings by a finished fit, with the uncertainty of its parameters and the noise. */
#include "fit/fit_internal.h"

#include <stdlib.h>
#include <string.h>

static void add_covariance(const struct wa_fit *fit, const double *jacobian, size_t count,
                           double *covariance)
{
    const size_t n = (size_t)fit->parameter_count;
    for (size_t p = 0; p < count; p++) {
        for (size_t i = 0; i < n; i++) {
            double carried = 0.0;
            for (size_t j = 0; j < n; j++) {
                carried += fit->covariance[i * n + j] * jacobian[p * n + j];
            }
            for (size_t q = 0; q < count; q++) {
                covariance[p * count + q] += jacobian[q * n + i] * carried;
            }
        }
    }
}

enum wa_status wa_fit_predict(const struct wa_experiment *experiment,
                              const struct wa_sample_model *sample, const struct wa_fit *fit,
                              const double *volume_mL, size_t count, double *reading,
                              double *covariance, struct wa_error *error)
{
    const struct wa_noise noise = {.reading = fit->noise_reading, .volume = fit->noise_volume};
    const size_t n = (size_t)fit->parameter_count;
    struct wa_experiment planned = *experiment;
    struct wa_point_model *points = calloc(count + 1, sizeof *points);
    double *jacobian = calloc(count * n + 1, sizeof *jacobian);
    double *volumes = calloc(count + 1, sizeof *volumes);
    double value[WA_PARAMETERS_MAX];
    enum wa_status status = WA_OK;
    if (points == NULL || jacobian == NULL || volumes == NULL) {
        status = wa_fail_memory(error);
    } else {
        memcpy(volumes, volume_mL, count * sizeof *volumes);
        planned.count = count;
        planned.volume_mL = volumes;
        planned.reading = reading;
        for (size_t p = 0; p < count; p++) {
            reading[p] = 7.0;
        }
        for (size_t i = 0; i < n; i++) {
            value[i] = fit->parameters[i].value;
        }
        status = wa_model_evaluate(&planned, sample, fit->parameters, value, fit->parameter_count,
                                   points, jacobian, error);
    }
    if (status == WA_OK) {
        memset(covariance, 0, count * count * sizeof *covariance);
        add_covariance(fit, jacobian, count, covariance);
        for (size_t p = 0; p < count; p++) {
            reading[p] = points[p].expected;
            covariance[p * count + p] += wa_noise_variance(&noise, &points[p]);
        }
    }
    free(points);
    free(jacobian);
    free(volumes);
    return status;
}
