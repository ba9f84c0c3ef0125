/* Constants: conversion, temperature, combination, and the shipped values against other tables.
 * Kinds of check: outside check (published tables, named), self-consistency (published pairs at two
 * ionic strengths), own contract (combination). */
#include "whichacid/equilibrium.h"
#include "whichacid/reference.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

/* cmocka's own comparison works in single precision. */
#define assert_near(value, expected, tolerance)                                                    \
    do {                                                                                           \
        double near_value = (value);                                                               \
        double near_expected = (expected);                                                         \
        if (!(fabs(near_value - near_expected) <= (tolerance))) {                                  \
            fail_msg("%.12g, expected %.12g within %g", near_value, near_expected,                 \
                     (double)(tolerance));                                                         \
        }                                                                                          \
    } while (0)

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

struct published_pKa {
    const char *acid;
    double pKa[4]; /* 0: not given */
    int first;     /* our step of the first value */
};

/* Compare with the tolerance of a handbook value, print the largest deviation. */
static void compare(const struct wa_table *table, const char *source,
                    const struct published_pKa *published, size_t count, double tolerance)
{
    double largest = 0.0;
    const char *where = "";
    size_t values = 0;
    for (size_t i = 0; i < count; i++) {
        int acid = wa_table_find_acid(table, published[i].acid);
        if (acid < 0) {
            fail_msg("there is no acid '%s'", published[i].acid);
        }
        for (int j = 0; j < 4 && published[i].pKa[j] > 0.0; j++) {
            int step = published[i].first + j;
            assert_true(step <= table->acids[acid].step_count);
            double off = table->acids[acid].steps[step - 1].pKa - published[i].pKa[j];
            values++;
            if (fabs(off) > largest) {
                largest = fabs(off);
                where = published[i].acid;
            }
            if (fabs(off) > tolerance) {
                fail_msg("%s, step %d: %.3f, published %.3f", published[i].acid, step,
                         table->acids[acid].steps[step - 1].pKa, published[i].pKa[j]);
            }
        }
    }
    print_message("%s: %zu acids, %zu values, largest deviation %.3f (%s)\n", source, count, values,
                  largest, where);
}

/* R. Blatchly, Amino Acids with Acidity Values, Keene State College (open course table; the values
 * of Dawson et al., Data for Biochemical Research, 1986), by ascending pKa. It mixes ionic
 * strengths, hence the wider tolerance; the last step of aspartic and glutamic acid, which 0.1
 * mol/L moves by 0.4, is left out. */
static void amino_acids_agree_with_another_table(void **state)
{
    static const struct published_pKa table[] = {
        {"glycine", {2.35, 9.78}, 1},         {"alanine", {2.35, 9.87}, 1},
        {"valine", {2.29, 9.74}, 1},          {"leucine", {2.33, 9.74}, 1},
        {"isoleucine", {2.32, 9.76}, 1},      {"phenylalanine", {2.20, 9.31}, 1},
        {"tryptophan", {2.46, 9.41}, 1},      {"tyrosine", {2.20, 9.21}, 1},
        {"histidine", {1.80, 6.04, 9.33}, 1}, {"serine", {2.19, 9.21}, 1},
        {"threonine", {2.09, 9.10}, 1},       {"methionine", {2.13, 9.28}, 1},
        {"cysteine", {1.92, 8.37, 10.70}, 1}, {"aspartic-acid", {1.99, 3.90}, 1},
        {"glutamic-acid", {2.10, 4.07}, 1},   {"asparagine", {2.14, 8.72}, 1},
        {"glutamine", {2.17, 9.13}, 1},       {"lysine", {2.16, 9.06}, 1},
        {"arginine", {1.82, 8.99}, 1},        {"proline", {1.95, 10.64}, 1},
    };
    compare(*state, "amino acids", table, sizeof table / sizeof table[0], 0.3);
}

/* J. R. Fromm, Ionization Constants of Aqueous Polyprotic Acids, 1997 (open course table). Its
 * third value of citric acid, 5.602 beside Ka 3.99e-6, and its first of chromic acid, -0.55,
 * contradict every other table and are left out, and EDTA, which stands there at another ionic
 * strength. */
