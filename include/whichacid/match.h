/* Matching on the whole curve: the model of every form in the table is fitted to the points, with
 * its reference constants as priors, and its evidence decides. */
#ifndef WHICHACID_MATCH_H
#define WHICHACID_MATCH_H

#include "whichacid/observation.h"
#include "whichacid/protons.h"
#include "whichacid/reference.h"
#include "whichacid/weights.h"

/** Prior weight of "not in the table". */
#define WA_NOT_IN_TABLE_PRIOR 0.2

/** Share that goes to "not in the table" when nobody said what the titrant was. */
#define WA_TITRANT_DOUBT 0.1

/** Of the electrodes whose calibration nobody noted, this share is taken to be off by more: by this
 * much, in pH. */
#define WA_STRAY_ELECTRODE_SHARE 0.15
#define WA_STRAY_ELECTRODE_U 0.2

/** This share of "not in the table" resembles what is listed: constants about those of a listed
 * acid within this u, and a molar mass that is the same (an isomer) in this share, else within this
 * u of its ln. */
#define WA_RELATIVE_SHARE 0.7
#define WA_RELATIVE_PK_U 0.35
#define WA_RELATIVE_ISOMER_SHARE 0.3
#define WA_RELATIVE_LN_MASS_U 0.25

/** Molar masses that an unknown may have, g/mol, log-uniform. */
#define WA_MOLAR_MASS_LOW 40.0
#define WA_MOLAR_MASS_HIGH 1000.0

/** Purity of a sample: a stated mixture of "reagent grade" (ln of the fraction, normal) and "as
 * found" (below 1, half-normal in ln): a sample holds hardly more than its mass. */
#define WA_PURITY_REAGENT_SHARE 0.8
#define WA_PURITY_REAGENT_LN_MEAN (-0.003)
#define WA_PURITY_REAGENT_LN_U 0.004
#define WA_PURITY_FOUND_LN_S 0.08

/** Share of the acids whose row in the table is wrong by more than it admits, and what their
 * constants' uncertainties are then taken for: this many times wider, and at least this wide.
 * Handbooks contradict one another about that often (common practice). */
#define WA_ROW_WRONG_SHARE 0.05
#define WA_ROW_WRONG_WIDER 4.0
#define WA_ROW_WRONG_LEAST_U 0.1

/** The mass that was titrated. */
struct wa_titrated_mass {
    bool known;
    double mass_g; /**< of the part that was titrated: sample mass times aliquot */
    double u_g;
};

/** One candidate: forms of one acid system that bring the same ions to the solution and that the
 * data at hand cannot tell apart by mass either. */
struct wa_candidate {
    int acid;   /**< index of the first acid system, -1 for hydroxides alone */
    int form;   /**< index of the form that stands for them */
    int *forms; /**< all of them, table indices */
    size_t form_count;
    double log_weight; /**< ln of prior times evidence */
    double probability;
    double ln_amount; /**< ln of mol of formula units, from the fit */
    double ln_amount_u;
    double log_prior;    /**< ln of the share before the data */
    double log_curve;    /**< ln of the evidence of the curve alone */
    double log_mass;     /**< ln of what the mass says, 0 without one */
    double log_observed; /**< ln of the likelihood of what else was observed */
    bool row_doubted;    /**< its constants fit only when the table's uncertainties are widened */
    const struct wa_fit *fit;             /**< owned by the match */
    const struct wa_sample_model *sample; /**< owned by the match */
};

/**
 * The sample model of a form: its acid systems with the table's constants, at the experiment's
 * temperature, as priors.
 * @param[in] ionic_strength  mol/L, roughly: beyond 0.05 the Davies equation is trusted less
 * @param[in] ln_amount       prior of ln of mol of formula units
 */
void wa_match_sample(const struct wa_table *table, const struct wa_form *form,
                     const struct wa_experiment *experiment, double ionic_strength,
                     const struct wa_prior *ln_amount, struct wa_sample_model *sample);

/** What may be asked of a match. Zero-initialised means the defaults. */
struct wa_match_options {
    const char *const *among; /**< closed set of keys, NULL: the whole table */
    size_t among_count;
    const struct wa_weight_list *prior;    /**< NULL: even over acid systems, then over forms */
    const struct wa_observation *observed; /**< what else was observed */
    size_t observed_count;
    const char *const *wanted; /**< keys whose forms are fitted however they are screened */
    size_t wanted_count;
    double log_two_acids; /**< ln of prior and evidence of two acids; 0: not weighed */
};

/** The outcome, the most probable candidate first. */
struct wa_match {
    struct wa_candidate *candidates;
    size_t candidate_count;
    double not_in_table; /**< probability; 0 when the set was closed */
    double not_in_table_prior;
    double log_unknown; /**< ln of prior times evidence of "not in the table" */
    size_t forms_considered;
    size_t models_considered;         /**< distinct sample models among these forms */
    size_t models_fitted;             /**< of these, fitted fully after screening */
    struct wa_match_storage *storage; /**< opaque: fits and sample models */
};

/**
 * Weigh every form of the table.
 * @param[in]  study  generic acids of the same experiment; must hold at least one
 * @param[out] match  to be freed with wa_match_free
 * @return WA_ERROR_CALL when a key of `among` is unknown
 */
enum wa_status wa_match_run(const struct wa_experiment *experiment,
                            const struct wa_proton_study *study,
                            const struct wa_titrated_mass *mass, const struct wa_table *table,
                            const struct wa_match_options *options, struct wa_match *match,
                            struct wa_error *error) WA_MUST_USE;

/** One assumption varied, and where it takes the evidence ratio. */
struct wa_comparison_range {
    const char *assumption;
    double low, high; /**< lg of the ratio */
};

/** Evidence for one set of forms against another. */
struct wa_comparison {
    double log10_ratio;
    double log10_low, log10_high; /**< as the assumptions below are varied one at a time, together
                                       as the root of the sum of squares */
    struct wa_comparison_range ranges[3];
};

/**
 * The ratio of the evidence for two sets: each set's evidence is the mean over its forms by their
 * prior weights, so that the ratio does not depend on how probable the sets were before. Purity,
 * electrode and the share of outliers are varied.
 * @param[in] first   keys, commas between
 * @param[in] second  the same, or "rest": every other form, and what the table lacks
 * @return WA_ERROR_CALL for an unknown key, or when a set is empty or a form is in both
 */
enum wa_status wa_match_compare(const struct wa_experiment *experiment,
                                const struct wa_proton_study *study,
                                const struct wa_titrated_mass *mass, const struct wa_table *table,
                                const struct wa_match *match, const char *first, const char *second,
                                struct wa_comparison *comparison,
                                struct wa_error *error) WA_MUST_USE;

/** Free what a match owns. NULL is allowed. */
void wa_match_free(struct wa_match *match);

#endif
