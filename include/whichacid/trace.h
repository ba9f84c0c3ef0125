/* A fitted model as a smooth curve, ready to be drawn: expected readings and species fractions at
 * volumes close enough for the eye. */
#ifndef WHICHACID_TRACE_H
#define WHICHACID_TRACE_H

#include "whichacid/fit.h"

/** One fit as a curve. Zero-initialised: nothing to draw. */
struct wa_trace {
    size_t count;
    double *volume_mL; /**< rising */
    double *reading;   /**< what the electrode would show, in pH */
    double *pH;        /**< of the solution, electrode errors taken out */
    int step_count;    /**< of the sample's first acid system */
    int charge;        /**< of its fully protonated species */
    double *fraction;  /**< count rows of step_count + 1 values, by protons lost */
    size_t point_count;
    double *residual; /**< at the experiment's points, in standard uncertainties; a copy */
};

/**
 * Draw a fit. Volumes are even over the run, and between them such that steps of pH are even too,
 * so that a steep jump stays smooth.
 * @param[out] trace  to be freed with wa_trace_free; untouched on failure
 * @return WA_ERROR_NUMERIC when the model cannot be solved
 */
enum wa_status wa_trace_fit(const struct wa_experiment *experiment, const struct wa_fit *fit,
                            struct wa_trace *trace, struct wa_error *error) WA_MUST_USE;

/** Free what a trace owns. NULL is allowed. */
void wa_trace_free(struct wa_trace *trace);

#endif
