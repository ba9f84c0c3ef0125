/* Charge balance and ionic strength of a mixture, solved together by Newton's method in the
 * logarithm of the hydrogen ion activity and the square root of the ionic strength: in these two
 * every term is smooth down to pure water. A bracketing search stands behind it. */
#include "whichacid/equilibrium.h"

#include <math.h>
#include <string.h>

static const double ln10 = 2.302585092994046;
static const int newton_steps = 60;
static const double step_limit = 4.0; /* largest step in ln a(H+) */
static const double charge_tolerance = 1e-10;
static const double charge_acceptable = 1e-6;       /* where rounding allows no better */
static const double sqrt_hold = 1.4142135623730951; /* square root of WA_DAVIES_HOLD */
static const double step_tolerance = 1e-6;     /* quadratic convergence squares this once more */
static const double strength_tolerance = 1e-5; /* relative, of the root; squared too */

/* Moments of the charge over the species of one component, by the fractions at hand. */
struct moments {
    double concentration; /* dissolved, mol/L */
    double z;             /* mean charge */
    double z2;            /* mean squared charge */
    double var_z, cov_z_z2, var_z2;
    bool saturated;
    int solid_charge;
};

/* The two equations and their derivatives at one trial state. */
struct balance {
    double charge;   /* F1: net charge, mol/L */
    double scale;    /* sum of the absolute terms of F1 */
    double ionic;    /* half sum of z^2 c, mol/L */
    double charge_x; /* dF1 / d ln a(H+) */
    double charge_L; /* dF1 / d ln gamma of unit charge */
    double ionic_x;
    double ionic_L;
    double hydrogen, hydroxide;
    struct moments moments[WA_COMPONENTS_MAX];
};

struct state {
    double x; /* ln a(H+) */
    double s; /* square root of the ionic strength */
};

void wa_system_set(struct wa_system *system, int charge, int step_count, const double *pK)
{
    system->charge = charge;
    system->step_count = step_count;
    for (int i = 0; i < step_count; i++) {
        system->K[i] = exp(-ln10 * pK[i]);
    }
}

/* Unnormalised weights of the species, from the fully protonated one; returns their sum. */
static double species_weights(const struct wa_system *system, double hydrogen_activity,
                              double gamma, double *weight)
{
    /* gamma_0 / gamma_i = gamma^(z0^2 - z_i^2), and z0^2 - z_i^2 grows by 2 z_(i-1) - 1 a step. */
    const double gamma_step = 1.0 / (gamma * gamma);
    double factor = 1.0 / (hydrogen_activity * gamma);
    for (int z = 0; z < system->charge; z++) {
        factor /= gamma_step;
    }
    for (int z = 0; z > system->charge; z--) {
        factor *= gamma_step;
    }
    double sum = 1.0;
    weight[0] = 1.0;
    for (int i = 0; i < system->step_count; i++) {
        weight[i + 1] = weight[i] * system->K[i] * factor;
        factor *= gamma_step;
        sum += weight[i + 1];
    }
    return sum;
}

void wa_system_fractions(const struct wa_system *system, double hydrogen_activity, double gamma,
                         double *fraction)
{
    const double inverse = 1.0 / species_weights(system, hydrogen_activity, gamma, fraction);
    for (int i = 0; i <= system->step_count; i++) {
        fraction[i] *= inverse;
    }
}

static void component_moments(const struct wa_component *component, double hydrogen_activity,
                              double gamma, struct moments *moments)
{
    const struct wa_system *system = component->system;
    double weight[WA_PROTONS_MAX + 1];
    const double sum = species_weights(system, hydrogen_activity, gamma, weight);
    /* Powers of the protons lost are summed, so that one mean needs one pass. */
    double m1 = 0.0, m2 = 0.0, m3 = 0.0, m4 = 0.0;
    for (int i = 1; i <= system->step_count; i++) {
        const double lost = i;
        const double w1 = weight[i] * lost;
        const double w2 = w1 * lost;
        const double w3 = w2 * lost;
        m1 += w1;
        m2 += w2;
        m3 += w3;
        m4 += w3 * lost;
    }
    const double inverse = 1.0 / sum;
    m1 *= inverse;
    m2 *= inverse;
    m3 *= inverse;
    m4 *= inverse;
    const double z0 = system->charge;
    /* z = z0 - i, so z^2 = z0^2 - 2 z0 i + i^2. */
    const double var_i = m2 - m1 * m1;
    const double cov_i_i2 = m3 - m1 * m2;
    moments->z = z0 - m1;
    moments->z2 = z0 * z0 - 2.0 * z0 * m1 + m2;
    moments->var_z = var_i;
    moments->cov_z_z2 = 2.0 * z0 * var_i - cov_i_i2;
    moments->var_z2 = 4.0 * z0 * z0 * var_i - 4.0 * z0 * cov_i_i2 + (m4 - m2 * m2);
    moments->concentration = component->concentration;
    moments->saturated = false;
    if (isfinite(component->solubility)) {
        const double fraction = weight[component->solid_species] * inverse;
        if (component->concentration * fraction > component->solubility) {
            moments->saturated = true;
            moments->concentration = component->solubility / fraction;
            moments->solid_charge = system->charge - component->solid_species;
        }
    }
}

