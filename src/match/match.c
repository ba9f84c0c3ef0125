/* From screened models to probabilities. */
#include "match/match_internal.h"

#include "base/grow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double ln_sqrt_2pi = 0.91893853320467274;
static const double same_mass = 1e-4; /* relative: isomers and enantiomers weigh the same */

/* A model screened this far below the best (in ln evidence, prior in) is not fitted. The screening
 * is within a few units of the full fit where the fit is good, and this leaves a wide margin. */
static const double screening_margin = 18.0;
static const size_t fitted_at_least = 12;
static const size_t fitted_at_most = 72;

struct wa_match_storage {
    struct wa_group_list list;
};

static double log_normal_density(double x, double mean, double u)
{
    const double deviation = (x - mean) / u;
    return -0.5 * deviation * deviation - log(u) - ln_sqrt_2pi;
}

static double log_sum(double a, double b)
{
    const double high = fmax(a, b);
    return isfinite(high) ? high + log1p(exp(fmin(a, b) - high)) : high;
}

/* ln of what the mass says of a molar mass, relative to the broad prior that the fit used for the
 * amount. The fit's posterior of ln amount is Gaussian, so the integrals are closed. */
static double log_mass_evidence(const struct wa_titrated_mass *mass, double molar_mass,
                                double ln_amount, double ln_amount_u, const struct wa_prior *broad)
{
    if (!mass->known) {
        return 0.0;
    }
    const double expected = log(mass->mass_g / molar_mass);
    const double u = hypot(ln_amount_u, mass->u_g / mass->mass_g);
    const double reagent = log(WA_PURITY_REAGENT_SHARE) +
                           log_normal_density(ln_amount, expected + WA_PURITY_REAGENT_LN_MEAN,
                                              hypot(u, WA_PURITY_REAGENT_LN_U));
    const double found = log(1.0 - WA_PURITY_REAGENT_SHARE) +
                         log_normal_density(ln_amount, expected + WA_PURITY_FOUND_LN_MEAN,
                                            hypot(u, WA_PURITY_FOUND_LN_U));
    return log_sum(reagent, found) - log_normal_density(ln_amount, broad->mean, broad->u);
}

/* The same for an acid that nobody named: its molar mass is log-uniform. */
static double log_mass_evidence_generic(const struct wa_titrated_mass *mass, double ln_amount,
                                        const struct wa_prior *broad)
{
    if (!mass->known) {
        return 0.0;
    }
    const double molar_mass = mass->mass_g / exp(ln_amount);
    const double outside = fmax(log(WA_MOLAR_MASS_LOW / molar_mass), 0.0) +
                           fmax(log(molar_mass / WA_MOLAR_MASS_HIGH), 0.0);
    /* Soft ends: half a per cent of purity must not decide. */
    const double density =
        -log(log(WA_MOLAR_MASS_HIGH / WA_MOLAR_MASS_LOW)) - 0.5 * pow(outside / 0.05, 2.0);
    return density - log_normal_density(ln_amount, broad->mean, broad->u);
}

