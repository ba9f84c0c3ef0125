/* Simulated runs. Their chemistry is checked with the equilibrium room; here it is the way from
 * names to points and on to a file. */
#include "whichacid/reader.h"
#include "whichacid/simulate.h"

#include "base/sha256.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static struct wa_table table;

static void assert_near(double value, double expected, double tolerance)
{
    if (!(fabs(value - expected) <= tolerance)) {
        fail_msg("%.12g is not %.12g within %.3g", value, expected, tolerance);
    }
}

static struct wa_simulation simulated(const struct wa_simulation_options *options)
{
    struct wa_simulation simulation;
    struct wa_error error;
    if (wa_simulate(&table, options, &simulation, &error) != WA_OK) {
        fail_msg("%s", error.message);
    }
    return simulation;
}

static struct wa_simulation_options ask(const char *form)
{
    struct wa_simulation_options options;
    wa_simulation_defaults(&options);
    options.forms[0] = form;
    options.form_count = 1;
    return options;
}

static char *written(const struct wa_simulation_options *options, size_t *length)
{
    struct wa_simulation simulation = simulated(options);
    char *text = NULL;
    struct wa_error error;
    assert_int_equal(wa_simulation_write(&simulation, &text, length, &error), WA_OK);
    wa_simulation_free(&simulation);
    return text;
}

/* Own contract: the same seed gives the same file on any machine. The fingerprint was taken on
 * x86-64; a strong acid depends on nothing in the table that could be improved. Red when the
 * generator, the order of the draws, the rounding or the file's layout changes. */
static void same_seed_same_file(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("hydrochloric-acid");
    options.mass[0] = (struct wa_quantity){.value = 0.0729};
    options.titrant_concentration = (struct wa_quantity){.value = 0.1, .u = 0.0002, .has_u = true};
    options.seed = 20240229;
    size_t length, again_length, other_length;
    char *text = written(&options, &length);
    char *again = written(&options, &again_length);
    options.seed++;
    char *other = written(&options, &other_length);
    char digest[65];
    wa_sha256(text, length, digest);
    assert_string_equal(digest, "c616f1fece69901631630982d5f6b6f6e24f3ddb3b4fbf27bc4fd11bb3c028b9");
    assert_string_equal(text, again);
    assert_string_not_equal(text, other);
    free(text);
    free(again);
    free(other);
}

/* Own contract: the reader takes the file whole, and the notes come back as they were asked for. */
static void reader_takes_it(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("citric acid");
    options.mass[0] = (struct wa_quantity){.value = 0.15, .u = 0.0002, .has_u = true};
    options.titrant_concentration = (struct wa_quantity){.value = 0.1, .u = 0.0002, .has_u = true};
    options.titrant_carbonate = (struct wa_quantity){.value = 0.005, .u = 0.002, .has_u = true};
    options.electrode_slope = (struct wa_quantity){.value = 0.99, .u = 0.004, .has_u = true};
    options.electrode_offset = (struct wa_quantity){.value = -0.03, .u = 0.01, .has_u = true};
    size_t length;
    char *text = written(&options, &length);
    struct wa_run_list list = {0};
    struct wa_error error;
    assert_non_null(strstr(text, "synthetic"));
    assert_int_equal(wa_read_memory(text, length, "simulated", NULL, &list, &error), WA_OK);
    assert_int_equal(list.count, 1);
    const struct wa_run *run = &list.runs[0];
    const struct wa_conditions *c = &run->conditions;
    assert_int_equal(run->point_count, 60);
    assert_int_equal(run->set_aside_count, 0);
    assert_near(c->sample_mass.quantity.value, 0.15, 1e-12);
    assert_near(c->titrant_concentration.quantity.u, 0.0002, 1e-12);
    assert_near(c->titrant_carbonate.quantity.value, 0.005, 1e-12);
    assert_near(c->electrode_slope.quantity.value, 0.99, 1e-12);
    assert_near(c->electrode_offset.quantity.value, -0.03, 1e-12);
    assert_near(c->electrode_offset.quantity.u, 0.01, 1e-12);
    assert_string_equal(c->titrant, "Sodium hydroxide");
    wa_run_list_free(&list);
    free(text);
}

