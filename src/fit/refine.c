/* The refinement itself: least squares by GSL with frozen weights, alternating with the weights,
 * the outlier probabilities and the noise levels, until nothing moves. Each round is a step of an
 * expectation-maximisation for the likelihood in noise.c, so that the likelihood never falls. */
#include "fit/fit_internal.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>
#include <gsl/gsl_multifit_nlinear.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const int default_iterations = 60;
static const size_t steps_a_round = 1; /* more would polish weights that are about to move */
static const double settled = 5e-3;    /* in posterior standard deviations */

/* lg 4: two alike and independent sites; the softness lets hydrogen-bonded pairs pass. */
static const double alike_spacing = 0.60205999132796239;
static const double alike_softness = 0.15;

/* Everything one fit works on. Parameters are handled as deviations from their prior means in
 * prior standard deviations, so that each prior is the residual of its own parameter. */
struct work {
    const struct wa_experiment *experiment;
    const struct wa_sample_model *sample;
    struct wa_parameter *parameters;
    int count;
    struct wa_point_model *points;
    double *jacobian;  /* natural units, count to a point */
    double *precision; /* frozen precision of each reading */
    double *square;    /* expected squared residual */
    double *inlier;
    double *value; /* natural units */
    gsl_vector *deviation;
    gsl_vector *evaluated_at; /* deviations that points and jacobian belong to */
    bool evaluated;
    gsl_matrix *information;
    gsl_vector *scratch;
    gsl_multifit_nlinear_workspace *solver;
    struct wa_noise noise;
    double log_determinant;
};

static size_t hinge_count(const struct wa_sample_model *sample)
{
    size_t count = 0;
    for (int k = 0; sample->alike_sites && k < sample->part_count; k++) {
        count += (size_t)(sample->parts[k].step_count - 1);
    }
    return count;
}

/* The parameter indices of two successive free constants of one part, for one hinge. */
static bool hinge_pair(const struct work *work, size_t hinge, int *low, int *high)
{
    size_t seen = 0;
    for (int i = 0; i + 1 < work->count; i++) {
        const struct wa_parameter *a = &work->parameters[i];
        const struct wa_parameter *b = &work->parameters[i + 1];
        if (a->kind == WA_PARAMETER_PK && b->kind == WA_PARAMETER_PK && a->part == b->part) {
            if (seen == hinge) {
                *low = i;
                *high = i + 1;
                return true;
            }
            seen++;
        }
    }
    return false;
}

static double hinge_residual(const struct work *work, int low, int high)
{
    const double spacing = work->value[high] - work->value[low];
    return fmax(alike_spacing - spacing, 0.0) / alike_softness;
}

/* Bring points and jacobian to a vector of deviations, unless they are there already. */
static int evaluate(struct work *work, const gsl_vector *deviation)
{
    if (work->evaluated && gsl_vector_equal(deviation, work->evaluated_at)) {
        return GSL_SUCCESS;
    }
    for (int i = 0; i < work->count; i++) {
        const struct wa_parameter *parameter = &work->parameters[i];
        work->value[i] =
            parameter->prior.mean + parameter->prior.u * gsl_vector_get(deviation, (size_t)i);
    }
    struct wa_error error;
    work->evaluated =
        wa_model_evaluate(work->experiment, work->sample, work->parameters, work->value,
                          work->count, work->points, work->jacobian, &error) == WA_OK;
    gsl_vector_memcpy(work->evaluated_at, deviation);
    return work->evaluated ? GSL_SUCCESS : GSL_EFAILED;
}

static int residual_callback(const gsl_vector *deviation, void *data, gsl_vector *residual)
{
    struct work *work = data;
    if (evaluate(work, deviation) != GSL_SUCCESS) {
        return GSL_EFAILED;
    }
    size_t row = 0;
    for (size_t p = 0; p < work->experiment->count; p++) {
        const double difference = work->points[p].expected - work->experiment->reading[p];
        gsl_vector_set(residual, row++, sqrt(work->precision[p]) * difference);
    }
    for (int i = 0; i < work->count; i++) {
        gsl_vector_set(residual, row++, gsl_vector_get(deviation, (size_t)i));
    }
    for (size_t hinge = 0; row < residual->size; hinge++) {
        int low, high;
        gsl_vector_set(residual, row++,
                       hinge_pair(work, hinge, &low, &high) ? hinge_residual(work, low, high)
                                                            : 0.0);
    }
    return GSL_SUCCESS;
}

