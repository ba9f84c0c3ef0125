/* Where fits start: many places are scored, the best few tried, the best of these converged. */
#include "fit/fit_internal.h"
#include "fit/generic_internal.h"

#include <math.h>
#include <stdlib.h>

static const int trial_iterations = 8;
static const double blunt_reading = 0.15; /* pH */
static const double blunt_volume = 0.01;  /* of the last volume */

/* How well values describe the points, to within a blunt tolerance. */
static double score(const struct wa_experiment *experiment, const struct wa_point_model *points)
{
    const struct wa_noise blunt = {
        .reading = blunt_reading,
        .volume = blunt_volume * experiment->volume_mL[experiment->count - 1],
    };
    double sum = 0.0;
    for (size_t p = 0; p < experiment->count; p++) {
        double inlier;
        sum += wa_noise_log_likelihood(wa_outlier_share(experiment),
                                       experiment->reading[p] - points[p].expected,
                                       wa_noise_variance(&blunt, &points[p]), &inlier);
    }
    return sum;
}

static void keep(const struct wa_start *start, struct wa_start_list *list)
{
    int at = list->count;
    while (at > 0 && start->score > list->best[at - 1].score) {
        if (at < WA_STARTS_TRIED) {
            list->best[at] = list->best[at - 1];
        }
        at--;
    }
    if (at < WA_STARTS_TRIED) {
        list->best[at] = *start;
        list->count += list->count < WA_STARTS_TRIED ? 1 : 0;
    }
}

enum wa_status wa_start_consider(const struct wa_experiment *experiment,
                                 const struct wa_sample_model *sample, struct wa_start *start,
                                 struct wa_start_list *list, struct wa_error *error)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(experiment, sample, parameters);
    struct wa_point_model *points = calloc(experiment->count, sizeof *points);
    if (points == NULL) {
        return wa_fail_memory(error);
    }
    /* A start at which the model cannot be evaluated is no start, and no failure either. */
    if (wa_model_evaluate(experiment, sample, parameters, start->value, count, points, NULL,
                          NULL) == WA_OK) {
        start->score = score(experiment, points);
        keep(start, list);
    }
    free(points);
    return WA_OK;
}

enum wa_status wa_fit_from_starts(const struct wa_experiment *experiment,
                                  const struct wa_sample_model *sample,
                                  const struct wa_start_list *list, struct wa_fit *fit,
                                  struct wa_error *error)
{
    const struct wa_fit_options trial = {.most_iterations = trial_iterations, .from_afar = true};
    double best_value[WA_PARAMETERS_MAX];
    double best = -INFINITY;
    *fit = (struct wa_fit){.parameter_count = 0};
    for (int s = 0; s < list->count; s++) {
        struct wa_fit tried;
        const enum wa_status status =
            wa_fit_run(experiment, sample, &trial, list->best[s].value, &tried, error);
        if (status != WA_OK) {
            return status;
        }
        if (tried.misfit > 0.0 && tried.log_evidence > best) {
            best = tried.log_evidence;
            for (int i = 0; i < tried.parameter_count; i++) {
                best_value[i] = tried.parameters[i].value;
            }
        }
        wa_fit_free(&tried);
    }
    return isfinite(best) ? wa_fit_run(experiment, sample, NULL, best_value, fit, error) : WA_OK;
}

int wa_generic_shown(const struct wa_experiment *experiment, const struct wa_fit *fit, int part,
                     int step_count, int lost)
{
    const bool base = experiment->titrant_is_base;
    double lowest = INFINITY, highest = -INFINITY;
    for (size_t p = 0; p < experiment->count; p++) {
        lowest = fmin(lowest, experiment->reading[p]);
        highest = fmax(highest, experiment->reading[p]);
    }
    /* A strong acid's proton is shown though its constant is not. */
    int shown = 0;
    for (int step = base ? lost : 0; step < (base ? step_count : lost); step++) {
        const double pK = fit->parameters[wa_fit_find(fit, WA_PARAMETER_PK, part, step)].value;
        shown += (base ? pK > highest : pK < lowest) ? 0 : 1;
    }
    return shown;
}
