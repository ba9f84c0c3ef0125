/* Budgets, Monte Carlo, Grubbs' test and standardization.
 *
 * Outside checks: Eurachem/CITAC guide CG 4 (QUAM), examples A1, A2 and A3 as printed, and their
 * recomputation with unrounded inputs in the documentation of GTC (Measurement Standards Laboratory
 * of New Zealand), pages CITAC A1, A2 and A3; critical values of F. E. Grubbs, Technometrics 11
 * (1969) 1, table 1; JCGM 101:2008, 9.2.3 (four rectangular inputs). The rest: own contract. */
#include "whichacid/bench_report.h"
#include "whichacid/reader.h"
#include "whichacid/simulate.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

static int load(void **state)
{
    static struct wa_table table;
    struct wa_error error;
    *state = &table;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    wa_table_free(*state);
    return 0;
}

static void near(double value, double expected, double within)
{
    if (!(fabs(value - expected) <= within)) {
        fail_msg("%.9g is not %.9g within %g", value, expected, within);
    }
}

static void printed(double value, const char *format, const char *expected)
{
    char text[32];
    snprintf(text, sizeof text, format, value);
    assert_string_equal(text, expected);
}

static const struct wa_bench_input *line_of(const struct wa_bench_budget *budget, const char *name)
{
    for (size_t i = 0; i < budget->input_count; i++) {
        if (strcmp(budget->inputs[i].name, name) == 0) {
            return &budget->inputs[i];
        }
    }
    fail_msg("the budget has no line '%s'", name);
    return NULL;
}

/* 1000 m P / V with the three errors of the flask beside it. */
static double flask(const double *v, const void *context)
{
    (void)context;
    return 1000.0 * v[0] * v[1] / (v[2] + v[3] + v[4]);
}

/* Turns red: a wrong divisor of a distribution, a wrong sensitivity, a share not squared. */
static void quam_a1(void **state)
{
    (void)state;
    struct wa_bench_budget b;
    struct wa_error error;
    wa_bench_start(&b, "concentration of cadmium", "mg/L");
    wa_bench_add(&b, "mass", "mg", 100.28, 0.05, WA_TYPE_B);
    wa_bench_add_limits(&b, "purity", "", 0.9999, 0.0001, WA_RECTANGULAR);
    wa_bench_add_limits(&b, "flask", "mL", 100.0, 0.1, WA_TRIANGULAR);
    wa_bench_add(&b, "filling", "mL", 0.0, 0.02, WA_TYPE_A);
    wa_bench_add_limits(&b, "temperature", "mL", 0.0, 100.0 * WA_WATER_EXPANSION * 4.0,
                        WA_RECTANGULAR);
    assert_int_equal(wa_bench_compute(&b, flask, NULL, &error), WA_OK);
    printed(b.value, "%.1f", "1002.7");
    printed(line_of(&b, "purity")->u, "%.6f", "0.000058");
    printed(line_of(&b, "flask")->u, "%.2f", "0.04");
    printed(line_of(&b, "temperature")->u, "%.2f", "0.05");
    printed(hypot(hypot(line_of(&b, "flask")->u, 0.02), line_of(&b, "temperature")->u), "%.2f",
            "0.07");
    near(b.u, 0.835199, 5e-7);
    near(line_of(&b, "mass")->effect, 0.49995, 5e-6);
    near(line_of(&b, "temperature")->effect, 0.486284, 1e-3);
    near(line_of(&b, "flask")->effect, 0.40935, 5e-6);
    near(line_of(&b, "filling")->effect, 0.20054, 5e-6);
    near(line_of(&b, "purity")->effect, 0.0578967, 5e-8);
    near(line_of(&b, "mass")->share + line_of(&b, "flask")->share + line_of(&b, "filling")->share +
             line_of(&b, "temperature")->share + line_of(&b, "purity")->share,
         1.0, 1e-12);
}

static struct wa_standardize_options quam_options(double repeatability)
{
    return (struct wa_standardize_options){
        .standard = "potassium-hydrogen-phthalate",
        .purity = {1.0, 0.00029, true},
        .molar_mass = {204.2212, 0.0038, true},
        .repeatability = repeatability,
    };
}

