/* The charge balance: solved from both sides, checked by a balance written anew here, and its
 * sensitivities against differences of high order. */
#include "whichacid/equilibrium.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static const double ln10 = 2.302585092994046;

static void assert_near(double value, double expected, double tolerance)
{
    if (!(fabs(value - expected) <= tolerance)) {
        fail_msg("%.12g is not %.12g within %.3g", value, expected, tolerance);
    }
}

/* A small generator of its own, so that cases are the same everywhere. */
static double uniform(uint64_t *seed, double low, double high)
{
    *seed = *seed * 6364136223846793005u + 1442695040888963407u;
    return low + (high - low) * (double)(*seed >> 11) / 9007199254740992.0;
}

/* ---- the balance anew ---------------------------------------------------------------------------
 */

struct check {
    double charge, charge_scale; /* net charge, and the sum of its absolute terms, mol/L */
    double ionic;
};

/* Species by cumulative constants in logarithms, all activity coefficients explicit: unlike the
 * library, nothing is multiplied up step by step. */
static void add_species(const struct wa_component *component, double pH, double log10_gamma,
                        struct check *check)
{
    const struct wa_system *system = component->system;
    double log_share[WA_PROTONS_MAX + 1], highest = -INFINITY, sum = 0.0;
    double pK_sum = 0.0;
    const int z0 = system->charge;
    for (int i = 0; i <= system->step_count; i++) {
        const int z = z0 - i;
        pK_sum += i > 0 ? -log10(system->K[i - 1]) : 0.0;
        /* c_i gamma_i a_H^i / (c_0 gamma_0) = beta_i */
        log_share[i] = i * pH - pK_sum + (z0 * z0 - z * z) * log10_gamma;
        highest = fmax(highest, log_share[i]);
    }
    for (int i = 0; i <= system->step_count; i++) {
        sum += pow(10.0, log_share[i] - highest);
    }
    double dissolved = component->concentration;
    if (isfinite(component->solubility)) {
        const double solid = pow(10.0, log_share[component->solid_species] - highest) / sum;
        dissolved = fmin(dissolved, component->solubility / solid);
    }
    for (int i = 0; i <= system->step_count; i++) {
        const int z = z0 - i;
        const double c = dissolved * pow(10.0, log_share[i] - highest) / sum;
        check->charge += z * c;
        check->charge_scale += abs(z) * c;
        check->ionic += 0.5 * z * z * c;
    }
}

static struct check balance_at(const struct wa_mixture *mixture, double pH, double ionic_strength)
{
    const struct wa_medium *medium = mixture->medium;
    const double log10_gamma =
        wa_davies_log10_gamma(ionic_strength, medium->debye_huckel_A, mixture->davies_coefficient);
    const double h = medium->density * pow(10.0, -pH - log10_gamma);
    const double oh = medium->density * pow(10.0, pH - medium->pKw - log10_gamma);
    struct check check = {h - oh + mixture->spectator_charge,
                          h + oh + fabs(mixture->spectator_charge),
                          0.5 * (h + oh) + mixture->spectator_ionic};
    for (int k = 0; k < mixture->component_count; k++) {
        add_species(&mixture->components[k], pH, log10_gamma, &check);
    }
    return check;
}

static void assert_balanced(const struct wa_mixture *mixture, const struct wa_solution *solution)
{
    assert_true(isfinite(solution->pH) && isfinite(solution->ionic_strength));
    const struct check check = balance_at(mixture, solution->pH, solution->ionic_strength);
    if (!(fabs(check.charge) <= 1e-9 * check.charge_scale)) {
        fail_msg("pH %.6f: charge %.3g of %.3g", solution->pH, check.charge, check.charge_scale);
    }
    /* Only the hold of the coefficient at high ionic strength leaves this equation a kink. */
    assert_near(check.ionic / solution->ionic_strength, 1.0, 1e-9);
}

/* ---- mixtures -----------------------------------------------------------------------------------
 */

struct drawn {
    struct wa_medium medium;
    struct wa_system systems[WA_COMPONENTS_MAX];
    struct wa_mixture mixture;
};