static void polyprotic_acids_agree_with_another_table(void **state)
{
    static const struct published_pKa table[] = {
        {"boric-acid", {9.238}, 1},
        {"carbonic-acid", {6.361, 10.329}, 1},
        {"chromic-acid", {6.473}, 2},
        {"citric-acid", {3.130, 4.757}, 1},
        {"oxalic-acid", {1.268, 4.282}, 1},
        {"phthalic-acid", {2.946, 5.409}, 1},
        {"phosphoric-acid", {2.148, 7.206, 12.342}, 1},
        {"succinic-acid", {4.207, 5.636}, 1},
        {"sulfuric-acid", {1.994}, 2},
        {"sulfurous-acid", {1.766, 7.223}, 1},
    };
    compare(*state, "polyprotic acids", table, sizeof table / sizeof table[0], 0.2);
}

/* LibreTexts, Reference Tables, E1 Acid Dissociation Constants at 25 °C (monoprotic ones). */
static void monoprotic_acids_agree_with_another_table(void **state)
{
    static const struct published_pKa table[] = {
        {"acetic-acid", {4.756}, 1},        {"benzoic-acid", {4.204}, 1},
        {"bromoacetic-acid", {2.90}, 1},    {"chloroacetic-acid", {2.87}, 1},
        {"dichloroacetic-acid", {1.35}, 1}, {"fluoroacetic-acid", {2.59}, 1},
        {"formic-acid", {3.75}, 1},         {"hydrocyanic-acid", {9.21}, 1},
        {"hydrofluoric-acid", {3.20}, 1},   {"hypochlorous-acid", {7.40}, 1},
    };
    compare(*state, "monoprotic acids", table, sizeof table / sizeof table[0], 0.08);
}

/* Open laboratory table "Acid and Base Ionization Constants" (thelabrat.com), Kb to two figures:
 * pKa = 13.995 - pKb. */
static void bases_agree_with_another_table(void **state)
{
    static const struct published_pKa table[] = {
        {"ammonia", {9.25}, 1},     {"aniline", {4.62}, 1},       {"dimethylamine", {10.70}, 1},
        {"ethylamine", {10.67}, 1}, {"hydroxylamine", {6.04}, 1}, {"methylamine", {10.64}, 1},
        {"pyridine", {5.14}, 1},
    };
    compare(*state, "bases", table, sizeof table / sizeof table[0], 0.1);
}

/* Harris, Quantitative Chemical Analysis, appendix G (after Martell, Smith and Motekaitis): glycine
 * 2.350 and 9.778 at I = 0; NIST SRD 46: 2.33 and 9.57 at I = 0.1. Tris 8.072 and 8.10. Turns red
 * when a sign, a charge or the factor two of the conversion is wrong: the amine of glycine, whose
 * charge falls from 0 to -1, moves by 0.2, the others hardly. */
static void concentration_constants_convert_to_zero_ionic_strength(void **state)
{
    (void)state;
    double u;
    double pKa =
        wa_constant_to_zero_ionic_strength(9.57, WA_CONSTANT_CONCENTRATION, 0, 0.1, 25.0, &u);
    assert_near(pKa, 9.778, 0.02);
    assert_true(u > 0.005 && u < 0.05);
    pKa = wa_constant_to_zero_ionic_strength(2.33, WA_CONSTANT_CONCENTRATION, 1, 0.1, 25.0, &u);
    assert_near(pKa, 2.33, 1e-9);
    pKa = wa_constant_to_zero_ionic_strength(8.10, WA_CONSTANT_CONCENTRATION, 1, 0.1, 25.0, &u);
    assert_near(pKa, 8.072, 0.03);
    /* A mixed constant holds a(H) and so lies between: pKm = pKc - g, with g = lg γ. */
    double g = wa_davies_log10_gamma(0.1, wa_medium_at(25.0).debye_huckel_A, WA_DAVIES_COEFFICIENT);
    pKa = wa_constant_to_zero_ionic_strength(9.57 - g, WA_CONSTANT_MIXED, 0, 0.1, 25.0, NULL);
    assert_near(
        pKa,
        wa_constant_to_zero_ionic_strength(9.57, WA_CONSTANT_CONCENTRATION, 0, 0.1, 25.0, NULL),
        1e-12);
    assert_near(
        wa_constant_to_zero_ionic_strength(5.0, WA_CONSTANT_THERMODYNAMIC, 0, 0.1, 25.0, &u), 5.0,
        0.0);
}

