/* Amounts and their uncertainty budgets. */
#include "whichacid/amount.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

/* cmocka compares single precision only. */
static void assert_near(double value, double expected, double tolerance)
{
    if (!(fabs(value - expected) <= tolerance)) {
        fail_msg("%.12g is not %.12g within %.3g", value, expected, tolerance);
    }
}

static struct wa_quantity quantity(double value, double u)
{
    return (struct wa_quantity){value, u, true};
}

/* Outside check. Eurachem/CITAC guide CG 4, QUAM:2012, example A2, standardising a sodium hydroxide
 * solution: 0.102 14 mol/L with u = 0.000 10 from the figures of its table A2.3. Red when a factor
 * is inverted, a contribution is lost, or shares are not of the variance. */
static void quam_example_a2(void **state)
{
    (void)state;
    const struct wa_amount_inputs inputs = {
        .sample_mass = quantity(0.3888, 0.00013),
        .purity = quantity(1.0, 0.00029),
        .molar_mass = quantity(204.2212, 0.0038),
        .equivalence_volume = quantity(18.64, 0.013),
        .repeatability = 0.0005,
        .protons = 1,
    };
    struct wa_budget budget;
    assert_int_equal(wa_amount_titrant_concentration(&inputs, &budget, NULL), WA_OK);
    assert_near(budget.value, 0.10214, 0.000005);
    assert_near(budget.u, 0.00010, 0.000005);
    assert_string_equal(budget.unit, "mol/L");
    double shares = 0.0, largest = 0.0;
    const char *name = "";
    for (size_t i = 0; i < budget.contribution_count; i++) {
        shares += budget.contributions[i].share;
        if (budget.contributions[i].share > largest) {
            largest = budget.contributions[i].share;
            name = budget.contributions[i].name;
        }
    }
    assert_near(shares, 1.0, 1e-12);
    assert_string_equal(name, "equivalence volume");
}

/* Self-consistency: the titrant of the example against the same standard gives back its molar
 * mass; a blank, an aliquot and a second proton each enter the right way round. */
static void molar_mass_comes_back(void **state)
{
    (void)state;
    struct wa_amount_inputs inputs = {
        .sample_mass = quantity(2.0 * 0.3888, 0.0002),
        .titrant_concentration = quantity(0.102138, 0.0001),
        .equivalence_volume = quantity(18.64 + 0.05, 0.013),
        .blank = quantity(0.05, 0.01),
        .aliquot = quantity(0.5, 0.0005),
    };
    struct wa_budget budget;
    assert_int_equal(wa_amount_equivalent_mass(&inputs, &budget, NULL), WA_OK);
    assert_near(budget.value, 204.22, 0.01);
    inputs.protons = 2;
    assert_int_equal(wa_amount_molar_mass(&inputs, &budget, NULL), WA_OK);
    assert_near(budget.value, 408.44, 0.02);
    assert_int_equal(wa_amount_equivalents(&inputs, &budget, NULL), WA_OK);
    assert_near(budget.value, 0.102138 * 18.64 / 500.0, 1e-12);
    assert_int_equal(wa_amount_moles(&inputs, &budget, NULL), WA_OK);
    assert_near(budget.value, 0.102138 * 18.64 / 1000.0, 1e-12);
}

static double equivalents_with(const struct wa_amount_inputs *inputs)
{
    struct wa_budget budget;
    assert_int_equal(wa_amount_equivalents(inputs, &budget, NULL), WA_OK);
    return budget.value;
}

/* Self-consistency: the stated sensitivities are the derivatives. Red when the blank has the wrong
 * sign or a factor the wrong power. */
static void sensitivities_are_derivatives(void **state)
{
    (void)state;
    const struct wa_amount_inputs inputs = {
        .titrant_concentration = quantity(0.1, 0.0002),
        .equivalence_volume = quantity(20.0, 0.02),
        .blank = quantity(0.1, 0.02),
        .aliquot = quantity(0.2, 0.0002),
    };
    struct wa_budget budget;
    assert_int_equal(wa_amount_equivalents(&inputs, &budget, NULL), WA_OK);
    assert_int_equal(budget.contribution_count, 4);
    for (size_t i = 0; i < 4; i++) {
        struct wa_amount_inputs moved = inputs;
        struct wa_quantity *which[] = {&moved.equivalence_volume, &moved.blank,
                                       &moved.titrant_concentration, &moved.aliquot};
        const double step = 1e-6 * which[i]->value;
        assert_near(budget.contributions[i].value, which[i]->value, 0.0);
        which[i]->value += step;
        const double high = equivalents_with(&moved);
        which[i]->value -= 2.0 * step;
        const double derivative = (high - equivalents_with(&moved)) / (2.0 * step);
        assert_near(budget.contributions[i].sensitivity, derivative, 1e-6 * fabs(derivative));
    }
}

/* Own contract: a liquid sample stands for a mass; what is missing is named. */
static void liquids_and_missing_inputs(void **state)
{
    (void)state;
    struct wa_amount_inputs inputs = {
        .titrant_concentration = quantity(0.1, 0.0),
        .equivalence_volume = quantity(8.33, 0.01),
        .sample_volume = quantity(1.0, 0.004),
        .molar_mass = quantity(60.052, 0.001),
    };
    struct wa_budget budget;
    struct wa_error error;
    assert_int_equal(wa_amount_content(&inputs, &budget, &error), WA_ERROR_INPUT);
    assert_string_equal(
        error.message,
        "The sample density is not known or not above zero; note it to have this amount computed.");
    assert_int_equal(budget.contribution_count, 0);
    inputs.sample_density = quantity(1.005, 0.001);
    assert_int_equal(wa_amount_content(&inputs, &budget, &error), WA_OK);
    assert_near(budget.value, 0.1 * 8.33e-3 * 60.052 / 1.005, 1e-12);
    inputs.blank = quantity(9.0, 0.1);
    assert_int_equal(wa_amount_equivalents(&inputs, &budget, &error), WA_ERROR_INPUT);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(quam_example_a2),
        cmocka_unit_test(molar_mass_comes_back),
        cmocka_unit_test(sensitivities_are_derivatives),
        cmocka_unit_test(liquids_and_missing_inputs),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
