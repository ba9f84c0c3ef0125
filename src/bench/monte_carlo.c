/* Propagation of distributions, JCGM 101:2008: the adaptive procedure of 7.9.4 and the validation
 * of 8.1. */
#include "whichacid/bench_budget.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <gsl/gsl_sort.h>
#include <math.h>
#include <stdlib.h>

#define BLOCK 10000
#define BLOCKS_MAX 100
#define BLOCKS_MIN 5

/* What each block gives: value, u, and the two end points. */
enum { block_mean, block_u, block_low, block_high, block_figures };

struct sampling {
    const struct wa_bench_budget *budget;
    wa_bench_model *model;
    const void *context;
    gsl_rng *random;
    double *values; /* of one block, sorted */
    double figures[block_figures][BLOCKS_MAX];
    size_t blocks;
};

static double draw(const struct wa_bench_input *input, gsl_rng *random)
{
    switch (input->distribution) {
    case WA_RECTANGULAR:
        return input->value + input->u * sqrt(3.0) * (2.0 * gsl_rng_uniform(random) - 1.0);
    case WA_TRIANGULAR:
        return input->value +
               input->u * sqrt(6.0) * (gsl_rng_uniform(random) + gsl_rng_uniform(random) - 1.0);
    case WA_STUDENT:
        return input->value + input->u * gsl_ran_tdist(random, input->degrees_of_freedom);
    case WA_NORMAL:
        break;
    }
    return input->value + gsl_ran_gaussian_ziggurat(random, input->u);
}

static double trial(const struct sampling *sampling)
{
    double values[WA_BENCH_INPUTS_MAX];
    for (size_t i = 0; i < sampling->budget->input_count; i++) {
        const struct wa_bench_input *input = &sampling->budget->inputs[i];
        values[i] = input->u > 0.0 ? draw(input, sampling->random) : input->value;
    }
    return sampling->model(values, sampling->context);
}

static void run_block(struct sampling *sampling)
{
    double sum = 0.0, square = 0.0;
    for (size_t t = 0; t < BLOCK; t++) {
        sampling->values[t] = trial(sampling);
        sum += sampling->values[t];
    }
    const double mean = sum / BLOCK;
    for (size_t t = 0; t < BLOCK; t++) {
        square += (sampling->values[t] - mean) * (sampling->values[t] - mean);
    }
    gsl_sort(sampling->values, 1, BLOCK);
    const size_t b = sampling->blocks++;
    sampling->figures[block_mean][b] = mean;
    sampling->figures[block_u][b] = sqrt(square / (BLOCK - 1));
    sampling->figures[block_low][b] = sampling->values[BLOCK / 40 - 1];
    sampling->figures[block_high][b] = sampling->values[BLOCK - BLOCK / 40 - 1];
}

static double average(const struct sampling *sampling, int figure)
{
    double sum = 0.0;
    for (size_t b = 0; b < sampling->blocks; b++) {
        sum += sampling->figures[figure][b];
    }
    return sum / (double)sampling->blocks;
}

/* Twice the standard deviation of an average. */
static double twice_error(const struct sampling *sampling, int figure)
{
    const double n = (double)sampling->blocks;
    const double mean = average(sampling, figure);
    double square = 0.0;
    for (size_t b = 0; b < sampling->blocks; b++) {
        square += (sampling->figures[figure][b] - mean) * (sampling->figures[figure][b] - mean);
    }
    return 2.0 * sqrt(square / (n * (n - 1.0)));
}

static bool stands(const struct sampling *sampling, double limit, bool u_exists)
{
    for (int f = u_exists ? block_mean : block_low; f < block_figures; f++) {
        if (twice_error(sampling, f) >= limit) {
            return false;
        }
    }
    return true;
}

/* delta for u to two significant digits (7.9.2). */
static double tolerance_of(double u)
{
    return u > 0.0 ? 0.5 * pow(10.0, floor(log10(u)) - 1.0) : 0.0;
}

/* t with two degrees of freedom or fewer has no variance. */
static bool has_variance(const struct wa_bench_budget *budget)
{
    for (size_t i = 0; i < budget->input_count; i++) {
        const struct wa_bench_input *input = &budget->inputs[i];
        if (input->distribution == WA_STUDENT && !(input->degrees_of_freedom > 2.0)) {
            return false;
        }
    }
    return true;
}

static void summarise(const struct sampling *sampling, bool u_exists, struct wa_monte_carlo *result)
{
    const struct wa_bench_budget *budget = sampling->budget;
    const double half = budget->k95 * budget->u;
    result->trials = sampling->blocks * BLOCK;
    result->mean = average(sampling, block_mean);
    result->u = u_exists ? average(sampling, block_u) : (double)NAN;
    result->low = average(sampling, block_low);
    result->high = average(sampling, block_high);
    result->low_difference = fabs(budget->value - half - result->low);
    result->high_difference = fabs(budget->value + half - result->high);
    result->scatter = fmax(twice_error(sampling, block_low), twice_error(sampling, block_high));
    result->agrees = fmax(result->low_difference, result->high_difference) <=
                     result->tolerance + result->scatter;
}

enum wa_status wa_bench_monte_carlo(const struct wa_bench_budget *budget, wa_bench_model *model,
                                    const void *context, uint32_t seed,
                                    struct wa_monte_carlo *result, struct wa_error *error)
{
    struct sampling sampling = {.budget = budget, .model = model, .context = context};
    const bool u_exists = has_variance(budget);
    sampling.random = gsl_rng_alloc(gsl_rng_mt19937);
    sampling.values = malloc(BLOCK * sizeof *sampling.values);
    if (sampling.random == NULL || sampling.values == NULL) {
        if (sampling.random != NULL) {
            gsl_rng_free(sampling.random);
        }
        free(sampling.values);
        return wa_fail_memory(error);
    }
    gsl_rng_set(sampling.random, seed);
    *result = (struct wa_monte_carlo){.tolerance = tolerance_of(budget->u)};
    while (sampling.blocks < BLOCKS_MAX && !result->settled) {
        run_block(&sampling);
        result->settled = sampling.blocks >= BLOCKS_MIN &&
                          stands(&sampling, fmax(result->tolerance / 5.0, 1e-300), u_exists);
    }
    summarise(&sampling, u_exists, result);
    gsl_rng_free(sampling.random);
    free(sampling.values);
    return WA_OK;
}
