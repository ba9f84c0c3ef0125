/* Amounts without a curve. Outside checks: Eurachem/CITAC CG 4, A1, as printed (1002.7 mg/L, u
 * 0.9 mg/L with the guide's rounded inputs). Common practice: the equations of mixed alkali and of
 * phosphoric with hydrochloric acid, checked with volumes made from known amounts. */
#include "whichacid/bench_report.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

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

static struct wa_amount_result make(const struct wa_table *table,
                                    const struct wa_amount_options *options)
{
    struct wa_amount_result result;
    struct wa_error error;
    if (wa_amount_make(table, options, &result, &error) != WA_OK) {
        fail_msg("%s", error.message);
    }
    return result;
}

static void quam_a1(void **state)
{
    const struct wa_amount_options options = {
        .kind = WA_AMOUNT_SOLUTION,
        .sample_mass = {0.10028, 0.00005, true},
        .purity = {0.9999, 0.000058, true},
        .dilutions = {{.flask = {100.0, 0.07, true}}},
        .dilution_count = 1,
    };
    const struct wa_amount_result result = make(*state, &options);
    printed(result.budgets[0].value, "%.1f", "1002.7");
    printed(result.budgets[0].u, "%.1f", "0.9");
    assert_int_equal(result.count, 1);
}

/* The same flask by its standard's limits: 0.10 mL, triangular, and 4 K, rectangular. */
static void flask_by_its_standard(void **state)
{
    const struct wa_amount_options options = {
        .kind = WA_AMOUNT_SOLUTION,
        .sample_mass = {0.10028, 0.00005, true},
        .purity = {0.9999, 0.000058, true},
        .dilutions = {{.flask = {100.0, 0.0, false}}},
        .dilution_count = 1,
        .temperature_spread = 4.0,
    };
    const struct wa_amount_result result = make(*state, &options);
    near(result.budgets[0].u, sqrt(0.835199 * 0.835199 - 0.20054 * 0.20054), 0.001);
    near(wa_flask_tolerance(250.0), 0.15, 0.0);
    near(wa_pipette_tolerance(25.0), 0.03, 0.0);
    assert_true(isnan(wa_pipette_tolerance(1000.0)));
}

/* 1.0000 g in 250 mL, 25 mL of that in 100 mL: 1000 mg/L. */
static void dilutions(void **state)
{
    const struct wa_amount_options options = {
        .kind = WA_AMOUNT_SOLUTION,
        .sample_mass = {1.0, 0.0001, true},
        .molar_mass = {100.0, 0.0, true},
        .dilutions = {{.flask = {250.0, 0, false}},
                      {.pipette = {25.0, 0, false}, .flask = {100.0, 0, false}}},
        .dilution_count = 2,
    };
    const struct wa_amount_result result = make(*state, &options);
    near(result.budgets[0].value, 1000.0, 1e-6);
    near(result.budgets[1].value, 0.01, 1e-9);
}

/* An aliquot: a tenth is titrated, the equivalent mass stays. Oxalic acid dihydrate, 126.07 g/mol,
 * holds two waters beside the anhydrous acid. */
static void equivalent_mass_and_water(void **state)
{
    const struct wa_amount_options options = {
        .kind = WA_AMOUNT_EQUIVALENT,
        .sample_mass = {1.26066, 0.0003, true},
        .concentration = {0.1, 0.0001, true},
        .end_points = {{20.0, 0.02, true}},
        .dilutions = {{.flask = {250.0, 0, false}}, {.pipette = {25.0, 0, false}}},
        .dilution_count = 2,
        .protons = 2,
        .anhydrous = "oxalic-acid",
    };
    const struct wa_amount_result result = make(*state, &options);
    near(result.budgets[0].value, 63.033, 0.001);
    near(result.budgets[1].value, 2.0, 0.001);
    near(result.budgets[2].value, 126.066, 0.002);
    bool found = false;
    for (size_t i = 0; i < result.candidate_count; i++) {
        found = found || strcmp(result.candidates[i].form->key, "oxalic-acid-dihydrate") == 0;
        assert_true(fabs(result.candidates[i].deviation) <= 2.0);
    }
    assert_true(found);
}

