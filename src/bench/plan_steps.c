/* Will it work: reaction constants, jumps, indicators. */
#include "bench/plan_internal.h"

#include <math.h>
#include <stdlib.h>

static const double titrated_by_base = 12.5; /* a proton above this pKa is not counted on */
static const double titrated_by_acid = 1.5;
static const double strong_pKa = 0.0;    /* stands for the hydronium ion */
static const double visible_jump = 0.4;  /* pH over 2 % of the volume */
static const double small_error = 0.003; /* of the volume, for an indicator that will do */
static const double step_of_slope = 1e-4;
static const double narrow = 0.01;   /* of the volume, for the whole change of an indicator */
static const double eye = 1.0 / 3.0; /* part of half a change that two people differ by */
static const double nothing = 1e-9;  /* stands for carbonate that is not there */

double wa_plan_reaction_constant(double donor, double acceptor, double pKw)
{
    return pow(10.0, fmin(acceptor, pKw) - fmax(donor, strong_pKa));
}

/* pKa of the titrant's own pair: the hydroxide or hydronium ion of a strong one. */
static double titrant_pKa(const struct plan_work *work)
{
    const struct wa_titrant *titrant = work->plan->titrant;
    if (!titrant->is_weak || titrant->acid < 0) {
        return titrant->is_base ? work->titration.medium.pKw : strong_pKa;
    }
    const struct wa_acid *acid = &work->table->acids[titrant->acid];
    const int lost = titrant->lost / (titrant->count > 0 ? titrant->count : 1);
    const int step = titrant->is_base ? lost - 1 : lost;
    return wa_step_pKa_at(&acid->steps[step < 0 ? 0 : step], work->options->temperature_C, NULL);
}

/* Of the protons of a step, how many the titrant takes or gives. */
static int protons_of(const struct wa_form_part *part, int step, bool base)
{
    const int beyond = part->lost - step * part->count;
    const int lost = beyond < 0 ? 0 : beyond > part->count ? part->count : beyond;
    return base ? part->count - lost : lost;
}

static int compare_up(const void *a, const void *b)
{
    const double x = ((const struct wa_plan_step *)a)->pKa;
    const double y = ((const struct wa_plan_step *)b)->pKa;
    return (x > y) - (x < y);
}

static void add_step(struct wa_plan *plan, double pKa, double protons)
{
    if (plan->step_count < WA_PLAN_STEPS_MAX && protons > 0.0) {
        plan->steps[plan->step_count++] = (struct wa_plan_step){.pKa = pKa, .volume_mL = protons};
    }
}

/* The protons that count, in the order in which the titrant meets them; volume_mL holds their
 * number a formula unit at first. */
static void collect_steps(struct plan_work *work)
{
    struct wa_plan *plan = work->plan;
    const bool base = plan->titrant->is_base;
    for (int k = 0; k < plan->form->part_count; k++) {
        const struct wa_form_part *part = &plan->form->parts[k];
        if (part->acid == WA_PART_WATER) {
            add_step(plan, work->titration.medium.pKw, base ? 0 : part->lost);
            continue;
        }
        const struct wa_acid *acid = &work->table->acids[part->acid];
        for (int i = 0; i < acid->step_count; i++) {
            const double pKa = wa_step_pKa_at(&acid->steps[i], work->options->temperature_C, NULL);
            if (base ? pKa < titrated_by_base : pKa > titrated_by_acid) {
                add_step(plan, pKa, protons_of(part, i, base));
            }
        }
    }
    qsort(plan->steps, (size_t)plan->step_count, sizeof plan->steps[0], compare_up);
    for (int i = 0; !base && i < plan->step_count / 2; i++) {
        const struct wa_plan_step other = plan->steps[plan->step_count - 1 - i];
        plan->steps[plan->step_count - 1 - i] = plan->steps[i];
        plan->steps[i] = other;
    }
    double sum = 0.0;
    for (int i = 0; i < plan->step_count; i++) {
        sum += plan->steps[i].volume_mL;
        plan->steps[i].volume_mL =
            1e3 * work->moles * sum / (plan->concentration * plan->titrant->protons);
    }
}

