/* From parameter values to the composition of a titration, and the derivatives of each reading by
 * each parameter, by the chain rule over the sensitivities of the equilibrium. */
#include "fit/fault.h"
#include "fit/fit_internal.h"

#include <math.h>

/* Carbonic acid at 25 degree Celsius: H. S. Harned, R. Davis Jr., J. Am. Chem. Soc. 65 (1943)
 * 2030; H. S. Harned, S. R. Scholes, J. Am. Chem. Soc. 63 (1941) 1706. Enthalpy and heat capacity:
 * R. N. Goldberg, N. Kishore, R. M. Lennen, J. Phys. Chem. Ref. Data 31 (2002) 231. */
static const double carbonic_pK[2] = {6.352, 10.329};
static const double carbonic_enthalpy[2] = {9.15, 14.70};     /* kJ/mol */
static const double carbonic_heat_capacity[2] = {-371, -249}; /* J/(K mol) */

static bool brings_carbonate(const struct wa_experiment *experiment)
{
    return experiment->ln_carbon_dioxide.u > 0.0 ||
           (experiment->titrant_is_base && !experiment->titrant_is_weak);
}

static double value_of(const struct wa_parameter *parameters, const double *value, int count,
                       enum wa_parameter_kind kind, int part, double otherwise)
{
    for (int i = 0; i < count; i++) {
        if (parameters[i].kind == kind && parameters[i].part == part) {
            return value[i];
        }
    }
    return otherwise;
}

static void set_system(struct wa_titration_component *component, int charge, int step_count,
                       const double *pK)
{
    wa_system_set(&component->system, charge, step_count, pK);
    component->sample_moles = 0.0;
    component->titrant_concentration = 0.0;
    component->solubility = INFINITY;
    component->solid_species = 0;
}

static void set_parts(const struct wa_sample_model *sample, const struct wa_parameter *parameters,
                      const double *value, int count, double temperature_shift,
                      const double *amount, struct wa_titration *titration)
{
    double pK[WA_PARTS_MAX][WA_PROTONS_MAX];
    for (int k = 0; k < sample->part_count; k++) {
        for (int i = 0; i < sample->parts[k].step_count; i++) {
            pK[k][i] = sample->parts[k].pK[i];
        }
    }
    for (int i = 0; i < count; i++) {
        if (parameters[i].kind == WA_PARAMETER_PK) {
            pK[parameters[i].part][parameters[i].step] = value[i];
        }
    }
    for (int k = 0; k < sample->part_count; k++) {
        const struct wa_model_part *part = &sample->parts[k];
        struct wa_titration_component *component = &titration->components[k];
        for (int i = 0; i < part->step_count; i++) {
            pK[k][i] += part->pK_slope[i] * temperature_shift;
        }
        set_system(component, part->charge, part->step_count, pK[k]);
        component->sample_moles = part->count * amount[part->substance];
        component->solubility =
            k > 0 ? part->solubility
                  : exp(value_of(parameters, value, count, WA_PARAMETER_LN_SOLUBILITY, 0,
                                 log(part->solubility)));
        component->solid_species = part->solid_species;
    }
    titration->component_count = sample->part_count;
}

static void set_carbonate(const struct wa_experiment *experiment, double concentration,
                          double fraction, double dissolved, struct wa_titration *titration,
                          struct wa_layout *layout)
{
    double pK[2];
    for (int i = 0; i < 2; i++) {
        pK[i] = wa_pK_at_temperature(carbonic_pK[i], carbonic_enthalpy[i],
                                     carbonic_heat_capacity[i], experiment->temperature_C);
    }
    layout->carbonate = titration->component_count++;
    struct wa_titration_component *component = &titration->components[layout->carbonate];
    set_system(component, 0, 2, pK);
    component->sample_moles = dissolved * titration->solution_volume_L;
    /* Carbonate counts twice in the total alkalinity that the concentration means. */
    component->titrant_concentration = 0.5 * fraction * concentration;
}

