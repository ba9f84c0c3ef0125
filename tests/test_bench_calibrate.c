/* Electrode calibration. Kinds: outside check (theoretical slope from CODATA 2018 constants:
 * 59.159 mV at 25 degree Celsius; buffer values of the table's own sources), self-consistency and
 * own contract. */
#include "whichacid/bench_report.h"

#include "whichacid/curve.h"
#include "whichacid/fit.h"
#include "whichacid/reader.h"

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

static enum wa_status read_text(const struct wa_table *table, const char *text,
                                struct wa_electrode *electrode, struct wa_error *error)
{
    char path[] = "bench-calibrate-XXXXXX";
    const int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    assert_int_equal(write(descriptor, text, strlen(text)), (int)strlen(text));
    close(descriptor);
    const enum wa_status status = wa_electrode_read(path, table, electrode, error);
    unlink(path);
    return status;
}

/* Turns red: a wrong slope constant, a sign, a buffer not brought to its temperature. */
static void perfect_electrode_in_mV(void **state)
{
    struct wa_electrode e;
    struct wa_error error;
    assert_int_equal(
        read_text(*state, "buffer,temperature,mV\n4.00,25,177.478\n7,25,0\n10.00,25,-177.478\n", &e,
                  &error),
        WA_OK);
    assert_int_equal(wa_electrode_calibrate(&e, 0.0, &error), WA_OK);
    near(e.slope, 1.0, 1e-5);
    near(e.offset, 0.0, 1e-9);
    near(e.correlation, 0.0, 1e-9);
    assert_true(e.birge < 1e-3);
}

static void buffers_at_temperature(void **state)
{
    double pH, u;
    assert_true(wa_buffer_pH(*state, "phthalate", 25.0, &pH, &u));
    near(pH, 4.005, 1e-9);
    assert_true(wa_buffer_pH(*state, "Borax", 25.0, &pH, &u));
    near(pH, 9.180, 1e-9);
    assert_true(wa_buffer_pH(*state, "borax", 24.5, &pH, &u));
    assert_true(pH > 9.180 && pH < 9.190);
    assert_false(wa_buffer_pH(*state, "borax", 300.0, &pH, &u));
    assert_false(wa_buffer_pH(*state, "milk", 25.0, &pH, &u));
}

/* Own contract: about the pivot slope and offset are independent, and both forms say the same. */
static void pivot_is_consistent(void **state)
{
    struct wa_electrode e;
    struct wa_error error;
    assert_int_equal(read_text(*state,
                               "buffer;temperature;pH\nphthalate;25,0;4,02\nphosphate;25,0;6,85\n",
                               &e, &error),
                     WA_OK);
    assert_int_equal(wa_electrode_calibrate(&e, 0.01, &error), WA_OK);
    assert_true(e.correlation > 0.7);
    near(e.pivot, (4.005 + 6.865) / 2.0, 1e-6);
    for (double pH = 2.0; pH < 12.0; pH += 3.0) {
        const double by_7 = 7.0 + e.slope * (pH - 7.0) + e.offset;
        const double by_pivot = e.pivot + e.slope * (pH - e.pivot) + e.pivot_offset;
        near(by_7, by_pivot, 1e-12);
        const double x = pH - 7.0;
        const double u_7 = x * x * e.slope_u * e.slope_u + e.offset_u * e.offset_u +
                           2.0 * x * e.correlation * e.slope_u * e.offset_u;
        const double u_pivot =
            pow((pH - e.pivot) * e.slope_u, 2.0) + e.pivot_offset_u * e.pivot_offset_u;
        near(u_7, u_pivot, 1e-12);
    }
}

static void one_buffer_leaves_the_slope_open(void **state)
{
    struct wa_electrode e;
    struct wa_error error;
    char why[192];
    const struct wa_electrode_limits limits = wa_electrode_limits_default();
    assert_int_equal(read_text(*state, "buffer,pH\n4.005,4.055\n", &e, &error), WA_OK);
    assert_int_equal(wa_electrode_calibrate(&e, 0.01, &error), WA_OK);
    assert_true(e.slope_assumed);
    near(e.offset, 0.05, 1e-9);
    near(e.slope_u, WA_DEFAULT_SLOPE_U, 0.0);
    near(e.pivot, 4.005, 1e-9);
    assert_false(wa_electrode_accepted(&e, &limits, why, sizeof why));
}