static void add_component(struct balance *balance, const struct moments *m)
{
    const double c = m->concentration;
    balance->charge += c * m->z;
    balance->scale += c * sqrt(fmax(m->z2, 0.0)); /* at least the mean of |z| */
    balance->ionic += 0.5 * c * m->z2;
    balance->charge_x += c * m->var_z;
    balance->charge_L -= c * m->cov_z_z2;
    balance->ionic_x += 0.5 * c * m->cov_z_z2;
    balance->ionic_L -= 0.5 * c * m->var_z2;
    if (m->saturated) {
        /* The dissolved amount is solubility over fraction, and moves against the fraction. */
        const double d_x = -(m->solid_charge - m->z);
        const double d_L = m->solid_charge * m->solid_charge - m->z2;
        balance->charge_x += c * m->z * d_x;
        balance->charge_L += c * m->z * d_L;
        balance->ionic_x += 0.5 * c * m->z2 * d_x;
        balance->ionic_L += 0.5 * c * m->z2 * d_L;
    }
}

static double ln_gamma(const struct wa_mixture *mixture, double s)
{
    const double held = fmin(s, sqrt_hold);
    return -ln10 * mixture->medium->debye_huckel_A *
           (held / (1.0 + held) - mixture->davies_coefficient * held * held);
}

static double ln_gamma_slope(const struct wa_mixture *mixture, double s)
{
    if (s >= sqrt_hold) {
        return 0.0;
    }
    return -ln10 * mixture->medium->debye_huckel_A *
           (1.0 / ((1.0 + s) * (1.0 + s)) - 2.0 * mixture->davies_coefficient * s);
}

static void evaluate(const struct wa_mixture *mixture, const struct state *state, double Kw,
                     struct balance *balance)
{
    const double gamma = exp(ln_gamma(mixture, state->s));
    const double activity = exp(state->x);
    const double density = mixture->medium->density;
    /* Activities are molal; the density turns molalities into concentrations. */
    const double hydrogen = density * activity / gamma;
    const double hydroxide = density * Kw / (activity * gamma);
    balance->hydrogen = hydrogen;
    balance->hydroxide = hydroxide;
    balance->charge = hydrogen - hydroxide + mixture->spectator_charge;
    balance->scale = hydrogen + hydroxide + fabs(mixture->spectator_charge);
    balance->ionic = 0.5 * (hydrogen + hydroxide) + mixture->spectator_ionic;
    balance->charge_x = hydrogen + hydroxide;
    balance->charge_L = hydroxide - hydrogen;
    balance->ionic_x = 0.5 * (hydrogen - hydroxide);
    balance->ionic_L = -0.5 * (hydrogen + hydroxide);
    for (int k = 0; k < mixture->component_count; k++) {
        component_moments(&mixture->components[k], activity, gamma, &balance->moments[k]);
        add_component(balance, &balance->moments[k]);
    }
}

/* Newton's step for both unknowns from an evaluated balance; false when it cannot be taken. */
static bool newton_step(const struct wa_mixture *mixture, const struct balance *balance,
                        const struct state *state, double *dx, double *ds)
{
    const double slope = ln_gamma_slope(mixture, state->s);
    const double a = balance->charge_x;
    const double b = balance->charge_L * slope;
    const double c = -balance->ionic_x;
    const double d = 2.0 * state->s - balance->ionic_L * slope;
    const double f1 = balance->charge;
    const double f2 = state->s * state->s - balance->ionic;
    const double determinant = a * d - b * c;
    *dx = -(f1 * d - b * f2) / determinant;
    *ds = -(a * f2 - c * f1) / determinant;
    return isfinite(*dx) && isfinite(*ds);
}

