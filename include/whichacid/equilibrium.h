/* The forward model: pH and ionic strength of a mixture of acid systems, spectator ions and water,
 * and the mixture that a titration holds at each volume. One model serves acids titrated with base,
 * bases titrated with acid, acid salts and ampholytes: they differ only in the charge of the fully
 * protonated species and in the spectator charge of the form that was weighed. */
#ifndef WHICHACID_EQUILIBRIUM_H
#define WHICHACID_EQUILIBRIUM_H

#include "whichacid/activity.h"
#include "whichacid/error.h"
#include "whichacid/reference.h"

/** Most acid systems in one mixture: the sample's parts, a weak titrant and carbonate. */
#define WA_COMPONENTS_MAX 8

/** An acid system at the medium's temperature, with thermodynamic constants. */
struct wa_system {
    int step_count;
    int charge;               /**< of the fully protonated species */
    double K[WA_PROTONS_MAX]; /**< 10^-pK of each step */
};

/** Build a system. @param[in] pK step_count values, thermodynamic, at the mixture's temperature */
void wa_system_set(struct wa_system *system, int charge, int step_count, const double *pK);

/** One acid system in a mixture. */
struct wa_component {
    const struct wa_system *system; /**< borrowed */
    double concentration;           /**< mol/L, all its species and any solid together */
    double solubility; /**< mol/L that species `solid_species` can reach; INFINITY: dissolves */
    int solid_species; /**< protons lost by the species that can be solid */
};

/** A mixture at one moment. Plain data. */
struct wa_mixture {
    const struct wa_medium *medium; /**< borrowed */
    double davies_coefficient;      /**< linear coefficient of the Davies equation */
    struct wa_component components[WA_COMPONENTS_MAX];
    int component_count;
    double spectator_charge; /**< mol/L of charge carried by ions that never react */
    double spectator_ionic;  /**< mol/L, their half sum of z^2 c, background included */
};

/** The equilibrium of a mixture. */
struct wa_solution {
    double pH;                             /**< -lg a(H+), activity on the molal scale */
    double ionic_strength;                 /**< mol/L */
    double hydrogen;                       /**< concentration of H+, mol/L */
    double hydroxide;                      /**< concentration of OH-, mol/L */
    double charge_residual;                /**< charge balance over the sum of its absolute terms */
    double mean_charge[WA_COMPONENTS_MAX]; /**< of each component's dissolved species */
    bool saturated[WA_COMPONENTS_MAX];     /**< solid is present */
};

/** Partial derivatives of pH at equilibrium, through the ionic strength as well. */
struct wa_sensitivity {
    double spectator_charge;                      /**< per mol/L */
    double spectator_ionic;                       /**< per mol/L */
    double concentration[WA_COMPONENTS_MAX];      /**< per mol/L */
    double pK[WA_COMPONENTS_MAX][WA_PROTONS_MAX]; /**< per unit of pK */
    double ln_solubility[WA_COMPONENTS_MAX];      /**< per unit of ln, 0 where all is dissolved */
    double davies_coefficient;                    /**< per unit */
    double pKw;                                   /**< per unit */
};

/**
 * Solve the charge balance together with the ionic strength.
 * @param[in]  pH_guess     where to start; any finite value will do
 * @param[out] sensitivity  may be NULL
 * @return WA_OK, or WA_ERROR_NUMERIC when the mixture holds values that are not finite
 */
enum wa_status wa_mixture_solve(const struct wa_mixture *mixture, double pH_guess,
                                struct wa_solution *solution, struct wa_sensitivity *sensitivity,
                                struct wa_error *error) WA_MUST_USE;

/**
 * The same from a start near the solution, as after a small change of a parameter: half the cost.
 * @param[in] ionic_guess  mol/L, 0 when unknown
 */
enum wa_status wa_mixture_solve_near(const struct wa_mixture *mixture, double pH_guess,
                                     double ionic_guess, struct wa_solution *solution,
                                     struct wa_sensitivity *sensitivity,
                                     struct wa_error *error) WA_MUST_USE;

/**
 * Solubility of one species of a system in pure water, from that of all its species together as
 * tables give it.
 * @param[in] total    mol/L of the saturated solution
 * @param[in] species  protons lost by the species that is the solid
 */
enum wa_status wa_species_solubility(const struct wa_system *system, const struct wa_medium *medium,
                                     double total, int species, double *solubility,
                                     struct wa_error *error) WA_MUST_USE;

/** One acid system in a titration. */
struct wa_titration_component {
    struct wa_system system;
    double sample_moles;          /**< mol brought by the sample */
    double titrant_concentration; /**< mol/L brought by the titrant */
    double solubility;            /**< mol/L, INFINITY when it dissolves */
    int solid_species;
};

/** Everything that fixes the composition at each titrant volume. Plain data. */
struct wa_titration {
    struct wa_medium medium;
    double davies_coefficient;
    double solution_volume_L; /**< at the start */
    struct wa_titration_component components[WA_COMPONENTS_MAX];
    int component_count;
    double sample_charge;  /**< mol of spectator charge in the sample */
    double sample_ionic;   /**< mol, half sum of z^2 n of the sample's spectators and background */
    double titrant_charge; /**< mol/L of spectator charge in the titrant (+C for NaOH) */
    double titrant_ionic;  /**< mol/L, half sum of z^2 c of the titrant's spectators */
};

/** The mixture at a titrant volume; it borrows from `titration`. */
void wa_titration_mixture(const struct wa_titration *titration, double volume_mL,
                          struct wa_mixture *mixture);

/** pH at a titrant volume; parameters as for wa_mixture_solve. */
enum wa_status wa_titration_pH(const struct wa_titration *titration, double volume_mL,
                               double pH_guess, struct wa_solution *solution,
                               struct wa_sensitivity *sensitivity,
                               struct wa_error *error) WA_MUST_USE;

/** d pH / d V per mL from the sensitivities at that volume. */
double wa_titration_slope(const struct wa_titration *titration, double volume_mL,
                          const struct wa_sensitivity *sensitivity);

/**
 * Titrant volume at which the solution has a given pH: explicit at given ionic strength, which is
 * iterated.
 * @param[out] volume_mL  may be negative: the pH lies before the start
 * @return WA_ERROR_NUMERIC when no volume of this titrant reaches the pH
 */
enum wa_status wa_titration_volume(const struct wa_titration *titration, double pH,
                                   double *volume_mL, struct wa_error *error) WA_MUST_USE;

/**
 * Fractions of the species of a system.
 * @param[in]  hydrogen_activity  10^-pH
 * @param[in]  gamma              activity coefficient of a singly charged ion
 * @param[out] fraction           step_count + 1 values, by protons lost
 */
void wa_system_fractions(const struct wa_system *system, double hydrogen_activity, double gamma,
                         double *fraction);

#endif
