/* The refinement itself: a damped Gauss-Newton step with frozen weights, then new weights, outlier
 * probabilities and noise levels, until nothing moves: an expectation-maximisation for the
 * likelihood in noise.c. GSL's trust regions are not used because they would start afresh in every
 * round, and crawl along directions that only the priors determine; with every prior an
 * observation, the normal equations are well conditioned and a full step nearly always serves. */
#include "fit/fit_internal.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const int default_iterations = 60;
static const double first_bluntness = 64.0; /* and its share that is left after each round */
static const double bluntness_left = 0.6;
static const int halvings = 8;
static const int rounds_undamped = 12;
static const double afar_reading = 0.1;  /* pH */
static const double afar_volume = 0.005; /* of the last volume */
static const double longest_pK_step = 1.5;
static const double longest_ln_step = 0.7;
static const double default_settled = 5e-3; /* in posterior standard deviations */

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
    gsl_matrix *prior; /* precision of the deviations before the data */
    gsl_vector *scratch;
    gsl_vector *step;
    gsl_vector *trial;
    struct wa_noise noise;
    double bluntness; /* factor on both noise levels while a fit from afar sharpens its weights */
    double log_determinant;
    double log_determinant_prior;
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

/* Freeze the weights at the current parameters; returns the log likelihood. */
static double weigh(struct work *work)
{
    const double outlier_share = wa_outlier_share(work->experiment);
    double sum = 0.0;
    for (size_t p = 0; p < work->experiment->count; p++) {
        const double residual = work->experiment->reading[p] - work->points[p].expected;
        const double variance =
            wa_noise_variance(&work->noise, &work->points[p]) * work->bluntness * work->bluntness;
        const double wide = variance + WA_OUTLIER_SPREAD * WA_OUTLIER_SPREAD;
        sum += wa_noise_log_likelihood(outlier_share, residual, variance, &work->inlier[p]);
        work->precision[p] = work->inlier[p] / variance + (1.0 - work->inlier[p]) / wide;
        work->square[p] = residual * residual;
    }
    return sum;
}

