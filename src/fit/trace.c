/* A fit as a smooth curve: volumes chosen for the eye, then the model at each. */
#include "whichacid/trace.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { EVEN_VOLUMES = 201, PH_STEPS_MOST = 400 };

static const double pH_step = 0.05;

static int by_value(const void *one, const void *other)
{
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static double parameter_value(const struct wa_fit *fit, enum wa_parameter_kind kind,
                              double otherwise)
{
    const int index = wa_fit_find(fit, kind, 0, 0);
    return index >= 0 ? fit->parameters[index].value : otherwise;
}

/* Rising volumes, no two alike. Returns how many. */
static size_t choose_volumes(const struct wa_experiment *experiment, const struct wa_fit *fit,
                             double *volumes)
{
    const double first = experiment->volume_mL[0];
    const double last = experiment->volume_mL[experiment->count - 1];
    size_t count = 0;
    for (int i = 0; i < EVEN_VOLUMES; i++) {
        volumes[count++] = first + (last - first) * i / (EVEN_VOLUMES - 1);
    }
    double ends[2] = {7.0, 7.0};
    for (int i = 0; i < 2; i++) {
        struct wa_solution solution;
        if (wa_titration_pH(&fit->titration, i == 0 ? first : last, 7.0, &solution, NULL, NULL) ==
            WA_OK) {
            ends[i] = solution.pH;
        }
    }
    const double low = fmin(ends[0], ends[1]), high = fmax(ends[0], ends[1]);
    for (int i = 1; i < PH_STEPS_MOST && low + i * pH_step < high; i++) {
        double volume;
        if (wa_titration_volume(&fit->titration, low + i * pH_step, &volume, NULL) == WA_OK &&
            volume > first && volume < last) {
            volumes[count++] = volume;
        }
    }
    qsort(volumes, count, sizeof *volumes, by_value);
    size_t kept = 0;
    for (size_t i = 0; i < count; i++) {
        if (kept == 0 || volumes[i] > volumes[kept - 1]) {
            volumes[kept++] = volumes[i];
        }
    }
    return kept;
}

static bool make_room(struct wa_trace *trace, size_t most)
{
    trace->volume_mL = calloc(most, sizeof(double));
    trace->reading = calloc(most, sizeof(double));
    trace->pH = calloc(most, sizeof(double));
    trace->fraction = calloc(most * (size_t)(trace->step_count + 1), sizeof(double));
    trace->residual = calloc(trace->point_count, sizeof(double));
    return trace->volume_mL != NULL && trace->reading != NULL && trace->pH != NULL &&
           trace->fraction != NULL && trace->residual != NULL;
}

static enum wa_status follow(const struct wa_experiment *experiment, const struct wa_fit *fit,
                             struct wa_trace *trace, struct wa_error *error)
{
    const double slope = parameter_value(fit, WA_PARAMETER_SLOPE, experiment->slope.mean);
    const double offset = parameter_value(fit, WA_PARAMETER_OFFSET, experiment->offset.mean);
    const struct wa_titration *titration = &fit->titration;
    const double neutral = 7.0 + experiment->pivot;
    double guess = 7.0;
    for (size_t i = 0; i < trace->count; i++) {
        struct wa_solution solution;
        const enum wa_status status =
            wa_titration_pH(titration, trace->volume_mL[i], guess, &solution, NULL, error);
        if (status != WA_OK) {
            return status;
        }
        guess = solution.pH;
        trace->pH[i] = solution.pH;
        trace->reading[i] = neutral + slope * (solution.pH - neutral) + offset;
        const double gamma = pow(10.0, wa_davies_log10_gamma(solution.ionic_strength,
                                                             titration->medium.debye_huckel_A,
                                                             titration->davies_coefficient));
        wa_system_fractions(&titration->components[0].system, pow(10.0, -solution.pH), gamma,
                            &trace->fraction[i * (size_t)(trace->step_count + 1)]);
    }
    return WA_OK;
}

enum wa_status wa_trace_fit(const struct wa_experiment *experiment, const struct wa_fit *fit,
                            struct wa_trace *trace, struct wa_error *error)
{
    if (experiment->count < 2 || fit->titration.component_count < 1 || fit->residual == NULL) {
        *trace = (struct wa_trace){.count = 0};
        return WA_OK;
    }
    const struct wa_system *system = &fit->titration.components[0].system;
    struct wa_trace made = {.step_count = system->step_count,
                            .charge = system->charge,
                            .point_count = experiment->count};
    enum wa_status status = WA_OK;
    if (!make_room(&made, EVEN_VOLUMES + PH_STEPS_MOST)) {
        status = wa_fail_memory(error);
    } else {
        made.count = choose_volumes(experiment, fit, made.volume_mL);
        memcpy(made.residual, fit->residual, made.point_count * sizeof(double));
        status = follow(experiment, fit, &made, error);
    }
    if (status != WA_OK) {
        wa_trace_free(&made);
        return status;
    }
    *trace = made;
    return WA_OK;
}

void wa_trace_free(struct wa_trace *trace)
{
    if (trace == NULL) {
        return;
    }
    free(trace->volume_mL);
    free(trace->reading);
    free(trace->pH);
    free(trace->fraction);
    free(trace->residual);
    *trace = (struct wa_trace){.count = 0};
}
