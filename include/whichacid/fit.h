/* Whole-curve refinement: the forward model is fitted to every point of a run, with all that the
 * analyst noted, or a stated default, as priors. A prior is one more observation. */
#ifndef WHICHACID_FIT_H
#define WHICHACID_FIT_H

#include "whichacid/curve.h"
#include "whichacid/equilibrium.h"
#include "whichacid/run.h"

/** Substances with an amount of their own in one sample model (2: a mixture of two acids). */
#define WA_SUBSTANCES_MAX 2

/** Most parameters of one fit. */
#define WA_PARAMETERS_MAX (WA_PARTS_MAX * WA_PROTONS_MAX + 16)

/** A prior: normal with this mean and standard deviation. */
struct wa_prior {
    double mean;
    double u;
    enum wa_origin origin; /**< whence it came, for the report */
    long line;
};

/** Nuisances for a suspected fault: src/fit/fault.h. */
struct wa_fault;

/** A titration ready for fitting: points in pH and everything that was noted, as priors. */
struct wa_experiment {
    size_t count;
    double *volume_mL; /**< blank subtracted */
    double *reading;   /**< pH as the electrode showed it */
    long *line;        /**< lines in the file */
    size_t grouping;   /**< readings averaged in each point: 1 but for very long runs */
    bool titrant_is_base;
    double pivot;         /**< where slope and offset are not correlated, less 7; 0 unless a
                               calibration tells their correlation */
    bool titrant_assumed; /**< nobody said what was in the burette: a strong one is assumed */
    bool uncalibrated;    /**< readings were mV without a calibration: the offset is free */
    double temperature_C;
    struct wa_prior temperature;       /**< degree Celsius */
    struct wa_prior ln_volume;         /**< ln of the solution volume in L at the start */
    struct wa_prior ln_titrant;        /**< ln of the titrant concentration in mol/L */
    struct wa_prior ln_carbonate;      /**< ln of the carbonate fraction of a base titrant */
    struct wa_prior ln_carbon_dioxide; /**< ln of mol/L dissolved in the sample's water */
    struct wa_prior slope;             /**< electrode slope, 1 is theoretical */
    struct wa_prior offset;            /**< electrode offset in pH at pH 7 + pivot */
    struct wa_prior davies;            /**< linear coefficient of the Davies equation */
    struct wa_prior ln_noise_reading;  /**< ln of the standard deviation of a pH reading */
    struct wa_prior ln_noise_volume;   /**< ln of the standard deviation of a volume in mL */
    double background;                 /**< mol/L of 1:1 electrolyte in the sample */
    double outlier_share;              /**< of the rows before the data; 0: the stated default */
    double excess_u; /**< prior u of strong acid (or, negative, base) in the sample, mol; 0: none */
    double equivalents;    /**< protons that a mole of titrant takes or gives, positive */
    double titrant_charge; /**< spectator charge a mole of titrant brings: +1 NaOH, -1 HCl */
    bool titrant_is_weak;  /**< it brings an acid system of its own (sulfuric acid too) */
    int weak_charge;       /**< of the fully protonated species of that system */
    int weak_step_count;
    double weak_count; /**< molecules of it in one formula unit of titrant */
    double weak_pK[WA_PROTONS_MAX];
    /** Next replicate of the series, or NULL. What a series shares (constants, titrant, carbonate,
     * electrode, Davies coefficient, and the amount per mass where masses are noted) is fitted
     * jointly; the rest is each run's own. */
    const struct wa_experiment *next;
    double ln_mass;               /**< ln of the titrated mass in g, NaN when it is not known */
    const struct wa_fault *fault; /**< borrowed: a fault that is weighed, NULL in ordinary fits */
};

/** Most runs of one series. */
#define WA_SERIES_MAX 16

/** One acid system in a sample model. */
struct wa_model_part {
    int charge; /**< of the fully protonated species */
    int step_count;
    int substance;                   /**< which amount it follows */
    double count;                    /**< molecules in one formula unit */
    double pK[WA_PROTONS_MAX];       /**< prior means, thermodynamic, at the run's temperature */
    double pK_u[WA_PROTONS_MAX];     /**< prior standard deviations; 0 holds the value */
    double pK_slope[WA_PROTONS_MAX]; /**< d pK / d temperature, per K */
    double solubility;               /**< mol/L of the species below, INFINITY when it dissolves */
    int solid_species;
    double ln_solubility_u; /**< prior standard deviation of its logarithm; 0 holds it */
};

/** What is in the beaker, up to the amounts. */
struct wa_sample_model {
    struct wa_model_part parts[WA_PARTS_MAX];
    int part_count;
    int substance_count;
    double spectator_charge[WA_SUBSTANCES_MAX];   /**< per formula unit */
    double spectator_z2[WA_SUBSTANCES_MAX];       /**< sum of z^2 over them, per formula unit */
    struct wa_prior ln_amount[WA_SUBSTANCES_MAX]; /**< ln of mol */
    bool alike_sites; /**< generic acid: successive pK are at least lg 4 apart, softly */
};

