/* Equivalence points: the stoichiometric volumes of the fit, and the inflections of the curve. */
#include "identify/identify_internal.h"

#include <math.h>
#include <stdlib.h>

/* A fit whose readings scatter more than this says nothing about volumes, in pH. */
static const double usable_noise = 0.25;

static const double contradiction = 3.0; /* combined standard uncertainties */

static double variance_of_difference(const struct wa_fit *fit, int a, int b)
{
    const double covariance = fit->covariance[a * fit->parameter_count + b];
    return fit->parameters[a].u * fit->parameters[a].u +
           fit->parameters[b].u * fit->parameters[b].u - 2.0 * covariance;
}

struct wa_volume_estimate wa_equivalence_by_fit(const struct wa_experiment *experiment,
                                                const struct wa_fit *fit, int protons)
{
    const int amount = wa_fit_find(fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const int titrant = wa_fit_find(fit, WA_PARAMETER_LN_TITRANT, 0, 0);
    const double ln_ratio = fit->parameters[amount].value - fit->parameters[titrant].value;
    struct wa_volume_estimate estimate = {.volume_mL = 1e3 * protons * exp(ln_ratio) /
                                                       experiment->equivalents};
    estimate.u_mL =
        estimate.volume_mL * sqrt(fmax(variance_of_difference(fit, amount, titrant), 0.0));
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

/* Where fit and curve contradict each other the curve is believed, and the contradiction counts as
 * uncertainty: the model may not hold what is in the beaker. */
static void doubt(struct wa_result_equivalence *point, const struct wa_inflection *inflection)
{
    if (inflection == NULL || !(inflection->equivalence.u_mL > 0.0)) {
        return;
    }
    const struct wa_volume_estimate *by_curve = &inflection->equivalence;
    const double difference = fabs(by_curve->volume_mL - point->volume_mL);
    if (difference > contradiction * hypot(by_curve->u_mL, point->u_mL)) {
        point->volume_mL = by_curve->volume_mL;
        point->u_mL = fmax(by_curve->u_mL, 0.5 * difference);
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
            doubt(&point, inflection);
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
