/* What the sources of the room share: the model at one parameter vector, and the noise. */
#ifndef WHICHACID_FIT_INTERNAL_H
#define WHICHACID_FIT_INTERNAL_H

#include "whichacid/fit.h"

/** Stated shares of the likelihood: one row in fifty may be an outlier, spread by one pH. */
#define WA_OUTLIER_FRACTION 0.02
#define WA_OUTLIER_SPREAD 1.0

/** Electrode errors grow beyond these readings, by this much a pH unit (common practice: junction
 * error in strong acid, alkaline error of glass). */
#define WA_ACID_LIMIT 2.0
#define WA_ALKALINE_LIMIT 12.0
#define WA_EXTREME_ERROR 0.03

/** Where in the titration's components the parts of a model are. */
struct wa_layout {
    int carbonate; /**< component index, -1 when there is none */
    int weak;      /**< of a weak titrant, -1 when there is none */
};

/** The two noise levels as standard deviations, and how well they are known. */
struct wa_noise {
    double reading;             /**< pH */
    double volume;              /**< mL */
    double variance_ln_reading; /**< posterior variance of ln reading */
    double variance_ln_volume;
    double log_determinant; /**< ln det of the information about both logarithms, priors in */
};

/** Everything known about one point at one parameter vector. */
struct wa_point_model {
    double expected; /**< reading */
    double pH;
    double slope; /**< d reading / dV, per mL */
    double ionic_strength;
};

/** Set the titration's composition from parameter values. */
void wa_model_titration(const struct wa_experiment *experiment,
                        const struct wa_sample_model *sample, const struct wa_parameter *parameters,
                        const double *value, int count, struct wa_titration *titration,
                        struct wa_layout *layout);

/**
 * Expected readings at every point and, when `jacobian` is not NULL, their derivatives by every
 * parameter (point by point, `count` to a row).
 * @param[in,out] points  zeroed, or as an earlier evaluation left them: a start for this one
 */
enum wa_status wa_model_evaluate(const struct wa_experiment *experiment,
                                 const struct wa_sample_model *sample,
                                 const struct wa_parameter *parameters, const double *value,
                                 int count, struct wa_point_model *points, double *jacobian,
                                 struct wa_error *error) WA_MUST_USE;

/** A joint prior of all parameters of a fit, instead of their own. */
struct wa_joint_prior {
    const struct wa_parameter *parameters; /**< with their marginal priors */
    const double *precision;               /**< inverse of the correlations, count squared */
    double log_determinant;                /**< ln of the determinant of the precision */
};

/** Fit one run alone; `joint` NULL takes each parameter's own prior. */
enum wa_status wa_fit_single(const struct wa_experiment *experiment,
                             const struct wa_sample_model *sample,
                             const struct wa_fit_options *options, const double *start,
                             const struct wa_joint_prior *joint, struct wa_fit *fit,
                             struct wa_error *error) WA_MUST_USE;

/** Variance of one reading under the noise levels, volume error carried through the slope. */
double wa_noise_variance(const struct wa_noise *noise, const struct wa_point_model *point);

/** Share of outliers before the data. */
double wa_outlier_share(const struct wa_experiment *experiment);

/** ln of the likelihood of one residual, and the probability that it is no outlier. */
double wa_noise_log_likelihood(double outlier_share, double residual, double variance,
                               double *inlier);

/**
 * One round of Fisher scoring for the noise levels, given expected squared residuals.
 * @param[in]     square  squared residual plus its variance by the parameters, one a point
 * @param[in]     weight  probability of being no outlier, one a point
 * @param[in,out] noise   levels and what is known of them
 */
void wa_noise_update(const struct wa_experiment *experiment, const struct wa_point_model *points,
                     const double *square, const double *weight, struct wa_noise *noise);

/**
 * The levels that stand for their whole posterior when parameters are to be given uncertainties:
 * the mean of the variance of a log-normal is above the square of its mode, and the few points of
 * a jump leave the volume's noise poorly known.
 */
struct wa_noise wa_noise_marginal(const struct wa_noise *noise);

#endif
