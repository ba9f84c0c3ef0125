/* Atomic weights, formulas and molar masses.
 * Kinds of check: outside check (published atomic weights and molar masses, sources named at each
 * table), own contract (what is refused). */
#include "whichacid/reference.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <math.h>
#include <string.h>

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

static double mass_of(const struct wa_table *table, const char *formula)
{
    struct wa_error error = {0};
    double mass = NAN;
    if (wa_table_molar_mass(table, formula, &mass, NULL, &error) != WA_OK) {
        print_message("%s: %s\n", formula, error.message);
    }
    return mass;
}

/* Standard atomic weights abridged to five figures, IUPAC 2021: T. Prohaska et al., Pure Appl.
 * Chem. 94 (2022) 573, as the values stand in that report's table. Turns red when a weight of the
 * table is mistyped. */
static void atomic_weights_are_those_of_iupac(void **state)
{
    static const struct {
        const char *symbol;
        double weight;
    } iupac[] = {
        {"H", 1.0080},  {"Li", 6.94},   {"B", 10.81},   {"C", 12.011},  {"N", 14.007},
        {"O", 15.999},  {"F", 18.998},  {"Na", 22.990}, {"Mg", 24.305}, {"Al", 26.982},
        {"Si", 28.085}, {"P", 30.974},  {"S", 32.06},   {"Cl", 35.45},  {"K", 39.098},
        {"Ca", 40.078}, {"Cr", 51.996}, {"Mn", 54.938}, {"Fe", 55.845}, {"Co", 58.933},
        {"Ni", 58.693}, {"Cu", 63.546}, {"Zn", 65.38},  {"As", 74.922}, {"Se", 78.971},
        {"Br", 79.904}, {"Sr", 87.62},  {"Ag", 107.87}, {"Cd", 112.41}, {"Sn", 118.71},
        {"I", 126.90},  {"Ba", 137.33}, {"Hg", 200.59}, {"Tl", 204.38}, {"Pb", 207.2},
        {"Bi", 208.98}, {"U", 238.03},
    };
    for (size_t i = 0; i < sizeof iupac / sizeof iupac[0]; i++) {
        assert_near(mass_of(*state, iupac[i].symbol), iupac[i].weight, 1e-9);
    }
}

struct published_mass {
    const char *form;
    double mass;
    double tolerance; /* half the last printed digit, and what the atomic weights then used add */
};

static void compare_masses(const struct wa_table *table, const struct published_mass *published,
                           size_t count)
{
    double largest = 0.0;
    for (size_t i = 0; i < count; i++) {
        int form = wa_table_find_form(table, published[i].form);
        if (form < 0) {
            fail_msg("there is no form '%s'", published[i].form);
        }
        double off = table->forms[form].molar_mass - published[i].mass;
        largest = fmax(largest, fabs(off));
        if (fabs(off) > published[i].tolerance) {
            fail_msg("%s: %.4f g/mol, published %.4f", published[i].form,
                     table->forms[form].molar_mass, published[i].mass);
        }
    }
    print_message("largest deviation of %zu molar masses: %.4f g/mol\n", count, largest);
}

/* ACS Reagent Chemicals, 2017, appendix "Composition of Concentrated Reagent-Grade Acids and
 * Ammonium, Potassium, and Sodium Hydroxide Solutions". */
static void reagent_masses_are_the_published_ones(void **state)
{
    static const struct published_mass acs[] = {
        {"acetic-acid", 60.052, 0.0015},      {"formic-acid", 46.026, 0.0015},
        {"hydrochloric-acid", 36.461, 0.004}, {"hydrofluoric-acid", 20.006, 0.0015},
        {"nitric-acid", 63.013, 0.0015},      {"perchloric-acid", 100.458, 0.006},
        {"phosphoric-acid", 97.995, 0.0015},  {"sulfuric-acid", 98.073, 0.0015},
        {"sodium-hydroxide", 39.997, 0.0015}, {"potassium-hydroxide", 56.105, 0.0015},
    };
    compare_masses(*state, acs, sizeof acs / sizeof acs[0]);
}

/* Average masses as listed for the proteinogenic amino acids in the open encyclopaedia (chemical
 * properties table; computed from atomic weights of five decimals, sulfur 32.065 then). */
static void amino_acid_masses_are_the_published_ones(void **state)
{
    static const struct published_mass listed[] = {
        {"l-alanine", 89.09404, 0.002},        {"l-cysteine", 121.15404, 0.008},
        {"l-aspartic-acid", 133.10384, 0.003}, {"l-glutamic-acid", 147.13074, 0.003},
        {"l-phenylalanine", 165.19184, 0.003}, {"glycine", 75.06714, 0.002},
        {"l-histidine", 155.15634, 0.003},     {"l-isoleucine", 131.17464, 0.003},
        {"l-lysine", 146.18934, 0.003},        {"l-leucine", 131.17464, 0.003},
        {"l-methionine", 149.20784, 0.008},    {"l-asparagine", 132.11904, 0.003},
        {"l-proline", 115.13194, 0.003},       {"l-glutamine", 146.14594, 0.003},
        {"l-arginine", 174.20274, 0.004},      {"l-serine", 105.09344, 0.002},
        {"l-threonine", 119.12034, 0.003},     {"l-valine", 117.14784, 0.003},
        {"l-tryptophan", 204.22844, 0.004},    {"l-tyrosine", 181.19124, 0.003},
    };
    compare_masses(*state, listed, sizeof listed / sizeof listed[0]);
}

/* Properties of acids and bases as printed beside concentrated reagents in open laboratory notes
 * (ethylenediamine to triethanolamine), the formula weights of the Compendium of Physiological
 * Solutions, Biological Bulletin (sodium hydrogencarbonate), and example A2 of the Eurachem/CITAC
 * guide QUAM (potassium hydrogen phthalate, 204.2212 with the atomic weights of 2009). */
