/* Where to place the additions: the readings that make the joint uncertainty of constants and
 * amount least (D-optimality for a subset of the parameters: A. C. Atkinson and A. N. Donev,
 * Optimum Experimental Designs, 1992), found by exchanging points (V. V. Fedorov, Theory of Optimal
 * Experiments, 1972). Each volume is read once: readings that come too close share their errors. */
#include "bench/plan_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define GRID_MAX 200
#define PASSES_MAX 4

static const size_t fixed_each = 3;       /* every third reading stays evenly placed */
static const double beyond = 1.2;         /* of the equivalence volume */
static const double volume_steps = 100.0; /* a mL; volumes are told to 0.01 mL */
static const double around[] = {0.98, 0.99, 0.995, 1.005, 1.01, 1.02};

/* Rows of scaled sensitivities, the parameters of interest last. */
struct grid {
    size_t count;
    int parameters, interest;
    int kept[WA_PARAMETERS_MAX]; /* parameter at each place */
    double u[WA_PARAMETERS_MAX]; /* prior of the one at each place */
    double volume_mL[GRID_MAX];
    double rows[GRID_MAX][WA_PARAMETERS_MAX];
    bool used[GRID_MAX];
};

typedef double matrix[WA_PARAMETERS_MAX][WA_PARAMETERS_MAX];

static double rounded(double volume_mL)
{
    return round(volume_mL * volume_steps) / volume_steps;
}

static int compare_numbers(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static void set_volumes(const struct wa_plan *plan, double equivalence_mL, struct grid *grid)
{
    const size_t extra = sizeof around / sizeof around[0];
    for (size_t i = 0; i + extra < GRID_MAX; i++) {
        grid->volume_mL[i] = rounded(plan->end_mL * (double)i / (double)(GRID_MAX - extra - 1));
    }
    for (size_t i = 0; i < extra; i++) {
        grid->volume_mL[GRID_MAX - extra + i] = rounded(equivalence_mL * around[i]);
    }
    qsort(grid->volume_mL, GRID_MAX, sizeof grid->volume_mL[0], compare_numbers);
    grid->count = 1;
    for (size_t i = 1; i < GRID_MAX; i++) {
        if (grid->volume_mL[i] > grid->volume_mL[grid->count - 1]) {
            grid->volume_mL[grid->count++] = grid->volume_mL[i];
        }
    }
}

/* Places: nuisances first, so that the last pivots of the factor are those of interest. */
static void set_places(const struct plan_work *work, struct grid *grid)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(&work->experiment, &work->sample, parameters);
    grid->parameters = count;
    int place = 0;
    for (int wanted = 0; wanted < 2; wanted++) {
        for (int i = 0; i < count; i++) {
            if (plan_finds(&parameters[i]) == (wanted == 1)) {
                grid->u[place] = parameters[i].prior.u;
                grid->kept[place++] = i;
                grid->interest += wanted;
            }
        }
    }
}

/* Sensitivities over the standard deviation of a reading, volume errors carried through the slope;
 * parameters in units of their prior. */
static enum wa_status set_rows(const struct plan_work *work, struct grid *grid,
                               struct wa_error *error)
{
    struct wa_experiment experiment;
    const size_t width = (size_t)grid->parameters;
    double *jacobian = calloc(grid->count * width, sizeof *jacobian);
    double slope[GRID_MAX];
    enum wa_status status = jacobian != NULL ? plan_experiment(&work->experiment, grid->volume_mL,
                                                               grid->count, &experiment, error)
                                             : wa_fail_memory(error);
    if (status != WA_OK) {
        free(jacobian);
        return status;
    }
    status = wa_fit_expect(&experiment, &work->sample, NULL, NULL, slope, jacobian, NULL, error);
    for (size_t p = 0; status == WA_OK && p < grid->count; p++) {
        const double sigma =
            hypot(work->options->noise_reading, slope[p] * work->options->noise_volume);
        for (size_t i = 0; i < width; i++) {
            grid->rows[p][i] = jacobian[p * width + (size_t)grid->kept[i]] * grid->u[i] / sigma;
        }
    }
    wa_experiment_free(&experiment);
    free(jacobian);
    return status;
}

