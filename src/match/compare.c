/* The evidence for one set of forms against another, and how it depends on what was assumed. */
#include "match/match_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double ln10 = 2.302585092994046;
static const double worth_fitting = 0.01; /* share of a set's evidence */
#define REFITTED_MOST 6                   /* groups of one set */

enum { FIRST, SECOND, NEITHER };

/* What one comparison works on. */
struct comparing {
    const struct wa_proton_study *study;
    const struct wa_titrated_mass *mass;
    const struct wa_table *table;
    const struct wa_match *match;
    const struct wa_group_list *list;
    unsigned char *set; /* by table index of the form */
    bool rest;          /* the second set is all others, the unknown in it */
    bool *refit;        /* by group */
};

/* One assumption varied. */
struct variant {
    struct wa_purity purity;
    struct wa_experiment experiment;
    bool curve; /* the experiment differs: curves have to be fitted again */
};

static enum wa_status mark(struct comparing *c, const char *keys, unsigned char set,
                           struct wa_error *error)
{
    char key[256];
    bool any = false;
    for (const char *at = keys; *at != '\0';) {
        const size_t length = strcspn(at, ",");
        const size_t kept = length < sizeof key - 1 ? length : sizeof key - 1;
        memcpy(key, at, kept);
        key[kept] = '\0';
        at += length + (at[length] == ',' ? 1 : 0);
        for (size_t f = 0; f < c->table->form_count; f++) {
            if (!isfinite(c->list->form_prior[f]) || !wa_form_is_meant(c->table, (int)f, key)) {
                continue;
            }
            if (c->set[f] != NEITHER && c->set[f] != set) {
                return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                               "--compare: '%.100s' stands on both sides.", key);
            }
            c->set[f] = set;
            any = true;
        }
    }
    return any ? WA_OK
               : wa_fail(error, WA_ERROR_CALL, NULL, 0,
                         "--compare: no form of '%.100s' is among those that are compared.", keys);
}

static enum wa_status mark_sets(struct comparing *c, const char *first, const char *second,
                                struct wa_error *error)
{
    memset(c->set, NEITHER, c->table->form_count);
    enum wa_status status = mark(c, first, FIRST, error);
    c->rest = strcmp(second, WA_WEIGHT_REST) == 0;
    if (status == WA_OK && !c->rest) {
        status = mark(c, second, SECOND, error);
    }
    for (size_t f = 0; c->rest && f < c->table->form_count; f++) {
        c->set[f] = c->set[f] == NEITHER ? SECOND : c->set[f];
    }
    return status;
}