static void draw_component(uint64_t *seed, bool solid, struct drawn *drawn, int k)
{
    double pK[WA_PROTONS_MAX];
    const int steps = 1 + (int)uniform(seed, 0.0, k == 0 ? 6.0 : 3.0);
    double at = uniform(seed, -3.0, 9.0);
    for (int i = 0; i < steps; i++) {
        pK[i] = at;
        at = fmin(at + uniform(seed, 0.3, 5.0), 14.0);
    }
    const int charge = (int)uniform(seed, -1.0, 4.0);
    wa_system_set(&drawn->systems[k], charge, steps, pK);
    struct wa_component *component = &drawn->mixture.components[k];
    *component = (struct wa_component){
        .system = &drawn->systems[k],
        .concentration = pow(10.0, uniform(seed, -7.0, log10(5.0))),
        .solubility = INFINITY,
    };
    if (solid && charge >= 0 && charge <= steps) {
        component->solid_species = charge; /* the uncharged one */
        component->solubility = component->concentration * uniform(seed, 0.01, 1.5);
    }
}

static void draw(uint64_t *seed, bool solid, struct drawn *drawn)
{
    memset(drawn, 0, sizeof *drawn);
    drawn->medium = wa_medium_at(uniform(seed, 0.0, 80.0));
    drawn->mixture.medium = &drawn->medium;
    drawn->mixture.davies_coefficient = uniform(seed, 0.1, 0.5);
    drawn->mixture.component_count = (int)uniform(seed, 0.0, 4.0);
    double charge_low = 0.0, charge_high = 0.0;
    for (int k = 0; k < drawn->mixture.component_count; k++) {
        draw_component(seed, solid, drawn, k);
        const struct wa_component *c = &drawn->mixture.components[k];
        charge_low -= c->concentration * c->system->charge;
        charge_high += c->concentration * (c->system->step_count - c->system->charge);
    }
    /* Counter-ions that leave the pH anywhere from that of the acids to that of a strong base. */
    const double strong = pow(10.0, uniform(seed, -7.0, 0.0)) * uniform(seed, -1.0, 1.0);
    drawn->mixture.spectator_charge = uniform(seed, charge_low, charge_high) + strong;
    drawn->mixture.spectator_ionic =
        0.5 * fabs(drawn->mixture.spectator_charge) + pow(10.0, uniform(seed, -6.0, -0.5));
}

/* Own contract, checked by the balance written anew: 20 000 mixtures of up to three systems with
 * pKa -3 to 14, 1e-7 to 5 mol/L, 0 to 80 degree Celsius, from a start that is far off. Red when
 * any species, activity coefficient or the water is missing in one of the two equations. */
static void random_mixtures(void **state)
{
    (void)state;
    uint64_t seed = 1;
    for (int n = 0; n < 20000; n++) {
        struct drawn drawn;
        struct wa_solution solution;
        struct wa_error error;
        draw(&seed, false, &drawn);
        if (wa_mixture_solve(&drawn.mixture, uniform(&seed, -3.0, 17.0), &solution, NULL, &error) !=
            WA_OK) {
            fail_msg("mixture %d: %s", n, error.message);
        }
        assert_balanced(&drawn.mixture, &solution);
    }
}

/* Own contract: the same with a solid. The uncharged species stands at its solubility exactly when
 * a solid is reported. */
static void random_solids(void **state)
{
    (void)state;
    uint64_t seed = 2;
    int saturated = 0;
    for (int n = 0; n < 10000; n++) {
        struct drawn drawn;
        struct wa_solution solution;
        struct wa_error error;
        draw(&seed, true, &drawn);
        if (wa_mixture_solve(&drawn.mixture, 7.0, &solution, NULL, &error) != WA_OK) {
            fail_msg("mixture %d: %s", n, error.message);
        }
        assert_balanced(&drawn.mixture, &solution);
        for (int k = 0; k < drawn.mixture.component_count; k++) {
            saturated += solution.saturated[k];
        }
    }
    assert_in_range(saturated, 500, 20000);
}

/* ---- sensitivities ------------------------------------------------------------------------------
 */

/* One parameter of a mixture, by address and step of the difference. */
struct knob {
    double *value;
    double step;
    bool is_K; /* value is K and the derivative is by pK */
    double expected;
    double weight; /* size of the parameter, to put the derivatives on one scale */
};

static double pH_of(const struct wa_mixture *mixture, double guess)
{
    struct wa_solution solution;
    struct wa_error error;
    assert_int_equal(wa_mixture_solve(mixture, guess, &solution, NULL, &error), WA_OK);
    return solution.pH;
}

