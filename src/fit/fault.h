/* What a suspected fault adds to an experiment: nuisances that ordinary fits do not have. A prior
 * without a width is a nuisance that is not there. */
#ifndef WHICHACID_FAULT_H
#define WHICHACID_FAULT_H

#include "whichacid/fit.h"

/** A suspected fault. The arrays are borrowed and have an entry a point. */
struct wa_fault {
    struct wa_prior drift;         /**< of the reading from the first point to the last, pH */
    const double *course;          /**< how much of the run has passed, 0 to 1 */
    struct wa_prior ln_uptake;     /**< ln of mol of carbon dioxide taken up in all */
    const double *uptake;          /**< how much of it has been taken up, 0 to 1 */
    struct wa_prior volume_step;   /**< mL to be added from `step_row` on */
    size_t step_row;               /**< first row that the step concerns */
    size_t step_end;               /**< first row after these */
    struct wa_prior ln_solubility; /**< ln of mol/L of the first part in its solid species */
};

/** The parts of a fault that one point has. */
struct wa_fault_share {
    double course;
    double uptake;
    double step; /**< 1 where the volume step acts, else 0 */
};

/** The parts at a point; all 0 without a fault. */
struct wa_fault_share wa_fault_share(const struct wa_fault *fault, size_t point);

#endif
