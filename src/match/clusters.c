/* From fitted groups to candidates: forms that the data cannot tell apart stand together. */
#include "match/match_internal.h"

#include "base/grow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double same_mass = 1e-4;      /* relative: isomers and enantiomers weigh the same */
static const double same_likelihood = 0.1; /* ln */

/* What all clusters of one match share. */
struct clustering {
    const struct wa_table *table;
    const struct wa_titrated_mass *mass;
    const struct wa_purity *purity;
    struct wa_group_list *list;
    struct wa_match *match;
    size_t capacity;
};

static bool goes_before(const struct clustering *c, int a, int b)
{
    const double x = c->table->forms[a].molar_mass, y = c->table->forms[b].molar_mass;
    if (c->mass->known && fabs(x / y - 1.0) > same_mass) {
        return x < y;
    }
    if (fabs(c->list->form_observed[a] - c->list->form_observed[b]) > same_likelihood) {
        return c->list->form_observed[a] > c->list->form_observed[b];
    }
    return x < y;
}

/* In order of molar mass and of what was observed, so that forms that are alike stand together. */
static void sort_forms(const struct clustering *c, struct wa_group *group)
{
    for (size_t i = 1; i < group->form_count; i++) {
        const int form = group->forms[i];
        size_t j = i;
        while (j > 0 && goes_before(c, form, group->forms[j - 1])) {
            group->forms[j] = group->forms[j - 1];
            j--;
        }
        group->forms[j] = form;
    }
}

static bool are_alike(const struct clustering *c, int a, int b)
{
    const double ratio = c->table->forms[a].molar_mass / c->table->forms[b].molar_mass;
    return (!c->mass->known || fabs(ratio - 1.0) < same_mass) &&
           fabs(c->list->form_observed[a] - c->list->form_observed[b]) < same_likelihood;
}

static size_t cluster_size(const struct clustering *c, const struct wa_group *group, size_t first)
{
    size_t size = 1;
    while (first + size < group->form_count &&
           are_alike(c, group->forms[first], group->forms[first + size])) {
        size++;
    }
    return size;
}

/* The form that stands for a cluster: the acid itself if it is there, else the most probable before
 * the data, else the first. */
static int representative(const struct clustering *c, struct wa_group *group, size_t first,
                          size_t size)
{
    size_t best = first;
    for (size_t i = first; i < first + size; i++) {
        if (c->list->form_prior[group->forms[i]] >
            c->list->form_prior[group->forms[best]] + same_likelihood) {
            best = i;
        }
    }
    for (size_t i = first; group->acid >= 0 && i < first + size; i++) {
        if (strcmp(c->table->forms[group->forms[i]].key, c->table->acids[group->acid].key) == 0) {
            best = i;
        }
    }
    const int form = group->forms[best];
    group->forms[best] = group->forms[first];
    group->forms[first] = form;
    return form;
}

static enum wa_status add_cluster(struct clustering *c, struct wa_group *group, size_t first,
                                  size_t size, struct wa_error *error)
{
    const int index = wa_fit_find(group->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &group->fit->parameters[index];
    if (!wa_grow(&c->match->candidates, &c->capacity, c->match->candidate_count + 1,
                 sizeof *c->match->candidates)) {
        return wa_fail_memory(error);
    }
    const int form = representative(c, group, first, size);
    double log_prior = -INFINITY;
    for (size_t i = first; i < first + size; i++) {
        log_prior = wa_log_sum(log_prior, c->list->form_prior[group->forms[i]]);
    }
    const double log_mass =
        wa_log_mass_evidence(c->mass, c->purity, c->table->forms[form].molar_mass, amount->value,
                             amount->u, &amount->prior);
    c->match->candidates[c->match->candidate_count++] = (struct wa_candidate){
        .acid = group->acid,
        .form = form,
        .forms = &group->forms[first],
        .form_count = size,
        .log_weight = log_prior + group->log_curve + log_mass + c->list->form_observed[form],
        .log_prior = log_prior,
        .log_curve = group->log_curve,
        .log_mass = log_mass,
        .log_observed = c->list->form_observed[form],
        .row_doubted = group->row_doubted,
        .ln_amount = amount->value,
        .ln_amount_u = amount->u,
        .fit = group->fit,
        .sample = &group->sample,
    };
    return WA_OK;
}

enum wa_status wa_groups_candidates(const struct wa_table *table,
                                    const struct wa_titrated_mass *mass,
                                    const struct wa_purity *purity, struct wa_group_list *list,
                                    struct wa_match *match, struct wa_error *error)
{
    struct clustering c = {
        .table = table, .mass = mass, .purity = purity, .list = list, .match = match};
    enum wa_status status = WA_OK;
    for (size_t g = 0; status == WA_OK && g < list->count; g++) {
        struct wa_group *group = &list->groups[g];
        if (!isfinite(group->log_curve)) {
            continue;
        }
        sort_forms(&c, group);
        for (size_t first = 0, size; status == WA_OK && first < group->form_count; first += size) {
            size = cluster_size(&c, group, first);
            status = add_cluster(&c, group, first, size, error);
        }
    }
    return status;
}