/* The table as printed: rounded uncertainties in. */
static void quam_a2_as_printed(void **state)
{
    const struct wa_standardize_options options = quam_options(0.0005);
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0.00013, true}, .volume = {18.64, 0.013, true}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    const struct wa_bench_budget *b = &work.budget;
    printed(b->value, "%.5f", "0.10214");
    printed(b->u, "%.5f", "0.00010");
    printed(b->u / b->value, "%.5f", "0.00097");
    const struct wa_bench_input *mass = line_of(b, "mass of standard");
    const struct wa_bench_input *volume = line_of(b, "volume of titrant");
    const struct wa_bench_input *molar_mass = line_of(b, "molar mass of standard");
    printed(mass->u / mass->value, "%.5f", "0.00033");
    printed(volume->u / volume->value, "%.4f", "0.0007");
    printed(molar_mass->u / molar_mass->value, "%.6f", "0.000019");
    assert_string_equal(work.titrant->key, "sodium-hydroxide");
    assert_true(work.monte_carlo.agrees);
}

/* The same from limits of error, against the unrounded recomputation. */
static void quam_a2_from_limits(void **state)
{
    struct wa_standardize_options options = quam_options(0.0005);
    options.purity.u = 0.0005 / sqrt(3.0);
    options.balance_linearity = 0.00015;
    options.burette_tolerance = 0.03;
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0, false}, .volume = {18.64, 0.006, true}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    const struct wa_bench_budget *b = &work.budget;
    near(b->value, 0.102136159706, 5e-10);
    near(b->u, 0.000100500722, 5e-9);
    near(line_of(b, "calibration of burette")->effect, 6.71088e-5, 5e-10);
    near(line_of(b, "volume of titrant")->effect, 3.28764e-5, 5e-10);
    near(line_of(b, "repeatability")->effect, 5.10681e-5, 5e-10);
    near(line_of(b, "linearity of balance, twice")->effect, 3.21735e-5, 5e-10);
    near(line_of(b, "purity of standard")->effect, 2.94842e-5, 5e-10);
    near(line_of(b, "molar mass of standard")->effect, 1.88312e-6, 2e-8);
}

static void quam_a3(void **state)
{
    struct wa_standardize_options options = quam_options(0.001);
    options.purity.u = 0.0005 / sqrt(3.0);
    options.balance_linearity = 0.00015;
    options.burette_tolerance = 0.03;
    options.pipette_tolerance = 0.02;
    options.second_volume = (struct wa_quantity){15.0, 0.0, false};
    options.second_end_point = (struct wa_quantity){14.89, 0.0, false};
    options.temperature_spread = 4.0;
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0, false}, .volume = {18.64, 0, false}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    const struct wa_bench_budget *b = &work.budget;
    printed(b->value, "%.5f", "0.10139");
    printed(b->u, "%.5f", "0.00018");
    /* There 19 mL stand for 18.64 and 15 for 14.89 in the lines of temperature. */
    const double at_19 = pow(5.01198e-5, 2.0) * (1.0 - pow(18.64 / 19.0, 2.0));
    const double at_15 = pow(4.95334e-5, 2.0) * (1.0 - pow(14.89 / 15.0, 2.0));
    near(sqrt(b->u * b->u + at_19 + at_15), 0.00018435, 5e-8);
    near(line_of(b, "repeatability")->effect, 1.01387e-4, 5e-10);
    near(line_of(b, "calibration of burette, 2nd")->effect, 8.33938e-5, 5e-10);
    near(line_of(b, "calibration of burette")->effect, 6.66166e-5, 5e-10);
    near(line_of(b, "calibration of pipette")->effect, 5.51882e-5, 5e-10);
    near(line_of(b, "temperature of 2nd solution")->effect, 4.91702e-5, 5e-10);
    near(line_of(b, "temperature of titrant")->effect, 5.01198e-5 * 18.64 / 19.0, 5e-10);
    near(line_of(b, "temperature of titrant, 2nd")->effect, 4.95334e-5 * 14.89 / 15.0, 5e-10);
    near(line_of(b, "linearity of balance, twice")->effect, 3.19376e-5, 5e-10);
    assert_string_equal(work.titrant->key, "hydrochloric-acid");
    options.repeatability = 0.001 / sqrt(3.0);
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    printed(work.budget.u, "%.5f", "0.00016");
}

/* A3.6: 0.05 mL too much by the indicator, u 0.03 mL, in both titrations. */
static void quam_a3_indicator(void **state)
{
    struct wa_standardize_options options = quam_options(0.001 / sqrt(3.0));
    options.balance_linearity = 0.00015;
    options.burette_tolerance = 0.03;
    options.pipette_tolerance = 0.02;
    options.second_volume = (struct wa_quantity){15.0, 0.0, false};
    options.second_end_point = (struct wa_quantity){14.89, 0.0, false};
    options.temperature_spread = 4.0;
    options.blank = (struct wa_quantity){0.05, 0.03, true};
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0, false}, .volume = {18.64, 0, false}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    printed(work.budget.value, "%.5f", "0.10132");
    printed(work.budget.u, "%.5f", "0.00031");
}