/* Joint Newton iteration. */
static bool solve_newton(const struct wa_mixture *mixture, double Kw, struct state *state,
                         struct balance *balance)
{
    double previous = 0.0;
    for (int step = 0; step < newton_steps; step++) {
        double dx, ds;
        evaluate(mixture, state, Kw, balance);
        if (!newton_step(mixture, balance, state, &dx, &ds)) {
            return false;
        }
        const bool close = fabs(dx) < step_tolerance && fabs(ds) < strength_tolerance * state->s;
        /* A step back nearly as long as the last one is the start of a cycle about a kink, as
         * where a solid appears. */
        const bool swings = dx * previous < 0.0 && fabs(dx) > 0.5 * fabs(previous);
        const double shrink = fmin(swings ? 0.5 : 1.0, step_limit / (fabs(dx) + 1e-300));
        previous = shrink * dx;
        state->x = fmin(fmax(state->x + shrink * dx, -ln10 * 20.0), ln10 * 3.0);
        state->s = fmin(fmax(state->s + shrink * ds, 0.25 * state->s), 4.0 * state->s);
        if (close) {
            evaluate(mixture, state, Kw, balance);
            if (fabs(balance->charge) < charge_tolerance * balance->scale) {
                return true;
            }
        }
    }
    return false;
}

/* Bisection on the charge balance, monotonic in pH at given ionic strength, which is iterated. */
static bool solve_bracketed(const struct wa_mixture *mixture, double Kw, struct state *state,
                            struct balance *balance)
{
    state->s = sqrt(fmax(mixture->spectator_ionic, 1e-7));
    for (int outer = 0; outer < 200; outer++) {
        double low = -ln10 * 20.0, high = ln10 * 3.0;
        while (high - low > 1e-13 * (1.0 + fabs(low))) {
            state->x = 0.5 * (low + high);
            evaluate(mixture, state, Kw, balance);
            if (balance->charge > 0.0) {
                high = state->x;
            } else {
                low = state->x;
            }
            if (state->x == low && state->x == high) {
                break;
            }
        }
        const double next = sqrt(balance->ionic);
        const double change = next - state->s;
        /* Half steps: a full step can swing where Davies turns upwards at high ionic strength. */
        state->s += 0.5 * change;
        if (fabs(change) < step_tolerance * (1.0 + state->s)) {
            break;
        }
    }
    const struct state found = *state;
    if (!solve_newton(mixture, Kw, state, balance)) {
        *state = found;
        evaluate(mixture, state, Kw, balance);
    }
    return isfinite(state->x) && isfinite(state->s);
}

/* d(pH)/d(parameter) from the parameter's partial derivatives of both equations: F1 itself and the
 * ionic sum of F2. `row` holds the first row of the inverse Jacobian. */
static double respond(const double row[2], double d_charge, double d_ionic)
{
    return (row[0] * d_charge - row[1] * d_ionic) / ln10;
}

static void component_sensitivity(const struct wa_component *component, const struct moments *m,
                                  const double row[2], double activity, double gamma,
                                  double *by_concentration, double *by_ln_solubility, double *by_pK)
{
    const struct wa_system *system = component->system;
    const double c = m->concentration;
    *by_concentration = m->saturated ? 0.0 : respond(row, m->z, 0.5 * m->z2);
    *by_ln_solubility = m->saturated ? respond(row, c * m->z, 0.5 * c * m->z2) : 0.0;
    double fraction[WA_PROTONS_MAX + 1];
    const double sum = species_weights(system, activity, gamma, fraction);
    /* Raising pK_k lowers the weight of every species past step k alike. */
    double tail = 0.0, tail_z = 0.0, tail_z2 = 0.0;
    for (int k = system->step_count; k >= 1; k--) {
        const double share = fraction[k] / sum;
        const double z = system->charge - k;
        tail += share;
        tail_z += share * z;
        tail_z2 += share * z * z;
        double d_z = -ln10 * (tail_z - tail * m->z);
        double d_z2 = -ln10 * (tail_z2 - tail * m->z2);
        if (m->saturated) {
            const double past = component->solid_species >= k ? 1.0 : 0.0;
            const double d_ln_c = ln10 * (past - tail);
            d_z += m->z * d_ln_c;
            d_z2 += m->z2 * d_ln_c;
        }
        by_pK[k - 1] = respond(row, c * d_z, 0.5 * c * d_z2);
    }
}