/* Central difference of sixth order. */
static double difference(const struct wa_mixture *mixture, const struct knob *knob, double guess)
{
    static const double weight[] = {45.0 / 60.0, -9.0 / 60.0, 1.0 / 60.0};
    const double middle = *knob->value;
    double sum = 0.0;
    for (int i = 1; i <= 3; i++) {
        for (int side = -1; side <= 1; side += 2) {
            const double move = side * i * knob->step;
            *knob->value = knob->is_K ? middle * exp(-ln10 * move) : middle + move;
            sum += side * weight[i - 1] * pH_of(mixture, guess);
        }
    }
    *knob->value = middle;
    return sum / knob->step;
}

static int collect_knobs(struct drawn *drawn, const struct wa_sensitivity *s, struct knob *knobs)
{
    struct wa_mixture *m = &drawn->mixture;
    int count = 0;
    const double charge = fabs(m->spectator_charge) + 1e-7;
    knobs[count++] =
        (struct knob){&m->spectator_charge, 1e-4 * charge, false, s->spectator_charge, charge};
    knobs[count++] = (struct knob){&m->spectator_ionic, 1e-3 * m->spectator_ionic, false,
                                   s->spectator_ionic, m->spectator_ionic};
    knobs[count++] = (struct knob){&m->davies_coefficient, 1e-2, false, s->davies_coefficient, 1.0};
    knobs[count++] = (struct knob){&drawn->medium.pKw, 1e-3, false, s->pKw, 1.0};
    for (int k = 0; k < m->component_count; k++) {
        double *c = &m->components[k].concentration;
        knobs[count++] = (struct knob){c, 1e-4 * *c, false, s->concentration[k], *c};
        for (int i = 0; i < drawn->systems[k].step_count; i++) {
            knobs[count++] = (struct knob){&drawn->systems[k].K[i], 1e-3, true, s->pK[k][i], 1.0};
        }
    }
    return count;
}

/* Mixtures whose pH bends within the width of a difference (on a jump, at a solid's edge or at the
 * hold of the activity coefficient) cannot be judged by it. */
static bool smooth_here(const struct drawn *drawn, const struct wa_solution *solution,
                        const struct wa_sensitivity *s)
{
    if (fabs(solution->ionic_strength - WA_DAVIES_HOLD) < 0.1 * WA_DAVIES_HOLD) {
        return false;
    }
    for (int k = 0; k < drawn->mixture.component_count; k++) {
        const struct wa_component *c = &drawn->mixture.components[k];
        struct check check = {0.0, 0.0, 0.0};
        struct wa_component unlimited = *c;
        unlimited.solubility = INFINITY;
        const double log10_gamma =
            wa_davies_log10_gamma(solution->ionic_strength, drawn->medium.debye_huckel_A,
                                  drawn->mixture.davies_coefficient);
        add_species(&unlimited, solution->pH, log10_gamma, &check);
        if (isfinite(c->solubility)) {
            double fraction[WA_PROTONS_MAX + 1];
            wa_system_fractions(c->system, pow(10.0, -solution->pH), pow(10.0, log10_gamma),
                                fraction);
            const double load = c->concentration * fraction[c->solid_species] / c->solubility;
            if (fabs(load - 1.0) < 0.1) {
                return false;
            }
        }
    }
    return fabs(s->spectator_charge) * (fabs(drawn->mixture.spectator_charge) + 1e-7) < 20.0;
}

static int check_sensitivities(uint64_t *seed, bool solid)
{
    struct drawn drawn;
    struct wa_solution solution;
    struct wa_sensitivity s;
    struct wa_error error;
    struct knob knobs[4 + WA_COMPONENTS_MAX * (WA_PROTONS_MAX + 1)];
    draw(seed, solid, &drawn);
    assert_int_equal(wa_mixture_solve(&drawn.mixture, 7.0, &solution, &s, &error), WA_OK);
    if (!smooth_here(&drawn, &solution, &s)) {
        return 0;
    }
    const int count = collect_knobs(&drawn, &s, knobs);
    double largest = 0.01;
    for (int i = 0; i < count; i++) {
        largest = fmax(largest, fabs(knobs[i].expected) * knobs[i].weight);
    }
    for (int i = 0; i < count; i++) {
        const double by_difference = difference(&drawn.mixture, &knobs[i], solution.pH);
        const double off = (by_difference - knobs[i].expected) * knobs[i].weight;
        if (!(fabs(off) <= 1e-6 * largest)) {
            fail_msg("knob %d of %d at pH %.4f, I %.4g: %.9g by difference, %.9g", i, count,
                     solution.pH, solution.ionic_strength, by_difference, knobs[i].expected);
        }
    }
    return 1;
}

