/* Competing explanations of a curve besides one pure acid: strong acid or base beside it (a partly
 * neutralized sample is one with base beside it), or two acids. */
#ifndef WHICHACID_EXPLANATIONS_H
#define WHICHACID_EXPLANATIONS_H

#include "whichacid/protons.h"

/** Prior weights: most samples are one substance (common practice). */
#define WA_EXCESS_PRIOR 0.04
#define WA_TWO_ACIDS_PRIOR 0.04

enum wa_explanation_kind {
    WA_EXPLANATION_ONE_ACID,
    WA_EXPLANATION_EXCESS,    /**< one acid, and strong acid or base beside it */
    WA_EXPLANATION_TWO_ACIDS, /**< two acids, each with an amount of its own */
};

/** What the data say of the explanations. */
struct wa_explanations {
    double probability[3]; /**< by kind; they add up to 1 */
    enum wa_explanation_kind preferred;
    double log_two_acids; /**< ln of prior and evidence of two acids, -INFINITY: not tried */
    double excess_mol;    /**< strong acid beside the acid; negative: strong base */
    double excess_u;
    struct wa_sample_model two_sample; /**< the best two acids, and their fit */
    struct wa_fit two_fit;             /**< parameter_count 0 when none converged */
};

/**
 * Weigh the explanations. Only a run with two jumps or more can show two acids.
 * @param[in]  study         generic acids of this experiment, at least one
 * @param[out] explanations  to be freed with wa_explanations_free
 */
enum wa_status wa_explanations_weigh(const struct wa_experiment *experiment,
                                     const struct wa_curve *curve,
                                     const struct wa_proton_study *study,
                                     struct wa_explanations *explanations,
                                     struct wa_error *error) WA_MUST_USE;

/** Free what it owns. NULL is allowed. */
void wa_explanations_free(struct wa_explanations *explanations);

/** Prior u of strong acid in excess for this experiment, mol. */
double wa_excess_prior_u(const struct wa_experiment *experiment);

#endif
