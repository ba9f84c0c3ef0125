/* Budgets by JCGM 100:2008, and Grubbs' test. */
#include "whichacid/bench_budget.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdio.h>

/* Steps of the central differences: small against u, large against rounding. */
static const double step_of_u = 0.01;
static const double step_of_value = 1e-6;

void wa_bench_start(struct wa_bench_budget *budget, const char *name, const char *unit)
{
    *budget = (struct wa_bench_budget){.value = NAN};
    snprintf(budget->name, sizeof budget->name, "%s", name);
    snprintf(budget->unit, sizeof budget->unit, "%s", unit);
}

struct wa_bench_input *wa_bench_add(struct wa_bench_budget *budget, const char *name,
                                    const char *unit, double value, double u,
                                    enum wa_evaluation type)
{
    if (budget->input_count == WA_BENCH_INPUTS_MAX) {
        budget->input_count--;
    }
    struct wa_bench_input *input = &budget->inputs[budget->input_count++];
    *input = (struct wa_bench_input){.value = value, .u = fabs(u), .type = type};
    snprintf(input->name, sizeof input->name, "%s", name);
    snprintf(input->unit, sizeof input->unit, "%s", unit);
    return input;
}

struct wa_bench_input *wa_bench_add_limits(struct wa_bench_budget *budget, const char *name,
                                           const char *unit, double value, double half_width,
                                           enum wa_distribution distribution)
{
    const double divisor = distribution == WA_TRIANGULAR ? sqrt(6.0) : sqrt(3.0);
    struct wa_bench_input *input =
        wa_bench_add(budget, name, unit, value, half_width / divisor, WA_TYPE_B);
    input->distribution = distribution;
    return input;
}

static void collect(const struct wa_bench_budget *budget, double *values)
{
    for (size_t i = 0; i < budget->input_count; i++) {
        values[i] = budget->inputs[i].value;
    }
}

static void set_sensitivity(struct wa_bench_budget *budget, size_t index, wa_bench_model *model,
                            const void *context)
{
    double values[WA_BENCH_INPUTS_MAX];
    struct wa_bench_input *input = &budget->inputs[index];
    const double step =
        input->u > 0.0 ? step_of_u * input->u : fmax(step_of_value * fabs(input->value), 1e-12);
    collect(budget, values);
    values[index] = input->value + step;
    const double above = model(values, context);
    values[index] = input->value - step;
    input->sensitivity = (above - model(values, context)) / (2.0 * step);
    input->effect = fabs(input->sensitivity) * input->u;
}

/* Welch and Satterthwaite, JCGM 100, G.4.1. */
static double effective_degrees_of_freedom(const struct wa_bench_budget *budget)
{
    double sum = 0.0;
    for (size_t i = 0; i < budget->input_count; i++) {
        const struct wa_bench_input *input = &budget->inputs[i];
        if (input->degrees_of_freedom > 0.0) {
            sum += pow(input->effect, 4.0) / input->degrees_of_freedom;
        }
    }
    return sum > 0.0 ? pow(budget->u, 4.0) / sum : (double)INFINITY;
}

enum wa_status wa_bench_compute(struct wa_bench_budget *budget, wa_bench_model *model,
                                const void *context, struct wa_error *error)
{
    double values[WA_BENCH_INPUTS_MAX];
    double square = 0.0;
    collect(budget, values);
    budget->value = model(values, context);
    for (size_t i = 0; i < budget->input_count; i++) {
        set_sensitivity(budget, i, model, context);
        square += budget->inputs[i].effect * budget->inputs[i].effect;
    }
    if (!isfinite(budget->value) || !isfinite(square)) {
        return wa_fail(error, WA_ERROR_NUMERIC, NULL, 0,
                       "The %s cannot be computed from these values; check that none is zero or "
                       "has the wrong unit.",
                       budget->name);
    }
    budget->u = sqrt(square);
    for (size_t i = 0; i < budget->input_count; i++) {
        struct wa_bench_input *input = &budget->inputs[i];
        input->share = square > 0.0 ? input->effect * input->effect / square : 0.0;
    }
    budget->degrees_of_freedom = effective_degrees_of_freedom(budget);
    budget->k95 = isfinite(budget->degrees_of_freedom)
                      ? gsl_cdf_tdist_Pinv(0.975, budget->degrees_of_freedom)
                      : gsl_cdf_ugaussian_Pinv(0.975);
    return WA_OK;
}

const struct wa_bench_input *wa_bench_largest(const struct wa_bench_budget *budget)
{
    const struct wa_bench_input *largest = NULL;
    for (size_t i = 0; i < budget->input_count; i++) {
        const struct wa_bench_input *input = &budget->inputs[i];
        if (input->share > (largest != NULL ? largest->share : 0.0)) {
            largest = input;
        }
    }
    return largest;
}

double wa_grubbs_critical(size_t count, double share)
{
    const double n = (double)count;
    const double t = gsl_cdf_tdist_Qinv(share / n, n - 2.0);
    return (n - 1.0) / sqrt(n) * sqrt(t * t / (n - 2.0 + t * t));
}

struct wa_grubbs wa_grubbs_test(const double *values, size_t count)
{
    struct wa_grubbs test = {.possible = false};
    double sum = 0.0, square = 0.0;
    for (size_t i = 0; i < count; i++) {
        sum += values[i];
    }
    const double mean = count > 0 ? sum / (double)count : 0.0;
    for (size_t i = 0; i < count; i++) {
        square += (values[i] - mean) * (values[i] - mean);
        if (fabs(values[i] - mean) > fabs(values[test.index] - mean)) {
            test.index = i;
        }
    }
    if (count < 3 || !(square > 0.0)) {
        return test;
    }
    test.possible = true;
    test.G = fabs(values[test.index] - mean) / sqrt(square / (double)(count - 1));
    test.critical = wa_grubbs_critical(count, 0.025);
    test.outlier = test.G > test.critical;
    return test;
}