static double sum_of_four(const double *v, const void *context)
{
    (void)context;
    return v[0] + v[1] + v[2] + v[3];
}

/* JCGM 101, 9.2.3: u 2.0, interval [-3.88, 3.88] against [-3.92, 3.92] by the GUM; not validated
 * with two significant digits. Turns red: a wrong quantile, a wrong tolerance. */
static void jcgm_101_rectangular(void **state)
{
    (void)state;
    struct wa_bench_budget b;
    struct wa_monte_carlo mc;
    struct wa_error error;
    wa_bench_start(&b, "sum", "");
    for (int i = 0; i < 4; i++) {
        wa_bench_add_limits(&b, "x", "", 0.0, sqrt(3.0), WA_RECTANGULAR);
    }
    assert_int_equal(wa_bench_compute(&b, sum_of_four, NULL, &error), WA_OK);
    near(b.u, 2.0, 1e-9);
    near(b.k95 * b.u, 3.92, 0.001);
    assert_int_equal(wa_bench_monte_carlo(&b, sum_of_four, NULL, 1, &mc, &error), WA_OK);
    near(mc.u, 2.0, 0.01);
    near(mc.low, -3.88, 0.012);
    near(mc.high, 3.88, 0.012);
    near(mc.tolerance, 0.05, 1e-12);
    near(mc.low_difference, 0.04, 0.012);
}

static void grubbs_table(void **state)
{
    (void)state;
    static const struct {
        size_t n;
        double at_5, at_2_5;
    } table[] = {{3, 1.153, 1.155}, {4, 1.463, 1.481},  {5, 1.672, 1.715},
                 {6, 1.822, 1.887}, {7, 1.938, 2.020},  {8, 2.032, 2.126},
                 {9, 2.110, 2.215}, {10, 2.176, 2.290}, {15, 2.409, 2.549}};
    for (size_t i = 0; i < sizeof table / sizeof table[0]; i++) {
        near(wa_grubbs_critical(table[i].n, 0.05), table[i].at_5, 0.00101);
        near(wa_grubbs_critical(table[i].n, 0.025), table[i].at_2_5, 0.00101);
    }
}

/* Own contract: a suspicious titration is told of and still counted. */
static void outlier_is_not_left_out(void **state)
{
    const struct wa_standardize_options options = {.standard = "KHP"};
    struct wa_standardization work = {.replicate_count = 5};
    struct wa_error error;
    const double volumes[] = {18.64, 18.65, 18.63, 18.64, 19.40};
    for (size_t i = 0; i < 5; i++) {
        work.replicates[i] =
            (struct wa_replicate){.mass = {0.3888, 0, false}, .volume = {volumes[i], 0, false}};
    }
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    assert_true(work.grubbs.outlier);
    assert_int_equal(work.grubbs.index, 4);
    assert_int_equal(work.used_count, 5);
    const double with = work.budget.value;
    work.replicates[4].left_out = true;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    assert_int_equal(work.used_count, 4);
    assert_true(work.budget.value > with * 1.005);
    near(work.budget.inputs[0].degrees_of_freedom, 3.0, 0.0);
}

/* Self-consistency: equivalents of standard and titrant both count. Two protons of sulfuric acid
 * against two of sodium carbonate give half the moles of two hydrochloric acids. */
static void equivalents_of_both(void **state)
{
    struct wa_standardize_options options = {.standard = "sodium-carbonate"};
    struct wa_standardization work = {
        .replicates = {{.mass = {0.2, 0, false}, .volume = {20.0, 0, false}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    const double one = work.budget.value;
    near(one, 2000.0 * 0.2 * 0.9995 / (105.988 * 20.0), 1e-5);
    options.titrant = "sulfuric acid";
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    near(work.budget.value, one / 2.0, 1e-12);
    options.titrant = "sodium hydroxide";
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_ERROR_CALL);
}

/* Common practice: a substance of density 1.6 weighs six parts in ten thousand too little in air.
 */
static void buoyancy(void **state)
{
    struct wa_standardize_options options = {.standard = "KHP", .density = {1.636, 0.0, false}};
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0, false}, .volume = {18.64, 0, false}}},
        .replicate_count = 1};
    struct wa_error error;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    near(work.buoyancy, 1.00058, 1e-5);
    const double with = work.budget.value;
    options.density.value = 0.0;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    near(with / work.budget.value, work.buoyancy == 1.0 ? 1.00058 : 0.0, 1e-5);
}

