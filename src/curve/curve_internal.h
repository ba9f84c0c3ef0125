/* What the parts of the curve room share. Not for other rooms. */
#ifndef WHICHACID_CURVE_INTERNAL_H
#define WHICHACID_CURVE_INTERNAL_H

#include "whichacid/curve.h"

/** Most points that are analysed one by one; longer runs are averaged in groups first. */
#define CURVE_POINTS_MAX 4000
/** Widest half-width of the adaptive smoothing, in points. */
#define CURVE_HALF_WIDTH_MAX 64

/** What the conditions of a run mean for the curve, with fallbacks where nobody said anything. */
struct curve_context {
    struct wa_curve *curve;
    double *point_u;       /**< standard deviation of each reading, volume error included */
    double volume_u;       /**< mL, standard deviation of one volume reading */
    bool volume_u_noted;   /**< volume_u is the analyst's, not a default */
    bool increments;       /**< volume errors accumulate from point to point */
    double start_volume;   /**< mL of solution before the titration */
    double start_volume_u; /**< mL */
    double titrant;        /**< mol/L, NaN when unknown */
    double titrant_u;
    bool titrant_is_base;
    /** Carbonate fraction: a Gaussian of this centre and width, cut off below zero; width 0 for an
     * acid, which has none. */
    double carbonate_centre, carbonate_width;
    double carbonate, carbonate_u; /**< mean and standard deviation of that */
    double offset, offset_u;       /**< electrode offset at pH 7 */
    double slope, slope_u;         /**< electrode slope, fraction of theory */
    double temperature_C;
    double background;
    double blank_mL, blank_u;
    double per_decade; /**< change of reading for one decade of hydrogen-ion activity */
};

/** A window of consecutive points with its least-squares slope (of direction x reading). */
struct curve_window {
    size_t first, last;
    double slope;
    double u;
};

/** A jump as found by the test against noise, with the flat stretches on both sides. */
struct curve_jump {
    struct curve_window before, steep, after;
    double significance;
};

/** Scratch for least squares of windows up to a fixed size. */
struct curve_polynomial;

struct curve_polynomial *curve_polynomial_new(size_t rows_max);
void curve_polynomial_free(struct curve_polynomial *polynomial);

/**
 * Polynomial of `degree` (1..4) through points first..last, at volume `at`.
 * @param[out] residual_square  sum of squared residuals, may be NULL
 * @return false when the window holds fewer distinct volumes than the degree needs
 */
bool curve_polynomial_fit(struct curve_polynomial *polynomial, const double *volume,
                          const double *reading, size_t first, size_t last, double at, int degree,
                          double value[3], double variance_factor[3], double *residual_square);

/** Distinct, ascending, finite points into curve->volume_mL and curve->reading. */
enum wa_status curve_collect(const struct wa_run *run, struct curve_context *context,
                             struct wa_error *error);
/** Fill curve->noise from contrasts that a cubic leaves at zero. */
enum wa_status curve_estimate_noise(const struct wa_run *run, struct curve_context *context,
                                    struct wa_error *error);
/** Take out single readings that a mistyped digit has thrown off, with a remark for each. */
enum wa_status curve_drop_outliers(struct curve_context *context, struct wa_error *error);
/** Fill smooth, first, second and their uncertainties. */
enum wa_status curve_smooth(struct curve_context *context, struct wa_error *error);
/** Find the jumps; at most `capacity` are written, in order of volume. */
enum wa_status curve_find_jumps(const struct curve_context *context, struct curve_jump *jumps,
                                size_t capacity, size_t *count, struct wa_error *error);
/** Volumes of steepest slope and buffer regions from the jumps. */
void curve_place_inflections(struct curve_context *context, const struct curve_jump *jumps,
                             size_t count);
/** Gran's lines and the combined equivalence volume of every inflection. */
enum wa_status curve_equivalence_volumes(struct curve_context *context, struct wa_error *error);
/** Half-equivalence pKa of every step. */
enum wa_status curve_half_equivalences(struct curve_context *context, struct wa_error *error);
/** Spacing of the equivalence volumes against small integers. */
void curve_explain_spacing(struct curve_context *context);

/** Mean and standard deviation of a Gaussian cut off below zero. */
void curve_truncate(double centre, double width, double *mean, double *deviation);
/** Part of a carbonate titrant's alkalinity that is not yet used at this pH (1 in strong alkali,
 * 1/2 at hydrogencarbonate, 0 in acid). */
double curve_carbonate_unused(double pH);
/** Hydrogen-ion exponent of a reading, on an arbitrary zero for uncalibrated mV. */
double curve_exponent(const struct curve_context *context, double reading);
/** Smoothed reading at any volume, with its standard uncertainty. */
double curve_reading_at(const struct curve_context *context, double volume, double *u);
/** Index of the last point at or below a volume (0 when all lie above). */
size_t curve_index_below(const struct wa_curve *curve, double volume);
/** Append a sentence to the curve's remarks. */
enum wa_status curve_remark(struct wa_curve *curve, struct wa_error *error, const char *format, ...)
    WA_PRINTF(3, 4);

#endif