static enum wa_status pH_at(const struct plan_work *work, double volume_mL, double *pH,
                            struct wa_error *error)
{
    struct wa_solution solution;
    const enum wa_status status =
        wa_titration_pH(&work->titration, volume_mL, 7.0, &solution, NULL, error);
    *pH = solution.pH;
    return status;
}

static enum wa_status change(const struct plan_work *work, double volume_mL, double share,
                             double *difference, struct wa_error *error)
{
    double below = 0.0, above = 0.0;
    enum wa_status status = pH_at(work, volume_mL * (1.0 - share), &below, error);
    if (status == WA_OK) {
        status = pH_at(work, volume_mL * (1.0 + share), &above, error);
    }
    *difference = fabs(above - below);
    return status;
}

/* Share left over when as much titrant as sample is there: K = (1 - y) / (c y^2) with water's own
 * ion, ((1 - y) / y)^2 between two weak ones. */
static double share_left(const struct plan_work *work, double K, double volume_mL)
{
    const double c = work->moles / (1e-3 * (work->options->solution_mL + volume_mL));
    if (work->plan->titrant->is_weak) {
        return 1.0 / (1.0 + sqrt(K));
    }
    return K * c > 1e-12 ? (sqrt(1.0 + 4.0 * K * c) - 1.0) / (2.0 * K * c) : 1.0;
}

static enum wa_status study(struct plan_work *work, struct wa_plan_step *step,
                            struct wa_error *error)
{
    const bool base = work->plan->titrant->is_base;
    const double own = titrant_pKa(work);
    step->K = wa_plan_reaction_constant(base ? step->pKa : own, base ? own : step->pKa,
                                        work->titration.medium.pKw);
    step->complete = step->K >= WA_COMPLETE_K;
    step->unconverted = share_left(work, step->K, step->volume_mL);
    enum wa_status status = pH_at(work, step->volume_mL, &step->pH, error);
    if (status == WA_OK) {
        status = change(work, step->volume_mL, 0.001, &step->jump, error);
    }
    if (status == WA_OK) {
        status = change(work, step->volume_mL, 0.01, &step->wide_jump, error);
    }
    if (status == WA_OK) {
        status = change(work, step->volume_mL, step_of_slope, &step->steepness, error);
    }
    step->steepness /= 2.0 * step_of_slope * step->volume_mL;
    step->visible = step->complete && step->wide_jump >= visible_jump;
    return status;
}

static enum wa_status compose(struct plan_work *work, struct wa_error *error)
{
    struct wa_experiment none = work->experiment;
    none.count = 0;
    none.ln_carbon_dioxide.mean = log(nothing);
    if (!(work->options->titrant_carbonate.value > 0.0)) {
        none.ln_carbonate.mean = log(nothing);
    }
    return wa_fit_expect(&none, &work->sample, NULL, NULL, NULL, NULL, &work->titration, error);
}

/* An unknown is studied at both ends of its range, the harder one last; the middle is left. */
static enum wa_status unknown_steps(struct plan_work *work, struct wa_error *error)
{
    const struct wa_plan_options *o = work->options;
    const double ends[] = {o->unknown_is_base ? o->pKa_high : o->pKa_low,
                           o->unknown_is_base ? o->pKa_low : o->pKa_high};
    const double middle = work->sample.parts[0].pK[0];
    enum wa_status status = WA_OK;
    for (int i = 0; i < 2 && status == WA_OK; i++) {
        struct wa_plan_step *step = &work->plan->steps[work->plan->step_count++];
        *step = (struct wa_plan_step){.pKa = ends[i], .volume_mL = o->end_point_mL};
        work->sample.parts[0].pK[0] = ends[i];
        status = compose(work, error);
        if (status == WA_OK) {
            status = study(work, step, error);
        }
    }
    /* Indicators and readings are planned for the harder end, the design for the middle. */
    work->plan->chosen = work->plan->steps[1].visible ? 1 : work->plan->steps[0].visible ? 0 : -1;
    work->sample.parts[0].pK[0] =
        work->plan->chosen >= 0 ? work->plan->steps[work->plan->chosen].pKa : middle;
    if (status == WA_OK) {
        status = compose(work, error);
    }
    work->sample.parts[0].pK[0] = middle;
    return status;
}

