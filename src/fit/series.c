/* Replicates of one sample, fitted jointly: what the runs before have told of the shared
 * parameters, correlations included, is the prior of the next run. Under Laplace's approximation
 * this is the joint fit, and the evidence of the series is the product of each run's given those
 * before it. */
#include "fit/fit_internal.h"

#include <gsl/gsl_linalg.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double least_share = 0.02; /* of a mass: hydration and purity vary between portions */

/* Whether a parameter is the same thing in both runs. */
static bool is_shared(const struct wa_experiment *a, const struct wa_experiment *b,
                      enum wa_parameter_kind kind)
{
    switch (kind) {
    case WA_PARAMETER_PK:
    case WA_PARAMETER_OFFSET:
    case WA_PARAMETER_SLOPE:
    case WA_PARAMETER_DAVIES:
    case WA_PARAMETER_LN_SOLUBILITY:
        return true;
    case WA_PARAMETER_LN_TITRANT:
    case WA_PARAMETER_LN_CARBONATE:
        /* Another strength is another bottle. */
        return a->titrant_is_base == b->titrant_is_base &&
               fabs(a->ln_titrant.mean - b->ln_titrant.mean) < 1e-9;
    case WA_PARAMETER_LN_AMOUNT:
        return isfinite(a->ln_mass) && isfinite(b->ln_mass);
    default:
        return false;
    }
}

/* What makes the prior of the next run. */
struct joining {
    const struct wa_experiment *first;
    const struct wa_experiment *next;
    const struct wa_fit *fit;
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    int from[WA_PARAMETERS_MAX]; /* index in the fit, -1 for a parameter of the run's own */
    int count;
};

static double amount_shift(const struct joining *joining, const struct wa_parameter *parameter)
{
    return parameter->kind == WA_PARAMETER_LN_AMOUNT
               ? joining->next->ln_mass - joining->first->ln_mass
               : 0.0;
}

static double covariance_of(const struct joining *joining, int i, int j)
{
    const int a = joining->from[i], b = joining->from[j];
    if (a < 0 || b < 0) {
        return i == j ? joining->parameters[i].prior.u * joining->parameters[i].prior.u : 0.0;
    }
    const double weighing = i == j && joining->parameters[i].kind == WA_PARAMETER_LN_AMOUNT
                                ? least_share * least_share * 0.01
                                : 0.0;
    return joining->fit->covariance[a * joining->fit->parameter_count + b] + weighing;
}

/* Marginal priors of the next run's parameters. */
static void join(const struct wa_sample_model *sample, struct joining *joining)
{
    joining->count = wa_fit_parameters(joining->next, sample, joining->parameters);
    for (int i = 0; i < joining->count; i++) {
        struct wa_parameter *parameter = &joining->parameters[i];
        joining->from[i] =
            is_shared(joining->first, joining->next, parameter->kind)
                ? wa_fit_find(joining->fit, parameter->kind, parameter->part, parameter->step)
                : -1;
        if (joining->from[i] >= 0) {
            parameter->prior.mean =
                joining->fit->parameters[joining->from[i]].value + amount_shift(joining, parameter);
            parameter->prior.u = sqrt(covariance_of(joining, i, i));
        }
    }
}

/* Inverse of the correlations between them; false when it cannot be inverted. */
static bool correlate(const struct joining *joining, double *precision, double *log_determinant)
{
    const size_t count = (size_t)joining->count;
    gsl_matrix_view view = gsl_matrix_view_array(precision, count, count);
    for (int i = 0; i < joining->count; i++) {
        for (int j = 0; j < joining->count; j++) {
            const double scale = joining->parameters[i].prior.u * joining->parameters[j].prior.u;
            gsl_matrix_set(&view.matrix, (size_t)i, (size_t)j,
                           covariance_of(joining, i, j) / scale);
        }
    }
    if (gsl_linalg_cholesky_decomp1(&view.matrix) != 0) {
        return false;
    }
    *log_determinant = 0.0;
    for (size_t i = 0; i < count; i++) {
        *log_determinant -= 2.0 * log(gsl_matrix_get(&view.matrix, i, i));
    }
    return gsl_linalg_cholesky_invert(&view.matrix) == 0;
}

/* Old covariance of the shared parameters, factored, and what the next run has made of them. */
struct update {
    int shared[WA_PARAMETERS_MAX]; /* indices in the fit */
    int index[WA_PARAMETERS_MAX];  /* the same parameters in the next run */
    int count;
    double factor[WA_PARAMETERS_MAX * WA_PARAMETERS_MAX];
    double moved[WA_PARAMETERS_MAX]; /* new value less old */
};

static bool prepare_update(const struct joining *joining, const struct wa_fit *next,
                           const struct wa_fit *fit, struct update *update)
{
    update->count = 0;
    for (int i = 0; i < joining->count; i++) {
        if (joining->from[i] >= 0) {
            const int a = joining->from[i];
            update->moved[update->count] = next->parameters[i].value -
                                           amount_shift(joining, &next->parameters[i]) -
                                           fit->parameters[a].value;
            update->index[update->count] = i;
            update->shared[update->count++] = a;
        }
    }
    for (int i = 0; i < update->count; i++) {
        for (int j = 0; j < update->count; j++) {
            update->factor[i * update->count + j] =
                fit->covariance[update->shared[i] * fit->parameter_count + update->shared[j]];
        }
    }
    const size_t size = (size_t)update->count;
    gsl_matrix_view factor = gsl_matrix_view_array(update->factor, size, size);
    return gsl_linalg_cholesky_decomp1(&factor.matrix) == 0;
}

