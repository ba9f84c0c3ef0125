/* Evidence besides the curve: prior weights by file, observations that are no titration, the mass.
 * Own contract, and closed forms against quadrature (self-consistency). */
#include "match/match_internal.h"
#include "whichacid/observation.h"
#include "whichacid/weights.h"

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

static struct wa_table table;

static int load(void **state)
{
    struct wa_error error;
    (void)state;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    (void)state;
    wa_table_free(&table);
    return 0;
}

static const struct wa_form *form_of(const char *key)
{
    const int form = wa_table_find_form(&table, key);
    assert_true(form >= 0);
    return &table.forms[form];
}

static enum wa_status weights_from(const char *text, struct wa_weight_list *list,
                                   struct wa_error *error)
{
    char path[] = "weights-XXXXXX";
    const int file = mkstemp(path);
    assert_true(file >= 0);
    assert_int_equal(write(file, text, strlen(text)), strlen(text));
    close(file);
    const enum wa_status status = wa_weights_load(path, &table, list, error);
    unlink(path);
    return status;
}

/* Red when a header, a comment, a semicolon, quotes or the words for the rest are misread. */
static void reads_weights(void **state)
{
    struct wa_weight_list list;
    struct wa_error error;
    (void)state;
    assert_int_equal(weights_from("key,weight\n# shelf\nborax;3\r\n\"citric-acid\",0.5\nrest,2\n"
                                  "not-in-table,1\n",
                                  &list, &error),
                     WA_OK);
    assert_int_equal(list.count, 2);
    assert_float_equal(list.weights[0].weight, 3.0, 0.0);
    assert_int_equal(list.weights[0].line, 3);
    assert_float_equal(list.weights[1].weight, 0.5, 0.0);
    assert_float_equal(list.rest, 2.0, 0.0);
    assert_float_equal(list.not_in_table, 1.0, 0.0);
    wa_weights_free(&list);
}

/* Red when a key that the table lacks, a repeated key or a negative weight passes, or is told
 * without its line. */
static void refuses_weights(void **state)
{
    static const char *const wrong[] = {"borax,1\nno-such-acid,1\n", "borax,1\nborax,2\n",
                                        "citric-acid,1\nborax,-1\n"};
    (void)state;
    for (size_t i = 0; i < sizeof wrong / sizeof wrong[0]; i++) {
        struct wa_weight_list list;
        struct wa_error error;
        assert_int_equal(weights_from(wrong[i], &list, &error), WA_ERROR_CALL);
        assert_int_equal(error.line, 2);
    }
}

/* The water of borax decahydrate, 10 x 18.015 of 381.37 (atomic weights): red when the number
 * before H2O or the raised dot is misread, or when water bound in a molecule counts. */
static void finds_water(void **state)
{
    (void)state;
    assert_float_equal(wa_form_water(&table, form_of("borax")), 0.4724, 0.0005);
    assert_float_equal(wa_form_water(&table, form_of("sodium-dihydrogen-phosphate-dihydrate")),
                       0.2309, 0.0005);
    assert_float_equal(wa_form_water(&table, form_of("benzoic-acid")), 0.0, 0.0);
}

/* Red when the sign of the depression is turned, or a wild value can veto a form. */
static void melting_point_is_asymmetric(void **state)
{
    struct wa_observation at;
    struct wa_error error;
    const struct wa_form *form = form_of("benzoic-acid");
    (void)state;
    assert_int_equal(wa_observation_parse("melting point: 122 \u00b1 1 \u00b0C", &at, &error),
                     WA_OK);
    double value[3];
    for (int i = 0; i < 3; i++) {
        at.quantity.value = form->melting_point_C + (i == 0 ? -5.0 : i == 1 ? 5.0 : 150.0);
        value[i] = wa_observation_log_likelihood(&table, form, &at);
    }
    assert_true(value[0] > value[1] + 1.0);
    assert_true(value[2] > -14.0);
}