/* Own contract against central differences of sixth order: every parameter, through the ionic
 * strength as well, with and without a solid, to 1e-6 of the largest derivative of the mixture.
 * Red when one term of one derivative is missing. */
static void sensitivities(void **state)
{
    (void)state;
    uint64_t seed = 3;
    int judged = 0;
    for (int n = 0; n < 1500; n++) {
        judged += check_sensitivities(&seed, n % 3 == 0);
    }
    assert_in_range(judged, 1000, 1500);
}

/* ---- titrations ---------------------------------------------------------------------------------
 */

static struct wa_titration titration_of(int charge, int steps, const double *pK, double moles,
                                        double concentration)
{
    struct wa_titration titration = {
        .medium = wa_medium_at(25.0),
        .davies_coefficient = WA_DAVIES_COEFFICIENT,
        .solution_volume_L = 0.05,
        .component_count = 1,
        .sample_charge = -charge * moles,
        .sample_ionic = 0.5 * abs(charge) * moles,
        .titrant_charge = concentration,
        .titrant_ionic = 0.5 * fabs(concentration),
    };
    titration.components[0] =
        (struct wa_titration_component){.sample_moles = moles, .solubility = INFINITY};
    wa_system_set(&titration.components[0].system, charge, steps, pK);
    return titration;
}

/* Own contract: the volume at a pH and the pH at a volume undo each other, in acids, bases and
 * strong solutions. Where a whole pH unit is a drop, the volume is what can be compared. */
static void both_directions(void **state)
{
    (void)state;
    uint64_t seed = 4;
    for (int n = 0; n < 3000; n++) {
        double pK[3];
        pK[0] = uniform(&seed, -3.0, 8.0);
        pK[1] = pK[0] + uniform(&seed, 0.5, 4.0);
        pK[2] = fmin(pK[1] + uniform(&seed, 0.5, 4.0), 14.0);
        const double moles = pow(10.0, uniform(&seed, -6.0, -2.0));
        const double titrant = 20.0 * moles * uniform(&seed, 0.5, 5.0);
        struct wa_titration titration =
            titration_of((int)uniform(&seed, 0.0, 3.0), 3, pK, moles, titrant);
        const double volume = uniform(&seed, 0.0, 100.0);
        struct wa_solution solution;
        struct wa_sensitivity s;
        struct wa_mixture mixture;
        struct wa_error error;
        double back;
        assert_int_equal(wa_titration_pH(&titration, volume, 7.0, &solution, &s, &error), WA_OK);
        wa_titration_mixture(&titration, volume, &mixture);
        assert_balanced(&mixture, &solution);
        assert_int_equal(wa_titration_volume(&titration, solution.pH, &back, &error), WA_OK);
        const double slope = wa_titration_slope(&titration, volume, &s);
        const double limit = 1e-9 * 150.0 + 1e-10 / fabs(slope);
        assert_near(back, volume, limit);
    }
}

/* Own contract: the slope is the derivative by volume. */
static void slope_by_volume(void **state)
{
    (void)state;
    static const double pK[] = {2.148, 7.198, 12.35};
    struct wa_titration titration = titration_of(0, 3, pK, 1e-3, 0.1);
    for (double volume = 0.5; volume < 40.0; volume += 0.73) {
        struct wa_solution solution, right, left;
        struct wa_sensitivity s;
        struct wa_error error;
        const double h = 1e-4;
        assert_int_equal(wa_titration_pH(&titration, volume, 7.0, &solution, &s, &error), WA_OK);
        assert_int_equal(wa_titration_pH(&titration, volume + h, 7.0, &right, NULL, &error), WA_OK);
        assert_int_equal(wa_titration_pH(&titration, volume - h, 7.0, &left, NULL, &error), WA_OK);
        const double slope = wa_titration_slope(&titration, volume, &s);
        assert_near((right.pH - left.pH) / (2.0 * h), slope, 1e-5 * (1.0 + slope * slope * slope));
    }
}

/* ---- cases that break careless solvers ----------------------------------------------------------
 */

/* Outside check and own contract. Pure water is pKw/2; a strong acid of pKa -3 and a base of pKa 14
 * in 1e-7 and 5 mol/L, no acid at all, a zero concentration: always a number, always balanced.
 * 1e-7 mol/L of a strong acid is pH 6.79 (the textbook value without activity coefficients; here
 * they are 0.9998). */