/* Limits of USP <791>: 90 % to 105 %, 30 mV. */
static void limits_are_kept(void **state)
{
    const struct {
        const char *text;
        bool accepted;
    } cases[] = {
        {"buffer,temperature,mV\n4,25,170\n10,25,-170\n", true},
        {"buffer,temperature,mV\n4,25,155\n10,25,-155\n", false},
        {"buffer,temperature,mV\n4,25,190\n10,25,-190\n", false},
        {"buffer,temperature,mV\n4,25,205\n10,25,-140\n", false},
        {"buffer,temperature,pH\n4,25,4\n7,25,7.1\n10,25,10\n", false},
    };
    const struct wa_electrode_limits limits = wa_electrode_limits_default();
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        struct wa_electrode e;
        struct wa_error error;
        char why[192];
        assert_int_equal(read_text(*state, cases[i].text, &e, &error), WA_OK);
        assert_int_equal(wa_electrode_calibrate(&e, 0.0, &error), WA_OK);
        assert_int_equal(wa_electrode_accepted(&e, &limits, why, sizeof why), cases[i].accepted);
        assert_int_equal(why[0] == '\0', cases[i].accepted);
    }
}

static void bad_lists_are_refused(void **state)
{
    static const char *const texts[] = {"4.00,25,177\n", "buffer,mV\nmilk,3\n", "buffer,mV\n4.00\n",
                                        "buffer,mV\n", "buffer,mV\n4.00,abc\n"};
    for (size_t i = 0; i < sizeof texts / sizeof texts[0]; i++) {
        struct wa_electrode e;
        struct wa_error error;
        assert_int_equal(read_text(*state, texts[i], &e, &error), WA_ERROR_INPUT);
    }
}

static void drift_is_told(void **state)
{
    struct wa_electrode before, after;
    struct wa_error error;
    assert_int_equal(read_text(*state, "buffer,pH\n4,4\n10,10\n", &before, &error), WA_OK);
    assert_int_equal(read_text(*state, "buffer,pH\n4,4.1\n10,10.1\n", &after, &error), WA_OK);
    assert_int_equal(wa_electrode_calibrate(&before, 0.005, &error), WA_OK);
    assert_int_equal(wa_electrode_calibrate(&after, 0.005, &error), WA_OK);
    const struct wa_electrode_drift drift = wa_electrode_compare(&before, &after);
    assert_true(drift.significant);
    near(drift.offset, 0.1, 1e-9);
    assert_false(wa_electrode_compare(&before, &before).significant);
}

/* Self-consistency: the correlation that a run notes becomes the pivot of its experiment, where the
 * variance of a reading at any pH is what slope, offset and correlation at pH 7 say. */
static void correlation_reaches_the_fit(void **state)
{
    static const char text[] =
        "# titrant: sodium hydroxide\n# electrode slope: 98.0 ± 0.5 %\n"
        "# electrode offset: 0.03 ± 0.02 pH\n# electrode correlation: 0.8\nvolume (mL),pH\n"
        "0,2.99\n3,3.80\n6,4.15\n9,4.39\n12,4.58\n15,4.76\n18,4.94\n21,5.13\n24,5.36\n27,5.71\n"
        "28,5.90\n29,6.22\n30,8.79\n31,11.09\n32,11.39\n";
    const struct wa_reader_options options = {.given = NULL};
    struct wa_run_list runs = {.count = 0};
    struct wa_curve curve;
    struct wa_experiment experiment;
    struct wa_error error;
    assert_int_equal(wa_read_memory(text, sizeof text - 1, "run", &options, &runs, &error), WA_OK);
    assert_int_equal(wa_curve_analyse(&runs.runs[0], &curve, &error), WA_OK);
    assert_int_equal(
        wa_experiment_collect(&runs.runs[0], &curve, *state, NULL, &experiment, &error), WA_OK);
    near(experiment.pivot, -0.8 * 0.02 / 0.005, 1e-9);
    const double x = 4.0 - 7.0, y = x - experiment.pivot;
    near(pow(y * experiment.slope.u, 2.0) + pow(experiment.offset.u, 2.0),
         x * x * 0.005 * 0.005 + 0.02 * 0.02 + 2.0 * x * 0.8 * 0.005 * 0.02, 1e-9);
    near(7.0 + experiment.pivot + 0.98 * y + experiment.offset.mean, 7.0 + 0.98 * x + 0.03, 1e-9);
    wa_experiment_free(&experiment);
    wa_curve_free(&curve);
    wa_run_list_free(&runs);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(perfect_electrode_in_mV),
        cmocka_unit_test(buffers_at_temperature),
        cmocka_unit_test(pivot_is_consistent),
        cmocka_unit_test(one_buffer_leaves_the_slope_open),
        cmocka_unit_test(limits_are_kept),
        cmocka_unit_test(bad_lists_are_refused),
        cmocka_unit_test(drift_is_told),
        cmocka_unit_test(correlation_reaches_the_fit),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
