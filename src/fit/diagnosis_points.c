/* What the points themselves tell: how many lie in the jump, and whether the residuals are random.
 */
#include "fit/diagnosis_internal.h"
#include "fit/fit_internal.h"

#include <math.h>

static const double jump_least = 0.3;       /* pH over 10 % of the volume; less is no jump */
static const double gap_allowed = 0.06;     /* of the equivalence volume */
static const double jump_half_width = 0.05; /* of the equivalence volume */

static double value_of(const struct wa_fit *fit, enum wa_parameter_kind kind, double otherwise)
{
    const int index = wa_fit_find(fit, kind, 0, 0);
    return index >= 0 ? fit->parameters[index].value : otherwise;
}

bool wa_inquiry_point(const struct wa_experiment *experiment, const struct wa_fit *fit,
                      double volume_mL, struct wa_point_model *point)
{
    struct wa_solution solution;
    struct wa_sensitivity sensitivity;
    if (wa_titration_pH(&fit->titration, volume_mL, 7.0, &solution, &sensitivity, NULL) != WA_OK) {
        return false;
    }
    const double slope = value_of(fit, WA_PARAMETER_SLOPE, experiment->slope.mean);
    const double offset = value_of(fit, WA_PARAMETER_OFFSET, experiment->offset.mean);
    const double neutral = 7.0 + experiment->pivot;
    *point = (struct wa_point_model){
        .expected = neutral + slope * (solution.pH - neutral) + offset,
        .pH = solution.pH,
        .slope = slope * wa_titration_slope(&fit->titration, volume_mL, &sensitivity),
        .ionic_strength = solution.ionic_strength};
    return true;
}

/* The equivalence volume with the highest jump within the run, 0 when there is none. */
static double highest_jump(const struct wa_experiment *e, const struct wa_generic *base)
{
    const double ln_amount = value_of(&base->fit, WA_PARAMETER_LN_AMOUNT, 0.0);
    const double ln_titrant = value_of(&base->fit, WA_PARAMETER_LN_TITRANT, e->ln_titrant.mean);
    const double unit_mL = 1e3 * exp(ln_amount - ln_titrant) / e->equivalents;
    double best = 0.0, height = jump_least;
    for (int protons = 1; protons <= base->shown; protons++) {
        const double volume = protons * unit_mL;
        struct wa_point_model before, after;
        if (volume < e->volume_mL[e->count - 1] &&
            wa_inquiry_point(e, &base->fit, volume * (1.0 - jump_half_width), &before) &&
            wa_inquiry_point(e, &base->fit, volume * (1.0 + jump_half_width), &after) &&
            fabs(after.expected - before.expected) > height) {
            height = fabs(after.expected - before.expected);
            best = volume;
        }
    }
    return best;
}

void wa_weigh_jump(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis)
{
    const struct wa_experiment *e = inquiry->experiment;
    struct wa_suspicion *suspicion = &diagnosis->suspicions[WA_FAULT_FEW_POINTS];
    const double volume = highest_jump(e, inquiry->bases[0]);
    for (size_t i = 1; volume > 0.0 && i < e->count; i++) {
        if (e->volume_mL[i - 1] <= volume && e->volume_mL[i] > volume) {
            suspicion->weighed = true;
            suspicion->explains = true;
            suspicion->statistic = (e->volume_mL[i] - e->volume_mL[i - 1]) / volume / gap_allowed;
            suspicion->value = volume;
            suspicion->row = i;
        }
    }
}

/* ln of the number of ways to choose. */
static double ln_choose(size_t all, size_t some)
{
    return lgamma((double)all + 1.0) - lgamma((double)some + 1.0) -
           lgamma((double)(all - some) + 1.0);
}

/* Chance of exactly this many runs of signs. */
static double chance_of(size_t positive, size_t negative, size_t runs)
{
    const size_t half = runs / 2;
    const double all = ln_choose(positive + negative, positive);
    if (half < 1 || half > positive || half > negative) {
        return 0.0;
    }
    if (runs % 2 == 0) {
        return 2.0 *
               exp(ln_choose(positive - 1, half - 1) + ln_choose(negative - 1, half - 1) - all);
    }
    double sum = 0.0;
    if (half + 1 <= positive) {
        sum += exp(ln_choose(positive - 1, half) + ln_choose(negative - 1, half - 1) - all);
    }
    if (half + 1 <= negative) {
        sum += exp(ln_choose(positive - 1, half - 1) + ln_choose(negative - 1, half) - all);
    }
    return sum;
}

struct wa_runs_test wa_runs_test(const double *residual, const double *outlier, size_t count)
{
    struct wa_runs_test test = {.chance = 1.0};
    int last = 0;
    for (size_t i = 0; i < count; i++) {
        if (residual[i] == 0.0 || (outlier != NULL && outlier[i] > 0.5)) {
            continue;
        }
        const int sign = residual[i] > 0.0 ? 1 : -1;
        test.positive += sign > 0 ? 1 : 0;
        test.negative += sign < 0 ? 1 : 0;
        test.runs += sign != last ? 1 : 0;
        last = sign;
    }
    if (test.positive > 0 && test.negative > 0) {
        test.chance = 0.0;
        for (size_t runs = 2; runs <= test.runs; runs++) {
            test.chance += chance_of(test.positive, test.negative, runs);
        }
        test.chance = fmin(test.chance, 1.0);
    }
    return test;
}