static void extremes(void **state)
{
    (void)state;
    static const double pKs[] = {-3.0, 0.0, 4.76, 14.0};
    static const double concentrations[] = {0.0, 1e-9, 1e-7, 1e-3, 1.0, 5.0};
    const struct wa_medium water = wa_medium_at(25.0);
    struct wa_mixture mixture = {.medium = &water, .davies_coefficient = WA_DAVIES_COEFFICIENT};
    struct wa_solution solution;
    struct wa_error error;
    assert_int_equal(wa_mixture_solve(&mixture, NAN, &solution, NULL, &error), WA_OK);
    assert_near(solution.pH, 0.5 * water.pKw, 1e-9);
    mixture.component_count = 1;
    for (size_t p = 0; p < 4; p++) {
        for (size_t c = 0; c < 6; c++) {
            for (int salt = 0; salt <= 1; salt++) {
                struct wa_system system;
                struct wa_sensitivity s;
                wa_system_set(&system, 0, 1, &pKs[p]);
                mixture.components[0] =
                    (struct wa_component){&system, concentrations[c], INFINITY, 0};
                mixture.spectator_charge = salt * concentrations[c];
                mixture.spectator_ionic = 0.5 * mixture.spectator_charge;
                assert_int_equal(wa_mixture_solve(&mixture, 20.0, &solution, &s, &error), WA_OK);
                assert_balanced(&mixture, &solution);
                assert_true(isfinite(s.pK[0][0]) && isfinite(s.concentration[0]) &&
                            isfinite(s.spectator_charge) && isfinite(s.davies_coefficient));
                if (p == 0 && c == 2 && salt == 0) {
                    assert_near(solution.pH, 6.79, 0.005);
                }
            }
        }
    }
}

/* Own contract: no volume of a base lowers the pH, and values that are not numbers are refused with
 * a sentence. */
static void refusals(void **state)
{
    (void)state;
    static const double pK = 4.76;
    struct wa_titration titration = titration_of(0, 1, &pK, 1e-3, 0.1);
    struct wa_solution solution;
    struct wa_error error;
    double volume;
    assert_int_equal(wa_titration_volume(&titration, 13.9, &volume, &error), WA_ERROR_NUMERIC);
    titration.sample_charge = NAN;
    assert_int_equal(wa_titration_pH(&titration, 1.0, 7.0, &solution, NULL, &error),
                     WA_ERROR_NUMERIC);
    assert_true(error.message[0] != '\0');
}

/* ---- worked examples ----------------------------------------------------------------------------
 */

/* Activity coefficients of one and the density of one: what textbooks compute with. */
static struct wa_medium textbook_water(void)
{
    return (struct wa_medium){
        .temperature_C = 25.0, .density = 1.0, .debye_huckel_A = 0.0, .pKw = 14.0};
}

/* Outside check. OpenStax, Chemistry: Atoms First (2016), table 14.4: 25.0 mL of 0.100 mol/L acetic
 * acid with 0.100 mol/L sodium hydroxide, from the equivalence point on, point by point as printed
 * (Ka 1.8e-5). Red when dilution or the alkaline side is wrong. */
static void worked_example_by_points(void **state)
{
    (void)state;
    static const double points[][2] = {{25.0, 8.72},  {25.1, 10.30}, {25.5, 11.00}, {26.0, 11.29},
                                       {28.0, 11.75}, {30.0, 11.96}, {35.0, 12.22}, {40.0, 12.36},
                                       {45.0, 12.46}, {50.0, 12.52}};
    const double pK = -log10(1.8e-5);
    struct wa_titration titration = titration_of(0, 1, &pK, 2.5e-3, 0.1);
    titration.medium = textbook_water();
    titration.solution_volume_L = 0.025;
    for (size_t i = 0; i < sizeof points / sizeof points[0]; i++) {
        struct wa_solution solution;
        struct wa_error error;
        assert_int_equal(wa_titration_pH(&titration, points[i][0], 7.0, &solution, NULL, &error),
                         WA_OK);
        assert_near(solution.pH, points[i][1], 0.0051);
    }
}

/* Outside check. 0.1 mol/L sodium carbonate with hydrochloric acid, pKa 6.35 and 10.33: a worked
 * exercise (wizedu.com, question 73274) gives pH 8.34 at the first equivalence point. */