/** What a parameter is. */
enum wa_parameter_kind {
    WA_PARAMETER_PK,
    WA_PARAMETER_LN_AMOUNT,
    WA_PARAMETER_LN_TITRANT,
    WA_PARAMETER_OFFSET,
    WA_PARAMETER_SLOPE,
    WA_PARAMETER_LN_CARBONATE,
    WA_PARAMETER_LN_CARBON_DIOXIDE,
    WA_PARAMETER_DAVIES,
    WA_PARAMETER_LN_VOLUME,
    WA_PARAMETER_TEMPERATURE,
    WA_PARAMETER_EXCESS,
    WA_PARAMETER_DRIFT,         /**< of the reading over the whole run, pH; faults only from here */
    WA_PARAMETER_LN_UPTAKE,     /**< ln of mol of carbon dioxide taken up during the run */
    WA_PARAMETER_VOLUME_STEP,   /**< mL that the later rows lack */
    WA_PARAMETER_LN_SOLUBILITY, /**< ln of mol/L that the first part can reach as weighed */
};

/** A parameter, its prior and its posterior. */
struct wa_parameter {
    enum wa_parameter_kind kind;
    int part; /**< of a pK, or substance of an amount */
    int step; /**< of a pK, from 0 */
    struct wa_prior prior;
    double value;
    double u;
};

/** A finished fit. Arrays have as many entries as the experiment has points. */
struct wa_fit {
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    int parameter_count;
    double *covariance; /**< parameter_count squared, row by row */
    bool converged;
    double log_likelihood;                 /**< normalised, in the space of the readings */
    double log_evidence;                   /**< by Laplace's approximation, noise levels included */
    double log_evidence_of[WA_SERIES_MAX]; /**< of each run of a series, given those before it */
    int run_count;                         /**< runs of the series that were fitted */
    double noise_reading;                  /**< pH */
    double noise_volume;                   /**< mL */
    double misfit;                         /**< root mean square of the residuals in their own u */
    double ionic_strength;                 /**< mean over the buffered points */
    double *model;                         /**< reading that the model expects */
    double *residual;                      /**< (measured - model) in standard uncertainties */
    double *outlier;                       /**< probability that the row is an outlier */
    struct wa_titration titration;         /**< the composition at the best parameters */
};

/** How a fit may be limited. Zero-initialised means the defaults. */
struct wa_fit_options {
    int most_iterations; /**< 0: 60 */
    bool from_afar; /**< the start may be far off: begin with blunt weights and sharpen them, so
                       that the points of a jump are not taken for outliers where they stand */
    double settled; /**< converged when no step is longer, in posterior u; 0: 5e-3 */
};

/**
 * Collect a run for fitting.
 * @param[in]  titrant     what the analyst's words mean, NULL when nothing was noted
 * @param[in]  table       for the constants of a weak titrant, may be NULL otherwise
 * @param[out] experiment  to be freed with wa_experiment_free
 */
enum wa_status wa_experiment_collect(const struct wa_run *run, const struct wa_curve *curve,
                                     const struct wa_table *table, const struct wa_titrant *titrant,
                                     struct wa_experiment *experiment,
                                     struct wa_error *error) WA_MUST_USE;

/** Free what an experiment owns. NULL is allowed. */
void wa_experiment_free(struct wa_experiment *experiment);

/**
 * Fit one sample model, to every run of the series that begins with `experiment`. The points'
 * model, residuals and outliers are those of the first run.
 * @param[in]  start  values to start from, in the order of the parameters that
 *                    wa_fit_parameters gives, or NULL for the prior means
 * @param[out] fit    to be freed with wa_fit_free; fit->converged tells whether it can be used
 */
enum wa_status wa_fit_run(const struct wa_experiment *experiment,
                          const struct wa_sample_model *sample,
                          const struct wa_fit_options *options, const double *start,
                          struct wa_fit *fit, struct wa_error *error) WA_MUST_USE;

/** The parameters that a fit of this model has, with their priors; returns how many. */
int wa_fit_parameters(const struct wa_experiment *experiment, const struct wa_sample_model *sample,
                      struct wa_parameter parameters[WA_PARAMETERS_MAX]);

/**
 * What a model expects at the volumes of an experiment, whose readings only start the search.
 * @param[in]  values     of the parameters in the order of wa_fit_parameters, NULL: prior means
 * @param[out] reading    one a point, may be NULL
 * @param[out] slope      d reading / d volume, per mL, one a point, may be NULL
 * @param[out] jacobian   d reading / d parameter, point by point, may be NULL
 * @param[out] titration  the composition, may be NULL
 */
enum wa_status wa_fit_expect(const struct wa_experiment *experiment,
                             const struct wa_sample_model *sample, const double *values,
                             double *reading, double *slope, double *jacobian,
                             struct wa_titration *titration, struct wa_error *error) WA_MUST_USE;

/** Index of a parameter, or -1. */
int wa_fit_find(const struct wa_fit *fit, enum wa_parameter_kind kind, int part, int step);

/**
 * Readings that a fit expects at further volumes, and their covariance: of its parameters, and the
 * noise on the diagonal.
 * @param[in]  experiment  may differ from the fitted one in temperature, volume and background
 * @param[out] reading     `count` values
 * @param[out] covariance  count squared, row by row
 */
enum wa_status wa_fit_predict(const struct wa_experiment *experiment,
                              const struct wa_sample_model *sample, const struct wa_fit *fit,
                              const double *volume_mL, size_t count, double *reading,
                              double *covariance, struct wa_error *error) WA_MUST_USE;

/** Free what a fit owns. NULL is allowed. */
void wa_fit_free(struct wa_fit *fit);

#endif