static void add_row(const struct grid *grid, size_t point, double sign, matrix information)
{
    const double *row = grid->rows[point];
    for (int i = 0; i < grid->parameters; i++) {
        for (int j = 0; j <= i; j++) {
            information[i][j] += sign * row[i] * row[j];
        }
    }
}

static void start_information(const struct grid *grid, matrix information)
{
    for (int i = 0; i < grid->parameters; i++) {
        for (int j = 0; j <= i; j++) {
            information[i][j] = i == j ? 1.0 : 0.0; /* the prior, in its own units */
        }
    }
}

/* Lower factor in place; -INFINITY when the matrix is not positive. The sum of the logarithms of
 * the last pivots is half the logarithm of the information about the parameters of interest. */
static double factorise(const struct grid *grid, matrix a)
{
    double sum = 0.0;
    for (int i = 0; i < grid->parameters; i++) {
        for (int j = 0; j <= i; j++) {
            double value = a[i][j];
            for (int k = 0; k < j; k++) {
                value -= a[i][k] * a[j][k];
            }
            if (i == j) {
                if (!(value > 0.0)) {
                    return -INFINITY;
                }
                a[i][i] = sqrt(value);
                sum += i >= grid->parameters - grid->interest ? log(a[i][i]) : 0.0;
            } else {
                a[i][j] = value / a[j][j];
            }
        }
    }
    return sum;
}

static double gain_with(const struct grid *grid, const matrix information, size_t out, size_t in)
{
    matrix trial;
    memcpy(trial, information, sizeof trial);
    add_row(grid, out, -1.0, trial);
    add_row(grid, in, 1.0, trial);
    return factorise(grid, trial);
}

/* One pass of exchanges; each third point and the last one stay, so that the curve is seen whole
 * and a sample that is not what was planned for is noticed. @return whether any was made */
static bool exchange(struct grid *grid, size_t *chosen, size_t count, matrix information)
{
    bool changed = false;
    for (size_t n = 1; n + 1 < count; n++) {
        if (n % fixed_each == 0) {
            continue;
        }
        matrix now;
        memcpy(now, information, sizeof now);
        double best = factorise(grid, now) + 1e-9;
        size_t better = chosen[n];
        for (size_t p = 0; p < grid->count; p++) {
            const double gain =
                grid->used[p] ? -INFINITY : gain_with(grid, information, chosen[n], p);
            if (gain > best) {
                best = gain;
                better = p;
            }
        }
        if (better != chosen[n]) {
            add_row(grid, chosen[n], -1.0, information);
            add_row(grid, better, 1.0, information);
            grid->used[chosen[n]] = false;
            grid->used[better] = true;
            chosen[n] = better;
            changed = true;
        }
    }
    return changed;
}

/* Standard deviations: the rows of the inverse factor squared. */
static void precision_of(const struct plan_work *work, const struct grid *grid, matrix information,
                         struct wa_plan_precision *precision)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(&work->experiment, &work->sample, parameters);
    matrix inverse = {{0.0}};
    factorise(grid, information);
    for (int c = 0; c < count; c++) {
        for (int i = c; i < count; i++) {
            double value = i == c ? 1.0 : 0.0;
            for (int k = c; k < i; k++) {
                value -= information[i][k] * inverse[k][c];
            }
            inverse[i][c] = value / information[i][i];
        }
    }
    int pKa = 0;
    for (int c = count - grid->interest; c < count; c++) {
        double square = 0.0;
        for (int i = c; i < count; i++) {
            square += inverse[i][c] * inverse[i][c];
        }
        const struct wa_parameter *parameter = &parameters[grid->kept[c]];
        const double u = grid->u[c] * sqrt(square);
        if (parameter->kind == WA_PARAMETER_PK && pKa < WA_PROTONS_MAX) {
            work->plan->free_pKa[pKa] = parameter->prior.mean;
            precision->pKa_u[pKa++] = u;
        } else if (parameter->kind == WA_PARAMETER_LN_AMOUNT) {
            precision->amount_u = u;
        }
    }
    work->plan->free_pKa_count = pKa;
}