/* Regression of one of the first run's own parameters on the shared ones. */
static void regress(struct update *update, const struct wa_fit *fit, int own, double *weight)
{
    const size_t size = (size_t)update->count;
    gsl_matrix_view factor = gsl_matrix_view_array(update->factor, size, size);
    gsl_vector_view solution = gsl_vector_view_array(weight, size);
    for (int i = 0; i < update->count; i++) {
        weight[i] = fit->covariance[own * fit->parameter_count + update->shared[i]];
    }
    gsl_linalg_cholesky_svx(&factor.matrix, &solution.vector);
}

/* Move one of the first run's own parameters as its regression on the shared ones tells; its
 * covariances with them, and its variance, follow. Two such parameters keep what they shared beside
 * that. */
static void move_own(const struct update *update, const struct wa_fit *next, const double *weight,
                     int own, struct wa_fit *fit)
{
    const int width = fit->parameter_count;
    double variance = fit->covariance[own * width + own];
    for (int i = 0; i < update->count; i++) {
        double cross = 0.0;
        for (int j = 0; j < update->count; j++) {
            cross += weight[j] *
                     next->covariance[update->index[j] * next->parameter_count + update->index[i]];
        }
        const double before = fit->covariance[own * width + update->shared[i]];
        variance += weight[i] * (cross - before);
        fit->covariance[own * width + update->shared[i]] = cross;
        fit->covariance[update->shared[i] * width + own] = cross;
        fit->parameters[own].value += weight[i] * update->moved[i];
    }
    fit->covariance[own * width + own] = fmax(variance, 0.0);
    fit->parameters[own].u = sqrt(fmax(variance, 0.0));
}

/* Take what the next run has added into the fit of the series, in terms of the first run. */
static bool absorb(const struct joining *joining, const struct wa_fit *next, struct wa_fit *fit)
{
    const int width = fit->parameter_count;
    struct update update;
    double weight[WA_PARAMETERS_MAX];
    if (!prepare_update(joining, next, fit, &update)) {
        return false;
    }
    for (int own = 0; own < width; own++) {
        bool shared = false;
        for (int i = 0; i < update.count; i++) {
            shared = shared || update.shared[i] == own;
        }
        if (!shared) {
            regress(&update, fit, own, weight);
            move_own(&update, next, weight, own, fit);
        }
    }
    for (int i = 0; i < update.count; i++) {
        struct wa_parameter *parameter = &fit->parameters[update.shared[i]];
        parameter->value += update.moved[i];
        parameter->u = next->parameters[update.index[i]].u;
        for (int j = 0; j < update.count; j++) {
            fit->covariance[update.shared[i] * width + update.shared[j]] =
                next->covariance[update.index[i] * next->parameter_count + update.index[j]];
        }
    }
    if (fit->run_count < WA_SERIES_MAX) {
        fit->log_evidence_of[fit->run_count++] = next->log_evidence;
    }
    fit->log_evidence += next->log_evidence;
    fit->log_likelihood += next->log_likelihood;
    return true;
}

static enum wa_status fit_next(const struct wa_experiment *first,
                               const struct wa_experiment *experiment,
                               const struct wa_sample_model *sample, struct wa_fit *fit,
                               struct wa_error *error)
{
    /* The spacing of alike sites was asked for with the first run; once is enough. */
    struct wa_sample_model free_sites = *sample;
    struct joining joining = {.first = first, .next = experiment, .fit = fit};
    free_sites.alike_sites = false;
    join(&free_sites, &joining);
    double *precision = calloc((size_t)(joining.count * joining.count), sizeof *precision);
    if (precision == NULL) {
        return wa_fail_memory(error);
    }
    struct wa_joint_prior prior = {.parameters = joining.parameters, .precision = precision};
    struct wa_fit next = {.parameter_count = 0};
    enum wa_status status = WA_OK;
    if (correlate(&joining, precision, &prior.log_determinant)) {
        status = wa_fit_single(experiment, &free_sites, NULL, NULL, &prior, &next, error);
    }
    free(precision);
    fit->converged = status == WA_OK && next.converged && absorb(&joining, &next, fit);
    wa_fit_free(&next);
    return status;
}

enum wa_status wa_fit_run(const struct wa_experiment *experiment,
                          const struct wa_sample_model *sample,
                          const struct wa_fit_options *options, const double *start,
                          struct wa_fit *fit, struct wa_error *error)
{
    enum wa_status status = wa_fit_single(experiment, sample, options, start, NULL, fit, error);
    const bool trial = options != NULL && options->most_iterations > 0;
    for (const struct wa_experiment *next = experiment->next;
         status == WA_OK && !trial && fit->converged && next != NULL; next = next->next) {
        status = fit_next(experiment, next, sample, fit, error);
    }
    return status;
}
