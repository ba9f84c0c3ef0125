/* Equivalence points: the stoichiometric volumes of the fit, and the inflections of the curve. */
#include "identify/identify_internal.h"

#include <math.h>
#include <stdlib.h>

/* A fit whose readings scatter more than this says nothing about volumes, in pH. */
static const double usable_noise = 0.25;

/* When the curve's own equivalence volume is believed against that of a doubtful fit: the jump must
 * be clear, and the two must differ by what matters and by what their uncertainties leave open. */
static const double excess_scatter = 2.0;
static const double carbonate_limit = 2.5; /* prior u */
static const double clear_jump = 2.0;      /* pH */
static const double least_doubt = 0.01;    /* of the volume */
static const double contradiction = 3.0;   /* combined standard uncertainties */

/* Variance of a linear combination of parameters. */
static double variance_of(const struct wa_fit *fit, const int *index, const double *weight,
                          int count)
{
    double sum = 0.0;
    for (int i = 0; i < count; i++) {
        for (int j = 0; j < count; j++) {
            sum +=
                weight[i] * weight[j] * fit->covariance[index[i] * fit->parameter_count + index[j]];
        }
    }
    return sum;
}

struct wa_volume_estimate wa_equivalence_by_fit(const struct wa_experiment *experiment,
                                                const struct wa_fit *fit, int protons)
{
    const int amount = wa_fit_find(fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const int titrant = wa_fit_find(fit, WA_PARAMETER_LN_TITRANT, 0, 0);
    const int excess = wa_fit_find(fit, WA_PARAMETER_EXCESS, 0, 0);
    const double mL_per_mol = 1e3 / (exp(fit->parameters[titrant].value) * experiment->equivalents);
    const double sign = experiment->titrant_is_base ? 1.0 : -1.0;
    const double of_acid = protons * exp(fit->parameters[amount].value) * mL_per_mol;
    const double of_excess = excess >= 0 ? sign * fit->parameters[excess].value * mL_per_mol : 0.0;
    struct wa_volume_estimate estimate = {.volume_mL = of_acid + of_excess};
    const int index[3] = {amount, titrant, excess};
    const double weight[3] = {of_acid, -estimate.volume_mL, sign * mL_per_mol};
    estimate.u_mL = sqrt(fmax(variance_of(fit, index, weight, excess >= 0 ? 3 : 2), 0.0));
    return estimate;
}

static const struct wa_inflection *nearest(const struct wa_curve *curve, double volume_mL,
                                           double within_mL)
{
    const struct wa_inflection *found = NULL;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const double distance = fabs(curve->inflections[i].volume_mL - volume_mL);
        if (distance < within_mL) {
            within_mL = distance;
            found = &curve->inflections[i];
        }
    }
    return found;
}

static void set_inflection(const struct wa_inflection *inflection, bool in_mV,
                           struct wa_result_equivalence *point)
{
    point->inflection_seen = true;
    point->inflection_mL = inflection->volume_mL;
    point->significance = inflection->significance;
    point->first_derivative = inflection->first_derivative;
    point->second_derivative = inflection->second_derivative;
    point->gran_before = inflection->gran_before;
    point->gran_after = inflection->gran_after;
    point->pH = in_mV ? NAN : inflection->reading;
}

static double pH_at(const struct wa_fit *fit, double volume_mL)
{
    struct wa_solution solution;
    return wa_titration_pH(&fit->titration, volume_mL, 7.0, &solution, NULL, NULL) == WA_OK
               ? solution.pH
               : NAN;
}

static enum wa_status add_point(struct wa_result *result, struct wa_result_equivalence point,
                                struct wa_error *error)
{
    struct wa_result_equivalence *larger =
        realloc(result->equivalence_points, (result->equivalence_count + 1) * sizeof *larger);
    if (larger == NULL) {
        return wa_fail_memory(error);
    }
    size_t at = result->equivalence_count++;
    result->equivalence_points = larger;
    while (at > 0 && larger[at - 1].volume_mL > point.volume_mL) {
        larger[at] = larger[at - 1];
        at--;
    }
    larger[at] = point;
    return WA_OK;
}

