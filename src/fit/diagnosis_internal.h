/* What the sources of the diagnosis share. */
#ifndef WHICHACID_DIAGNOSIS_INTERNAL_H
#define WHICHACID_DIAGNOSIS_INTERNAL_H

#include "fit/fault.h"
#include "fit/fit_internal.h"
#include "whichacid/diagnosis.h"

/** Generic acids that a fault is tried with: with the fault another one may be the best. */
#define WA_BASES_MAX 4

/** Statistic of a fault that was counted, not weighed. */
#define WA_FAULT_CERTAIN 100.0

/** What every test works on. */
struct wa_inquiry {
    const struct wa_run *run;
    const struct wa_experiment *experiment;
    const struct wa_proton_study *study;
    const struct wa_generic *bases[WA_BASES_MAX]; /**< the best first */
    int base_count;
    const struct wa_generic *neutral[WA_BASES_MAX]; /**< uncharged as weighed: may be solid */
    int neutral_count;
    double log_evidence; /**< without any fault */
    double *course;      /**< 0 to 1 by time, else by the order of the points */
    bool timed;
    double *uptake; /**< share of the alkaline part of the run that has passed */
    size_t alkaline;
    double alkaline_limit;
};

/** A refit with one fault more. */
struct wa_refit {
    double log_evidence; /**< -INFINITY when nothing converged */
    const struct wa_generic *base;
    double value, u; /**< of the parameter asked for */
    bool explains;   /**< the points scatter about it as points do */
};

/** Where a refit starts: where the base's fit ended, but for these. */
struct wa_refit_start {
    double value;    /**< of the parameter asked for; NaN: its own start */
    double pK_shift; /**< added to every constant */
    bool solid;      /**< the species as weighed may be solid; only neutral bases are tried */
};

/**
 * Fit an altered experiment from each base and keep the best evidence.
 * @param[in] kind        the parameter whose posterior is wanted
 * @param[in] iterations  0: until it converges, from afar; else a quick try of so many
 */
enum wa_status wa_refit(const struct wa_inquiry *inquiry, const struct wa_experiment *experiment,
                        enum wa_parameter_kind kind, const struct wa_refit_start *start,
                        int iterations, struct wa_refit *refit, struct wa_error *error) WA_MUST_USE;

/** Faults of the whole run: electrode, carbonate, uptake, drift, precipitate. */
enum wa_status wa_weigh_whole_run(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                                  struct wa_error *error) WA_MUST_USE;

/** Faults of single rows: burette, missed row. */
enum wa_status wa_weigh_rows(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                             struct wa_error *error) WA_MUST_USE;

/** The reading that a generic fit expects at any volume; false when it cannot be computed. */
bool wa_inquiry_point(const struct wa_experiment *experiment, const struct wa_fit *fit,
                      double volume_mL, struct wa_point_model *point);

/** A burette misread in a row that the reader set aside for its order. */
void wa_weigh_set_aside(const struct wa_inquiry *inquiry, struct wa_suspicion *suspicion);

/** Too few points in the jump. */
void wa_weigh_jump(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis);

/** The sentence of a fault that is said, malloc'd; NULL when memory is out. */
char *wa_fault_sentence(const struct wa_inquiry *inquiry, const struct wa_suspicion *suspicion);

#endif