void wa_model_titration(const struct wa_experiment *experiment,
                        const struct wa_sample_model *sample, const struct wa_parameter *parameters,
                        const double *value, int count, struct wa_titration *titration,
                        struct wa_layout *layout)
{
    double amount[WA_SUBSTANCES_MAX] = {0.0};
    titration->medium = wa_medium_at(experiment->temperature_C);
    const double temperature =
        value_of(parameters, value, count, WA_PARAMETER_TEMPERATURE, 0, experiment->temperature_C);
    const double shift = temperature - experiment->temperature_C;
    const double pKw_slope = wa_medium_at(experiment->temperature_C + 0.5).pKw -
                             wa_medium_at(experiment->temperature_C - 0.5).pKw;
    titration->medium.pKw += pKw_slope * shift;
    titration->davies_coefficient =
        value_of(parameters, value, count, WA_PARAMETER_DAVIES, 0, experiment->davies.mean);
    titration->solution_volume_L = exp(
        value_of(parameters, value, count, WA_PARAMETER_LN_VOLUME, 0, experiment->ln_volume.mean));
    titration->sample_charge = 0.0;
    titration->sample_ionic = experiment->background * titration->solution_volume_L;
    for (int a = 0; a < sample->substance_count; a++) {
        amount[a] = exp(value_of(parameters, value, count, WA_PARAMETER_LN_AMOUNT, a,
                                 sample->ln_amount[a].mean));
        titration->sample_charge += amount[a] * sample->spectator_charge[a];
        titration->sample_ionic += 0.5 * amount[a] * sample->spectator_z2[a];
    }
    const double excess = value_of(parameters, value, count, WA_PARAMETER_EXCESS, 0, 0.0);
    titration->sample_charge -= excess;
    titration->sample_ionic += 0.5 * fabs(excess);
    set_parts(sample, parameters, value, count, shift, amount, titration);

    const double concentration = exp(value_of(parameters, value, count, WA_PARAMETER_LN_TITRANT, 0,
                                              experiment->ln_titrant.mean));
    titration->titrant_charge = experiment->titrant_charge * concentration;
    titration->titrant_ionic = 0.5 * fabs(titration->titrant_charge);
    layout->carbonate = -1;
    layout->weak = -1;
    if (brings_carbonate(experiment)) {
        const bool from_titrant = experiment->titrant_is_base && !experiment->titrant_is_weak;
        const double fraction =
            from_titrant ? exp(value_of(parameters, value, count, WA_PARAMETER_LN_CARBONATE, 0,
                                        experiment->ln_carbonate.mean))
                         : 0.0;
        const double dissolved =
            exp(value_of(parameters, value, count, WA_PARAMETER_LN_CARBON_DIOXIDE, 0,
                         experiment->ln_carbon_dioxide.mean));
        set_carbonate(experiment, concentration, fraction, dissolved, titration, layout);
    }
    if (experiment->titrant_is_weak) {
        layout->weak = titration->component_count++;
        set_system(&titration->components[layout->weak], experiment->weak_charge,
                   experiment->weak_step_count, experiment->weak_pK);
        titration->components[layout->weak].titrant_concentration =
            experiment->weak_count * concentration;
    }
}

/* What one point's derivatives need. */
struct instant {
    const struct wa_sensitivity *sensitivity;
    const struct wa_titration *titration;
    const struct wa_sample_model *sample;
    const struct wa_mixture *mixture;
    const struct wa_solution *solution;
    struct wa_layout layout;
    struct wa_fault_share share;
    double added_L;
    double total_L;
    double pKw_slope;
};

/* d pH when sample amounts are scaled: charge, ionic strength and parts of one substance. */
static double by_amount(const struct instant *at, int substance, double amount)
{
    const struct wa_sensitivity *s = at->sensitivity;
    double sum = at->sample->spectator_charge[substance] * s->spectator_charge +
                 0.5 * at->sample->spectator_z2[substance] * s->spectator_ionic;
    for (int k = 0; k < at->sample->part_count; k++) {
        if (at->sample->parts[k].substance == substance) {
            sum += at->sample->parts[k].count * s->concentration[k];
        }
    }
    return sum * amount / at->total_L;
}