/* Whether a fit gives cause for doubt: it scatters more than the curve about its own smooth line,
 * or it needs far more carbonate than titrants hold. */
static bool is_doubtful(const struct wa_fit *fit, const struct wa_curve *curve)
{
    const int carbonate = wa_fit_find(fit, WA_PARAMETER_LN_CARBONATE, 0, 0);
    const struct wa_parameter *parameter = carbonate >= 0 ? &fit->parameters[carbonate] : NULL;
    return fit->noise_reading > excess_scatter * curve->noise ||
           (parameter != NULL &&
            parameter->value > parameter->prior.mean + carbonate_limit * parameter->prior.u);
}

/* Where a doubtful fit and the curve contradict each other the inflection is taken, as the trade
 * does, and the contradiction counts as uncertainty: the model does not hold what is in the beaker.
 */
static void doubt(const struct wa_fit *fit, const struct wa_curve *curve,
                  const struct wa_inflection *inflection, struct wa_result_equivalence *point)
{
    if (inflection == NULL) {
        return;
    }
    const double difference = fabs(inflection->volume_mL - point->volume_mL);
    if (is_doubtful(fit, curve) && inflection->jump > clear_jump &&
        difference > least_doubt * point->volume_mL &&
        difference > contradiction * hypot(inflection->u_mL, point->u_mL)) {
        point->volume_mL = inflection->volume_mL;
        point->u_mL = fmax(inflection->u_mL, 0.5 * difference);
        point->from_fit = false;
    }
}

/* Points of the fit: those with an inflection, and the last one in any case. */
static enum wa_status add_fitted(const struct wa_identification *work, struct wa_result *result,
                                 bool *used, struct wa_error *error)
{
    const struct wa_generic *best = &work->study.generic[0];
    const struct wa_experiment *experiment = &result->experiments[0];
    const struct wa_curve *curve = &result->curves[0];
    const double spacing = wa_equivalence_by_fit(experiment, &best->fit, 1).volume_mL;
    for (int k = 1; k <= best->shown; k++) {
        const struct wa_volume_estimate fitted = wa_equivalence_by_fit(experiment, &best->fit, k);
        const double within =
            fmin(0.3 * spacing, 0.05 * fitted.volume_mL + 4.0 * fitted.u_mL + 0.02 * spacing);
        const struct wa_inflection *inflection = nearest(curve, fitted.volume_mL, within);
        struct wa_result_equivalence point = {
            .volume_mL = fitted.volume_mL,
            .u_mL = fitted.u_mL,
            .pH = pH_at(&best->fit, fitted.volume_mL),
            .protons = k,
            .from_fit = true,
            .inflection_mL = NAN,
            .fit = fitted,
        };
        if (inflection != NULL) {
            set_inflection(inflection, curve->in_mV, &point);
            used[inflection - curve->inflections] = true;
        }
        const bool within_data = fitted.volume_mL <= experiment->volume_mL[experiment->count - 1];
        if (inflection != NULL || (k == best->shown && (within_data || k == 1))) {
            doubt(&best->fit, curve, inflection, &point);
            const enum wa_status status = add_point(result, point, error);
            if (status != WA_OK) {
                return status;
            }
        }
    }
    return WA_OK;
}

enum wa_status wa_fill_equivalence(const struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error)
{
    const struct wa_curve *curve = &result->curves[0];
    bool used[WA_INFLECTIONS_MAX] = {false};
    enum wa_status status = WA_OK;
    if (work->study.count > 0 && work->study.generic[0].fit.noise_reading < usable_noise) {
        status = add_fitted(work, result, used, error);
    }
    for (size_t i = 0; status == WA_OK && i < curve->inflection_count; i++) {
        if (!used[i]) {
            struct wa_result_equivalence point = {
                .volume_mL = curve->inflections[i].equivalence.volume_mL,
                .u_mL = curve->inflections[i].equivalence.u_mL,
                .protons = 0,
            };
            set_inflection(&curve->inflections[i], curve->in_mV, &point);
            status = add_point(result, point, error);
        }
    }
    return status;
}