/* Aspirin with an excess of base: 10 mmol of it use 20 of 25 mmol of hydroxide. */
static void back_titration(void **state)
{
    const struct wa_amount_options options = {
        .kind = WA_AMOUNT_CONTENT,
        .sample_mass = {2.0, 0.0003, true},
        .molar_mass = {180.16, 0.01, true},
        .protons = 2,
        .excess = {50.0, 0.03, true},
        .excess_concentration = {0.5, 0.001, true},
        .concentration = {0.5, 0.001, true},
        .end_points = {{10.0, 0.02, true}},
    };
    const struct wa_amount_result result = make(*state, &options);
    near(result.budgets[0].value, 0.9008, 1e-9);
}

/* 3 mmol of the first part and 1.5 mmol of the second, 0.1 mol/L titrant. */
static void mixtures(void **state)
{
    const struct {
        enum wa_amount_kind kind;
        double first, second;
    } cases[] = {
        {WA_AMOUNT_HYDROXIDE_CARBONATE, 45.0, 60.0},
        {WA_AMOUNT_CARBONATE_BICARBONATE, 30.0, 75.0},
        {WA_AMOUNT_PHOSPHORIC_HYDROCHLORIC, 45.0, 60.0},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const struct wa_amount_options options = {
            .kind = cases[i].kind,
            .concentration = {0.1, 0.0001, true},
            .end_points = {{cases[i].first, 0.02, true}, {cases[i].second, 0.02, true}},
        };
        const struct wa_amount_result result = make(*state, &options);
        assert_int_equal(result.count, 2);
        near(result.budgets[0].value, 3.0, 1e-9);
        near(result.budgets[1].value, 1.5, 1e-9);
    }
    struct wa_amount_options exchanged = {
        .kind = WA_AMOUNT_HYDROXIDE_CARBONATE,
        .concentration = {0.1, 0.0001, true},
        .end_points = {{10.0, 0.02, true}, {30.0, 0.02, true}},
    };
    assert_true(make(*state, &exchanged).sentence_count > 0);
    struct wa_amount_result result;
    struct wa_error error;
    exchanged.end_points[1].value = 5.0;
    assert_int_equal(wa_amount_make(*state, &exchanged, &result, &error), WA_ERROR_INPUT);
}

static void what_is_missing_is_named(void **state)
{
    const struct wa_amount_options options = {.kind = WA_AMOUNT_CONTENT,
                                              .sample_mass = {1.0, 0, false}};
    struct wa_amount_result result;
    struct wa_error error;
    assert_int_equal(wa_amount_make(*state, &options, &result, &error), WA_ERROR_CALL);
    assert_non_null(strstr(error.message, "titrant concentration"));
}

static void faces(void **state)
{
    const struct wa_amount_options options = {.kind = WA_AMOUNT_EQUIVALENT,
                                              .sample_mass = {0.25, 0, false},
                                              .concentration = {0.1, 0, false},
                                              .end_points = {{20.47, 0, false}}};
    const struct wa_amount_result result = make(*state, &options);
    struct wa_error error;
    char *text = NULL;
    assert_int_equal(wa_amount_text(&result, true, &text, &error), WA_OK);
    assert_non_null(strstr(text, "benzoic acid"));
    free(text);
    assert_int_equal(wa_amount_json(&result, &text, &error), WA_OK);
    assert_non_null(strstr(text, "\"candidates\""));
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(quam_a1),
        cmocka_unit_test(flask_by_its_standard),
        cmocka_unit_test(dilutions),
        cmocka_unit_test(equivalent_mass_and_water),
        cmocka_unit_test(back_titration),
        cmocka_unit_test(mixtures),
        cmocka_unit_test(what_is_missing_is_named),
        cmocka_unit_test(faces),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
