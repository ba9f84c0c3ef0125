/* Planning a titration before it is done: will it work, what to weigh, which indicator, where to
 * place the additions, and how well the answer will be known. */
#ifndef WHICHACID_BENCH_PLAN_H
#define WHICHACID_BENCH_PLAN_H

#include "whichacid/fit.h"
#include "whichacid/quantity.h"
#include "whichacid/reference.h"

#include <stdint.h>

/** Most equivalence points, indicators and additions of one plan. */
#define WA_PLAN_STEPS_MAX 16
#define WA_PLAN_INDICATORS_MAX 8
#define WA_PLAN_ADDITIONS_MAX 100

/** A reaction constant below this does not run to completion (common practice). */
#define WA_COMPLETE_K 1e4

/** What is planned. Start from wa_plan_defaults. */
struct wa_plan_options {
    const char *form;           /**< key of the sample; NULL: unknown, by the two ranges */
    const char *rival;          /**< key of a second candidate to be told apart, or NULL */
    double pKa_low, pKa_high;   /**< of an unknown with one proton */
    double mass_low, mass_high; /**< g/mol, of an unknown */
    bool unknown_is_base;       /**< titrated with acid */
    const char *titrant;        /**< words; NULL: the strong one that suits */
    struct wa_quantity titrant_concentration; /**< mol/L; u is what will be noted */
    struct wa_quantity titrant_carbonate;     /**< fraction, u likewise; no u: the usual default */
    struct wa_quantity electrode_slope;       /**< likewise */
    struct wa_quantity electrode_offset;      /**< likewise */
    double end_point_mL;                      /**< wanted volume of the last end point */
    double solution_mL;                       /**< at the start */
    double temperature_C;
    double noise_reading; /**< pH */
    double noise_volume;  /**< mL */
    double mass_u;        /**< g */
    int additions;        /**< readings to take, that of 0 mL included */
    int trials;           /**< simulated runs for each design; 0: none */
    uint32_t seed;
};

/** One proton (or kind of proton) that the titrant takes or gives. */
struct wa_plan_step {
    double pKa;
    double volume_mL;   /**< stoichiometric end of this step */
    double K;           /**< equilibrium constant of the titration reaction */
    double unconverted; /**< fraction not reacted at its equivalence point, about */
    double pH;          /**< at that volume */
    double jump;        /**< |pH(V + 0.1 %) - pH(V - 0.1 %)| */
    double wide_jump;   /**< the same with 1 % */
    double steepness;   /**< |dpH/dV| there, per mL */
    bool complete;      /**< K is at least WA_COMPLETE_K */
    bool visible;       /**< complete, and a jump that an electrode shows */
};

/** An indicator for the chosen end point. */
struct wa_plan_indicator {
    const struct wa_indicator *indicator;
    double pH;        /**< at which its end colour is taken */
    double error_mL;  /**< volume there less the equivalence volume */
    double spread_mL; /**< half the volume that its whole change takes */
    bool within;      /**< its error is at most 0.3 % of the volume */
};

/** How well a design does: standard uncertainties. */
struct wa_plan_precision {
    double pKa_u[WA_PROTONS_MAX]; /**< expected by the sensitivities */
    double amount_u;              /**< relative */
    /** Found over the simulated runs: the standard deviation that a normal distribution with their
     * median error has; NaN without runs. */
    double pKa_error[WA_PROTONS_MAX];
    double amount_error; /**< relative */
    int converged;       /**< simulated runs that gave a fit */
};

/** How often the truth gets 95 % against a rival, by the number of readings. */
struct wa_plan_power {
    int readings;
    double share; /**< of the simulated runs, both being the truth in turn */
};

/** The plan. `additions_mL` are running totals. Pointers belong to the table. */
struct wa_plan {
    const struct wa_form *form;  /**< NULL for an unknown; else of the table, or own_form */
    struct wa_form own_form;     /**< an acid that the table has no form of, by itself */
    const struct wa_form *rival; /**< NULL without */
    const struct wa_titrant *titrant;
    double concentration;
    double mass_g;                  /**< to weigh */
    double volume_low, volume_high; /**< mL, end points that an unknown's range gives */
    double molar_mass;              /**< g/mol, of the form or the middle of the range */
    struct wa_plan_step steps[WA_PLAN_STEPS_MAX];
    int step_count;
    int chosen; /**< step whose end is titrated to, -1: none works */
    struct wa_plan_indicator indicators[WA_PLAN_INDICATORS_MAX];
    int indicator_count;
    double end_mL; /**< last addition */
    int addition_count;
    double additions_mL[WA_PLAN_ADDITIONS_MAX];
    double expected_pH[WA_PLAN_ADDITIONS_MAX];
    double even_mL[WA_PLAN_ADDITIONS_MAX];
    int free_pKa_count;
    double free_pKa[WA_PROTONS_MAX];
    struct wa_plan_precision design, even;
    double molar_mass_u; /**< g/mol, of one run by the design, mass and titrant included */
    struct wa_plan_power power[4];
    int power_count;
    bool rival_told; /**< some power is at least 0.9 */
};

/** Titrant 0.1 mol/L +- 0.1 %, 20 mL, 50 mL of solution, 25 degree Celsius, noise of 0.01 pH and
 * 0.01 mL, 0.3 mg, 30 readings, 200 trials, an acid of pKa 2 to 6 and 60 to 300 g/mol. */
void wa_plan_defaults(struct wa_plan_options *options);

/**
 * Make a plan.
 * @return WA_ERROR_CALL for names the table lacks or values that are not possible
 */
enum wa_status wa_plan_make(const struct wa_table *table, const struct wa_plan_options *options,
                            struct wa_plan *plan, struct wa_error *error) WA_MUST_USE;

/**
 * Equilibrium constant of HA + B = A + HB; a strong acid or base counts as the ion of water that
 * does its work (L/mol then, in water).
 * @param[in] donor     pKa of HA
 * @param[in] acceptor  pKa of HB
 */
double wa_plan_reaction_constant(double donor, double acceptor, double pKw);

#endif