static void carbonate_at_equivalence(void **state)
{
    (void)state;
    static const double carbonic[] = {6.35, 10.33};
    struct wa_titration titration = titration_of(0, 2, carbonic, 5e-3, -0.1);
    struct wa_solution solution;
    struct wa_error error;
    titration.medium = textbook_water();
    titration.sample_charge = 1e-2;
    assert_int_equal(wa_titration_pH(&titration, 50.0, 7.0, &solution, NULL, &error), WA_OK);
    assert_near(solution.pH, 8.34, 0.01);
}

/* Outside check, by formula. The textbooks' closed form of the titration of a polyprotic acid by a
 * strong base (R. de Levie, J. Chem. Educ. 70 (1993) 209, cited from memory): with the fractions
 * a1, a2, a3 of a triprotic acid and D = [H+] - [OH-],
 * V = V0 (C (a1 + 2 a2 + 3 a3) - D) / (Cb + D). Phosphoric acid, 50 mL of 0.1 mol/L, every tenth of
 * a pH unit, from both directions. */
static void explicit_triprotic_curve(void **state)
{
    (void)state;
    static const double pK[] = {2.148, 7.198, 12.35};
    struct wa_titration titration = titration_of(0, 3, pK, 5e-3, 0.1);
    titration.medium = textbook_water();
    for (int tenth = 20; tenth <= 124; tenth++) {
        const double pH = 0.1 * tenth, h = pow(10.0, -pH);
        const double w1 = pow(10.0, -pK[0]) * h * h;
        const double w2 = pow(10.0, -pK[0] - pK[1]) * h;
        const double w3 = pow(10.0, -pK[0] - pK[1] - pK[2]);
        const double mean = (w1 + 2.0 * w2 + 3.0 * w3) / (h * h * h + w1 + w2 + w3);
        const double surplus = h - 1e-14 / h;
        const double published = 50.0 * (0.1 * mean - surplus) / (0.1 + surplus);
        double volume;
        struct wa_solution solution;
        struct wa_error error;
        assert_int_equal(wa_titration_volume(&titration, pH, &volume, &error), WA_OK);
        assert_near(volume, published, 1e-9);
        assert_int_equal(wa_titration_pH(&titration, published, 7.0, &solution, NULL, &error),
                         WA_OK);
        assert_near(solution.pH, pH, 1e-8);
    }
}

/* Outside check, by formula. A monoprotic weak acid without activity coefficients is a cubic in
 * [H+], [H]^3 + (Ka + b)[H]^2 + (b Ka - c Ka - Kw)[H] - Ka Kw = 0 with b the strong base; the cubic
 * must vanish at every point of 25 mL of 0.1 mol/L acid with 0.1 mol/L base. */
static void exact_cubic(void **state)
{
    (void)state;
    static const double pK = 4.76;
    struct wa_titration titration = titration_of(0, 1, &pK, 2.5e-3, 0.1);
    titration.medium = textbook_water();
    titration.solution_volume_L = 0.025;
    const double Ka = pow(10.0, -4.76), Kw = 1e-14;
    for (double volume = 0.0; volume <= 40.0; volume += 0.5) {
        struct wa_solution solution;
        struct wa_error error;
        assert_int_equal(wa_titration_pH(&titration, volume, 7.0, &solution, NULL, &error), WA_OK);
        const double total_mL = 25.0 + volume;
        const double b = 0.1 * volume / total_mL, c = 2.5 / total_mL;
        const double h = pow(10.0, -solution.pH);
        const double terms[] = {h * h * h, (Ka + b) * h * h, (b * Ka - c * Ka - Kw) * h, -Ka * Kw};
        double sum = 0.0, scale = 0.0;
        for (int i = 0; i < 4; i++) {
            sum += terms[i];
            scale += fabs(terms[i]);
        }
        assert_near(sum / scale, 0.0, 1e-8);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(random_mixtures),
        cmocka_unit_test(random_solids),
        cmocka_unit_test(sensitivities),
        cmocka_unit_test(both_directions),
        cmocka_unit_test(slope_by_volume),
        cmocka_unit_test(extremes),
        cmocka_unit_test(refusals),
        cmocka_unit_test(worked_example_by_points),
        cmocka_unit_test(carbonate_at_equivalence),
        cmocka_unit_test(explicit_triprotic_curve),
        cmocka_unit_test(exact_cubic),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
