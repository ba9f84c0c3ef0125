/* Self-consistency of the fit: many runs simulated by its own model, nuisances drawn from their
 * priors, noise levels unknown to it. Spread over the Cramer-Rao bound (priors in), bias and cover
 * of the 95 % intervals, for every constant and the amount.
 *
 * Usage: spread CASE class|instrument RUNS SEED. The aims are a spread of at most 1.08, a bias
 * under 0.1 u and a cover of 93 to 97 %; a figure beyond its aim is marked by a star. Exit status 1
 * when one is beyond by more than three standard deviations of its own, sd 1/sqrt(2 N) for the
 * spread, 1/sqrt(N) for the bias and the binomial sqrt(0.95 * 0.05 / N) for the cover, or when more
 * than one run in 200 does not converge. */
#include "fit_cases.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>

#include <stdio.h>

#define SPREAD_POINTS 60
#define WATCHED_MAX 6

/* The starts are up to 0.3 in pK and a tenth of the amount off. */
static const struct wa_fit_options from_afar = {.from_afar = true};

static const double aim_spread = 1.08;
static const double aim_bias = 0.1;
static const double aim_cover = 0.02;
static const double allowed = 3.0; /* standard deviations of the figure */

/* One level for the work of a class, one for an automatic instrument. */
static const struct wa_noise class_noise = {.reading = 0.02, .volume = 0.02};
static const struct wa_noise instrument_noise = {.reading = 0.003, .volume = 0.002};

/* Sums over the runs for one parameter. */
struct watched {
    int index; /* among the parameters */
    char name[16];
    double bound;   /* sum of Cramer-Rao variances */
    double error;   /* sum of estimate less truth */
    double square;  /* of its squares */
    double in_u;    /* sum of errors in stated uncertainties */
    double covered; /* count */
};

static void watch(const struct wa_parameter *parameters, int count, struct watched *list,
                  int *watched)
{
    for (int i = 0; i < count && *watched < WATCHED_MAX; i++) {
        struct watched *w = &list[*watched];
        if (parameters[i].kind == WA_PARAMETER_PK) {
            snprintf(w->name, sizeof w->name, "pK%d", parameters[i].step + 1);
        } else if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            snprintf(w->name, sizeof w->name, "ln amount");
        } else {
            continue;
        }
        w->index = i;
        (*watched)++;
    }
}

/* Variances that no unbiased estimate undercuts: the inverse information at the truth and the true
 * noise, with each prior as one more observation. */
static bool bounds(const struct wa_experiment *experiment, const struct wa_sample_model *sample,
                   const struct wa_parameter *parameters, const double *truth, int count,
                   const struct wa_noise *noise, double *variance)
{
    static struct wa_point_model work[SPREAD_POINTS];
    static double precision[SPREAD_POINTS], jacobian[SPREAD_POINTS * WA_PARAMETERS_MAX];
    if (!case_precisions(experiment, sample, parameters, truth, count, noise, false, work, jacobian,
                         precision)) {
        return false;
    }
    const size_t n = (size_t)count;
    gsl_matrix *information = gsl_matrix_calloc(n, n);
    for (size_t i = 0; i < n; i++) {
        const double u = parameters[i].prior.u;
        for (size_t j = 0; j < n; j++) {
            double sum = i == j ? 1.0 : 0.0;
            for (size_t p = 0; p < experiment->count; p++) {
                sum += precision[p] * jacobian[p * n + i] * u * jacobian[p * n + j] *
                       parameters[j].prior.u;
            }
            gsl_matrix_set(information, i, j, sum);
        }
    }
    const bool made = gsl_linalg_cholesky_decomp1(information) == GSL_SUCCESS;
    gsl_linalg_cholesky_invert(information);
    for (size_t i = 0; i < n; i++) {
        variance[i] =
            gsl_matrix_get(information, i, i) * parameters[i].prior.u * parameters[i].prior.u;
    }
    gsl_matrix_free(information);
    return made;
}