static int jacobian_callback(const gsl_vector *deviation, void *data, gsl_matrix *jacobian)
{
    struct work *work = data;
    if (evaluate(work, deviation) != GSL_SUCCESS) {
        return GSL_EFAILED;
    }
    const size_t count = (size_t)work->count;
    size_t row = 0;
    for (size_t p = 0; p < work->experiment->count; p++, row++) {
        const double root = sqrt(work->precision[p]);
        for (size_t i = 0; i < count; i++) {
            gsl_matrix_set(jacobian, row, i,
                           root * work->jacobian[p * count + i] * work->parameters[i].prior.u);
        }
    }
    for (size_t i = 0; i < count; i++, row++) {
        for (size_t j = 0; j < count; j++) {
            gsl_matrix_set(jacobian, row, j, i == j ? 1.0 : 0.0);
        }
    }
    for (size_t hinge = 0; row < jacobian->size1; hinge++, row++) {
        gsl_vector_view line = gsl_matrix_row(jacobian, row);
        int low, high;
        gsl_vector_set_zero(&line.vector);
        if (hinge_pair(work, hinge, &low, &high) && hinge_residual(work, low, high) > 0.0) {
            gsl_vector_set(&line.vector, (size_t)low,
                           work->parameters[low].prior.u / alike_softness);
            gsl_vector_set(&line.vector, (size_t)high,
                           -work->parameters[high].prior.u / alike_softness);
        }
    }
    return GSL_SUCCESS;
}

/* Freeze the weights at the current parameters; returns the log likelihood. */
static double weigh(struct work *work)
{
    double sum = 0.0;
    for (size_t p = 0; p < work->experiment->count; p++) {
        const double residual = work->experiment->reading[p] - work->points[p].expected;
        const double variance = wa_noise_variance(&work->noise, &work->points[p]);
        const double wide = variance + WA_OUTLIER_SPREAD * WA_OUTLIER_SPREAD;
        sum += wa_noise_log_likelihood(residual, variance, &work->inlier[p]);
        work->precision[p] = work->inlier[p] / variance + (1.0 - work->inlier[p]) / wide;
        work->square[p] = residual * residual;
    }
    return sum;
}

/* Information matrix of the deviations with the frozen weights, factored by Cholesky. */
static bool inform(struct work *work)
{
    const size_t count = (size_t)work->count;
    gsl_matrix_set_identity(work->information);
    for (size_t p = 0; p < work->experiment->count; p++) {
        for (size_t i = 0; i < count; i++) {
            const double entry = work->jacobian[p * count + i] * work->parameters[i].prior.u;
            gsl_vector_set(work->scratch, i, entry);
        }
        gsl_blas_dsyr(CblasLower, work->precision[p], work->scratch, work->information);
    }
    for (size_t hinge = 0; hinge < hinge_count(work->sample); hinge++) {
        int low, high;
        if (hinge_pair(work, hinge, &low, &high) && hinge_residual(work, low, high) > 0.0) {
            gsl_vector_set_zero(work->scratch);
            gsl_vector_set(work->scratch, (size_t)low,
                           work->parameters[low].prior.u / alike_softness);
            gsl_vector_set(work->scratch, (size_t)high,
                           -work->parameters[high].prior.u / alike_softness);
            gsl_blas_dsyr(CblasLower, 1.0, work->scratch, work->information);
        }
    }
    if (gsl_linalg_cholesky_decomp1(work->information) != GSL_SUCCESS) {
        return false;
    }
    work->log_determinant = 0.0;
    for (size_t i = 0; i < count; i++) {
        work->log_determinant += 2.0 * log(gsl_matrix_get(work->information, i, i));
    }
    return isfinite(work->log_determinant);
}

/* Add to each squared residual its variance by the parameters: without it the noise would be
 * taken too small by the share of the points that the parameters have used up. */
static void expect_squares(struct work *work)
{
    const size_t count = (size_t)work->count;
    for (size_t p = 0; p < work->experiment->count; p++) {
        for (size_t i = 0; i < count; i++) {
            gsl_vector_set(work->scratch, i,
                           work->jacobian[p * count + i] * work->parameters[i].prior.u);
        }
        gsl_blas_dtrsv(CblasLower, CblasNoTrans, CblasNonUnit, work->information, work->scratch);
        double leverage;
        gsl_blas_ddot(work->scratch, work->scratch, &leverage);
        work->square[p] += leverage;
    }
}