/* Self-consistency: what is written is read back; words are no file; another .json is refused. */
static void file_round_trip(void **state)
{
    const struct wa_standardize_options options = {.standard = "KHP"};
    struct wa_standardization work = {
        .replicates = {{.mass = {0.3888, 0, false}, .volume = {18.64, 0, false}}},
        .replicate_count = 1};
    struct wa_error error;
    char path[] = "bench-standardize-XXXXXX";
    char *text = NULL;
    assert_int_equal(wa_standardize(*state, &options, &work, &error), WA_OK);
    assert_int_equal(wa_standardization_json(&work, &text, &error), WA_OK);
    const int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    assert_int_equal(write(descriptor, text, strlen(text)), (int)strlen(text));
    close(descriptor);
    free(text);
    struct wa_bench_file file;
    bool ours = false;
    assert_int_equal(wa_bench_read(path, WA_TITRANT_FILE_KIND, &file, &ours, &error), WA_OK);
    unlink(path);
    assert_true(ours);
    near(file.concentration.value, work.budget.value, 1e-15);
    near(file.concentration.u, work.budget.u, 1e-15);
    assert_string_equal(file.titrant, "Sodium hydroxide");
    assert_int_equal(wa_bench_read("sodium hydroxide", WA_TITRANT_FILE_KIND, &file, &ours, &error),
                     WA_OK);
    assert_false(ours);
    assert_int_equal(wa_bench_read("nowhere.json", WA_TITRANT_FILE_KIND, &file, &ours, &error),
                     WA_ERROR_FILE);
}

/* Self-consistency: simulated curves of three standards give back the titrant they were made with,
 * carbonate included, whatever the notes say of it. Turns red: equivalents, sign, mass or the blank
 * mixed up on the way through the fit. */
static void curves_give_the_titrant_back(void **state)
{
    static const char *const keys[] = {"potassium-hydrogen-phthalate", "sodium-carbonate", "tris"};
    for (size_t k = 0; k < sizeof keys / sizeof keys[0]; k++) {
        struct wa_simulation_options options;
        struct wa_simulation simulation;
        struct wa_run_list runs = {.count = 0};
        struct wa_error error;
        char *text = NULL;
        size_t length = 0;
        wa_simulation_defaults(&options);
        options.forms[0] = keys[k];
        options.form_count = 1;
        options.titrant_concentration.value = 0.1021;
        options.seed = 5;
        assert_int_equal(wa_simulate(*state, &options, &simulation, &error), WA_OK);
        assert_int_equal(wa_simulation_write(&simulation, &text, &length, &error), WA_OK);
        wa_simulation_free(&simulation);
        const struct wa_reader_options reader = {.given = NULL};
        assert_int_equal(wa_read_memory(text, length, "run", &reader, &runs, &error), WA_OK);
        free(text);
        const struct wa_standardize_options standardize = {
            .standard = keys[k], .purity = {1.0, 0.0001, true}, .blank = {0.05, 0.0, true}};
        struct wa_standardization work = {.replicate_count = 1};
        assert_int_equal(
            wa_standardize_run(*state, &standardize, &runs.runs[0], &work.replicates[0], &error),
            WA_OK);
        assert_true(work.replicates[0].from_curve);
        assert_true(work.replicates[0].volume.u < 0.05);
        assert_int_equal(wa_standardize(*state, &standardize, &work, &error), WA_OK);
        near(work.budget.value, 0.1021, 3.0 * 0.1021 * work.replicates[0].volume.u / 20.0);
        wa_run_list_free(&runs);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(quam_a1),
        cmocka_unit_test(quam_a2_as_printed),
        cmocka_unit_test(quam_a2_from_limits),
        cmocka_unit_test(quam_a3),
        cmocka_unit_test(quam_a3_indicator),
        cmocka_unit_test(jcgm_101_rectangular),
        cmocka_unit_test(grubbs_table),
        cmocka_unit_test(outlier_is_not_left_out),
        cmocka_unit_test(equivalents_of_both),
        cmocka_unit_test(buoyancy),
        cmocka_unit_test(file_round_trip),
        cmocka_unit_test(curves_give_the_titrant_back),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