static double by_titrant(const struct instant *at)
{
    const struct wa_sensitivity *s = at->sensitivity;
    const struct wa_titration *t = at->titration;
    double sum = t->titrant_charge * s->spectator_charge + t->titrant_ionic * s->spectator_ionic;
    for (int k = 0; k < t->component_count; k++) {
        sum += t->components[k].titrant_concentration * s->concentration[k];
    }
    return sum * at->added_L / at->total_L;
}

static double by_volume(const struct instant *at, double background)
{
    const struct wa_sensitivity *s = at->sensitivity;
    const struct wa_titration *t = at->titration;
    const double start_L = t->solution_volume_L;
    /* The sample's moles stay, the volume dilutes everything; dissolved carbon dioxide and the
     * background come with the water. */
    const double charge = (t->sample_charge + t->titrant_charge * at->added_L) / at->total_L;
    const double ionic = (t->sample_ionic + t->titrant_ionic * at->added_L) / at->total_L;
    double sum = -charge * s->spectator_charge + (background - ionic) * s->spectator_ionic;
    for (int k = 0; k < t->component_count; k++) {
        const struct wa_titration_component *component = &t->components[k];
        double change =
            -(component->sample_moles + component->titrant_concentration * at->added_L) /
            at->total_L;
        if (k == at->layout.carbonate) {
            change += component->sample_moles / start_L;
        }
        sum += change * s->concentration[k];
    }
    return sum * start_L / at->total_L;
}

static double by_temperature(const struct instant *at)
{
    double sum = at->sensitivity->pKw * at->pKw_slope;
    for (int k = 0; k < at->sample->part_count; k++) {
        const struct wa_model_part *part = &at->sample->parts[k];
        for (int i = 0; i < part->step_count; i++) {
            sum += at->sensitivity->pK[k][i] * part->pK_slope[i];
        }
    }
    return sum;
}

/* d pH / d ln solubility while some solid is there, by a small difference: the solver gives no
 * derivative by a solubility, and only a suspected fault asks for one. */
static double by_solubility(const struct instant *at)
{
    static const double part = 1e-4;
    if (!at->solution->saturated[0]) {
        return 0.0;
    }
    struct wa_mixture mixture = *at->mixture;
    struct wa_solution solution;
    mixture.components[0].solubility *= 1.0 + part;
    return wa_mixture_solve_near(&mixture, at->solution->pH, at->solution->ionic_strength,
                                 &solution, NULL, NULL) == WA_OK
               ? (solution.pH - at->solution->pH) / part
               : 0.0;
}

/* d pH / d parameter at one point; electrode parameters are handled by the caller. */
static double derivative(const struct instant *at, const struct wa_experiment *experiment,
                         const struct wa_parameter *parameter, double value)
{
    const struct wa_sensitivity *s = at->sensitivity;
    const struct wa_titration *t = at->titration;
    switch (parameter->kind) {
    case WA_PARAMETER_PK:
        return s->pK[parameter->part][parameter->step];
    case WA_PARAMETER_LN_AMOUNT:
        return by_amount(at, parameter->part, exp(value));
    case WA_PARAMETER_LN_TITRANT:
        return by_titrant(at);
    case WA_PARAMETER_LN_CARBONATE:
        return s->concentration[at->layout.carbonate] *
               t->components[at->layout.carbonate].titrant_concentration * at->added_L /
               at->total_L;
    case WA_PARAMETER_LN_CARBON_DIOXIDE:
        return s->concentration[at->layout.carbonate] *
               t->components[at->layout.carbonate].sample_moles / at->total_L;
    case WA_PARAMETER_DAVIES:
        return s->davies_coefficient;
    case WA_PARAMETER_LN_VOLUME:
        return by_volume(at, experiment->background);
    case WA_PARAMETER_TEMPERATURE:
        return by_temperature(at);
    case WA_PARAMETER_EXCESS:
        return (-s->spectator_charge + copysign(0.5, value) * s->spectator_ionic) / at->total_L;
    case WA_PARAMETER_LN_UPTAKE:
        return s->concentration[at->layout.carbonate] * exp(value) * at->share.uptake / at->total_L;
    case WA_PARAMETER_VOLUME_STEP:
        return at->share.step * wa_titration_slope(t, 1e3 * at->added_L, s);
    case WA_PARAMETER_LN_SOLUBILITY:
        return by_solubility(at);
    case WA_PARAMETER_OFFSET:
    case WA_PARAMETER_SLOPE:
    case WA_PARAMETER_DRIFT:
        break;
    }
    return 0.0;
}

