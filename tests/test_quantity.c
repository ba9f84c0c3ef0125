/* Kinds of check: outside check (JCGM 100:2008, 7.2.6, on digits; QUAM:2012 example A2 for the
 * result it prints) and own contract of the texts an analyst may write. */
#include "whichacid/quantity.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <math.h>
#include <string.h>

/* One text and what it means; u < 0 stands for "no uncertainty stated". */
struct meaning {
    const char *text;
    enum wa_dimension dimension;
    double value, u;
};

static const struct meaning meanings[] = {
    {"0.1023 ± 0.0002 mol/L", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0.1023 +/- 0.0002 mol/l", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0,1023 ± 0,0002 mol/L", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"(0.1023 ± 0.0002) mol/L", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0.1023 mol/L ± 0.0002 mol/L", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0.1023 mol/L ± 0.2 mmol/L", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0.1023 mol/L ± 0.2 %", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002046},
    {"0.1023(2) M", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"0.1023 ± 0.0004 mol/L (k = 2)", WA_DIMENSION_CONCENTRATION, 0.1023, 0.0002},
    {"102.3 mM", WA_DIMENSION_CONCENTRATION, 0.1023, -1},
    {"0.1023 mol·L⁻¹", WA_DIMENSION_CONCENTRATION, 0.1023, -1},
    {"0.1023 mol dm-3", WA_DIMENSION_CONCENTRATION, 0.1023, -1},
    {"0.3127 g", WA_DIMENSION_MASS, 0.3127, -1},
    {"0.3127 g (dried)", WA_DIMENSION_MASS, 0.3127, -1},
    {"312.7 ± 0.2 mg", WA_DIMENSION_MASS, 0.3127, 0.0002},
    {"0.3127", WA_DIMENSION_MASS, 0.3127, -1},
    {"200 µL", WA_DIMENSION_VOLUME, 0.2, -1},
    {"200 μL", WA_DIMENSION_VOLUME, 0.2, -1},
    {"50 cm³", WA_DIMENSION_VOLUME, 50, -1},
    {"0.05 L", WA_DIMENSION_VOLUME, 50, -1},
    {"298.15 ± 0.5 K", WA_DIMENSION_TEMPERATURE, 25, 0.5},
    {"25,0 °C", WA_DIMENSION_TEMPERATURE, 25, -1},
    {"77 °F", WA_DIMENSION_TEMPERATURE, 25, -1},
    {"99.2 ± 0.4 %", WA_DIMENSION_FRACTION, 0.992, 0.004},
    {"99.2 % ± 0.4 %", WA_DIMENSION_FRACTION, 0.992, 0.004},
    {"0.992", WA_DIMENSION_FRACTION, 0.992, -1},
    {"-0.02 ± 0.01 pH", WA_DIMENSION_PH, -0.02, 0.01},
    {"0.1723 V", WA_DIMENSION_VOLTAGE, 172.3, -1},
    {"1006 kg/m³", WA_DIMENSION_DENSITY, 1.006, -1},
    {"1.5e-3 mol/L", WA_DIMENSION_CONCENTRATION, 0.0015, -1},
};

static void texts_mean_what_they_say(void **state)
{
    (void)state;
    for (size_t i = 0; i < sizeof meanings / sizeof meanings[0]; i++) {
        const struct meaning *meaning = &meanings[i];
        struct wa_quantity quantity;
        struct wa_error error;
        if (wa_quantity_parse(meaning->text, meaning->dimension, &quantity, &error) != WA_OK) {
            fail_msg("%s: %s", meaning->text, error.message);
        }
        if (fabs(quantity.value - meaning->value) > 1e-12 * fmax(1, fabs(meaning->value)) ||
            quantity.has_u != (meaning->u >= 0) ||
            (quantity.has_u && fabs(quantity.u - meaning->u) > 1e-12)) {
            fail_msg("%s: got %.15g u %.15g", meaning->text, quantity.value, quantity.u);
        }
    }
}

static void what_is_no_value_is_refused_with_units(void **state)
{
    (void)state;
    static const struct meaning wrong[] = {
        {"0.3127 mL", WA_DIMENSION_MASS, 0, 0},    {"", WA_DIMENSION_MASS, 0, 0},
        {"heavy", WA_DIMENSION_MASS, 0, 0},        {"0.31Z7 g", WA_DIMENSION_MASS, 0, 0},
        {"1,234.5 mg", WA_DIMENSION_MASS, 0, 0},   {"0.3 ± g", WA_DIMENSION_MASS, 0, 0},
        {"0.3 ± -0.1 g", WA_DIMENSION_MASS, 0, 0}, {"1e999 g", WA_DIMENSION_MASS, 0, 0},
        {"5 %", WA_DIMENSION_CONCENTRATION, 0, 0},
    };
    for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++) {
        struct wa_quantity quantity = {.value = -7};
        struct wa_error error = {0};
        assert_int_equal(wa_quantity_parse(wrong[i].text, wrong[i].dimension, &quantity, &error),
                         WA_ERROR_INPUT);
        assert_true(quantity.value == -7);
        assert_non_null(strstr(error.message, "units known here"));
    }
}

static void words_around_a_value_do_not_hide_it(void **state)
{
    (void)state;
    struct wa_quantity quantity;
    assert_true(wa_quantity_find("0.1 M NaOH", WA_DIMENSION_CONCENTRATION, &quantity));
    assert_true(quantity.value == 0.1);
    assert_true(wa_quantity_find("NaOH, 0.1 ± 0.001 mol/L", WA_DIMENSION_CONCENTRATION, &quantity));
    assert_true(quantity.has_u);
    assert_false(wa_quantity_find("NaOH 2", WA_DIMENSION_CONCENTRATION, &quantity));
    assert_false(wa_quantity_find("vial 17", WA_DIMENSION_CONCENTRATION, &quantity));
}

/* JCGM 100:2008, 7.2.6: at most two significant digits of u, the value to the same place. */
static void digits_follow_the_uncertainty(void **state)
{
    (void)state;
    static const struct {
        double value, u;
        const char *text;
    } shown[] = {
        /* QUAM:2012 A2: 0.10214 mol/L with u = 0.00010 */
        {0.102136, 0.0001005, "0.10214 ± 0.00010"},
        {10.05762, 0.027, "10.058 ± 0.027"},
        {1, 0.0996, "1.00 ± 0.10"},
        {1234, 151, "1230 ± 150"},
        {0, 0.06, "0.000 ± 0.060"},
        {-3.14159, 0.0021, "-3.1416 ± 0.0021"},
        {1.75e-5, 2.1e-7, "(1.750 ± 0.021)e-5"},
        {2.5, 0, "2.5"},
    };
    for (size_t i = 0; i < sizeof shown / sizeof shown[0]; i++) {
        char text[80];
        wa_quantity_format(text, sizeof text, shown[i].value, shown[i].u);
        assert_string_equal(text, shown[i].text);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(texts_mean_what_they_say),
        cmocka_unit_test(what_is_no_value_is_refused_with_units),
        cmocka_unit_test(words_around_a_value_do_not_hide_it),
        cmocka_unit_test(digits_follow_the_uncertainty),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
