/* What went wrong at the bench, as far as the curve tells: each fault is weighed against what the
 * noise and the priors explain, and is said only when it explains clearly more. */
#ifndef WHICHACID_DIAGNOSIS_H
#define WHICHACID_DIAGNOSIS_H

#include "whichacid/protons.h"

/** The faults that are looked for. */
enum wa_fault_kind {
    WA_FAULT_ELECTRODE,   /**< electrode out of calibration */
    WA_FAULT_CARBONATE,   /**< carbonate in the titrant */
    WA_FAULT_UPTAKE,      /**< carbon dioxide taken up during the run */
    WA_FAULT_DRIFT,       /**< the reading drifts */
    WA_FAULT_PRECIPITATE, /**< solid at the start */
    WA_FAULT_FEW_POINTS,  /**< too few points in the jump */
    WA_FAULT_BURETTE,     /**< the burette was misread by 1 mL */
    WA_FAULT_MISSED_ROW,  /**< a row is missing */
    WA_FAULT_RUNS,        /**< the residuals are not random, and no fault above says why */
    WA_FAULT_KINDS,
};

/** Which rows a fault of rows concerns. */
enum wa_fault_row {
    WA_FAULT_ONE_ROW,     /**< that row alone */
    WA_FAULT_FROM_ROW_ON, /**< that row and all after it */
    WA_FAULT_IN_SERIES,   /**< a regular series leaves one out before that row */
    WA_FAULT_SET_ASIDE,   /**< a row that the reader set aside; `row` is its place in the run's list
                           */
};

/** One fault and what the data say for it. */
struct wa_suspicion {
    enum wa_fault_kind kind;
    const char *code; /**< stable: "electrode-calibration", "drift", ... */
    bool weighed;     /**< false when this run cannot show the fault */
    /** ln of the evidence for the fault over that without it, each at its best generic acid and
     * with the fault's size integrated over its prior; for residual-runs minus ln of the chance of
     * so few runs; for few-points-in-jump the gap over the largest gap that is allowed. */
    double statistic;
    double log_evidence;              /**< of the run with this fault, less that without any */
    double threshold;                 /**< beyond which it is said */
    double value, u;                  /**< size of the fault in its own unit */
    enum wa_parameter_kind parameter; /**< what `value` is of, where a refit gave it */
    size_t row;                       /**< of the experiment, where the fault is about a row */
    enum wa_fault_row which;
    bool explains; /**< with the fault the curve describes the run; else it is not said */
    bool said;
    char *sentence; /**< NULL unless said */
};

/** All faults of one run. */
struct wa_diagnosis {
    struct wa_suspicion suspicions[WA_FAULT_KINDS];
};

/**
 * Look for faults.
 * @param[in]  run         the same run as the experiment's: times, rows set aside, kind of volumes
 * @param[in]  study       generic acids of the experiment; nothing is weighed when it holds none
 * @param[in]  log_rival   ln of prior and evidence of another explanation without a fault, such as
 *                         two acids; -INFINITY when there is none
 * @param[out] diagnosis   to be freed with wa_diagnosis_free
 */
enum wa_status wa_diagnose(const struct wa_run *run, const struct wa_experiment *experiment,
                           const struct wa_proton_study *study, double log_rival,
                           struct wa_diagnosis *diagnosis, struct wa_error *error) WA_MUST_USE;

/** Free what a diagnosis owns. NULL is allowed. */
void wa_diagnosis_free(struct wa_diagnosis *diagnosis);

/** Signs of successive residuals. */
struct wa_runs_test {
    size_t positive;
    size_t negative;
    size_t runs;
    double chance; /**< of so few runs or fewer when every order of the signs is as likely */
};

/**
 * Runs test, exact (A. Wald, J. Wolfowitz, Ann. Math. Stat. 11 (1940) 147).
 * @param[in] outlier  residuals whose entry exceeds 0.5 are left out; may be NULL
 */
struct wa_runs_test wa_runs_test(const double *residual, const double *outlier, size_t count);

#endif
