/* Which models are fitted in full, and the fits. */
#include "match/match_internal.h"

#include <math.h>
#include <stdlib.h>

/* Models are fitted in the order of their screening until none of the rest can matter: the best
 * that a full fit made of a screening so far, and some more, would leave them this far below the
 * best (in ln evidence, prior in). */
static const double screening_margin = 8.0;
static const double screening_slack = 5.0;
static const size_t fitted_at_least = 10;
static const size_t fitted_at_most = 120;
static const double screened_amount_u = 0.01; /* ln */

/* Constants strained by less than this need no second look at the table. */
static const double strain_let_pass = 4.0;

/* Of a solubility in the table: tables disagree, and a beaker is not at rest. */
static const double solubility_ln_u = 0.2;

/* What the fits of one match share. */
struct fitting {
    const struct wa_experiment *experiment;
    const struct wa_fit *best;
    const struct wa_table *table;
    const struct wa_titrated_mass *mass;
    struct wa_purity purity;
    struct wa_group_list *list;
    double highest; /* weight of the best model fitted so far */
    double gain;    /* most that a full fit made of a screening so far */
};

double wa_log_strain(double strain, int constants)
{
    const double wrong = log(WA_ROW_WRONG_SHARE) - constants * log(WA_ROW_WRONG_WIDER) -
                         0.5 * strain / (WA_ROW_WRONG_WIDER * WA_ROW_WRONG_WIDER);
    return fmax(-0.5 * strain, wrong);
}

/* Start values: the reference constants and what the best generic fit found for the rest. */
static void start_values(const struct fitting *fitting, const struct wa_sample_model *sample,
                         double ln_amount, double *start)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(fitting->experiment, sample, parameters);
    for (int i = 0; i < count; i++) {
        start[i] = parameters[i].prior.mean;
        if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            start[i] = ln_amount;
        } else if (parameters[i].kind != WA_PARAMETER_PK) {
            const int index = wa_fit_find(fitting->best, parameters[i].kind, parameters[i].part, 0);
            start[i] = index >= 0 ? fitting->best->parameters[index].value : start[i];
        }
    }
}

static enum wa_status fit_sample(const struct fitting *fitting,
                                 const struct wa_sample_model *sample, double ln_amount,
                                 struct wa_fit **fit, struct wa_error *error)
{
    static const struct wa_fit_options from_afar = {.from_afar = true};
    double start[WA_PARAMETERS_MAX];
    start_values(fitting, sample, ln_amount, start);
    *fit = malloc(sizeof **fit);
    if (*fit == NULL) {
        return wa_fail_memory(error);
    }
    return wa_fit_run(fitting->experiment, sample, &from_afar, start, *fit, error);
}

/* Sum of the squared deviations of the constants from the table, in u. */
static double strain_of(const struct wa_fit *fit)
{
    double sum = 0.0;
    for (int i = 0; i < fit->parameter_count; i++) {
        const struct wa_parameter *parameter = &fit->parameters[i];
        const double deviation = (parameter->value - parameter->prior.mean) / parameter->prior.u;
        sum += parameter->kind == WA_PARAMETER_PK ? deviation * deviation : 0.0;
    }
    return sum;
}

/* ln of the evidence of the curve by a fit with the table's own uncertainties. */
static double log_curve_of(const struct fitting *fitting, const struct wa_fit *fit)
{
    return fit->converged ? log(1.0 - WA_ROW_WRONG_SHARE) + fit->log_evidence +
                                wa_log_stray_electrode(fitting->experiment, fit)
                          : -INFINITY;
}

/* The best that the forms of a group can add: prior, mass and what else was observed. */
static double best_form(const struct fitting *fitting, const struct wa_group *group)
{
    double best = -INFINITY;
    for (size_t i = 0; i < group->form_count; i++) {
        const int form = group->forms[i];
        best = fmax(best, fitting->list->form_prior[form] + fitting->list->form_observed[form] +
                              wa_log_mass_evidence(fitting->mass, &fitting->purity,
                                                   fitting->table->forms[form].molar_mass,
                                                   group->ln_amount, screened_amount_u,
                                                   &group->sample.ln_amount[0]));
    }
    return best;
}

static void widen(struct wa_sample_model *sample)
{
    for (int k = 0; k < sample->part_count; k++) {
        for (int i = 0; i < sample->parts[k].step_count; i++) {
            double *u = &sample->parts[k].pK_u[i];
            *u = *u > 0.0 ? fmax(WA_ROW_WRONG_WIDER * *u, WA_ROW_WRONG_LEAST_U) : 0.0;
        }
    }
}

/* The same with a table that is wrong about this acid; the better of the two fits stands for it. */
static enum wa_status fit_wide(const struct fitting *fitting, struct wa_group *group,
                               struct wa_error *error)
{
    struct wa_sample_model wide = group->sample;
    struct wa_fit *fit = NULL;
    widen(&wide);
    const enum wa_status status = fit_sample(fitting, &wide, group->ln_amount, &fit, error);
    if (status == WA_OK && fit->converged) {
        const double log_wide = log(WA_ROW_WRONG_SHARE) + fit->log_evidence +
                                wa_log_stray_electrode(fitting->experiment, fit);
        if (log_wide > group->log_curve) {
            struct wa_fit *other = group->fit;
            group->fit = fit;
            group->row_doubted = true;
            fit = other;
        }
        group->log_curve = wa_log_sum(group->log_curve, log_wide);
    }
    wa_fit_free(fit);
    free(fit);
    return status;
}