static void other_masses_are_the_published_ones(void **state)
{
    static const struct published_mass others[] = {
        {"potassium-hydrogen-phthalate", 204.2212, 0.004},
        {"ethylenediamine", 60.10, 0.006},
        {"pyridine", 79.10, 0.006},
        {"triethanolamine", 149.19, 0.006},
        {"sodium-bicarbonate", 84.01, 0.006},
        {"hydriodic-acid", 127.91, 0.006},
    };
    compare_masses(*state, others, sizeof others / sizeof others[0]);
}

/* D. Harvey, Analytical Chemistry 2.1, LibreTexts, appendix 16.8, Recommended Primary Standards.
 * It adds weights to more figures than IUPAC's abridged ones: 39.0983 for potassium, and 132.905
 * for caesium where the abridged weight is 132.91, which is 0.01 in two atoms. */
static void primary_standard_masses_are_the_published_ones(void **state)
{
    static const struct published_mass standards[] = {
        {"boric-acid", 61.83, 0.006},
        {"calcium-carbonate", 100.09, 0.006},
        {"caesium-carbonate", 325.82, 0.015},
        {"lithium-carbonate", 73.89, 0.006},
        {"potassium-dihydrogen-phosphate", 136.09, 0.007},
        {"potassium-carbonate", 138.21, 0.007},
        {"sodium-oxalate", 134.00, 0.006},
        {"strontium-carbonate", 147.63, 0.006},
        {"sodium-sulfate", 142.04, 0.006},
    };
    compare_masses(*state, standards, sizeof standards / sizeof standards[0]);
}

/* Ways to write one formula must give one mass. Turns red when a sign, a bracket or a dot of a
 * hydrate is read wrongly. */
static void formulas_are_read_however_they_are_written(void **state)
{
    static const struct {
        const char *written;
        const char *plain;
    } pairs[] = {
        {"(NH4)2C2O4·H2O", "N2H10C2O5"},
        {"(NH4)2C2O4*H2O", "N2H10C2O5"},
        {"(NH4)2C2O4 • H2O", "N2H10C2O5"},
        {"Na2B4O7·10H2O", "Na2B4O17H20"},
        {"CuSO4.5H2O", "CuSO9H10"},
        {"CaSO4·0.5H2O", "Ca2S2O9H2"},
        {"CaSO4·½H2O", "Ca2S2O9H2"},
        {"K4[Fe(CN)6]·3H2O", "K4FeC6N6H6O3"},
        {"[Al(H2O)6]Cl3", "AlH12O6Cl3"},
        {"H₂SO₄", "H2SO4"},
        {"HOOC(CH2)4COOH", "C6H10O4"},
        {"(C9H13N)2·H2SO4", "C18H28N2SO4"},
        {"NH4+", "NH4"},
        {"SO4^2-", "SO4"},
        {"SO4²⁻", "SO4"},
        {"SO4(2-)", "SO4"},
        {"PO4---", "PO4"},
        {"CH3COO−", "C2H3O2"},
    };
    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++) {
        double halved = strstr(pairs[i].plain, "Ca2S2") != NULL ? 0.5 : 1.0;
        assert_near(mass_of(*state, pairs[i].written), halved * mass_of(*state, pairs[i].plain),
                    1e-9);
    }
}

/* Turns red when something that is no formula is given a mass. */
static void what_is_no_formula_is_refused(void **state)
{
    static const char *const bad[] = {
        "",           "acetic acid", "Xx",     "C2H4O2)",      "(C2H4O2",
        "[NaCl)",     "C0",          "2",      "C2H4O2·",      "·H2O",
        "NaCl·0H2O",  "C99999",      "na2co3", "C2H4O2 or so", "((((((((((C))))))))))",
        "C2H4O2;H2O", "C2..H4",      "+",      "C\xC2",
    };
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        struct wa_error error = {0};
        double mass = -1.0;
        if (wa_table_molar_mass(*state, bad[i], &mass, NULL, &error) != WA_ERROR_INPUT) {
            fail_msg("'%s' was given %g g/mol", bad[i], mass);
        }
        assert_near(mass, -1.0, 0.0);
        assert_true(strlen(error.message) > 20);
    }
}

/* Uncertainty by the rule of QUAM example A2: the ± of each abridged weight as a rectangular
 * half-width, atoms of one element fully correlated. Phthalate: C8 0.002, H5 0.0002, O4 0.001,
 * K 0.001 give u = sqrt((8*0.002)^2 + (5*0.0002)^2 + (4*0.001)^2 + 0.001^2)/sqrt(3). */
static void uncertainty_follows_the_atomic_weights(void **state)
{
    struct wa_error error;
    double mass;
    double u;
    assert_int_equal(wa_table_molar_mass(*state, "KHC8H4O4", &mass, &u, &error), WA_OK);
    double squares = pow(8 * 0.002, 2) + pow(5 * 0.0002, 2) + pow(4 * 0.001, 2) + pow(0.001, 2);
    assert_near(u, sqrt(squares / 3.0), 1e-9);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(atomic_weights_are_those_of_iupac),
        cmocka_unit_test(reagent_masses_are_the_published_ones),
        cmocka_unit_test(amino_acid_masses_are_the_published_ones),
        cmocka_unit_test(other_masses_are_the_published_ones),
        cmocka_unit_test(primary_standard_masses_are_the_published_ones),
        cmocka_unit_test(formulas_are_read_however_they_are_written),
        cmocka_unit_test(what_is_no_formula_is_refused),
        cmocka_unit_test(uncertainty_follows_the_atomic_weights),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