/* Every pair of rows of the table that two published compilations give for one step at zero and at
 * 0.1 mol/L, 25 °C: the converted value must come near the thermodynamic one. The root mean square
 * is printed; 0.1 would mean that the conversion does no better than leaving it out. */
static void published_pairs_agree_after_conversion(void **state)
{
    const struct wa_table *table = *state;
    double squares = 0.0;
    size_t pairs = 0;
    for (size_t i = 0; i + 1 < table->constant_count; i++) {
        for (size_t j = i + 1;
             j < table->constant_count && table->constants[j].acid == table->constants[i].acid &&
             table->constants[j].step == table->constants[i].step;
             j++) {
            const struct wa_constant_row *a = &table->constants[i];
            const struct wa_constant_row *b = &table->constants[j];
            if (a->thermodynamic && b->kind == WA_CONSTANT_CONCENTRATION &&
                fabs(b->ionic_strength - 0.1) < 0.01 && fabs(a->temperature_C - 25.0) < 0.1 &&
                fabs(b->temperature_C - 25.0) < 0.1 && strcmp(a->source, "harris-2010-g") == 0) {
                squares += pow(b->pKa_standard - a->pKa, 2);
                pairs++;
            }
        }
    }
    assert_true(pairs >= 20);
    print_message("%zu pairs, root mean square %.3f\n", pairs, sqrt(squares / (double)pairs));
    assert_true(sqrt(squares / (double)pairs) < 0.1);
}

/* Ammonium, enthalpy 52.2 kJ/mol and heat capacity near zero: 9.245 at 25 °C, 10.07 near 0 °C and
 * 8.54 near 50 °C as R. G. Bates and G. D. Pinching measured (J. Res. Natl. Bur. Stand. 42 (1949)
 * 419; values quoted from memory, hence the tolerance). */
static void temperature_moves_a_constant_by_its_enthalpy(void **state)
{
    (void)state;
    const struct wa_step step = {.pKa = 9.245, .u = 0.005, .enthalpy = 52.2, .enthalpy_u = 1.0};
    double u;
    assert_near(wa_step_pKa_at(&step, 25.0, &u), 9.245, 1e-12);
    assert_near(u, 0.005, 1e-12);
    assert_near(wa_step_pKa_at(&step, 0.0, &u), 10.08, 0.03);
    assert_near(wa_step_pKa_at(&step, 50.0, &u), 8.54, 0.03);
    assert_true(u > 0.01);
}

/* Write rows for acetic acid into a file and load them over the table. */
static void load_rows(const char *rows, struct wa_table *table, char path[64])
{
    struct wa_error error = {0};
    strcpy(path, "/tmp/whichacid-constants-XXXXXX");
    int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    FILE *stream = fdopen(descriptor, "w");
    assert_non_null(stream);
    fprintf(stream,
            "acid,step,pKa,u,temperature,ionic strength,kind,enthalpy,heat "
            "capacity,source,note\n%s",
            rows);
    fclose(stream);
    const char *also = path;
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, &also, 1, table, &error), WA_OK);
    unlink(path);
}

static struct wa_step step_of(const char *rows)
{
    struct wa_table table;
    char path[64];
    load_rows(rows, &table, path);
    int acid = wa_table_find_acid(&table, "acetic-acid");
    assert_true(acid >= 0);
    struct wa_step step = table.acids[acid].steps[0];
    wa_table_free(&table);
    return step;
}