/* One run; false when it did not converge. */
static bool one_run(const struct fit_case *c, const struct wa_noise *noise, gsl_rng *random,
                    struct wa_experiment *experiment, struct watched *list, int *watched)
{
    struct wa_sample_model sample;
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    double truth[WA_PARAMETERS_MAX], start[WA_PARAMETERS_MAX], variance[WA_PARAMETERS_MAX];
    struct wa_fit fit;
    struct wa_error error;
    wa_generic_sample(experiment, c->steps, c->lost, c->charge, &sample);
    const int count = case_truth(c, experiment, &sample, random, parameters, truth);
    if (*watched == 0) {
        watch(parameters, count, list, watched);
    }
    case_start(parameters, truth, count, random, start);
    if (!case_readings(&sample, parameters, truth, count, noise, random, experiment) ||
        !bounds(experiment, &sample, parameters, truth, count, noise, variance) ||
        wa_fit_run(experiment, &sample, &from_afar, start, &fit, &error) != WA_OK) {
        return false;
    }
    for (int k = 0; fit.converged && k < *watched; k++) {
        struct watched *w = &list[k];
        const double off = fit.parameters[w->index].value - truth[w->index];
        const double u = fit.parameters[w->index].u;
        w->bound += variance[w->index];
        w->error += off;
        w->square += off * off;
        w->in_u += off / u;
        w->covered += fabs(off) < 1.959964 * u ? 1.0 : 0.0;
    }
    const bool converged = fit.converged;
    wa_fit_free(&fit);
    return converged;
}

/* Print a figure; false when it is beyond its aim by more than chance explains. */
static bool figure(const char *name, double value, double beyond, double deviation)
{
    const bool good = !(beyond > allowed * deviation);
    printf("  %s %+.3f%s", name, value, beyond > 0.0 ? (good ? "*" : "!") : " ");
    return good;
}

static bool judge(const struct watched *w, double runs)
{
    const double spread = sqrt(w->square / w->bound);
    const double bias = w->in_u / runs;
    const double cover = w->covered / runs;
    printf("  %-10s", w->name);
    bool good = figure("spread", spread, spread - aim_spread, 1.0 / sqrt(2.0 * runs));
    good = figure("bias", bias, fabs(bias) - aim_bias, 1.0 / sqrt(runs)) && good;
    good = figure("cover", cover, fabs(cover - 0.95) - aim_cover, sqrt(0.95 * 0.05 / runs)) && good;
    printf("\n");
    return good;
}

static bool study(const struct fit_case *c, const struct wa_noise *noise, unsigned long runs,
                  unsigned long seed)
{
    struct watched list[WATCHED_MAX] = {{.index = 0}};
    int watched = 0;
    unsigned long lost = 0;
    struct wa_experiment experiment;
    gsl_rng *random = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(random, seed);
    bool good = case_experiment(c, SPREAD_POINTS, &experiment);
    for (unsigned long run = 0; good && run < runs; run++) {
        lost += one_run(c, noise, random, &experiment, list, &watched) ? 0 : 1;
    }
    printf("%s, %g pH and %g mL: %lu runs, %lu without convergence\n", c->name, noise->reading,
           noise->volume, runs, lost);
    good = good && 200 * lost <= runs;
    for (int k = 0; k < watched; k++) {
        good = judge(&list[k], (double)(runs - lost)) && good;
    }
    wa_experiment_free(&experiment);
    gsl_rng_free(random);
    return good;
}

int main(int argument_count, char **arguments)
{
    const struct fit_case *c = NULL;
    for (size_t i = 0; argument_count == 5 && i < FIT_CASE_COUNT; i++) {
        c = strcmp(fit_cases[i].name, arguments[1]) == 0 ? &fit_cases[i] : c;
    }
    if (c == NULL) {
        fprintf(stderr, "Usage: spread CASE class|instrument RUNS SEED\n");
        return 2;
    }
    const bool instrument = strcmp(arguments[2], "instrument") == 0;
    return study(c, instrument ? &instrument_noise : &class_noise, strtoul(arguments[3], NULL, 10),
                 strtoul(arguments[4], NULL, 10))
               ? 0
               : 1;
}