/* Own contract: every modelled form of the table can be simulated with the defaults: its ions are
 * neutral, about 20 mL reach the last equivalence point, and the readings move the right way. */
static void every_form(void **state)
{
    (void)state;
    for (size_t f = 0; f < table.form_count; f++) {
        if (!table.forms[f].modelled) {
            continue;
        }
        struct wa_simulation_options options = ask(table.forms[f].key);
        options.step_mL = 1.0;
        options.noise_reading = 0.0;
        options.noise_volume = 0.0;
        struct wa_simulation made = simulated(&options);
        const double rise = made.reading[made.count - 1] - made.reading[0];
        if (!(made.titrant->is_base ? rise > 0.0 : rise < 0.0)) {
            fail_msg("%s: the pH moves by %g", table.forms[f].key, rise);
        }
        double charge = made.titration.sample_charge, most = 1e-12;
        for (int k = 0; k < made.forms[0]->part_count; k++) {
            const struct wa_form_part *part = &made.forms[0]->parts[k];
            const int z = part->acid == WA_PART_WATER ? 0 : table.acids[part->acid].charge;
            charge += (part->count * z - part->lost) * made.mass[0] / made.forms[0]->molar_mass;
        }
        assert_near(charge, 0.0, most);
        assert_in_range((int)made.options.end_mL, 15, 40);
        wa_simulation_free(&made);
    }
}

/* Own contract: the reading is 7 + slope (pH - 7) + offset of the model's pH, and points stand
 * closer where the pH moves. Without noise nothing is random. */
static void electrode_and_points(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("acetic-acid");
    options.noise_reading = options.noise_volume = 0.0;
    options.electrode_slope.value = 0.98;
    options.electrode_offset.value = 0.1;
    struct wa_simulation made = simulated(&options);
    double narrowest = INFINITY, at = 0.0;
    for (size_t p = 0; p < made.count; p++) {
        struct wa_solution solution;
        struct wa_error error;
        assert_int_equal(
            wa_titration_pH(&made.titration, made.volume_mL[p], 7.0, &solution, NULL, &error),
            WA_OK);
        assert_near(made.reading[p], 7.0 + 0.98 * (solution.pH - 7.0) + 0.1, 0.51e-4);
        if (p > 0 && made.volume_mL[p] - made.volume_mL[p - 1] < narrowest) {
            narrowest = made.volume_mL[p] - made.volume_mL[p - 1];
            at = made.volume_mL[p];
        }
    }
    assert_int_equal(made.count, 60);
    assert_near(at, 20.0, 0.3);
    assert_true(narrowest > 0.0 && narrowest < 0.1);
    wa_simulation_free(&made);
}

/* Own contract: the noise has the standard deviation asked for. 2000 readings: the estimate's own
 * relative standard deviation is 1/sqrt(2 * 2000) = 1.6 %; four of them are the limit. */
static void noise_level(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("tris");
    options.point_count = 2000;
    options.noise_reading = 0.02;
    options.noise_volume = 0.0;
    struct wa_simulation noisy = simulated(&options);
    options.noise_reading = 0.0;
    struct wa_simulation clean = simulated(&options);
    double square = 0.0;
    for (size_t p = 0; p < noisy.count; p++) {
        square += pow(noisy.reading[p] - clean.reading[p], 2.0);
    }
    assert_near(sqrt(square / 2000.0), 0.02, 4.0 * 0.016 * 0.02);
    wa_simulation_free(&noisy);
    wa_simulation_free(&clean);
}

/* Outside check of the solid: benzoic acid, 0.34 g in 100 mL at 25 degree Celsius by the table, is
 * a solution of 27.8 mmol/L with all its species. A sample at that concentration is just dissolved,
 * a larger one is not, and its pH at the start is that of the saturated solution. */
