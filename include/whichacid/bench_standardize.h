/* The concentration of a titrant against a weighed primary standard, by end-point volumes or by
 * whole curves, with its budget; and a second solution standardized by the first. */
#ifndef WHICHACID_BENCH_STANDARDIZE_H
#define WHICHACID_BENCH_STANDARDIZE_H

#include "whichacid/bench_budget.h"
#include "whichacid/reference.h"
#include "whichacid/run.h"

/** Most titrations of one standardization. */
#define WA_REPLICATES_MAX 30

/** What stands in for an uncertainty that nobody stated. */
#define WA_DEFAULT_MASS_U 0.0003         /**< g: a balance that reads to 0.1 mg, twice */
#define WA_DEFAULT_END_POINT_U 0.02      /**< mL */
#define WA_DEFAULT_REPEATABILITY_U 0.001 /**< relative, of one titration without a replicate */

/** One titration of the standard. */
struct wa_replicate {
    struct wa_quantity mass;   /**< g of standard in this titration */
    struct wa_quantity volume; /**< mL of titrant at the end point */
    bool from_curve;           /**< volume and its u come from a fit of the whole curve */
    const char *label;         /**< file of the curve, or NULL */
    bool left_out;             /**< by the analyst's decision */
    double concentration;      /**< computed: mol/L by this titration alone */
};

/** What is standardized and how. Zero-initialised means the defaults; a quantity with value 0 is
 * not given. */
struct wa_standardize_options {
    const char *standard;      /**< key or name in standards.csv */
    const char *titrant;       /**< words; NULL: sodium hydroxide or hydrochloric acid, as suits */
    struct wa_quantity purity; /**< mass fraction; not given: the table's */
    struct wa_quantity molar_mass; /**< g/mol; not given: from the formula */
    int equivalents;               /**< of one mole of the standard; 0: the table's */
    struct wa_quantity blank;      /**< mL, subtracted from every end-point volume; may be 0 ± u */
    double repeatability;          /**< relative standard uncertainty of one titration; 0: the
                                        scatter of the replicates */
    double balance_linearity;   /**< g, limits of error of one weighing, two of which give a mass */
    double burette_tolerance;   /**< mL, limits of error (ISO 385), taken as triangular */
    double temperature_spread;  /**< K, limits around the temperature of calibration */
    struct wa_quantity density; /**< g/cm3 of the standard: its mass is corrected for buoyancy */
    struct wa_quantity second_volume;    /**< mL of a second solution, titrated with the first */
    struct wa_quantity second_end_point; /**< mL of titrant that it took */
    double pipette_tolerance;            /**< mL, limits of error of second_volume (ISO 648) */
    const char *second_titrant;          /**< words for the second solution */
    uint32_t seed;                       /**< of the Monte Carlo; 0: 1 */
};

/** Titrations and what they give. Plain data; strings are borrowed from the table and the call. */
struct wa_standardization {
    struct wa_replicate replicates[WA_REPLICATES_MAX];
    size_t replicate_count;
    size_t used_count;
    const struct wa_standard *standard;
    const struct wa_titrant *titrant; /**< what the result is about: the second, if there is one */
    bool titrant_assumed;
    bool second;
    double mean;          /**< mol/L of the titrations alone */
    double scatter;       /**< relative standard deviation of one titration, NaN for one */
    double repeatability; /**< relative standard uncertainty of one titration that was used */
    bool repeatability_stated;
    struct wa_grubbs grubbs; /**< of the titrations used; its index counts all of them */
    double buoyancy;         /**< factor on the mass, 1 without correction */
    struct wa_bench_budget budget;
    struct wa_monte_carlo monte_carlo;
    const char *assumed[8]; /**< sentences on what stands in for what nobody stated */
    size_t assumed_count;
};

/** Index of the standard with that key or name, or -1. */
int wa_bench_find_standard(const struct wa_table *table, const char *name);

/**
 * Compute the concentration, mol/L: the mean over the titrations of
 * 1000 m purity equivalents buoyancy / (M (V - blank) titrant_equivalents), the model of
 * Eurachem/CITAC CG 4, A2; with a second solution times V2/V(second), A3. Errors of mass and
 * volume stated with `±` are calibration errors, common to all titrations; the scatter holds what
 * is random (Type A, n - 1 degrees of freedom).
 * @param[in,out] work  replicates filled in by the caller
 * @return WA_ERROR_CALL for names the table lacks; WA_ERROR_INPUT for values that cannot be
 */
enum wa_status wa_standardize(const struct wa_table *table,
                              const struct wa_standardize_options *options,
                              struct wa_standardization *work, struct wa_error *error) WA_MUST_USE;

/**
 * Make a replicate of a run: the standard's mass from its notes (with the aliquot), the volume from
 * a fit of the standard's own model to the whole curve.
 * @param[in] run  with its notes applied
 * @return WA_ERROR_INPUT when the mass is missing or the curve cannot be fitted
 */
enum wa_status wa_standardize_run(const struct wa_table *table,
                                  const struct wa_standardize_options *options,
                                  const struct wa_run *run, struct wa_replicate *replicate,
                                  struct wa_error *error) WA_MUST_USE;

#endif
