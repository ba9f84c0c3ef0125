/* Amounts from an equivalence volume: equivalents, moles, equivalent and molar mass, content, and
 * the concentration of a titrant against a primary standard; each with its uncertainty budget
 * (JCGM 100:2008, 5.1.2, independent inputs). */
#ifndef WHICHACID_AMOUNT_H
#define WHICHACID_AMOUNT_H

#include "whichacid/run.h"

/** Most inputs of one result. */
#define WA_CONTRIBUTIONS_MAX 12

/** One line of an uncertainty budget. */
struct wa_contribution {
    char name[40];      /**< "equivalence volume" */
    char unit[8];       /**< "mL", "" for a plain number */
    double value;       /**< of the input */
    double u;           /**< its standard uncertainty */
    double sensitivity; /**< d result / d input */
    double effect;      /**< |sensitivity| u, in the unit of the result */
    double share;       /**< effect^2 / u(result)^2; 0 when u(result) is 0 */
};

/** A result with its budget. Plain data, nothing to free. */
struct wa_budget {
    double value;
    double u;     /**< standard uncertainty, k = 1 */
    char unit[8]; /**< of the result */
    struct wa_contribution contributions[WA_CONTRIBUTIONS_MAX];
    size_t contribution_count;
};

/** What the results are computed from. Zero-initialised means nothing is known; `u` counts only
 * where has_u is set. */
struct wa_amount_inputs {
    struct wa_quantity equivalence_volume;    /**< mL, on total alkalinity or acidity */
    struct wa_quantity titrant_concentration; /**< mol/L */
    struct wa_quantity blank;                 /**< mL of titrant the blank took; 0 when none */
    struct wa_quantity aliquot;               /**< titrated fraction; value 0 means all of it */
    struct wa_quantity sample_mass;           /**< g; 0 when unknown */
    struct wa_quantity sample_volume;         /**< mL of a liquid sample, used without a mass */
    struct wa_quantity sample_density;        /**< g/mL */
    struct wa_quantity molar_mass; /**< g/mol of the substance, for content and titrant */
    struct wa_quantity purity;     /**< mass fraction; value 0 means 1 without u */
    double repeatability;          /**< relative standard uncertainty of the procedure */
    int protons; /**< equivalents that one mole of the substance gives; 0 means 1 */
};

/** The inputs that the notes of a run hold; the equivalence volume is left for the caller. */
struct wa_amount_inputs wa_amount_inputs_of(const struct wa_conditions *conditions);

/**
 * Equivalents in the whole sample, mol: c (V - blank) / (1000 aliquot).
 * @return WA_ERROR_INPUT when an input is missing or gives no positive result, naming it
 */
enum wa_status wa_amount_equivalents(const struct wa_amount_inputs *inputs,
                                     struct wa_budget *result, struct wa_error *error) WA_MUST_USE;

/** Moles of the substance, equivalents / protons. Errors as above. */
enum wa_status wa_amount_moles(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                               struct wa_error *error) WA_MUST_USE;

/** Equivalent mass, g/mol: sample mass (or volume x density) x purity / equivalents. */
enum wa_status wa_amount_equivalent_mass(const struct wa_amount_inputs *inputs,
                                         struct wa_budget *result,
                                         struct wa_error *error) WA_MUST_USE;

/** Molar mass, g/mol: equivalent mass x protons. */
enum wa_status wa_amount_molar_mass(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                                    struct wa_error *error) WA_MUST_USE;

/** Mass fraction of the substance in the sample: moles x molar mass / sample mass. */
enum wa_status wa_amount_content(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                                 struct wa_error *error) WA_MUST_USE;

/**
 * Concentration of the titrant, mol/L, from a weighed primary standard:
 * 1000 m purity protons aliquot / (M (V - blank)). This is the model of Eurachem/CITAC guide CG 4
 * (QUAM), example A2. The titrant concentration among the inputs is not used.
 */
enum wa_status wa_amount_titrant_concentration(const struct wa_amount_inputs *inputs,
                                               struct wa_budget *result,
                                               struct wa_error *error) WA_MUST_USE;

#endif
