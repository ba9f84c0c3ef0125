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
    double log_prior;   /**< ln of the share of one form */
    double solubility;  /**< mol/L of the uncharged species, INFINITY when unknown */
    int solid_species;  /**< protons lost by that species */
    double screened;    /**< approximate ln of the evidence of the curve */
    double ln_amount;   /**< approximate, where a fit starts */
    struct wa_fit *fit; /**< NULL until it is fitted */
    double log_curve;   /**< ln of the evidence of the curve by the full fit */
};

/** All groups of a table. */
struct wa_group_list {
    struct wa_group *groups;
    size_t count;
    size_t form_count;
};

/** Collect the groups of the forms in question; WA_ERROR_CALL for an unknown key. */
enum wa_status wa_groups_collect(const struct wa_table *table,
                                 const struct wa_experiment *experiment, double ionic_strength,
                                 const struct wa_prior *ln_amount,
                                 const struct wa_match_options *options, struct wa_group_list *list,
                                 struct wa_error *error) WA_MUST_USE;

/** Free what the list owns. NULL is allowed. */
void wa_groups_free(struct wa_group_list *list);

/**
 * Approximate the evidence of every group by linear algebra in the charge balance at the measured
 * pH, where the amount enters linearly and no equation has to be solved.
 */
enum wa_status wa_groups_screen(const struct wa_experiment *experiment, const struct wa_fit *best,
                                struct wa_group_list *list, struct wa_error *error) WA_MUST_USE;

/**
 * ln of the factor by which a fit's evidence changes when some electrodes of unknown calibration
 * are allowed to be far off: the prior of the offset becomes a mixture of the one fitted with and a
 * wide one. Zero when the calibration was noted.
 */
double wa_log_stray_electrode(const struct wa_experiment *experiment, const struct wa_fit *fit);

#endif