/* ln of prior times evidence of one form, its group's curve at `log_curve`. */
static double log_form(const struct comparing *c, const struct variant *variant,
                       const struct wa_fit *fit, double log_curve, int form)
{
    const int index = wa_fit_find(fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &fit->parameters[index];
    return c->list->form_prior[form] + c->list->form_observed[form] + log_curve +
           wa_log_mass_evidence(c->mass, &variant->purity, c->table->forms[form].molar_mass,
                                amount->value, amount->u, &amount->prior);
}

/* A group's part in each set's evidence. */
static void add_group(const struct comparing *c, const struct variant *variant,
                      const struct wa_group *group, const struct wa_fit *fit, double log_curve,
                      double sum[2])
{
    for (size_t i = 0; i < group->form_count; i++) {
        const int form = group->forms[i];
        if (c->set[form] != NEITHER) {
            sum[c->set[form]] =
                wa_log_sum(sum[c->set[form]], log_form(c, variant, fit, log_curve, form));
        }
    }
}

/* The change that a variant makes of a group's curve: both fits with the same constants. */
static enum wa_status refit_group(const struct variant *variant, const struct wa_group *group,
                                  double *log_curve, struct wa_fit *fit, struct wa_error *error)
{
    struct wa_sample_model sample = group->sample;
    double start[WA_PARAMETERS_MAX];
    for (int i = 0; i < group->fit->parameter_count; i++) {
        const struct wa_parameter *parameter = &group->fit->parameters[i];
        start[i] = parameter->value;
        if (parameter->kind == WA_PARAMETER_PK) {
            sample.parts[parameter->part].pK_u[parameter->step] = parameter->prior.u;
        }
    }
    const enum wa_status status =
        wa_fit_run(&variant->experiment, &sample, NULL, start, fit, error);
    *log_curve = group->log_curve;
    if (status == WA_OK && fit->converged) {
        *log_curve += fit->log_evidence - group->fit->log_evidence;
    }
    return status;
}

static enum wa_status log_unknown(const struct comparing *c, const struct variant *variant,
                                  double *log_weight, struct wa_error *error)
{
    const struct wa_generic *best = &c->study->generic[0];
    *log_weight = c->match->log_unknown;
    if (!variant->curve || !isfinite(*log_weight)) {
        return WA_OK;
    }
    double start[WA_PARAMETERS_MAX];
    struct wa_fit fit;
    for (int i = 0; i < best->fit.parameter_count; i++) {
        start[i] = best->fit.parameters[i].value;
    }
    const enum wa_status status =
        wa_fit_run(&variant->experiment, &best->sample, NULL, start, &fit, error);
    if (status == WA_OK && fit.converged) {
        *log_weight += fit.log_evidence - best->fit.log_evidence;
    }
    wa_fit_free(&fit);
    return status;
}

/* lg of the ratio under one variant. */
static enum wa_status ratio(const struct comparing *c, const struct variant *variant,
                            double *log10_ratio, struct wa_error *error)
{
    double sum[2] = {-INFINITY, -INFINITY}, prior[2] = {-INFINITY, -INFINITY};
    enum wa_status status = WA_OK;
    for (size_t f = 0; f < c->table->form_count; f++) {
        if (c->set[f] != NEITHER) {
            prior[c->set[f]] = wa_log_sum(prior[c->set[f]], c->list->form_prior[f]);
        }
    }
    for (size_t g = 0; status == WA_OK && g < c->list->count; g++) {
        const struct wa_group *group = &c->list->groups[g];
        if (!isfinite(group->log_curve)) {
            continue;
        }
        if (variant->curve && c->refit[g]) {
            struct wa_fit fit;
            double log_curve;
            status = refit_group(variant, group, &log_curve, &fit, error);
            if (status == WA_OK && fit.converged) {
                add_group(c, variant, group, &fit, log_curve, sum);
            }
            wa_fit_free(&fit);
        } else {
            add_group(c, variant, group, group->fit, group->log_curve, sum);
        }
    }
    if (status == WA_OK && c->rest && c->match->not_in_table_prior > 0.0) {
        double unknown;
        status = log_unknown(c, variant, &unknown, error);
        sum[SECOND] = wa_log_sum(sum[SECOND], unknown);
        prior[SECOND] = wa_log_sum(prior[SECOND], log(c->match->not_in_table_prior));
    }
    *log10_ratio = (sum[FIRST] - prior[FIRST] - sum[SECOND] + prior[SECOND]) / ln10;
    return status;
}

/* Groups that carry a set's evidence are fitted again for each variant. */
static void choose_refits(struct comparing *c, const struct variant *base)
{
    double sum[2] = {-INFINITY, -INFINITY};
    size_t chosen[2] = {0, 0};
    for (size_t g = 0; g < c->list->count; g++) {
        const struct wa_group *group = &c->list->groups[g];
        if (isfinite(group->log_curve)) {
            add_group(c, base, group, group->fit, group->log_curve, sum);
        }
    }
    for (size_t g = 0; g < c->list->count; g++) {
        const struct wa_group *group = &c->list->groups[g];
        double own[2] = {-INFINITY, -INFINITY};
        if (isfinite(group->log_curve)) {
            add_group(c, base, group, group->fit, group->log_curve, own);
        }
        for (int set = FIRST; set <= SECOND; set++) {
            if (isfinite(own[set]) && own[set] > sum[set] + log(worth_fitting) &&
                chosen[set] < REFITTED_MOST) {
                c->refit[g] = true;
                chosen[set]++;
            }
        }
    }
}

static enum wa_status vary(const struct comparing *c, const struct variant variants[], size_t count,
                           double base, struct wa_comparison_range *range, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    range->low = base;
    range->high = base;
    for (size_t i = 0; status == WA_OK && i < count; i++) {
        double varied;
        status = ratio(c, &variants[i], &varied, error);
        range->low = fmin(range->low, varied);
        range->high = fmax(range->high, varied);
    }
    return status;
}

static enum wa_status vary_all(const struct comparing *c, const struct variant *base,
                               struct wa_comparison *comparison, struct wa_error *error)
{
    struct variant purity[4] = {*base, *base, *base, *base};
    struct variant electrode[2] = {*base, *base}, outliers[2] = {*base, *base};
    purity[0].purity.reagent_share = 0.5;
    purity[1].purity.reagent_share = 0.95;
    purity[2].purity.found_ln_s *= 0.5;
    purity[3].purity.found_ln_s *= 2.0;
    for (int i = 0; i < 2; i++) {
        const double factor = i == 0 ? 0.5 : 2.0;
        electrode[i].curve = true;
        electrode[i].experiment.offset.u *= factor;
        electrode[i].experiment.slope.u *= factor;
        outliers[i].curve = true;
        outliers[i].experiment.outlier_share = i == 0 ? 0.005 : 0.05;
    }
    comparison->ranges[0].assumption = "purity";
    comparison->ranges[1].assumption = "electrode";
    comparison->ranges[2].assumption = "share of outliers";
    const double ratio_here = comparison->log10_ratio;
    enum wa_status status = vary(c, purity, 4, ratio_here, &comparison->ranges[0], error);
    if (status == WA_OK) {
        status = vary(c, electrode, 2, ratio_here, &comparison->ranges[1], error);
    }
    if (status == WA_OK) {
        status = vary(c, outliers, 2, ratio_here, &comparison->ranges[2], error);
    }
    double below = 0.0, above = 0.0;
    for (int i = 0; i < 3; i++) {
        below = hypot(below, ratio_here - comparison->ranges[i].low);
        above = hypot(above, comparison->ranges[i].high - ratio_here);
    }
    comparison->log10_low = ratio_here - below;
    comparison->log10_high = ratio_here + above;
    return status;
}

enum wa_status wa_match_compare(const struct wa_experiment *experiment,
                                const struct wa_proton_study *study,
                                const struct wa_titrated_mass *mass, const struct wa_table *table,
                                const struct wa_match *match, const char *first, const char *second,
                                struct wa_comparison *comparison, struct wa_error *error)
{
    const struct wa_group_list *list = wa_match_groups(match);
    struct comparing c = {.study = study,
                          .mass = mass,
                          .table = table,
                          .match = match,
                          .list = list,
                          .set = calloc(table->form_count + 1, 1),
                          .refit = calloc(list->count + 1, sizeof *c.refit)};
    const struct variant base = {.purity = wa_purity_default(), .experiment = *experiment};
    *comparison = (struct wa_comparison){.log10_ratio = 0.0};
    enum wa_status status = c.set != NULL && c.refit != NULL ? WA_OK : wa_fail_memory(error);
    if (status == WA_OK) {
        status = mark_sets(&c, first, second, error);
    }
    if (status == WA_OK) {
        choose_refits(&c, &base);
        status = ratio(&c, &base, &comparison->log10_ratio, error);
    }
    if (status == WA_OK) {
        status = vary_all(&c, &base, comparison, error);
    }
    free(c.set);
    free(c.refit);
    return status;
}