enum wa_status plan_steps(struct plan_work *work, struct wa_error *error)
{
    if (work->plan->form == NULL) {
        return unknown_steps(work, error);
    }
    enum wa_status status = compose(work, error);
    if (status != WA_OK) {
        return status;
    }
    collect_steps(work);
    for (int i = 0; i < work->plan->step_count && status == WA_OK; i++) {
        status = study(work, &work->plan->steps[i], error);
        if (work->plan->steps[i].visible) {
            work->plan->chosen = i;
        }
    }
    return status;
}

static bool is_colourless(const char *colour)
{
    return colour[0] == 'c' && colour[1] == 'o' && colour[2] == 'l' && colour[6] == 'l';
}

/* A colour out of none is seen as soon as it begins, and one that fades when it is gone; between
 * two colours the middle of the change is taken. */
static double end_pH(const struct wa_indicator *indicator)
{
    if (is_colourless(indicator->colour_acid)) {
        return indicator->low_pH;
    }
    if (is_colourless(indicator->colour_base)) {
        return indicator->high_pH;
    }
    const bool inside = indicator->pKa > indicator->low_pH && indicator->pKa < indicator->high_pH;
    return inside ? indicator->pKa : 0.5 * (indicator->low_pH + indicator->high_pH);
}

static bool indicator_of(const struct plan_work *work, const struct wa_indicator *indicator,
                         struct wa_plan_indicator *found)
{
    const struct wa_plan_step *step = &work->plan->steps[work->plan->chosen];
    double at, low, high;
    *found = (struct wa_plan_indicator){.indicator = indicator, .pH = end_pH(indicator)};
    if (wa_titration_volume(&work->titration, found->pH, &at, NULL) != WA_OK ||
        wa_titration_volume(&work->titration, indicator->low_pH, &low, NULL) != WA_OK ||
        wa_titration_volume(&work->titration, indicator->high_pH, &high, NULL) != WA_OK) {
        return false;
    }
    found->error_mL = at - step->volume_mL;
    found->spread_mL = 0.5 * fabs(high - low);
    found->within = fabs(found->error_mL) <= small_error * step->volume_mL &&
                    found->spread_mL <= narrow * step->volume_mL;
    return isfinite(found->error_mL) && isfinite(found->spread_mL);
}

static double badness(const struct wa_plan_indicator *found)
{
    return hypot(found->error_mL, eye * found->spread_mL);
}

/* Keep the list sorted, the worst falls off its end. */
static void insert(struct wa_plan *plan, const struct wa_plan_indicator *found)
{
    int at = plan->indicator_count;
    while (at > 0 && badness(&plan->indicators[at - 1]) > badness(found)) {
        at--;
    }
    if (at >= WA_PLAN_INDICATORS_MAX) {
        return;
    }
    if (plan->indicator_count < WA_PLAN_INDICATORS_MAX) {
        plan->indicator_count++;
    }
    for (int i = plan->indicator_count - 1; i > at; i--) {
        plan->indicators[i] = plan->indicators[i - 1];
    }
    plan->indicators[at] = *found;
}

enum wa_status plan_indicators(struct plan_work *work, struct wa_error *error)
{
    (void)error;
    for (size_t i = 0; i < work->table->indicator_count; i++) {
        struct wa_plan_indicator found;
        if (indicator_of(work, &work->table->indicators[i], &found)) {
            insert(work->plan, &found);
        }
    }
    return WA_OK;
}