/* Least squares with frozen weights; false when the model cannot be evaluated at the start. */
static bool solve_round(struct work *work)
{
    gsl_multifit_nlinear_fdf system = {
        .f = residual_callback,
        .df = jacobian_callback,
        .n = work->solver->f->size,
        .p = (size_t)work->count,
        .params = work,
    };
    int info;
    if (gsl_multifit_nlinear_init(work->deviation, &system, work->solver) != GSL_SUCCESS) {
        return false;
    }
    gsl_multifit_nlinear_driver(steps_a_round, 1e-7, 1e-7, 0.0, NULL, NULL, &info, work->solver);
    return true;
}

/* Largest move between two vectors of deviations, in posterior standard deviations: the norm in
 * the metric of the information matrix bounds each of them. */
static double move_between(struct work *work, const gsl_vector *before, const gsl_vector *after)
{
    gsl_vector_memcpy(work->scratch, after);
    gsl_vector_sub(work->scratch, before);
    gsl_blas_dtrmv(CblasLower, CblasTrans, CblasNonUnit, work->information, work->scratch);
    return gsl_blas_dnrm2(work->scratch);
}

/* Alternate until parameters and noise stand still. */
static bool iterate(struct work *work, int most_iterations)
{
    for (int round = 0; round < most_iterations; round++) {
        if (evaluate(work, work->deviation) != GSL_SUCCESS) {
            return false;
        }
        weigh(work);
        if (!solve_round(work)) {
            return false;
        }
        if (evaluate(work, work->solver->x) != GSL_SUCCESS || !inform(work)) {
            return false;
        }
        const double move = move_between(work, work->deviation, work->solver->x);
        gsl_vector_memcpy(work->deviation, work->solver->x);
        weigh(work);
        expect_squares(work);
        const struct wa_noise before = work->noise;
        wa_noise_update(work->experiment, work->points, work->square, work->inlier, &work->noise);
        const double noise_move = fmax(fabs(log(work->noise.reading / before.reading)),
                                       fabs(log(work->noise.volume / before.volume)));
        if (move < settled && noise_move < settled) {
            return true;
        }
    }
    return false;
}

static double log_prior_of_noise(const struct wa_prior *prior, double level)
{
    const double deviation = (log(level) - prior->mean) / prior->u;
    return -0.5 * deviation * deviation - log(prior->u);
}

/* Laplace: the priors' normalisation and the Gaussian integral cancel but for the determinants. */
static double log_evidence(struct work *work, double log_likelihood)
{
    double sum = log_likelihood;
    for (int i = 0; i < work->count; i++) {
        const double deviation = gsl_vector_get(work->deviation, (size_t)i);
        sum -= 0.5 * deviation * deviation;
    }
    for (size_t hinge = 0; hinge < hinge_count(work->sample); hinge++) {
        int low, high;
        if (hinge_pair(work, hinge, &low, &high)) {
            const double residual = hinge_residual(work, low, high);
            sum -= 0.5 * residual * residual;
        }
    }
    sum += log_prior_of_noise(&work->experiment->ln_noise_reading, work->noise.reading);
    sum += log_prior_of_noise(&work->experiment->ln_noise_volume, work->noise.volume);
    return sum - 0.5 * work->log_determinant - 0.5 * work->noise.log_determinant;
}

static void store_points(const struct work *work, struct wa_fit *fit)
{
    double square = 0.0, ionic = 0.0;
    const size_t count = work->experiment->count;
    for (size_t p = 0; p < count; p++) {
        const double residual = work->experiment->reading[p] - work->points[p].expected;
        const double variance = wa_noise_variance(&work->noise, &work->points[p]);
        fit->model[p] = work->points[p].expected;
        fit->residual[p] = residual / sqrt(variance);
        fit->outlier[p] = 1.0 - work->inlier[p];
        square += work->inlier[p] * fit->residual[p] * fit->residual[p];
        ionic += work->points[p].ionic_strength;
    }
    fit->misfit = sqrt(square / (double)count);
    fit->ionic_strength = ionic / (double)count;
}

static void store_parameters(struct work *work, struct wa_fit *fit)
{
    const size_t count = (size_t)work->count;
    gsl_linalg_cholesky_invert(work->information);
    for (size_t i = 0; i < count; i++) {
        struct wa_parameter *parameter = &fit->parameters[i];
        parameter->value = work->value[i];
        parameter->u = parameter->prior.u * sqrt(gsl_matrix_get(work->information, i, i));
        for (size_t j = 0; j < count; j++) {
            fit->covariance[i * count + j] = gsl_matrix_get(work->information, i, j) *
                                             parameter->prior.u * fit->parameters[j].prior.u;
        }
    }
}

