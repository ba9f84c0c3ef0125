/* How many protons: generic acids of n steps are fitted and weighed by their evidence. */
#ifndef WHICHACID_PROTONS_H
#define WHICHACID_PROTONS_H

#include "whichacid/fit.h"

/** Most protons of a generic acid. */
#define WA_GENERIC_STEPS_MAX 6

/** Most generic acids that compete. */
#define WA_GENERIC_MAX 32

/** Prior of each constant of a generic acid, stated in the report. */
#define WA_GENERIC_PK_MEAN 6.5
#define WA_GENERIC_PK_U 3.2

/** A generic acid and what became of it. */
struct wa_generic {
    int step_count; /**< protons it has */
    int lost;       /**< protons already missing in the form that was weighed */
    int charge;     /**< of the fully protonated species */
    double log_prior;
    double probability; /**< among the generic acids */
    int shown;          /**< protons that the run shows being removed or added */
    struct wa_sample_model sample;
    struct wa_fit fit;
};

/** All that were tried, the most probable first. */
struct wa_proton_study {
    struct wa_generic generic[WA_GENERIC_MAX];
    int count;
    double by_count[WA_PROTONS_MAX + 1]; /**< probability of each number of shown protons */
    double log_evidence; /**< of "some acid not in the table", priors over the generic acids in */
};

/**
 * Fit generic acids with 1 to 6 protons and weigh them.
 * @param[out] study  to be freed with wa_proton_study_free; count 0 when nothing converged
 */
enum wa_status wa_proton_study_run(const struct wa_experiment *experiment,
                                   const struct wa_curve *curve, struct wa_proton_study *study,
                                   struct wa_error *error) WA_MUST_USE;

/**
 * Add a generic acid that starts where a fit of a known one ended: when a substance of the table
 * describes the curve better than every generic acid that was found, the search has missed it.
 * @param[in] sample  of the known one: one acid system
 */
enum wa_status wa_proton_study_seed(const struct wa_experiment *experiment,
                                    const struct wa_sample_model *sample, const struct wa_fit *fit,
                                    struct wa_proton_study *study,
                                    struct wa_error *error) WA_MUST_USE;

/** Free what a study owns. NULL is allowed. */
void wa_proton_study_free(struct wa_proton_study *study);

/** The sample model of a generic acid; its amount prior spans what the volumes allow. */
void wa_generic_sample(const struct wa_experiment *experiment, int step_count, int lost, int charge,
                       struct wa_sample_model *sample);

#endif