/* Information matrix of the deviations with the frozen weights, factored by Cholesky. */
static bool inform(struct work *work)
{
    const size_t count = (size_t)work->count;
    gsl_matrix_memcpy(work->information, work->prior);
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

/* Gradient of the frozen objective: minus half the weighted squares, priors and hinges in. */
static void gradient(const struct work *work, gsl_vector *slope)
{
    const size_t count = (size_t)work->count;
    gsl_blas_dsymv(CblasLower, -1.0, work->prior, work->deviation, 0.0, slope);
    for (size_t p = 0; p < work->experiment->count; p++) {
        const double pull =
            work->precision[p] * (work->experiment->reading[p] - work->points[p].expected);
        for (size_t i = 0; i < count; i++) {
            *gsl_vector_ptr(slope, i) +=
                pull * work->jacobian[p * count + i] * work->parameters[i].prior.u;
        }
    }
    for (size_t hinge = 0; hinge < hinge_count(work->sample); hinge++) {
        int low, high;
        if (hinge_pair(work, hinge, &low, &high)) {
            const double residual = hinge_residual(work, low, high) / alike_softness;
            *gsl_vector_ptr(slope, (size_t)low) -= residual * work->parameters[low].prior.u;
            *gsl_vector_ptr(slope, (size_t)high) += residual * work->parameters[high].prior.u;
        }
    }
}

/* Squared length of deviations in the metric of the prior. */
static double prior_square(const struct work *work, const gsl_vector *deviation)
{
    double square;
    gsl_blas_dsymv(CblasLower, 1.0, work->prior, deviation, 0.0, work->scratch);
    gsl_blas_ddot(work->scratch, deviation, &square);
    return square;
}

/* The frozen objective at the parameters evaluated last. */
static double objective(const struct work *work)
{
    double sum = 0.0;
    for (size_t p = 0; p < work->experiment->count; p++) {
        const double residual = work->experiment->reading[p] - work->points[p].expected;
        sum -= 0.5 * work->precision[p] * residual * residual;
    }
    for (size_t hinge = 0; hinge < hinge_count(work->sample); hinge++) {
        int low, high;
        if (hinge_pair(work, hinge, &low, &high)) {
            const double residual = hinge_residual(work, low, high);
            sum -= 0.5 * residual * residual;
        }
    }
    return sum - 0.5 * prior_square(work, work->evaluated_at);
}

/* The part of a step that keeps every parameter within its longest step. */
static double step_length(const struct work *work, const gsl_vector *step)
{
    double length = 1.0;
    for (int i = 0; i < work->count; i++) {
        const struct wa_parameter *parameter = &work->parameters[i];
        const double change = fabs(gsl_vector_get(step, (size_t)i)) * parameter->prior.u;
        const bool logarithm = parameter->kind == WA_PARAMETER_LN_AMOUNT ||
                               parameter->kind == WA_PARAMETER_LN_TITRANT ||
                               parameter->kind == WA_PARAMETER_LN_VOLUME;
        if (parameter->kind == WA_PARAMETER_PK) {
            length = fmin(length, longest_pK_step / fmax(change, 1e-300));
        } else if (logarithm) {
            length = fmin(length, longest_ln_step / fmax(change, 1e-300));
        }
    }
    return length;
}

/* One damped step with frozen weights, taken; `move` is its length in posterior standard
 * deviations. False when the model cannot be evaluated or nothing improves. */
static bool take_step(struct work *work, double *move)
{
    gsl_vector *step = work->step, *trial = work->trial;
    if (!inform(work)) {
        return false;
    }
    gradient(work, step);
    gsl_linalg_cholesky_svx(work->information, step);
    const double before = objective(work);
    double length = step_length(work, step);
    for (int halving = 0; halving <= halvings; halving++, length *= 0.5) {
        gsl_vector_memcpy(trial, step);
        gsl_vector_scale(trial, length);
        gsl_vector_memcpy(work->scratch, trial);
        gsl_blas_dtrmv(CblasLower, CblasTrans, CblasNonUnit, work->information, work->scratch);
        *move = gsl_blas_dnrm2(work->scratch);
        gsl_vector_add(trial, work->deviation);
        if (evaluate(work, trial) == GSL_SUCCESS &&
            objective(work) >= before - 1e-9 * fabs(before)) {
            gsl_vector_memcpy(work->deviation, trial);
            return true;
        }
    }
    /* Rounding leaves nothing to gain: the last point stands. */
    *move = 0.0;
    return evaluate(work, work->deviation) == GSL_SUCCESS;
}

static int by_size(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

/* How blunt the weights should be: as much as the median residual asks for, and less each round. A
 * start from which most points lie many u away would otherwise take them for outliers, and stay. */
static double bluntness(struct work *work, int round)
{
    static const double median_of_normal = 0.6745;
    const size_t count = work->experiment->count;
    for (size_t p = 0; p < count; p++) {
        const double residual = work->experiment->reading[p] - work->points[p].expected;
        work->square[p] = fabs(residual) / sqrt(wa_noise_variance(&work->noise, &work->points[p]));
    }
    qsort(work->square, count, sizeof *work->square, by_size);
    const double wanted = work->square[count / 2] / median_of_normal;
    return fmax(fmin(wanted, first_bluntness * pow(bluntness_left, round)), 1.0);
}

/* Half the change of the noise levels: the two can trade places for ever, each round's levels
 * asking for the parameters that ask for the others. */
static void damp_noise(const struct wa_noise *before, struct wa_noise *noise)
{
    noise->reading = sqrt(before->reading * noise->reading);
    noise->volume = sqrt(before->volume * noise->volume);
}

/* Alternate until parameters and noise stand still. */
static bool iterate(struct work *work, int most_iterations, double settled, bool from_afar)
{
    if (evaluate(work, work->deviation) != GSL_SUCCESS) {
        return false;
    }
    for (int round = 0; round < most_iterations; round++) {
        double move;
        work->bluntness = from_afar ? bluntness(work, round) : 1.0;
        weigh(work);
        if (!take_step(work, &move)) {
            return false;
        }
        work->bluntness = 1.0;
        weigh(work);
        if (!inform(work)) {
            return false;
        }
        expect_squares(work);
        const struct wa_noise before = work->noise;
        wa_noise_update(work->experiment, work->points, work->square, work->inlier, &work->noise);
        if (round >= rounds_undamped) {
            damp_noise(&before, &work->noise);
        }
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
    double sum = log_likelihood - 0.5 * prior_square(work, work->deviation) +
                 0.5 * work->log_determinant_prior;
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
    work->prior = gsl_matrix_calloc(count, count);
    work->step = gsl_vector_calloc(count);
    work->trial = gsl_vector_calloc(count);
    return work->points != NULL && work->jacobian != NULL && work->precision != NULL &&
           work->square != NULL && work->inlier != NULL && work->value != NULL &&
           work->deviation != NULL && work->evaluated_at != NULL && work->scratch != NULL &&
           work->information != NULL && work->prior != NULL && work->step != NULL &&
           work->trial != NULL;
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
    gsl_matrix_free(work->prior);
    gsl_vector_free(work->step);
    gsl_vector_free(work->trial);
}

/* Noise levels to start from; from afar no lower than what a start may be off by. */
static void start_noise(const struct wa_experiment *experiment, bool from_afar,
                        struct wa_noise *noise)
{
    const double last = experiment->volume_mL[experiment->count - 1];
    noise->reading = exp(experiment->ln_noise_reading.mean);
    noise->volume = exp(experiment->ln_noise_volume.mean);
    if (from_afar) {
        noise->reading = fmax(noise->reading, afar_reading);
        noise->volume = fmax(noise->volume, afar_volume * last);
    }
}

static void set_prior(const struct wa_joint_prior *joint, struct work *work)
{
    gsl_matrix_set_identity(work->prior);
    work->log_determinant_prior = joint != NULL ? joint->log_determinant : 0.0;
    for (size_t i = 0; joint != NULL && i < work->prior->size1; i++) {
        for (size_t j = 0; j < work->prior->size2; j++) {
            gsl_matrix_set(work->prior, i, j, joint->precision[i * work->prior->size2 + j]);
        }
    }
}

enum wa_status wa_fit_single(const struct wa_experiment *experiment,
                             const struct wa_sample_model *sample,
                             const struct wa_fit_options *options, const double *start,
                             const struct wa_joint_prior *joint, struct wa_fit *fit,
                             struct wa_error *error)
{
    /* GSL's default handler would end the program; every status is looked at here instead. */
    gsl_set_error_handler_off();
    const int most = options != NULL && options->most_iterations > 0 ? options->most_iterations
                                                                     : default_iterations;
    const double settled =
        options != NULL && options->settled > 0.0 ? options->settled : default_settled;
    *fit = (struct wa_fit){.run_count = 1};
    fit->parameter_count = wa_fit_parameters(experiment, sample, fit->parameters);
    if (joint != NULL) {
        memcpy(fit->parameters, joint->parameters,
               (size_t)fit->parameter_count * sizeof fit->parameters[0]);
    }
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
    set_prior(joint, &work);
    for (int i = 0; start != NULL && i < work.count; i++) {
        const struct wa_prior *prior = &fit->parameters[i].prior;
        gsl_vector_set(work.deviation, (size_t)i, (start[i] - prior->mean) / prior->u);
    }
    const bool from_afar = options != NULL && options->from_afar;
    start_noise(experiment, from_afar, &work.noise);
    fit->converged = iterate(&work, most, settled, from_afar);
    if (work.evaluated && isfinite(work.log_determinant)) {
        store(&work, fit);
        fit->log_evidence_of[0] = fit->log_evidence;
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