/* The same with a solid phase; the evidence is that of both, one in two, and the better fit is
 * kept. Warmth, another solvent or patience may have kept everything in solution. */
static enum wa_status fit_with_solid(const struct fitting *fitting, struct wa_group *group,
                                     struct wa_error *error)
{
    struct wa_sample_model solid = group->sample;
    struct wa_fit *fit = NULL;
    solid.parts[0].solubility = group->solubility;
    solid.parts[0].solid_species = group->solid_species;
    solid.parts[0].ln_solubility_u = solubility_ln_u;
    const enum wa_status status = fit_sample(fitting, &solid, group->ln_amount, &fit, error);
    if (status == WA_OK && fit->converged) {
        const double log_solid = log_curve_of(fitting, fit);
        if (log_solid > group->log_curve) {
            struct wa_fit *other = group->fit;
            group->fit = fit;
            group->sample = solid;
            fit = other;
        }
        group->log_curve = wa_log_sum(group->log_curve, log_solid) - log(2.0);
    }
    wa_fit_free(fit);
    free(fit);
    return status;
}

static enum wa_status fit_group(struct fitting *fitting, struct wa_group *group, double others,
                                struct wa_error *error)
{
    enum wa_status status =
        fit_sample(fitting, &group->sample, group->ln_amount, &group->fit, error);
    if (status != WA_OK) {
        return status;
    }
    group->log_curve = log_curve_of(fitting, group->fit);
    if (wa_group_leaves_solid(fitting->experiment, group)) {
        status = fit_with_solid(fitting, group, error);
        if (status != WA_OK) {
            return status;
        }
    }
    const bool converged = group->fit->converged;
    const double strain = converged ? strain_of(group->fit) : INFINITY;
    if (strain > strain_let_pass &&
        group->log_curve + others + 0.5 * strain + log(WA_ROW_WRONG_SHARE) >
            fitting->highest - screening_margin) {
        status = fit_wide(fitting, group, error);
    }
    if (isfinite(group->log_curve)) {
        fitting->highest = fmax(fitting->highest, group->log_curve + others);
        fitting->gain = fmax(fitting->gain, group->log_curve - group->screened);
    }
    return status;
}

struct ranked {
    double weight; /* screened, with what the forms can add */
    double others; /* the latter */
    size_t group;
};

static int by_weight(const void *a, const void *b)
{
    const struct ranked *x = a, *y = b;
    return (x->weight < y->weight) - (x->weight > y->weight);
}

static bool is_wanted(const struct wa_table *table, const struct wa_match_options *options,
                      const struct wa_group *group)
{
    for (size_t k = 0; options != NULL && k < options->wanted_count; k++) {
        for (size_t i = 0; i < group->form_count; i++) {
            if (wa_form_is_meant(table, group->forms[i], options->wanted[k])) {
                return true;
            }
        }
    }
    return false;
}

static enum wa_status fit_ranked(struct fitting *fitting, const struct ranked *ranked,
                                 size_t *fitted, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t i = 0; status == WA_OK && i < fitting->list->count && *fitted < fitted_at_most;
         i++) {
        if (!isfinite(ranked[i].weight) ||
            (i >= fitted_at_least && ranked[i].weight + fitting->gain + screening_slack <
                                         fitting->highest - screening_margin)) {
            break;
        }
        status =
            fit_group(fitting, &fitting->list->groups[ranked[i].group], ranked[i].others, error);
        (*fitted)++;
    }
    return status;
}

enum wa_status wa_groups_fit(const struct wa_experiment *experiment, const struct wa_fit *best,
                             const struct wa_table *table, const struct wa_titrated_mass *mass,
                             const struct wa_match_options *options, struct wa_group_list *list,
                             size_t *fitted, struct wa_error *error)
{
    struct fitting fitting = {.experiment = experiment,
                              .best = best,
                              .table = table,
                              .mass = mass,
                              .purity = wa_purity_default(),
                              .list = list,
                              .highest = -INFINITY,
                              .gain = -INFINITY};
    struct ranked *ranked = calloc(list->count + 1, sizeof *ranked);
    enum wa_status status = ranked != NULL ? WA_OK : wa_fail_memory(error);
    for (size_t g = 0; status == WA_OK && g < list->count; g++) {
        struct wa_group *group = &list->groups[g];
        const double others = best_form(&fitting, group);
        group->log_curve = -INFINITY;
        ranked[g] = (struct ranked){group->screened + others, others, g};
    }
    *fitted = 0;
    if (status == WA_OK) {
        qsort(ranked, list->count, sizeof *ranked, by_weight);
        status = fit_ranked(&fitting, ranked, fitted, error);
    }
    for (size_t g = 0; status == WA_OK && g < list->count; g++) {
        struct wa_group *group = &list->groups[g];
        if (group->fit == NULL && is_wanted(table, options, group)) {
            status = fit_group(&fitting, group, best_form(&fitting, group), error);
            (*fitted)++;
        }
    }
    free(ranked);
    return status;
}
