/* Further titration, simulated: each fitted model predicts the new readings as a Gaussian whose
 * covariance holds the uncertainty of its parameters and the noise. */
#include "match/expected_internal.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define MODELS_MAX 12 /* the most probable forms; the rest share the last one's prediction */
#define POINTS_MAX 20

static const int window_points = 6;
static const double window_low = 1.5;
static const double window_width = 2.0; /* pH */
static const int windows = 6;
static const double beyond_end = 1.3; /* times the last volume */
static const double concentration_factor = 5.0;
static const double warmer_K = 20.0;
static const double added_salt = 0.3;        /* mol/L */
static const double generic_slope_u = 0.015; /* d pK / dT of an acid that nobody named, per K */

/* One model's prediction. */
struct prediction {
    double mean[POINTS_MAX];
    double root[POINTS_MAX * POINTS_MAX]; /* Cholesky factor of the covariance */
    double log_determinant;
    bool usable;
};

/* All predictions of one plan. */
struct plan {
    struct prediction *models;
    size_t model_count;
    size_t points;
    size_t model_of[OUTLOOK_FORMS_MAX];
};

static void draw_readings(const struct wa_outlook *outlook, size_t truth, uint64_t *state,
                          void *context, double *log_likelihood)
{
    const struct plan *plan = context;
    const size_t n = plan->points;
    const struct prediction *from = &plan->models[plan->model_of[truth]];
    double white[POINTS_MAX], y[POINTS_MAX], weight[MODELS_MAX];
    for (size_t i = 0; i < n; i++) {
        white[i] = wa_draw_normal(state);
        y[i] = from->mean[i];
        for (size_t j = 0; j <= i; j++) {
            y[i] += from->root[i * n + j] * white[j];
        }
    }
    for (size_t m = 0; m < plan->model_count; m++) {
        const struct prediction *model = &plan->models[m];
        double square = 0.0, solved[POINTS_MAX];
        for (size_t i = 0; i < n; i++) {
            solved[i] = y[i] - model->mean[i];
            for (size_t j = 0; j < i; j++) {
                solved[i] -= model->root[i * n + j] * solved[j];
            }
            solved[i] /= model->root[i * n + i];
            square += solved[i] * solved[i];
        }
        weight[m] = -0.5 * (square + model->log_determinant);
    }
    for (size_t k = 0; k < outlook->count; k++) {
        log_likelihood[k] = weight[plan->model_of[k]];
    }
}

/* Which fits are predicted: one for each model among the most probable forms. */
static size_t choose_models(const struct wa_outlook *outlook, size_t model_of[OUTLOOK_FORMS_MAX],
                            const struct wa_outlook_form *chosen[MODELS_MAX])
{
    size_t count = 0;
    for (size_t k = 0; k < outlook->count; k++) {
        size_t m = 0;
        while (m < count && chosen[m]->fit != outlook->entities[k].fit) {
            m++;
        }
        if (m == count && count < MODELS_MAX) {
            chosen[count++] = &outlook->entities[k];
        }
        model_of[k] = m < count ? m : count - 1;
    }
    return count;
}

/* What a plan changes of a run. */
struct change {
    double dilution; /* concentrations times this, volumes by it */
    double warmer_K;
    double salt;
};

/* A fit's values carried to the changed run; its covariance gains what the change adds. */
static void carry(const struct wa_outlook_form *form, const struct change *change,
                  struct wa_fit *fit, double *covariance)
{
    const size_t n = (size_t)fit->parameter_count;
    memcpy(covariance, form->fit->covariance, n * n * sizeof *covariance);
    fit->covariance = covariance;
    fit->noise_volume /= change->dilution;
    for (size_t i = 0; i < n; i++) {
        struct wa_parameter *parameter = &fit->parameters[i];
        if (parameter->kind == WA_PARAMETER_LN_TITRANT) {
            parameter->value += log(change->dilution);
        } else if (parameter->kind == WA_PARAMETER_LN_VOLUME) {
            parameter->value -= log(change->dilution);
        } else if (parameter->kind == WA_PARAMETER_TEMPERATURE) {
            parameter->value += change->warmer_K;
        } else if (parameter->kind == WA_PARAMETER_PK) {
            const struct wa_model_part *part = &form->sample->parts[parameter->part];
            const double slope = form->form >= 0 ? part->pK_slope[parameter->step] : 0.0;
            const double slope_u = form->form >= 0 ? 0.2 * fabs(slope) : generic_slope_u;
            const double u = slope_u * change->warmer_K;
            parameter->value += slope * change->warmer_K;
            covariance[i * n + i] += u * u;
        }
    }
}

static enum wa_status predict(const struct wa_experiment *experiment,
                              const struct wa_outlook_form *form, const struct change *change,
                              const double *volume_mL, size_t count, struct prediction *prediction,
                              struct wa_error *error)
{
    const size_t n = (size_t)form->fit->parameter_count;
    struct wa_experiment planned = *experiment;
    struct wa_fit fit = *form->fit;
    double *covariance = malloc((n * n + 1) * sizeof *covariance);
    if (covariance == NULL) {
        return wa_fail_memory(error);
    }
    carry(form, change, &fit, covariance);
    planned.temperature_C += change->warmer_K;
    planned.ln_volume.mean -= log(change->dilution);
    planned.background += change->salt;
    struct wa_error ignored;
    prediction->usable = wa_fit_predict(&planned, form->sample, &fit, volume_mL, count,
                                        prediction->mean, prediction->root, &ignored) == WA_OK;
    free(covariance);
    gsl_matrix_view root = gsl_matrix_view_array(prediction->root, count, count);
    prediction->usable =
        prediction->usable && gsl_linalg_cholesky_decomp1(&root.matrix) == GSL_SUCCESS;
    prediction->log_determinant = 0.0;
    for (size_t i = 0; prediction->usable && i < count; i++) {
        prediction->log_determinant += 2.0 * log(prediction->root[i * count + i]);
    }
    return WA_OK;
}

