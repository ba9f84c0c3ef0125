/* Generic acids, shared by the sources that fit them. */
#ifndef WHICHACID_GENERIC_INTERNAL_H
#define WHICHACID_GENERIC_INTERNAL_H

#include "whichacid/protons.h"

/** Starts that are tried by a few rounds of a fit each. */
#define WA_STARTS_TRIED 2

/** Values that a fit may start from, and how well they describe the points. */
struct wa_start {
    double score;
    double value[WA_PARAMETERS_MAX];
};

/** The best few starts, best first. */
struct wa_start_list {
    struct wa_start best[WA_STARTS_TRIED];
    int count;
};

/**
 * Starting values for a generic acid of a given amount, with the constants where the charge balance
 * at the measured pH passes half a proton.
 * @param[in]  amount  mol
 * @param[in]  excess  mol of strong acid in the sample
 * @param[out] value   in the order of wa_fit_parameters
 */
enum wa_status wa_generic_start(const struct wa_experiment *experiment,
                                const struct wa_sample_model *sample, double amount, double excess,
                                double *value, struct wa_error *error) WA_MUST_USE;

/** Score a start and keep it if it is among the best few. */
enum wa_status wa_start_consider(const struct wa_experiment *experiment,
                                 const struct wa_sample_model *sample, struct wa_start *start,
                                 struct wa_start_list *list, struct wa_error *error) WA_MUST_USE;

/**
 * Fit from each start for a few rounds, then bring the best to convergence.
 * @param[out] fit  parameter_count 0 when no start could be evaluated
 */
enum wa_status wa_fit_from_starts(const struct wa_experiment *experiment,
                                  const struct wa_sample_model *sample,
                                  const struct wa_start_list *list, struct wa_fit *fit,
                                  struct wa_error *error) WA_MUST_USE;

/** Protons that a fit of a generic acid shows as removed or added within the readings. */
int wa_generic_shown(const struct wa_experiment *experiment, const struct wa_fit *fit, int part,
                     int step_count, int lost);

#endif
