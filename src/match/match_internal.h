/* Shared by the sources of the room: distinct sample models and their screening. */
#ifndef WHICHACID_MATCH_INTERNAL_H
#define WHICHACID_MATCH_INTERNAL_H

#include "whichacid/match.h"

/** Forms that bring the same ions to the solution: one sample model, several molar masses. */
struct wa_group {
    struct wa_sample_model sample;
    int acid;   /**< first acid system, -1 for hydroxides alone */
    int *forms; /**< table indices */
    size_t form_count;
    double solubility;  /**< mol/L of the uncharged species, INFINITY when unknown */
    int solid_species;  /**< protons lost by that species */
    double screened;    /**< approximate ln of the evidence of the curve */
    double ln_amount;   /**< approximate, where a fit starts */
    struct wa_fit *fit; /**< NULL until it is fitted */
    double log_curve;   /**< ln of the evidence of the curve by the full fit */
    bool row_doubted;   /**< the fit is the one with the table's uncertainties widened */
};

/** All groups of a table. */
struct wa_group_list {
    struct wa_group *groups;
    size_t count;
    size_t form_count;
    double *form_prior;      /**< by table index of the form: ln of its share before the data */
    double *form_observed;   /**< by table index: ln of the likelihood of what else was observed */
    double not_in_table;     /**< share of "not in the table" before the data */
    double unknown_observed; /**< ln of the likelihood of what else was observed, for that */
};

/** ln of the greater of the two densities of constants that are off by so much, relative to the
 * density of constants that are right: `strain` is the sum of their squared deviations in u. */
double wa_log_strain(double strain, int constants);

/** Purity of a sample before the data, in ln of the mass fraction. */
struct wa_purity {
    double reagent_share;   /**< weight of "reagent grade"; the rest is "as found" */
    double reagent_ln_mean; /**< normal */
    double reagent_ln_u;
    double found_ln_s; /**< half-normal below 1, of this scale */
};

/** ln of the evidence of a substance that resembles the listed ones, by their fits. */
double wa_groups_log_relatives(const struct wa_table *table, const struct wa_titrated_mass *mass,
                               const struct wa_purity *purity, const struct wa_group_list *list);

/** The groups of a finished match, borrowed. */
const struct wa_group_list *wa_match_groups(const struct wa_match *match);

/** The stated prior. */
struct wa_purity wa_purity_default(void);

/** ln(e^a + e^b). */
double wa_log_sum(double a, double b);

/**
 * ln of what the mass says of a molar mass, relative to the broad prior that the fit used for the
 * amount. The fit's posterior of ln amount is Gaussian, so that the integrals over the purity are
 * closed. 0 without a mass.
 */
double wa_log_mass_evidence(const struct wa_titrated_mass *mass, const struct wa_purity *purity,
                            double molar_mass, double ln_amount, double ln_amount_u,
                            const struct wa_prior *broad);

/** The same for an acid that nobody named: its molar mass is log-uniform. */
double wa_log_mass_evidence_generic(const struct wa_titrated_mass *mass, double ln_amount,
                                    const struct wa_prior *broad);

/** Collect the groups of the forms in question; WA_ERROR_CALL for an unknown key. */
enum wa_status wa_groups_collect(const struct wa_table *table,
                                 const struct wa_experiment *experiment, double ionic_strength,
                                 const struct wa_prior *ln_amount,
                                 const struct wa_match_options *options, struct wa_group_list *list,
                                 struct wa_error *error) WA_MUST_USE;

/** Free what the list owns. NULL is allowed. */
void wa_groups_free(struct wa_group_list *list);

/** Ranks the groups by their screening and fits those that can matter, and those asked for. */
enum wa_status wa_groups_fit(const struct wa_experiment *experiment, const struct wa_fit *best,
                             const struct wa_table *table, const struct wa_titrated_mass *mass,
                             const struct wa_match_options *options, struct wa_group_list *list,
                             size_t *fitted, struct wa_error *error) WA_MUST_USE;

/** Candidates of every group that was fitted: its forms, those that cannot be told apart in one. */
enum wa_status wa_groups_candidates(const struct wa_table *table,
                                    const struct wa_titrated_mass *mass,
                                    const struct wa_purity *purity, struct wa_group_list *list,
                                    struct wa_match *match, struct wa_error *error) WA_MUST_USE;

/** Shares of the forms before the data, in list->form_prior. */
enum wa_status wa_groups_priors(const struct wa_table *table,
                                const struct wa_match_options *options, struct wa_group_list *list,
                                struct wa_error *error) WA_MUST_USE;

/** Whether a key, name or other name means this form: itself, or the acid system it brings first.
 */
bool wa_form_is_meant(const struct wa_table *table, int form, const char *name);

/**
 * ln of the factor by which a fit's evidence changes when some electrodes of unknown calibration
 * are allowed to be far off: the prior of the offset becomes a mixture of the one fitted with and a
 * wide one. Zero when the calibration was noted.
 */
double wa_log_stray_electrode(const struct wa_experiment *experiment, const struct wa_fit *fit);

/** Find the solubility of the uncharged species of a group's first acid system in the table. */
void wa_group_solubility(const struct wa_table *table, double temperature_C,
                         struct wa_group *group);

/** Whether an amount leaves the uncharged species beyond its solubility at some point. */
bool wa_group_leaves_solid(const struct wa_experiment *experiment, const struct wa_group *group);

/**
 * Approximate the evidence of every group by linear algebra in the charge balance at the measured
 * pH, where the amount enters linearly and no equation has to be solved.
 */
enum wa_status wa_groups_screen(const struct wa_experiment *experiment, const struct wa_fit *best,
                                struct wa_group_list *list, struct wa_error *error) WA_MUST_USE;

#endif
