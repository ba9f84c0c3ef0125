/* Half-equivalence pKa, corrected by the charge balance.
 *
 * At volume V the acid has given off V + ([H+] - [OH-]) (V0 + V) / c (in mL of titrant, c its
 * concentration). Each step j of width W_j gives W_j / (1 + 10^(pKa_j - pH)) of that. The share of
 * step i is what the other steps leave, and pKa_i = pH - lg(share / (1 - share)). With a base
 * titrated by acid the same holds for protons taken up, and shares count from the other end. */
#include "curve/curve_internal.h"

#include <math.h>

/* Mixed constants hold the activity of the hydrogen ion and concentrations of the rest; the drift
 * of activity coefficients over a run is covered by this. */
static const double mixed_u = 0.03;

/* Stand-in for a titrant concentration that nobody noted, mol/L: what laboratories use most. */
static const double usual_titrant = 0.1, usual_titrant_u = 0.05;

/* Everything the correction depends on, so that each can be varied alone. */
enum parameter { FROM, TO, READING, OFFSET, SLOPE, TITRANT, START, PARAMETERS };

struct balance {
    const struct curve_context *context;
    const struct wa_curve *curve;
    double value[PARAMETERS], u[PARAMETERS];
    size_t step; /* index of the step in question */
};

static double step_start(const struct wa_curve *curve, size_t step, double origin)
{
    return step == 0 ? origin : curve->inflections[step - 1].equivalence.volume_mL;
}

/* Davies 1962 for a univalent ion; the ionic strength is about that of the salt formed. */
static double log_gamma(double ionic_strength)
{
    const double root = sqrt(fmax(ionic_strength, 0.0));
    return -0.509 * (root / (1.0 + root) - 0.3 * ionic_strength);
}

static double ionic_strength(const struct balance *balance, double volume)
{
    const double salt = balance->value[TITRANT] * volume / (balance->value[START] + volume);
    return salt + balance->context->background;
}

/* ([H+] - [OH-]) (V0 + V) / c in mL; pKw near 25 degree Celsius falls by 0.033 a degree. */
static double free_ions(const struct balance *balance, double volume, double pH)
{
    const double gamma = pow(10.0, log_gamma(ionic_strength(balance, volume)));
    const double pKw = 13.995 - 0.033 * (balance->context->temperature_C - 25.0);
    const double free = pow(10.0, -pH) / gamma - pow(10.0, pH - pKw) / gamma;
    return free * (balance->value[START] + volume) / balance->value[TITRANT];
}

/* pKa of the step with the given parameters; false when the share leaves no room for one. */
static bool solve_step(const struct balance *balance, double *pKa)
{
    const struct wa_curve *curve = balance->curve;
    const struct curve_context *context = balance->context;
    const double from = balance->value[FROM], to = balance->value[TO];
    const double volume = 0.5 * (from + to);
    const double pH =
        7.0 + (balance->value[READING] - 7.0 - balance->value[OFFSET]) / balance->value[SLOPE];
    const int sign = context->titrant_is_base ? 1 : -1;
    double given = volume - from + sign * free_ions(balance, volume, pH);
    for (size_t j = 0; j < curve->half_count; j++) {
        const struct wa_half_equivalence *other = &curve->halves[j];
        const size_t index = (size_t)(other->step - 1);
        if (index == balance->step || !isfinite(other->pKa)) {
            continue;
        }
        const double width =
            curve->inflections[index].equivalence.volume_mL - step_start(curve, index, 0.0);
        const double share = 1.0 / (1.0 + pow(10.0, sign * (other->pKa - pH)));
        given -= index < balance->step ? width * (share - 1.0) : width * share;
    }
    const double share = given / (to - from);
    if (!(share > 0.02 && share < 0.98)) {
        return false;
    }
    *pKa = pH - sign * log10(share / (1.0 - share));
    return true;
}

static struct balance balance_for(const struct curve_context *context, size_t step)
{
    const struct wa_curve *curve = context->curve;
    const struct wa_volume_estimate *here = &curve->inflections[step].equivalence;
    struct balance balance = {.context = context, .curve = curve, .step = step};
    balance.value[FROM] = step_start(curve, step, context->blank_mL);
    balance.u[FROM] = step == 0 ? context->blank_u : curve->inflections[step - 1].equivalence.u_mL;
    balance.value[TO] = here->volume_mL;
    balance.u[TO] = here->u_mL;
    balance.value[READING] = curve_reading_at(
        context, 0.5 * (balance.value[FROM] + balance.value[TO]), &balance.u[READING]);
    balance.value[OFFSET] = context->offset;
    balance.u[OFFSET] = context->offset_u;
    balance.value[SLOPE] = context->slope;
    balance.u[SLOPE] = context->slope_u;
    const bool known = isfinite(context->titrant);
    balance.value[TITRANT] = known ? context->titrant : usual_titrant;
    balance.u[TITRANT] = known ? context->titrant_u : usual_titrant_u;
    balance.value[START] = context->start_volume;
    balance.u[START] = context->start_volume_u;
    return balance;
}

/* Law of propagation (JCGM 100:2008, 5.1.2) by shifting one parameter at a time; the reading is
 * taken at the shifted volume too. A shift that leaves no pKa counts as one unit. */
