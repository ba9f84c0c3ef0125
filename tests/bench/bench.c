/* Times of the computation, one line each: name, median and quartiles in microseconds over
 * repetitions. A program, not a test; tests/bench/run sets it against SciPy. Usage: bench TABLE */
#include "fit_cases.h"

#include "whichacid/match.h"
#include "whichacid/reader.h"
#include "whichacid/simulate.h"

#include <stdio.h>
#include <time.h>

#define REPETITIONS 15

static double now_us(void)
{
    struct timespec time;
    clock_gettime(CLOCK_MONOTONIC, &time);
    return 1e6 * (double)time.tv_sec + 1e-3 * (double)time.tv_nsec;
}

static int by_size(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static void print_times(const char *name, double *times)
{
    qsort(times, REPETITIONS, sizeof *times, by_size);
    printf("%s %.4g %.4g %.4g\n", name, times[REPETITIONS / 2], times[REPETITIONS / 4],
           times[3 * REPETITIONS / 4]);
}

/* Value and gradient of each point of a triprotic acid with carbonate, cold and as a fit does it.
 */
static bool time_points(void)
{
    const int rounds = 200;
    struct wa_experiment experiment;
    struct wa_sample_model sample;
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    struct wa_titration titration;
    struct wa_layout layout;
    struct wa_error error;
    double start[WA_PARAMETERS_MAX], cold[REPETITIONS], warm[REPETITIONS];
    static struct wa_point_model points[60];
    static double jacobian[60 * WA_PARAMETERS_MAX];
    bool good = case_example(&fit_cases[2], 60, 1, &experiment, &sample, start);
    const int count = wa_fit_parameters(&experiment, &sample, parameters);
    wa_model_titration(&experiment, &sample, parameters, start, count, &titration, &layout);
    for (int r = 0; r < REPETITIONS; r++) {
        double began = now_us();
        for (int round = 0; good && round < rounds; round++) {
            for (size_t p = 0; p < experiment.count; p++) {
                struct wa_solution solution;
                struct wa_sensitivity sensitivity;
                good = good &&
                       wa_titration_pH(&titration, experiment.volume_mL[p], experiment.reading[p],
                                       &solution, &sensitivity, &error) == WA_OK;
            }
        }
        cold[r] = (now_us() - began) / (60.0 * rounds);
        began = now_us();
        for (int round = 0; good && round < rounds; round++) {
            start[0] += round % 2 == 0 ? 0.02 : -0.02;
            good = wa_model_evaluate(&experiment, &sample, parameters, start, count, points,
                                     jacobian, &error) == WA_OK;
        }
        warm[r] = (now_us() - began) / (60.0 * rounds);
    }
    print_times("point_cold", cold);
    print_times("point_in_a_fit", warm);
    wa_experiment_free(&experiment);
    return good;
}

/* One start, the number of protons given, 60 points: the run that fit_example prints. */
static bool time_fit(const struct fit_case *c)
{
    const int rounds = 20;
    const struct wa_fit_options options = {.from_afar = true};
    struct wa_experiment experiment;
    struct wa_sample_model sample;
    double start[WA_PARAMETERS_MAX], times[REPETITIONS];
    char name[40];
    bool good = case_example(c, 60, 1, &experiment, &sample, start);
    for (int r = 0; r < REPETITIONS; r++) {
        const double began = now_us();
        for (int round = 0; good && round < rounds; round++) {
            struct wa_fit fit;
            struct wa_error error;
            good = wa_fit_run(&experiment, &sample, &options, start, &fit, &error) == WA_OK &&
                   fit.converged;
            wa_fit_free(&fit);
        }
        times[r] = (now_us() - began) / rounds;
    }
    snprintf(name, sizeof name, "fit_%s", c->name);
    print_times(name, times);
    wa_experiment_free(&experiment);
    return good;
}

/* The whole of a simulated run of citric acid: proton study, then the match with the table. */
static bool time_study(const struct wa_table *table, const struct wa_experiment *experiment,
                       const struct wa_curve *curve)
{
    const struct wa_titrated_mass mass = {.known = true, .mass_g = 0.128, .u_g = 0.0003};
    struct wa_error error;
    double study_times[REPETITIONS], match_times[REPETITIONS];
    bool good = true;
    for (int r = 0; good && r < REPETITIONS; r++) {
        struct wa_proton_study study = {.count = 0};
        struct wa_match match = {.candidate_count = 0};
        const double began = now_us();
        good = wa_proton_study_run(experiment, curve, &study, &error) == WA_OK && study.count > 0;
        const double between = now_us();
        good =
            good && wa_match_run(experiment, &study, &mass, table, NULL, &match, &error) == WA_OK;
        study_times[r] = between - began;
        match_times[r] = now_us() - between;
        wa_match_free(&match);
        wa_proton_study_free(&study);
    }
    if (good) {
        print_times("proton_study", study_times);
        print_times("match", match_times);
    }
    return good;
}

static bool time_table(const char *folder)
{
    struct wa_table table = {.acid_count = 0};
    struct wa_simulation simulation = {.count = 0};
    struct wa_simulation_options options;
    struct wa_run_list list = {0};
    struct wa_curve curve = {0};
    struct wa_experiment experiment = {.count = 0};
    struct wa_error error;
    char *text = NULL;
    size_t length;
    wa_simulation_defaults(&options);
    options.forms[0] = "citric-acid";
    options.form_count = 1;
    bool good = wa_table_load(folder, NULL, 0, &table, &error) == WA_OK &&
                wa_simulate(&table, &options, &simulation, &error) == WA_OK &&
                wa_simulation_write(&simulation, &text, &length, &error) == WA_OK &&
                wa_read_memory(text, length, "simulated", NULL, &list, &error) == WA_OK &&
                wa_curve_analyse(&list.runs[0], &curve, &error) == WA_OK &&
                wa_experiment_collect(&list.runs[0], &curve, &table, simulation.titrant,
                                      &experiment, &error) == WA_OK;
    good = good && time_study(&table, &experiment, &curve);
    wa_experiment_free(&experiment);
    wa_curve_free(&curve);
    wa_run_list_free(&list);
    free(text);
    wa_simulation_free(&simulation);
    wa_table_free(&table);
    return good;
}

int main(int argument_count, char **arguments)
{
    if (argument_count != 2) {
        fprintf(stderr, "Usage: bench TABLE\n");
        return 2;
    }
    bool good = time_points();
    for (size_t i = 0; good && i < FIT_CASE_COUNT; i++) {
        good = time_fit(&fit_cases[i]);
    }
    good = good && time_table(arguments[1]);
    if (!good) {
        fprintf(stderr, "bench: a computation failed\n");
    }
    return good ? 0 : 1;
}