/* Red when words are taken for an observation that they are not. */
static void refuses_observations(void **state)
{
    struct wa_observation at;
    struct wa_error error;
    (void)state;
    assert_int_equal(wa_observation_parse("colour: red", &at, &error), WA_ERROR_CALL);
    assert_int_equal(wa_observation_parse("chloride: perhaps", &at, &error), WA_ERROR_CALL);
    assert_int_equal(wa_observation_parse("loss on drying: 850 %", &at, &error), WA_ERROR_CALL);
    assert_int_equal(wa_observation_parse("chloride: yes", &at, &error), WA_OK);
    assert_true(at.positive);
}

/* A halogen bound to carbon is no halide: red when chloroacetic acid counts as a chloride. */
static void tells_halides(void **state)
{
    static const struct wa_observation chloride = {.kind = WA_OBSERVED_CHLORIDE, .positive = true};
    (void)state;
    const double salt =
        wa_observation_log_likelihood(&table, form_of("l-lysine-hydrochloride"), &chloride);
    const double bound =
        wa_observation_log_likelihood(&table, form_of("chloroacetic-acid"), &chloride);
    assert_true(salt > bound + 2.0);
}

/* The likelihoods are densities: their integrals are 1, red when a normalisation is lost. */
static void densities_add_up(void **state)
{
    static const char *const keys[] = {"benzoic-acid", "borax"};
    (void)state;
    for (int i = 0; i < 3; i++) {
        const struct wa_form *form = i < 2 ? form_of(keys[i]) : NULL;
        double melting = 0.0, drying = 0.0;
        struct wa_observation at = {.kind = WA_OBSERVED_MELTING_POINT, .quantity = {.u = 1.0}};
        for (int k = -4000; k < 8000; k++) {
            at.quantity.value = 0.1 * k;
            melting += 0.1 * exp(wa_observation_log_likelihood(&table, form, &at));
        }
        at = (struct wa_observation){.kind = WA_OBSERVED_LOSS_ON_DRYING, .quantity = {.u = 0.002}};
        for (int k = -200; k < 7000; k++) {
            at.quantity.value = 1e-4 * k;
            drying += 1e-4 * exp(wa_observation_log_likelihood(&table, form, &at));
        }
        assert_float_equal(melting, 1.0, 0.01);
        assert_float_equal(drying, 1.0, 0.01);
    }
}

/* The closed form of the mass against quadrature over the purity: red when the half-normal leans
 * the other way or loses its factor 2. */
static void mass_matches_quadrature(void **state)
{
    const struct wa_purity purity = wa_purity_default();
    const struct wa_titrated_mass mass = {.known = true, .mass_g = 0.1, .u_g = 1e-4};
    const struct wa_prior broad = {.mean = -7.0, .u = 1.5};
    const double u = hypot(0.004, 1e-3);
    (void)state;
    for (int i = 0; i < 5; i++) {
        const double ln_amount = log(0.1 / 100.0) - 0.08 + 0.03 * i;
        const double short_of = ln_amount - log(0.1 / 100.0);
        double sum = 0.0;
        for (int k = -60000; k < 10000; k++) {
            const double t = 1e-5 * k;
            const double reagent =
                purity.reagent_share *
                exp(-0.5 * pow((t - purity.reagent_ln_mean) / purity.reagent_ln_u, 2.0)) /
                purity.reagent_ln_u;
            const double found = t > 0.0 ? 0.0
                                         : 2.0 * (1.0 - purity.reagent_share) *
                                               exp(-0.5 * pow(t / purity.found_ln_s, 2.0)) /
                                               purity.found_ln_s;
            sum += 1e-5 * (reagent + found) * exp(-0.5 * pow((short_of - t) / u, 2.0)) / u;
        }
        const double expected = log(sum / (2.0 * 3.14159265358979)) +
                                0.5 * pow((ln_amount + 7.0) / 1.5, 2.0) +
                                log(1.5 * sqrt(2.0 * 3.14159265358979));
        assert_float_equal(wa_log_mass_evidence(&mass, &purity, 100.0, ln_amount, 0.004, &broad),
                           expected, 2e-3);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(reads_weights),        cmocka_unit_test(refuses_weights),
        cmocka_unit_test(finds_water),          cmocka_unit_test(melting_point_is_asymmetric),
        cmocka_unit_test(refuses_observations), cmocka_unit_test(tells_halides),
        cmocka_unit_test(densities_add_up),     cmocka_unit_test(mass_matches_quadrature),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
