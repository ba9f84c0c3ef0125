#include "whichacid/equilibrium.h"

#include <math.h>

static const double litre_per_mL = 1e-3;

void wa_titration_mixture(const struct wa_titration *titration, double volume_mL,
                          struct wa_mixture *mixture)
{
    const double added_L = volume_mL * litre_per_mL;
    const double inverse_L = 1.0 / (titration->solution_volume_L + added_L);
    mixture->medium = &titration->medium;
    mixture->davies_coefficient = titration->davies_coefficient;
    mixture->component_count = titration->component_count;
    for (int k = 0; k < titration->component_count; k++) {
        const struct wa_titration_component *from = &titration->components[k];
        struct wa_component *to = &mixture->components[k];
        to->system = &from->system;
        to->concentration =
            (from->sample_moles + from->titrant_concentration * added_L) * inverse_L;
        to->solubility = from->solubility;
        to->solid_species = from->solid_species;
    }
    mixture->spectator_charge =
        (titration->sample_charge + titration->titrant_charge * added_L) * inverse_L;
    mixture->spectator_ionic =
        (titration->sample_ionic + titration->titrant_ionic * added_L) * inverse_L;
}

enum wa_status wa_titration_pH(const struct wa_titration *titration, double volume_mL,
                               double pH_guess, struct wa_solution *solution,
                               struct wa_sensitivity *sensitivity, struct wa_error *error)
{
    struct wa_mixture mixture;
    wa_titration_mixture(titration, volume_mL, &mixture);
    return wa_mixture_solve(&mixture, pH_guess, solution, sensitivity, error);
}

double wa_titration_slope(const struct wa_titration *titration, double volume_mL,
                          const struct wa_sensitivity *sensitivity)
{
    const double added_L = volume_mL * litre_per_mL;
    const double total_L = titration->solution_volume_L + added_L;
    /* d/dV of (n + C V)/(V0 + V) is (C V0 - n)/(V0 + V)^2. */
    const double scale = litre_per_mL / (total_L * total_L);
    const double start_L = titration->solution_volume_L;
    double slope = sensitivity->spectator_charge *
                       (titration->titrant_charge * start_L - titration->sample_charge) +
                   sensitivity->spectator_ionic *
                       (titration->titrant_ionic * start_L - titration->sample_ionic);
    for (int k = 0; k < titration->component_count; k++) {
        const struct wa_titration_component *component = &titration->components[k];
        slope += sensitivity->concentration[k] *
                 (component->titrant_concentration * start_L - component->sample_moles);
    }
    return slope * scale;
}

/* Charge per litre of titrant and per sample at a pH and unit activity coefficient: what an added
 * volume has to balance, and the ionic strength that this volume gives. */
struct charges {
    double sample;  /* mol */
    double titrant; /* mol/L */
    double sample_ionic, titrant_ionic;
};

static void add_charges(const struct wa_titration_component *component, double activity,
                        double gamma, double total_L, double added_L, struct charges *charges)
{
    double fraction[WA_PROTONS_MAX + 1];
    wa_system_fractions(&component->system, activity, gamma, fraction);
    double z_mean = 0.0, z2_mean = 0.0;
    for (int i = 0; i <= component->system.step_count; i++) {
        const double z = component->system.charge - i;
        z_mean += fraction[i] * z;
        z2_mean += fraction[i] * z * z;
    }
    double dissolved = 1.0;
    if (isfinite(component->solubility)) {
        const double total =
            (component->sample_moles + component->titrant_concentration * added_L) / total_L;
        const double neutral = total * fraction[component->solid_species];
        dissolved = neutral > component->solubility ? component->solubility / neutral : 1.0;
    }
    charges->sample += component->sample_moles * dissolved * z_mean;
    charges->titrant += component->titrant_concentration * dissolved * z_mean;
    charges->sample_ionic += 0.5 * component->sample_moles * dissolved * z2_mean;
    charges->titrant_ionic += 0.5 * component->titrant_concentration * dissolved * z2_mean;
}

enum wa_status wa_titration_volume(const struct wa_titration *titration, double pH,
                                   double *volume_mL, struct wa_error *error)
{
    const struct wa_medium *medium = &titration->medium;
    const double start_L = titration->solution_volume_L;
    const double activity = pow(10.0, -pH);
    double ionic_strength = 0.05, added_L = 0.0;
    for (int iteration = 0; iteration < 500; iteration++) {
        const double log10_gamma = wa_davies_log10_gamma(ionic_strength, medium->debye_huckel_A,
                                                         titration->davies_coefficient);
        const double gamma = pow(10.0, log10_gamma);
        const double hydrogen = medium->density * activity / gamma;
        const double hydroxide = medium->density * pow(10.0, pH - medium->pKw) / gamma;
        const double total_L = start_L + added_L;
        struct charges charges = {titration->sample_charge, titration->titrant_charge,
                                  titration->sample_ionic, titration->titrant_ionic};
        for (int k = 0; k < titration->component_count; k++) {
            add_charges(&titration->components[k], activity, gamma, total_L, added_L, &charges);
        }
        const double free_charge = hydrogen - hydroxide;
        const double next_L =
            -(charges.sample + free_charge * start_L) / (charges.titrant + free_charge);
        const double next_total_L = start_L + next_L;
        if (!isfinite(next_L) || next_total_L <= 0.0) {
            break;
        }
        const double next_ionic =
            0.5 * (hydrogen + hydroxide) +
            fmax(charges.sample_ionic + charges.titrant_ionic * next_L, 0.0) / next_total_L;
        const double change = next_L - added_L;
        const double ionic_change = next_ionic - ionic_strength;
        added_L = next_L;
        ionic_strength += ionic_change;
        if (fabs(change) < 1e-13 * next_total_L && fabs(ionic_change) < 1e-12) {
            *volume_mL = added_L / litre_per_mL;
            return WA_OK;
        }
    }
    return wa_fail(error, WA_ERROR_NUMERIC, NULL, 0,
                   "No volume of this titrant brings the solution to pH %.2f.", pH);
}