static double log_not_in_table(const struct wa_experiment *experiment,
                               const struct wa_proton_study *study,
                               const struct wa_titrated_mass *mass)
{
    double sum = -INFINITY;
    for (int i = 0; i < study->count; i++) {
        const struct wa_generic *generic = &study->generic[i];
        const int index = wa_fit_find(&generic->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
        const struct wa_parameter *amount = &generic->fit.parameters[index];
        sum = log_sum(sum, generic->fit.log_evidence + generic->log_prior +
                               wa_log_stray_electrode(experiment, &generic->fit) +
                               log_mass_evidence_generic(mass, amount->value, &amount->prior));
    }
    return sum;
}

/* ln of the weight of all that is no single substance of the table: one acid that nobody named, or
 * two acids. A mixture's mass says as little as an unknown's. */
static double log_unknown(const struct wa_experiment *experiment,
                          const struct wa_proton_study *study, const struct wa_titrated_mass *mass,
                          const struct wa_match_options *options)
{
    const struct wa_generic *best = &study->generic[0];
    const int index = wa_fit_find(&best->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &best->fit.parameters[index];
    const double one = log(WA_NOT_IN_TABLE_PRIOR) + log_not_in_table(experiment, study, mass);
    if (options == NULL || options->log_two_acids == 0.0) {
        return one;
    }
    return log_sum(one, options->log_two_acids +
                            log_mass_evidence_generic(mass, amount->value, &amount->prior));
}

/* Start values: the reference constants and what the best generic fit found for the rest. */
static void start_values(const struct wa_experiment *experiment, const struct wa_fit *best,
                         const struct wa_group *group, double *start)
{
    struct wa_parameter parameters[WA_PARAMETERS_MAX];
    const int count = wa_fit_parameters(experiment, &group->sample, parameters);
    for (int i = 0; i < count; i++) {
        start[i] = parameters[i].prior.mean;
        if (parameters[i].kind == WA_PARAMETER_LN_AMOUNT) {
            start[i] = group->ln_amount;
        } else if (parameters[i].kind != WA_PARAMETER_PK) {
            const int index = wa_fit_find(best, parameters[i].kind, parameters[i].part, 0);
            start[i] = index >= 0 ? best->parameters[index].value : start[i];
        }
    }
}

/* Whether the fitted amount leaves the uncharged species beyond its solubility at some point. */
static bool leaves_solid(const struct wa_experiment *experiment, const struct wa_group *group)
{
    if (!isfinite(group->solubility) || group->sample.part_count == 0) {
        return false;
    }
    const struct wa_titration *titration = &group->fit->titration;
    const struct wa_titration_component *component = &titration->components[0];
    bool solid = false;
    for (size_t p = 0; !solid && p < experiment->count; p++) {
        double fraction[WA_PROTONS_MAX + 1];
        const double total_L = titration->solution_volume_L + 1e-3 * experiment->volume_mL[p];
        wa_system_fractions(&component->system, pow(10.0, -experiment->reading[p]), 0.8, fraction);
        solid =
            component->sample_moles / total_L * fraction[group->solid_species] > group->solubility;
    }
    return solid;
}

/* Fit once more with a solid phase; the evidence is that of both, one in two, and the better fit is
 * kept. Warmth, another solvent or patience may have kept everything in solution. */
static enum wa_status fit_with_solid(const struct wa_experiment *experiment, const double *start,
                                     struct wa_group *group, struct wa_error *error)
{
    struct wa_sample_model solid = group->sample;
    const struct wa_fit_options options = {.from_afar = true};
    struct wa_fit fit;
    solid.parts[0].solubility = group->solubility;
    solid.parts[0].solid_species = group->solid_species;
    const enum wa_status status = wa_fit_run(experiment, &solid, &options, start, &fit, error);
    if (status != WA_OK) {
        return status;
    }
    if (fit.converged) {
        const double log_solid = fit.log_evidence + wa_log_stray_electrode(experiment, &fit);
        if (log_solid > group->log_curve) {
            wa_fit_free(group->fit);
            *group->fit = fit;
            group->sample = solid;
            fit = (struct wa_fit){.parameter_count = 0};
        }
        group->log_curve = log_sum(group->log_curve, log_solid) - log(2.0);
    }
    wa_fit_free(&fit);
    return WA_OK;
}

static enum wa_status fit_group(const struct wa_experiment *experiment, const struct wa_fit *best,
                                struct wa_group *group, struct wa_error *error)
{
    double start[WA_PARAMETERS_MAX];
    start_values(experiment, best, group, start);
    group->fit = malloc(sizeof *group->fit);
    if (group->fit == NULL) {
        return wa_fail_memory(error);
    }
    const struct wa_fit_options options = {.from_afar = true};
    const enum wa_status status =
        wa_fit_run(experiment, &group->sample, &options, start, group->fit, error);
    group->log_curve =
        status == WA_OK && group->fit->converged
            ? group->fit->log_evidence + wa_log_stray_electrode(experiment, group->fit)
            : -INFINITY;
    return status == WA_OK && leaves_solid(experiment, group)
               ? fit_with_solid(experiment, start, group, error)
               : status;
}

/* Best form's mass evidence at the screened amount: so that a form that the mass favours is not
 * lost because another has the better curve. */
static double screened_weight(const struct wa_table *table, const struct wa_titrated_mass *mass,
                              const struct wa_group *group)
{
    double best = -INFINITY;
    for (size_t i = 0; i < group->form_count; i++) {
        const double weight =
            log_mass_evidence(mass, table->forms[group->forms[i]].molar_mass, group->ln_amount,
                              0.01, &group->sample.ln_amount[0]);
        best = fmax(best, weight);
    }
    return group->screened + group->log_prior + best;
}

struct ranked {
    double weight;
    size_t group;
};

static int by_weight(const void *a, const void *b)
{
    const struct ranked *x = a, *y = b;
    return (x->weight < y->weight) - (x->weight > y->weight);
}

static enum wa_status fit_survivors(const struct wa_experiment *experiment,
                                    const struct wa_fit *best, const struct wa_table *table,
                                    const struct wa_titrated_mass *mass, struct wa_group_list *list,
                                    size_t *fitted, struct wa_error *error)
{
    struct ranked *ranked = calloc(list->count + 1, sizeof *ranked);
    enum wa_status status = ranked != NULL ? WA_OK : wa_fail_memory(error);
    for (size_t g = 0; status == WA_OK && g < list->count; g++) {
        list->groups[g].log_curve = -INFINITY;
        ranked[g] = (struct ranked){screened_weight(table, mass, &list->groups[g]), g};
    }
    if (status == WA_OK) {
        qsort(ranked, list->count, sizeof *ranked, by_weight);
    }
    *fitted = 0;
    for (size_t i = 0; status == WA_OK && i < list->count && *fitted < fitted_at_most; i++) {
        if (!isfinite(ranked[i].weight) ||
            (i >= fitted_at_least && ranked[i].weight < ranked[0].weight - screening_margin)) {
            break;
        }
        status = fit_group(experiment, best, &list->groups[ranked[i].group], error);
        (*fitted)++;
    }
    free(ranked);
    return status;
}

/* Forms of one group in order of molar mass, so that those that weigh the same stand together. */
static void sort_by_mass(const struct wa_table *table, struct wa_group *group)
{
    for (size_t i = 1; i < group->form_count; i++) {
        const int form = group->forms[i];
        size_t j = i;
        while (j > 0 &&
               table->forms[group->forms[j - 1]].molar_mass > table->forms[form].molar_mass) {
            group->forms[j] = group->forms[j - 1];
            j--;
        }
        group->forms[j] = form;
    }
}

/* How many forms from `first` on the data cannot tell apart: those of one molar mass, or all of
 * them when no mass was noted. */
static size_t cluster_size(const struct wa_table *table, const struct wa_titrated_mass *mass,
                           const struct wa_group *group, size_t first)
{
    size_t size = 1;
    const double molar_mass = table->forms[group->forms[first]].molar_mass;
    while (first + size < group->form_count &&
           (!mass->known ||
            table->forms[group->forms[first + size]].molar_mass < molar_mass * (1.0 + same_mass))) {
        size++;
    }
    return size;
}

/* The form that stands for a cluster: the acid itself if it is there, else the first. */
static int representative(const struct wa_table *table, const struct wa_group *group, size_t first,
                          size_t size)
{
    for (size_t i = first; group->acid >= 0 && i < first + size; i++) {
        if (strcmp(table->forms[group->forms[i]].key, table->acids[group->acid].key) == 0) {
            const int form = group->forms[i];
            group->forms[i] = group->forms[first];
            group->forms[first] = form;
        }
    }
    return group->forms[first];
}

static enum wa_status add_candidates(const struct wa_table *table,
                                     const struct wa_titrated_mass *mass, struct wa_group *group,
                                     struct wa_match *match, size_t *capacity,
                                     struct wa_error *error)
{
    const int index = wa_fit_find(group->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &group->fit->parameters[index];
    sort_by_mass(table, group);
    for (size_t first = 0, size; first < group->form_count; first += size) {
        size = cluster_size(table, mass, group, first);
        if (!wa_grow(&match->candidates, capacity, match->candidate_count + 1,
                     sizeof *match->candidates)) {
            return wa_fail_memory(error);
        }
        const double molar_mass = table->forms[group->forms[first]].molar_mass;
        match->candidates[match->candidate_count++] = (struct wa_candidate){
            .acid = group->acid,
            .form = representative(table, group, first, size),
            .forms = &group->forms[first],
            .form_count = size,
            .log_weight =
                group->log_prior + log((double)size) + group->log_curve +
                log_mass_evidence(mass, molar_mass, amount->value, amount->u, &amount->prior),
            .log_curve = group->log_curve,
            .ln_amount = amount->value,
            .ln_amount_u = amount->u,
            .fit = group->fit,
            .sample = &group->sample,
        };
    }
    return WA_OK;
}

static int by_log_weight(const void *a, const void *b)
{
    const struct wa_candidate *x = a, *y = b;
    return (x->log_weight < y->log_weight) - (x->log_weight > y->log_weight);
}

static void normalise(double log_unknown, struct wa_match *match)
{
    double total = log_unknown;
    for (size_t i = 0; i < match->candidate_count; i++) {
        total = log_sum(total, match->candidates[i].log_weight);
    }
    for (size_t i = 0; i < match->candidate_count; i++) {
        match->candidates[i].probability =
            isfinite(total) ? exp(match->candidates[i].log_weight - total) : 0.0;
    }
    match->not_in_table = isfinite(log_unknown) ? exp(log_unknown - total) : 0.0;
}

/* A titrant that nobody named may not be the strong one assumed: no candidate can be sure then. */
static void doubt_titrant(struct wa_match *match)
{
    match->not_in_table = 1.0 - (1.0 - WA_TITRANT_DOUBT) * (1.0 - match->not_in_table);
    for (size_t i = 0; i < match->candidate_count; i++) {
        match->candidates[i].probability *= 1.0 - WA_TITRANT_DOUBT;
    }
}

enum wa_status wa_match_run(const struct wa_experiment *experiment,
                            const struct wa_proton_study *study,
                            const struct wa_titrated_mass *mass, const struct wa_table *table,
                            const struct wa_match_options *options, struct wa_match *match,
                            struct wa_error *error)
{
    const struct wa_fit *best = &study->generic[0].fit;
    const bool closed = options != NULL && options->among_count > 0;
    size_t capacity = 0;
    *match = (struct wa_match){.candidate_count = 0};
    match->storage = calloc(1, sizeof *match->storage);
    if (match->storage == NULL) {
        return wa_fail_memory(error);
    }
    struct wa_group_list *list = &match->storage->list;
    enum wa_status status =
        wa_groups_collect(table, experiment, best->ionic_strength,
                          &study->generic[0].sample.ln_amount[0], options, list, error);
    if (status == WA_OK) {
        status = wa_groups_screen(experiment, best, list, error);
    }
    if (status == WA_OK) {
        status = fit_survivors(experiment, best, table, mass, list, &match->models_fitted, error);
    }
    for (size_t g = 0; status == WA_OK && g < list->count; g++) {
        if (isfinite(list->groups[g].log_curve)) {
            status = add_candidates(table, mass, &list->groups[g], match, &capacity, error);
        }
    }
    if (status != WA_OK) {
        wa_match_free(match);
        return status;
    }
    const double known_share = closed ? 0.0 : log(1.0 - WA_NOT_IN_TABLE_PRIOR);
    for (size_t i = 0; i < match->candidate_count; i++) {
        match->candidates[i].log_weight += known_share;
    }
    normalise(closed ? -INFINITY : log_unknown(experiment, study, mass, options), match);
    if (experiment->titrant_assumed && !closed) {
        doubt_titrant(match);
    }
    qsort(match->candidates, match->candidate_count, sizeof *match->candidates, by_log_weight);
    match->forms_considered = list->form_count;
    match->models_considered = list->count;
    return WA_OK;
}

void wa_match_free(struct wa_match *match)
{
    if (match != NULL) {
        if (match->storage != NULL) {
            wa_groups_free(&match->storage->list);
            free(match->storage);
        }
        free(match->candidates);
        *match = (struct wa_match){.candidate_count = 0};
    }
}