static double propagate(struct balance *balance, double pKa)
{
    double square = mixed_u * mixed_u;
    for (size_t k = 0; k < PARAMETERS; k++) {
        if (!(balance->u[k] > 0.0)) {
            continue;
        }
        struct balance shifted = *balance;
        shifted.value[k] += balance->u[k];
        if (k == FROM || k == TO) {
            shifted.value[READING] = curve_reading_at(
                balance->context, 0.5 * (shifted.value[FROM] + shifted.value[TO]), NULL);
        }
        double other;
        const double change = solve_step(&shifted, &other) ? other - pKa : 1.0;
        square += change * change;
    }
    return sqrt(square);
}

/* Hydrogen-ion exponent at part `share` of a step, free ions subtracted from its width. */
static double rise_of_step(const struct balance *balance)
{
    const double width = balance->value[TO] - balance->value[FROM];
    double exponent[2];
    for (int k = 0; k < 2; k++) {
        const double volume = balance->value[FROM] + width * (k == 0 ? 0.25 : 0.75);
        exponent[k] =
            curve_exponent(balance->context, curve_reading_at(balance->context, volume, NULL));
    }
    return fabs(exponent[1] - exponent[0]);
}

/* A lone step rises by 2 lg 3 = 0.95 between a quarter and three quarters of its width; a steeper
 * one hides several protons with constants apart. */
static bool looks_merged(const struct balance *balance, double pKa)
{
    const double tolerance =
        0.12 + 4.0 * balance->u[READING] +
        4.0 * (balance->u[FROM] + balance->u[TO]) / (balance->value[TO] - balance->value[FROM]);
    const bool inside = pKa > 3.5 && pKa < 10.5;
    return inside && rise_of_step(balance) > 2.0 * log10(3.0) + tolerance;
}

static void refine_all(struct curve_context *context)
{
    struct wa_curve *curve = context->curve;
    for (size_t i = 0; i < curve->half_count; i++) {
        struct wa_half_equivalence *half = &curve->halves[i];
        struct balance balance = balance_for(context, (size_t)(half->step - 1));
        double pKa;
        if (solve_step(&balance, &pKa)) {
            half->pKa = pKa;
            half->u = propagate(&balance, pKa);
        } else {
            half->pKa = NAN;
        }
        half->correction = half->pKa - half->pH;
    }
}

static void start_all(struct curve_context *context)
{
    struct wa_curve *curve = context->curve;
    for (size_t step = 0; step < curve->inflection_count; step++) {
        struct balance balance = balance_for(context, step);
        const double volume = 0.5 * (balance.value[FROM] + balance.value[TO]);
        const bool covered =
            volume >= curve->volume_mL[0] && balance.value[TO] > balance.value[FROM];
        if (!covered) {
            continue;
        }
        struct wa_half_equivalence *half = &curve->halves[curve->half_count++];
        *half = (struct wa_half_equivalence){.step = (int)step + 1, .volume_mL = volume};
        half->pH = balance.value[READING];
        half->pKa = NAN;
        half->ionic_strength = ionic_strength(&balance, volume);
    }
}

/* Drop the steps without a constant and say why. */
static enum wa_status drop_unsolved(struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    size_t kept = 0;
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < curve->half_count && status == WA_OK; i++) {
        const struct wa_half_equivalence half = curve->halves[i];
        if (isfinite(half.pKa) && half.u < 1.0) {
            curve->halves[kept++] = half;
            continue;
        }
        const char *kind = context->titrant_is_base ? "acid" : "base";
        const double volume = curve->inflections[half.step - 1].equivalence.volume_mL;
        status = isfinite(context->titrant)
                     ? curve_remark(curve, error,
                                    "The step before %.2f mL behaves like a strong %s (pH %.2f "
                                    "half-way): it has no half-equivalence pKa.",
                                    volume, kind, half.pH)
                     : curve_remark(curve, error,
                                    "The step before %.2f mL is that of a strong or fairly strong "
                                    "%s (pH %.2f half-way): note the titrant concentration and the "
                                    "solution volume to have its pKa computed.",
                                    volume, kind, half.pH);
    }
    curve->half_count = kept;
    return status;
}

/* Say so when a constant hangs on the assumed titrant. */
static enum wa_status remark_assumed(struct curve_context *context, struct wa_error *error)
{
    const struct wa_curve *curve = context->curve;
    for (size_t i = 0; i < curve->half_count && !isfinite(context->titrant); i++) {
        if (fabs(curve->halves[i].correction) > 0.02) {
            return curve_remark(context->curve, error,
                                "The titrant concentration is not noted: %.1f mol/L in %.0f mL of "
                                "solution was assumed to correct the pKa of strong steps.",
                                usual_titrant, context->start_volume);
        }
    }
    return WA_OK;
}

enum wa_status curve_half_equivalences(struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    if (curve->in_mV) {
        return curve->inflection_count == 0
                   ? WA_OK
                   : curve_remark(curve, error,
                                  "The readings are mV without a calibration: no pKa can be given; "
                                  "note the electrode slope and offset.");
    }
    start_all(context);
    for (int round = 0; round < 4; round++) {
        refine_all(context);
    }
    for (size_t i = 0; i < curve->half_count; i++) {
        struct balance balance = balance_for(context, (size_t)(curve->halves[i].step - 1));
        curve->halves[i].merged = looks_merged(&balance, curve->halves[i].pKa);
    }
    const enum wa_status status = drop_unsolved(context, error);
    return status == WA_OK ? remark_assumed(context, error) : status;
}