/* Expected information of readings at some volumes under a change. */
static enum wa_status weigh_plan(const struct wa_experiment *experiment,
                                 const struct wa_outlook *outlook, double threshold,
                                 const struct change *change, const double *volume_mL, size_t count,
                                 struct wa_expected *expected, struct wa_error *error)
{
    const struct wa_outlook_form *chosen[MODELS_MAX];
    struct plan plan = {.points = count};
    plan.model_count = choose_models(outlook, plan.model_of, chosen);
    plan.models = calloc(plan.model_count, sizeof *plan.models);
    bool usable = true;
    enum wa_status status = plan.models != NULL ? WA_OK : wa_fail_memory(error);
    for (size_t m = 0; status == WA_OK && m < plan.model_count; m++) {
        status = predict(experiment, chosen[m], change, volume_mL, count, &plan.models[m], error);
        usable = usable && plan.models[m].usable;
    }
    expected->bits = 0.0;
    if (status == WA_OK && usable) {
        wa_outlook_simulate(outlook, threshold, draw_readings, &plan, expected);
    }
    free(plan.models);
    return status;
}

/* Volumes of the window from `low` pH up, within the run and a little beyond; false when the
 * titration does not pass it. */
static bool window_volumes(const struct wa_experiment *experiment, const struct wa_fit *fit,
                           double low, double range_mL[2])
{
    const double most = beyond_end * experiment->volume_mL[experiment->count - 1];
    double at[2];
    struct wa_error ignored;
    for (int end = 0; end < 2; end++) {
        if (wa_titration_volume(&fit->titration, low + end * window_width, &at[end], &ignored) !=
            WA_OK) {
            return false;
        }
        at[end] = fmin(fmax(at[end], 0.0), most);
    }
    range_mL[0] = fmin(at[0], at[1]);
    range_mL[1] = fmax(at[0], at[1]);
    return range_mL[1] - range_mL[0] > 1e-3 * most;
}

static enum wa_status weigh_windows(const struct wa_experiment *experiment,
                                    const struct wa_outlook *outlook, double threshold,
                                    struct wa_expected *best, struct wa_error *error)
{
    static const struct change none = {.dilution = 1.0};
    enum wa_status status = WA_OK;
    *best = (struct wa_expected){.kind = WA_EXPECTED_POINTS, .points = window_points};
    for (int w = 0; status == WA_OK && w < windows; w++) {
        struct wa_expected window = *best;
        double volume_mL[POINTS_MAX];
        window.pH[0] = window_low + w * window_width;
        window.pH[1] = window.pH[0] + window_width;
        if (!window_volumes(experiment, outlook->entities[0].fit, window.pH[0], window.volume_mL)) {
            continue;
        }
        for (int i = 0; i < window_points; i++) {
            volume_mL[i] = window.volume_mL[0] +
                           (window.volume_mL[1] - window.volume_mL[0]) * (i + 0.5) / window_points;
        }
        status = weigh_plan(experiment, outlook, threshold, &none, volume_mL, (size_t)window_points,
                            &window, error);
        if (status == WA_OK && window.bits > best->bits) {
            *best = window;
        }
    }
    return status;
}

/* A whole further run under a change, its points even in volume. */
static enum wa_status weigh_run(const struct wa_experiment *experiment,
                                const struct wa_outlook *outlook, double threshold,
                                enum wa_expected_kind kind, const struct change *change,
                                struct wa_expected *run, struct wa_error *error)
{
    double volume_mL[POINTS_MAX];
    const double last = experiment->volume_mL[experiment->count - 1] / change->dilution;
    *run = (struct wa_expected){.kind = kind,
                                .points = POINTS_MAX,
                                .temperature_C = experiment->temperature_C + change->warmer_K};
    for (int i = 0; i < POINTS_MAX; i++) {
        volume_mL[i] = last * i / (POINTS_MAX - 1);
    }
    return weigh_plan(experiment, outlook, threshold, change, volume_mL, POINTS_MAX, run, error);
}

enum wa_status wa_outlook_runs(const struct wa_experiment *experiment,
                               const struct wa_outlook *outlook, double threshold,
                               struct wa_expected runs[OUTLOOK_RUNS_MAX], size_t *count,
                               struct wa_error *error)
{
    const struct change concentrated = {.dilution = concentration_factor};
    const struct change warmer = {.dilution = 1.0, .warmer_K = warmer_K};
    const struct change salted = {.dilution = 1.0, .salt = added_salt};
    enum wa_status status = weigh_windows(experiment, outlook, threshold, &runs[0], error);
    if (status == WA_OK) {
        status = weigh_run(experiment, outlook, threshold, WA_EXPECTED_CONCENTRATED, &concentrated,
                           &runs[1], error);
    }
    if (status == WA_OK) {
        status = weigh_run(experiment, outlook, threshold, WA_EXPECTED_TEMPERATURE, &warmer,
                           &runs[2], error);
    }
    if (status == WA_OK) {
        status = weigh_run(experiment, outlook, threshold, WA_EXPECTED_IONIC_STRENGTH, &salted,
                           &runs[3], error);
    }
    *count = OUTLOOK_RUNS_MAX;
    return status;
}
