/* The curve by itself, before any model: smoothing, derivatives, noise, inflections, Gran's lines,
 * equivalence volumes and half-equivalence pKa. */
#ifndef WHICHACID_CURVE_H
#define WHICHACID_CURVE_H

#include "whichacid/run.h"

/** Most inflections that are kept, strongest first in significance, listed by volume. */
#define WA_INFLECTIONS_MAX 8

/** A volume found by one method; u <= 0 means that the method gave nothing. */
struct wa_volume_estimate {
    double volume_mL;
    double u_mL;
};

/** One jump of the curve. */
struct wa_inflection {
    double volume_mL; /**< combined volume of steepest slope */
    double u_mL;      /**< its standard uncertainty; at least what the gap between points implies */
    double reading;   /**< smoothed reading there (pH or mV) */
    double slope;     /**< d reading / dV there, per mL, signed */
    double slope_u;
    double significance; /**< height of |slope| above its neighbouring minima, in its own u */
    double jump;         /**< |change of reading| between the neighbouring slope minima */
    struct wa_volume_estimate first_derivative;
    struct wa_volume_estimate second_derivative;
    struct wa_volume_estimate gran_before; /**< Gran 1952, line before the jump */
    struct wa_volume_estimate gran_after;  /**< Gran 1952, line after the jump */
    /** Combined equivalence volume. On its own this stage widens u by the shift that carbonate and
     * weak steps can cause (design 2.1). */
    struct wa_volume_estimate equivalence;
    int protons; /**< cumulative protons assigned by the spacing, 0 when none explains it */
    bool methods_disagree; /**< the methods differ by more than their uncertainties allow */
};

/** A stretch of small |slope| between jumps. */
struct wa_buffer_region {
    double volume_mL; /**< volume of least slope */
    double reading;
    double slope;
};

/** A half-equivalence reading; pH readings only. */
struct wa_half_equivalence {
    int step;         /**< proton counted in this run, from 1 */
    double volume_mL; /**< half-way between successive equivalence volumes */
    double pH;        /**< smoothed pH there */
    /** pH corrected by the charge balance for free H+ / OH-, dilution and the neighbouring steps.
     * A mixed (apparent) constant: activity of H+, concentrations of the rest, at ionic_strength.
     * No correction to zero ionic strength is made; u holds 0.03 for the drift of activity
     * coefficients over the run. */
    double pKa;
    double u;              /**< standard uncertainty of pKa, electrode offset included */
    double correction;     /**< pKa - pH */
    double ionic_strength; /**< mol/L, estimated there (of a 1:1 salt), for a later conversion */
    bool merged; /**< the interval holds more than one proton: the value is their mean, not a pKa */
};

/** The model-free features of a run. Arrays have `point_count` entries, one a distinct volume; a
 * reading that clearly falls out of its neighbours' order is left out with a remark, and past 4000
 * volumes neighbours are averaged in groups, with a remark. */
struct wa_curve {
    size_t point_count;
    double *volume_mL;
    double *reading; /**< as measured (mean where a volume was read twice) */
    double *smooth;  /**< smoothed reading */
    double *smooth_u;
    double *first; /**< first derivative, per mL */
    double *first_u;
    double *second; /**< second derivative, per mL^2 */
    double *second_u;
    double noise; /**< standard deviation of one reading, estimated from the curve */
    double noise_degrees_of_freedom;
    int direction; /**< +1 when the reading rises with volume, -1 when it falls */
    bool in_mV;    /**< readings are mV: no pKa can be given */
    struct wa_inflection inflections[WA_INFLECTIONS_MAX];
    size_t inflection_count;
    struct wa_buffer_region buffers[WA_INFLECTIONS_MAX + 1];
    size_t buffer_count;
    struct wa_half_equivalence halves[WA_INFLECTIONS_MAX];
    size_t half_count;
    bool spacing_explained; /**< the equivalence volumes stand in ratios of small integers */
    char spacing[256];      /**< sentence on the spacing, "" when there is nothing to say */
    char **remarks;         /**< sentences on what was assumed or is weak */
    size_t remark_count;
};

/**
 * Analyse one run. mV readings are converted to pH first when the conditions hold a calibration
 * (slope and offset); otherwise they stay mV and in_mV is set.
 * @param[out] curve  to be freed with wa_curve_free; untouched on failure
 * @return WA_OK also when no inflection is found (inflection_count 0); WA_ERROR_INPUT when there
 *         are too few points to smooth
 */
enum wa_status wa_curve_analyse(const struct wa_run *run, struct wa_curve *curve,
                                struct wa_error *error) WA_MUST_USE;

/** Free what wa_curve_analyse allocated. NULL is allowed. */
void wa_curve_free(struct wa_curve *curve);

/**
 * Smoothed value and first two derivatives at any volume by local polynomial regression of the
 * measured readings (Cleveland 1979; Savitzky and Golay 1964 in the equally spaced case).
 * @param[in]  half_width   points on each side used
 * @param[in]  degree       degree of the polynomial, 1..4
 * @param[out] value        value, d/dV, d2/dV2
 * @param[out] variance_factor  variance of each per unit reading variance
 */
enum wa_status wa_local_polynomial(const double *volume, const double *reading, size_t count,
                                   double at, size_t half_width, int degree, double value[3],
                                   double variance_factor[3], struct wa_error *error) WA_MUST_USE;

#endif
