/* Amounts without a curve: solutions made by weighing and diluting, equivalent mass and content by
 * end-point volumes, back titration, and mixtures whose parts are declared. Each result has its
 * budget. */
#ifndef WHICHACID_BENCH_AMOUNT_H
#define WHICHACID_BENCH_AMOUNT_H

#include "whichacid/bench_budget.h"
#include "whichacid/reference.h"

/** Most dilutions, results and listed forms of one call. */
#define WA_DILUTIONS_MAX 4
#define WA_AMOUNT_RESULTS_MAX 3
#define WA_MASS_CANDIDATES_MAX 20

/** What an indicator's end point may be off by when nobody says: Eurachem/CITAC CG 4, A3.6, gives
 * 0.03 mL for one that is judged by eye. */
#define WA_END_POINT_BY_EYE_U 0.03

/** What is asked for. */
enum wa_amount_kind {
    WA_AMOUNT_SOLUTION,                /**< concentration of a solution made by weighing */
    WA_AMOUNT_EQUIVALENT,              /**< equivalent mass and molar mass of what was weighed */
    WA_AMOUNT_CONTENT,                 /**< part of a sample that is a named substance */
    WA_AMOUNT_HYDROXIDE_CARBONATE,     /**< two end points with acid */
    WA_AMOUNT_CARBONATE_BICARBONATE,   /**< two end points with acid */
    WA_AMOUNT_PHOSPHORIC_HYDROCHLORIC, /**< two end points with base */
};

/** A step of dilution: `pipette` of the solution made up to `flask`. pipette 0: the weighed sample
 * itself is made up. */
struct wa_dilution {
    struct wa_quantity pipette; /**< mL */
    struct wa_quantity flask;   /**< mL */
};

/** What is known. A quantity with value 0 is not given. */
struct wa_amount_options {
    enum wa_amount_kind kind;
    struct wa_quantity sample_mass;          /**< g */
    struct wa_quantity sample_volume;        /**< mL, for a liquid without a mass */
    struct wa_quantity sample_density;       /**< g/mL */
    struct wa_quantity purity;               /**< mass fraction of what was weighed */
    struct wa_quantity concentration;        /**< mol/L of the titrant's equivalents */
    struct wa_quantity end_points[2];        /**< mL; the second for mixtures */
    struct wa_quantity blank;                /**< mL */
    struct wa_quantity excess;               /**< mL of an added solution that is titrated back */
    struct wa_quantity excess_concentration; /**< mol/L of its equivalents */
    struct wa_quantity molar_mass;           /**< g/mol of the substance */
    const char *substance;                   /**< key of a form, for its molar mass */
    const char *anhydrous; /**< key of a form: how much water the sample holds beside it */
    const char *titrant;   /**< words; for candidates by mass. NULL: a base */
    int protons;           /**< equivalents of one mole; 0: 1 */
    struct wa_dilution dilutions[WA_DILUTIONS_MAX];
    size_t dilution_count;
    bool class_B;              /**< flasks and pipettes of class B: twice the tolerance */
    double temperature_spread; /**< K, limits around the temperature of calibration */
    double repeatability;      /**< relative standard uncertainty of the procedure */
    uint32_t seed;             /**< 0: 1 */
};

/** A form of the table that agrees by its equivalent mass. */
struct wa_mass_candidate {
    const struct wa_form *form;
    int protons;      /**< that it would have given or taken */
    double deviation; /**< measured less its equivalent mass, in standard uncertainties */
};

/** What came out. Plain data; forms belong to the table. */
struct wa_amount_result {
    struct wa_bench_budget budgets[WA_AMOUNT_RESULTS_MAX];
    struct wa_monte_carlo monte_carlo[WA_AMOUNT_RESULTS_MAX];
    size_t count;
    struct wa_mass_candidate candidates[WA_MASS_CANDIDATES_MAX];
    size_t candidate_count;
    size_t candidates_left_off;
    char sentences[6][192]; /**< what was assumed, and what does not fit */
    size_t sentence_count;
};

/**
 * Compute amounts.
 * @return WA_ERROR_CALL naming what is missing; WA_ERROR_INPUT for volumes that cannot be, such as
 *         a second end point before the first
 */
enum wa_status wa_amount_make(const struct wa_table *table, const struct wa_amount_options *options,
                              struct wa_amount_result *result, struct wa_error *error) WA_MUST_USE;

/**
 * Limits of error of a one-mark flask (ISO 1042) or pipette (ISO 648), class A, mL; from memory.
 * For a size between two the larger one's; NaN beyond the largest.
 */
double wa_flask_tolerance(double volume_mL);
double wa_pipette_tolerance(double volume_mL);

#endif