/* Weighted mean and Birge ratio by hand: 4.70 ± 0.02 and 4.80 ± 0.02 give 4.75, chi squared 12.5,
 * ratio 3.54 and u = 0.0141 * 3.54 = 0.05. */
static void rows_are_combined_and_disagreement_shows(void **state)
{
    (void)state;
    struct wa_step step = step_of("acetic-acid,1,4.70,0.02,25,0,thermodynamic,,,from memory,\n"
                                  "acetic-acid,1,4.80,0.02,25,0,thermodynamic,,,from memory,\n");
    assert_near(step.pKa, 4.75, 1e-9);
    assert_near(step.birge_ratio, sqrt(12.5), 1e-9);
    assert_near(step.u, 0.05, 1e-9);
    assert_int_equal(step.row_count, 2);
    assert_true(step.from_memory);
    step = step_of("acetic-acid,1,4.75,0.01,25,0,thermodynamic,,,from memory,\n"
                   "acetic-acid,1,4.80,0.03,25,0,thermodynamic,,,from memory,\n");
    assert_near(step.pKa, (4.75 / 1e-4 + 4.80 / 9e-4) / (1 / 1e-4 + 1 / 9e-4), 1e-9);
    /* Two tables that agree have often copied one source: u is that of the better. */
    step = step_of("acetic-acid,1,4.75,0.01,25,0,thermodynamic,,,from memory,\n"
                   "acetic-acid,1,4.75,0.01,25,0,thermodynamic,,,from memory,x\n");
    assert_near(step.u, 0.01, 1e-9);
}

/* A row at 35 °C joins when an enthalpy brings it to 25 °C, stays out when it has none and a row at
 * 25 °C exists, and stands in, widened, when it is all there is. */
static void rows_at_other_temperatures_are_brought_over_or_left_out(void **state)
{
    (void)state;
    struct wa_step step = step_of("acetic-acid,1,5.00,0.02,35,0,thermodynamic,,,from memory,\n"
                                  "acetic-acid,1,4.75,0.02,25,0,thermodynamic,,,from memory,\n");
    assert_near(step.pKa, 4.75, 1e-12);
    assert_int_equal(step.row_count, 1);
    step = step_of("acetic-acid,1,4.75,0.02,35,0,thermodynamic,20,,from memory,\n"
                   "acetic-acid,1,4.90,0.02,25,0,thermodynamic,,,from memory,\n");
    assert_int_equal(step.row_count, 2);
    /* 20 kJ/mol over ten kelvin: lg K moves by 20000 (1/298.15 - 1/308.15)/(R ln 10); the enthalpy
     * is taken as known to 2 kJ/mol, a tenth of that. */
    double shift = 20000.0 * (1.0 / 298.15 - 1.0 / 308.15) / (8.314462618 * log(10.0));
    double weight = 1.0 / (0.02 * 0.02 + 0.1 * 0.1 * shift * shift);
    double mean = ((4.75 + shift) * weight + 4.90 * 2500.0) / (weight + 2500.0);
    assert_near(step.pKa, mean, 1e-6);
    step = step_of("acetic-acid,1,4.75,0.02,35,0,thermodynamic,,,from memory,\n");
    assert_int_equal(step.row_count, 1);
    assert_false(step.enthalpy_known);
    assert_true(step.u > 0.03);
}

/* Forms of a standard buffer and mol/kg of each. */
struct buffer_recipe {
    const char *key; /* in buffers.csv */
    const char *forms[2];
    double molality[2];
    double tolerance;
};