static size_t nearest_free(const struct grid *grid, double volume_mL)
{
    size_t best = GRID_MAX;
    for (size_t p = 0; p < grid->count; p++) {
        if (!grid->used[p] && (best == GRID_MAX || fabs(grid->volume_mL[p] - volume_mL) <
                                                       fabs(grid->volume_mL[best] - volume_mL))) {
            best = p;
        }
    }
    return best;
}

static void optimise(struct plan_work *work, struct grid *grid)
{
    struct wa_plan *plan = work->plan;
    const size_t count = (size_t)plan->addition_count;
    size_t chosen[WA_PLAN_ADDITIONS_MAX];
    matrix information;
    start_information(grid, information);
    for (size_t n = 0; n < count; n++) {
        plan->even_mL[n] = rounded(plan->end_mL * (double)n / (double)(count - 1));
        chosen[n] = nearest_free(grid, plan->even_mL[n]);
        grid->used[chosen[n]] = true;
        add_row(grid, chosen[n], 1.0, information);
    }
    matrix copy;
    memcpy(copy, information, sizeof copy);
    precision_of(work, grid, copy, &plan->even);
    for (int pass = 0; pass < PASSES_MAX && exchange(grid, chosen, count, information); pass++) {
    }
    precision_of(work, grid, information, &plan->design);
    for (size_t n = 0; n < count; n++) {
        plan->additions_mL[n] = grid->volume_mL[chosen[n]];
    }
    qsort(plan->additions_mL, count, sizeof plan->additions_mL[0], compare_numbers);
}

/* What the sheet shows beside each volume: a titrant free of carbonate, an electrode without error.
 */
static enum wa_status expect_readings(const struct plan_work *work, struct wa_error *error)
{
    struct wa_plan *plan = work->plan;
    enum wa_status status = WA_OK;
    for (int i = 0; i < plan->addition_count && status == WA_OK; i++) {
        struct wa_solution solution;
        status =
            wa_titration_pH(&work->titration, plan->additions_mL[i], 7.0, &solution, NULL, error);
        plan->expected_pH[i] = solution.pH;
    }
    return status;
}

enum wa_status plan_design(struct plan_work *work, struct wa_error *error)
{
    struct wa_plan *plan = work->plan;
    const int step = plan->chosen >= 0 ? plan->chosen : plan->step_count - 1;
    const double equivalence_mL = plan->steps[step].volume_mL;
    struct grid *grid = calloc(1, sizeof *grid);
    if (grid == NULL) {
        return wa_fail_memory(error);
    }
    plan->end_mL = rounded(beyond * plan->steps[plan->step_count - 1].volume_mL);
    plan->addition_count = work->options->additions;
    set_volumes(plan, equivalence_mL, grid);
    set_places(work, grid);
    enum wa_status status = set_rows(work, grid, error);
    if (status == WA_OK && grid->count < (size_t)plan->addition_count + 10) {
        status = wa_fail(error, WA_ERROR_CALL, NULL, 0,
                         "An end point of %g mL is too small for %d readings that differ by 0.01 "
                         "mL; plan fewer readings or a weaker titrant.",
                         equivalence_mL, plan->addition_count);
    }
    if (status == WA_OK) {
        optimise(work, grid);
        plan->molar_mass_u =
            plan->molar_mass * hypot(plan->design.amount_u, work->options->mass_u / plan->mass_g);
        status = expect_readings(work, error);
    }
    free(grid);
    return status;
}