static void solid_at_the_start(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("benzoic-acid");
    options.noise_reading = options.noise_volume = 0.0;
    const double saturated_g = 0.34 / 100.0 * 50.0;
    options.mass[0].value = 0.995 * saturated_g;
    struct wa_simulation below = simulated(&options);
    options.mass[0].value = 2.0 * saturated_g;
    struct wa_simulation above = simulated(&options);
    options.dissolved = true;
    struct wa_simulation forced = simulated(&options);
    assert_true(below.solid_until_mL == 0.0);
    assert_true(above.solid_until_mL > 1.0);
    assert_true(forced.solid_until_mL == 0.0);
    assert_near(above.reading[0], below.reading[0], 0.005);
    assert_true(forced.reading[0] < above.reading[0] - 0.1);
    wa_simulation_free(&below);
    wa_simulation_free(&above);
    wa_simulation_free(&forced);
}

/* Own contract: titrant chosen by what the sample is, mixtures add up, and carbonate shows. */
static void titrants_and_mixtures(void **state)
{
    (void)state;
    static const struct {
        const char *form;
        bool base;
    } expected[] = {
        {"potassium-hydrogen-phthalate", true},
        {"glycine", true},
        {"borax", false},
        {"sodium-carbonate", false},
        {"tris", false},
        {"citric-acid", true},
        {"disodium-hydrogen-phosphate", false},
        {"phosphoric-acid", true},
    };
    for (size_t i = 0; i < sizeof expected / sizeof expected[0]; i++) {
        const struct wa_simulation_options options = ask(expected[i].form);
        struct wa_simulation made = simulated(&options);
        assert_int_equal(made.titrant->is_base, expected[i].base);
        wa_simulation_free(&made);
    }
    struct wa_simulation_options options = ask("acetic-acid");
    options.forms[1] = "phosphoric-acid";
    options.form_count = 2;
    options.noise_reading = options.noise_volume = 0.0;
    struct wa_simulation clean = simulated(&options);
    assert_int_equal(clean.titration.component_count, 2);
    options.titrant_carbonate.value = 0.05;
    struct wa_simulation carbonated = simulated(&options);
    assert_int_equal(carbonated.titration.component_count, 3);
    assert_near(carbonated.titration.components[2].titrant_concentration, 0.0025, 1e-15);
    wa_simulation_free(&clean);
    wa_simulation_free(&carbonated);
}

/* Own contract: what cannot be is refused with a sentence, and nothing is leaked. */
static void refusals(void **state)
{
    (void)state;
    struct wa_simulation made;
    struct wa_error error;
    struct wa_simulation_options options = ask("no such acid");
    assert_int_equal(wa_simulate(&table, &options, &made, &error), WA_ERROR_CALL);
    assert_non_null(strstr(error.message, "no such acid"));
    options = ask("acetic-acid");
    options.titrant = "lemonade";
    assert_int_equal(wa_simulate(&table, &options, &made, &error), WA_ERROR_CALL);
    options = ask("acetic-acid");
    options.seed = 0;
    assert_int_equal(wa_simulate(&table, &options, &made, &error), WA_ERROR_CALL);
    options = ask("acetic-acid");
    options.temperature_C = NAN;
    assert_int_equal(wa_simulate(&table, &options, &made, &error), WA_ERROR_CALL);
    options = ask("acetic-acid");
    options.step_mL = 1e-9;
    assert_int_equal(wa_simulate(&table, &options, &made, &error), WA_ERROR_CALL);
}

static int load(void **state)
{
    (void)state;
    struct wa_error error;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    (void)state;
    wa_table_free(&table);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(same_seed_same_file),
        cmocka_unit_test(reader_takes_it),
        cmocka_unit_test(every_form),
        cmocka_unit_test(electrode_and_points),
        cmocka_unit_test(noise_level),
        cmocka_unit_test(solid_at_the_start),
        cmocka_unit_test(titrants_and_mixtures),
        cmocka_unit_test(refusals),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