enum wa_status wa_model_evaluate(const struct wa_experiment *experiment,
                                 const struct wa_sample_model *sample,
                                 const struct wa_parameter *parameters, const double *value,
                                 int count, struct wa_point_model *points, double *jacobian,
                                 struct wa_error *error)
{
    struct wa_titration titration;
    struct wa_sensitivity sensitivity;
    struct instant at = {.sensitivity = &sensitivity, .titration = &titration, .sample = sample};
    wa_model_titration(experiment, sample, parameters, value, count, &titration, &at.layout);
    at.pKw_slope = wa_medium_at(experiment->temperature_C + 0.5).pKw -
                   wa_medium_at(experiment->temperature_C - 0.5).pKw;
    const double slope =
        value_of(parameters, value, count, WA_PARAMETER_SLOPE, 0, experiment->slope.mean);
    const double offset =
        value_of(parameters, value, count, WA_PARAMETER_OFFSET, 0, experiment->offset.mean);
    const double neutral = 7.0 + experiment->pivot;
    const double drift = value_of(parameters, value, count, WA_PARAMETER_DRIFT, 0, 0.0);
    const double step = value_of(parameters, value, count, WA_PARAMETER_VOLUME_STEP, 0, 0.0);
    const double uptake =
        exp(value_of(parameters, value, count, WA_PARAMETER_LN_UPTAKE, 0, -INFINITY));
    for (size_t p = 0; p < experiment->count; p++) {
        struct wa_solution solution;
        struct wa_mixture mixture;
        at.share = wa_fault_share(experiment->fault, p);
        const double volume = fmax(experiment->volume_mL[p] + at.share.step * step, 0.0);
        /* The last evaluation is the best start, the measured reading the first. */
        const double ionic_guess = points[p].ionic_strength;
        const double guess = ionic_guess > 0.0
                                 ? points[p].pH
                                 : neutral + (experiment->reading[p] - neutral - offset) / slope;
        wa_titration_mixture(&titration, volume, &mixture);
        at.added_L = 1e-3 * volume;
        at.total_L = titration.solution_volume_L + at.added_L;
        if (uptake > 0.0) {
            mixture.components[at.layout.carbonate].concentration +=
                uptake * at.share.uptake / at.total_L;
        }
        const enum wa_status status =
            wa_mixture_solve_near(&mixture, guess, ionic_guess, &solution, &sensitivity, error);
        if (status != WA_OK) {
            return status;
        }
        at.mixture = &mixture;
        at.solution = &solution;
        points[p].pH = solution.pH;
        points[p].ionic_strength = solution.ionic_strength;
        points[p].expected =
            neutral + slope * (solution.pH - neutral) + offset + drift * at.share.course;
        points[p].slope = slope * wa_titration_slope(&titration, volume, &sensitivity);
        for (int i = 0; jacobian != NULL && i < count; i++) {
            double *entry = &jacobian[p * (size_t)count + (size_t)i];
            if (parameters[i].kind == WA_PARAMETER_OFFSET) {
                *entry = 1.0;
            } else if (parameters[i].kind == WA_PARAMETER_SLOPE) {
                *entry = solution.pH - neutral;
            } else if (parameters[i].kind == WA_PARAMETER_DRIFT) {
                *entry = at.share.course;
            } else {
                *entry = slope * derivative(&at, experiment, &parameters[i], value[i]);
            }
        }
    }
    return WA_OK;
}