static void store(struct work *work, struct wa_fit *fit)
{
    struct wa_layout layout;
    fit->log_likelihood = weigh(work);
    fit->log_evidence = log_evidence(work, fit->log_likelihood);
    fit->noise_reading = work->noise.reading;
    fit->noise_volume = work->noise.volume;
    store_points(work, fit);
    wa_model_titration(work->experiment, work->sample, work->parameters, work->value, work->count,
                       &fit->titration, &layout);
    work->noise = wa_noise_marginal(&work->noise);
    weigh(work);
    if (inform(work)) {
        store_parameters(work, fit);
    } else {
        fit->converged = false;
    }
}

static bool allocate_fit(size_t points, size_t count, struct wa_fit *fit)
{
    fit->covariance = calloc(count * count, sizeof *fit->covariance);
    fit->model = calloc(points, sizeof *fit->model);
    fit->residual = calloc(points, sizeof *fit->residual);
    fit->outlier = calloc(points, sizeof *fit->outlier);
    return fit->covariance != NULL && fit->model != NULL && fit->residual != NULL &&
           fit->outlier != NULL;
}

static bool allocate_work(size_t points, size_t count, struct work *work)
{
    gsl_multifit_nlinear_parameters settings = gsl_multifit_nlinear_default_parameters();
    settings.solver = gsl_multifit_nlinear_solver_cholesky;
    work->points = calloc(points, sizeof *work->points);
    work->jacobian = calloc(points * count, sizeof *work->jacobian);
    work->precision = calloc(points, sizeof *work->precision);
    work->square = calloc(points, sizeof *work->square);
    work->inlier = calloc(points, sizeof *work->inlier);
    work->value = calloc(count, sizeof *work->value);
    work->deviation = gsl_vector_calloc(count);
    work->evaluated_at = gsl_vector_calloc(count);
    work->scratch = gsl_vector_calloc(count);
    work->information = gsl_matrix_calloc(count, count);
    work->solver = gsl_multifit_nlinear_alloc(gsl_multifit_nlinear_trust, &settings,
                                              points + count + hinge_count(work->sample), count);
    return work->points != NULL && work->jacobian != NULL && work->precision != NULL &&
           work->square != NULL && work->inlier != NULL && work->value != NULL &&
           work->deviation != NULL && work->evaluated_at != NULL && work->scratch != NULL &&
           work->information != NULL && work->solver != NULL;
}

static void free_work(struct work *work)
{
    free(work->points);
    free(work->jacobian);
    free(work->precision);
    free(work->square);
    free(work->inlier);
    free(work->value);
    gsl_vector_free(work->deviation);
    gsl_vector_free(work->evaluated_at);
    gsl_vector_free(work->scratch);
    gsl_matrix_free(work->information);
    gsl_multifit_nlinear_free(work->solver);
}

enum wa_status wa_fit_run(const struct wa_experiment *experiment,
                          const struct wa_sample_model *sample,
                          const struct wa_fit_options *options, const double *start,
                          struct wa_fit *fit, struct wa_error *error)
{
    /* GSL's default handler would end the program; every status is looked at here instead. */
    gsl_set_error_handler_off();
    const int most = options != NULL && options->most_iterations > 0 ? options->most_iterations
                                                                     : default_iterations;
    *fit = (struct wa_fit){.parameter_count = 0};
    fit->parameter_count = wa_fit_parameters(experiment, sample, fit->parameters);
    struct work work = {.experiment = experiment,
                        .sample = sample,
                        .parameters = fit->parameters,
                        .count = fit->parameter_count};
    if (!allocate_fit(experiment->count, (size_t)fit->parameter_count, fit) ||
        !allocate_work(experiment->count, (size_t)fit->parameter_count, &work)) {
        free_work(&work);
        wa_fit_free(fit);
        return wa_fail_memory(error);
    }
    for (int i = 0; start != NULL && i < work.count; i++) {
        const struct wa_prior *prior = &fit->parameters[i].prior;
        gsl_vector_set(work.deviation, (size_t)i, (start[i] - prior->mean) / prior->u);
    }
    work.noise.reading = exp(experiment->ln_noise_reading.mean);
    work.noise.volume = exp(experiment->ln_noise_volume.mean);
    fit->converged = iterate(&work, most);
    if (work.evaluated && isfinite(work.log_determinant)) {
        store(&work, fit);
    } else {
        fit->converged = false;
    }
    free_work(&work);
    return WA_OK;
}

void wa_fit_free(struct wa_fit *fit)
{
    if (fit != NULL) {
        free(fit->covariance);
        free(fit->model);
        free(fit->residual);
        free(fit->outlier);
        *fit = (struct wa_fit){.parameter_count = 0};
    }
}
