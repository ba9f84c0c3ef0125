/* Steps of making a plan. */
#ifndef WHICHACID_BENCH_PLAN_INTERNAL_H
#define WHICHACID_BENCH_PLAN_INTERNAL_H

#include "whichacid/bench_plan.h"

/** What a plan works on: an experiment without data, and the sample as it is believed to be. */
struct plan_work {
    const struct wa_table *table;
    const struct wa_plan_options *options;
    struct wa_plan *plan;
    struct wa_experiment experiment; /**< conditions as identify would take them */
    struct wa_sample_model sample;   /**< constants and amount free */
    struct wa_titration titration;
    double moles;
};

/** Whether a plan is to find this parameter: a constant that is left open, or the amount. Constants
 * with a prior from the table are known already. */
bool plan_finds(const struct wa_parameter *parameter);

/** Steps, jumps and indicators from the titration. */
enum wa_status plan_steps(struct plan_work *work, struct wa_error *error) WA_MUST_USE;
enum wa_status plan_indicators(struct plan_work *work, struct wa_error *error) WA_MUST_USE;

/** Additions: D-optimal and even, with the uncertainties expected of both. */
enum wa_status plan_design(struct plan_work *work, struct wa_error *error) WA_MUST_USE;

/** Simulated runs of both designs. */
enum wa_status plan_trials(struct plan_work *work, struct wa_error *error) WA_MUST_USE;

/** Simulated power against the rival. */
enum wa_status plan_power(struct plan_work *work, struct wa_error *error) WA_MUST_USE;

/** A copy of the experiment with volumes of its own, readings zeroed at pH 7; free it with
 * wa_experiment_free. */
enum wa_status plan_experiment(const struct wa_experiment *from, const double *volume_mL,
                               size_t count, struct wa_experiment *experiment,
                               struct wa_error *error) WA_MUST_USE;

#endif