/* pH of a mixture of forms from the table's constants at 25 °C. */
static double recompute(const struct wa_table *table, const struct buffer_recipe *recipe)
{
    struct wa_system systems[WA_COMPONENTS_MAX];
    struct wa_medium medium = wa_medium_at(25.0);
    struct wa_mixture mixture = {.medium = &medium, .davies_coefficient = WA_DAVIES_COEFFICIENT};
    struct wa_solution solution;
    struct wa_error error;
    for (int i = 0; i < 2 && recipe->forms[i] != NULL; i++) {
        int index = wa_table_find_form(table, recipe->forms[i]);
        if (index < 0) {
            fail_msg("there is no form '%s'", recipe->forms[i]);
        }
        const struct wa_form *form = &table->forms[index];
        double concentration = recipe->molality[i] * medium.density;
        mixture.spectator_charge += concentration * form->spectator_charge;
        mixture.spectator_ionic += 0.5 * concentration * form->spectator_z2;
        for (int j = 0; j < form->part_count; j++) {
            const struct wa_acid *acid = &table->acids[form->parts[j].acid];
            struct wa_system *system = &systems[mixture.component_count];
            double pK[WA_PROTONS_MAX];
            for (int step = 0; step < acid->step_count; step++) {
                pK[step] = acid->steps[step].pKa;
            }
            wa_system_set(system, acid->charge, acid->step_count, pK);
            mixture.components[mixture.component_count] = (struct wa_component){
                .system = system,
                .concentration = concentration * form->parts[j].count,
                .solubility = INFINITY,
            };
            mixture.component_count++;
        }
    }
    assert_int_equal(wa_mixture_solve(&mixture, 7.0, &solution, NULL, &error), WA_OK);
    return solution.pH;
}

static double published_pH(const struct wa_table *table, const char *key)
{
    for (size_t i = 0; i < table->buffer_count; i++) {
        if (strcmp(table->buffers[i].key, key) == 0 &&
            fabs(table->buffers[i].temperature_C - 25.0) < 0.01) {
            return table->buffers[i].pH;
        }
    }
    return NAN;
}

/* The primary standards at 25 °C as buffers.csv has them from NBS/NIST and IUPAC, against the model
 * with the table's own constants and forms: phthalate 4.005, phosphate 6.865, borax 9.180,
 * carbonate 10.012, tetroxalate 1.679. Davies at 0.1 mol/L leaves about 0.02; where more is
 * allowed, triply charged ions or a constant of the table with a larger uncertainty stand behind
 * it. */
static void standard_buffers_come_out_of_the_constants(void **state)
{
    static const struct buffer_recipe recipes[] = {
        {"phthalate", {"potassium-hydrogen-phthalate", NULL}, {0.05, 0.0}, 0.03},
        {"phosphate",
         {"potassium-dihydrogen-phosphate", "disodium-hydrogen-phosphate"},
         {0.025, 0.025},
         0.03},
        {"borax", {"borax", NULL}, {0.01, 0.0}, 0.05},
        {"carbonate", {"sodium-bicarbonate", "sodium-carbonate"}, {0.025, 0.025}, 0.03},
        {"tetroxalate", {"potassium-tetroxalate-dihydrate", NULL}, {0.05, 0.0}, 0.05},
    };
    double largest = 0.0;
    for (size_t i = 0; i < sizeof recipes / sizeof recipes[0]; i++) {
        double published = published_pH(*state, recipes[i].key);
        double computed = recompute(*state, &recipes[i]);
        print_message("%s: %.3f, published %.3f\n", recipes[i].key, computed, published);
        assert_near(computed, published, recipes[i].tolerance);
        largest = fmax(largest, fabs(computed - published));
    }
    print_message("largest deviation of the buffers: %.3f\n", largest);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(amino_acids_agree_with_another_table),
        cmocka_unit_test(polyprotic_acids_agree_with_another_table),
        cmocka_unit_test(monoprotic_acids_agree_with_another_table),
        cmocka_unit_test(bases_agree_with_another_table),
        cmocka_unit_test(concentration_constants_convert_to_zero_ionic_strength),
        cmocka_unit_test(published_pairs_agree_after_conversion),
        cmocka_unit_test(temperature_moves_a_constant_by_its_enthalpy),
        cmocka_unit_test(rows_are_combined_and_disagreement_shows),
        cmocka_unit_test(rows_at_other_temperatures_are_brought_over_or_left_out),
        cmocka_unit_test(standard_buffers_come_out_of_the_constants),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
