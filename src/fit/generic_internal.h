/* Generic acids, shared by the sources that fit them. */
#ifndef WHICHACID_GENERIC_INTERNAL_H
#define WHICHACID_GENERIC_INTERNAL_H

#include "whichacid/protons.h"

/**
 * Starting values for a generic acid of a given amount.
 * @param[in]  amount  mol
 * @param[out] start   in the order of wa_fit_parameters
 * @return false when memory is out
 */
bool wa_generic_start(const struct wa_experiment *experiment, const struct wa_sample_model *sample,
                      double amount, double *start);

#endif