static void differentiate(const struct wa_mixture *mixture, const struct state *state,
                          const struct balance *balance, struct wa_sensitivity *sensitivity)
{
    const double slope = ln_gamma_slope(mixture, state->s);
    const double a = balance->charge_x;
    const double b = balance->charge_L * slope;
    const double c = -balance->ionic_x;
    const double d = 2.0 * state->s - balance->ionic_L * slope;
    const double determinant = a * d - b * c;
    /* x = ln a(H+) = -ln10 pH, so d pH = +J^-1 dF / ln10. */
    const double row[2] = {d / determinant, -b / determinant};
    const double gamma = exp(ln_gamma(mixture, state->s));
    const double activity = exp(state->x);

    sensitivity->spectator_charge = respond(row, 1.0, 0.0);
    sensitivity->spectator_ionic = respond(row, 0.0, 1.0);
    sensitivity->pKw = respond(row, ln10 * balance->hydroxide, -0.5 * ln10 * balance->hydroxide);
    const double held = fmin(state->s, sqrt_hold);
    const double d_L = ln10 * mixture->medium->debye_huckel_A * held * held;
    sensitivity->davies_coefficient = respond(row, balance->charge_L * d_L, balance->ionic_L * d_L);
    for (int k = 0; k < mixture->component_count; k++) {
        component_sensitivity(&mixture->components[k], &balance->moments[k], row, activity, gamma,
                              &sensitivity->concentration[k], &sensitivity->ln_solubility[k],
                              sensitivity->pK[k]);
    }
}

static bool mixture_is_finite(const struct wa_mixture *mixture)
{
    bool finite = isfinite(mixture->spectator_charge) && isfinite(mixture->spectator_ionic) &&
                  isfinite(mixture->davies_coefficient);
    for (int k = 0; k < mixture->component_count; k++) {
        finite = finite && isfinite(mixture->components[k].concentration) &&
                 mixture->components[k].concentration >= 0.0;
    }
    return finite;
}

enum wa_status wa_mixture_solve(const struct wa_mixture *mixture, double pH_guess,
                                struct wa_solution *solution, struct wa_sensitivity *sensitivity,
                                struct wa_error *error)
{
    return wa_mixture_solve_near(mixture, pH_guess, 0.0, solution, sensitivity, error);
}

enum wa_status wa_mixture_solve_near(const struct wa_mixture *mixture, double pH_guess,
                                     double ionic_guess, struct wa_solution *solution,
                                     struct wa_sensitivity *sensitivity, struct wa_error *error)
{
    struct balance balance;
    if (!mixture_is_finite(mixture)) {
        return wa_fail(error, WA_ERROR_NUMERIC, NULL, 0,
                       "A concentration is negative or not a number: the pH cannot be computed.");
    }
    const double Kw = exp(-ln10 * mixture->medium->pKw);
    const double guess = isfinite(pH_guess) ? pH_guess : 7.0;
    struct state state = {.x = -ln10 * fmin(fmax(guess, -2.0), 16.0)};
    if (ionic_guess > 0.0) {
        state.s = sqrt(ionic_guess);
    } else {
        /* The ionic strength at the guess is a far better start than any fixed one. */
        state.s = 0.1;
        evaluate(mixture, &state, Kw, &balance);
        state.s = sqrt(balance.ionic);
    }
    if (!solve_newton(mixture, Kw, &state, &balance) &&
        (!solve_bracketed(mixture, Kw, &state, &balance) ||
         !(fabs(balance.charge) < charge_acceptable * balance.scale))) {
        return wa_fail(error, WA_ERROR_NUMERIC, NULL, 0,
                       "The charge balance of this mixture could not be solved.");
    }
    solution->pH = -state.x / ln10;
    solution->ionic_strength = state.s * state.s;
    solution->hydrogen = balance.hydrogen;
    solution->hydroxide = balance.hydroxide;
    solution->charge_residual = balance.charge / balance.scale;
    for (int k = 0; k < mixture->component_count; k++) {
        solution->mean_charge[k] = balance.moments[k].z;
        solution->saturated[k] = balance.moments[k].saturated;
    }
    if (sensitivity != NULL) {
        differentiate(mixture, &state, &balance, sensitivity);
    }
    return WA_OK;
}
