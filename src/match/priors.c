/* What the forms weigh before the data: even over acid systems, then over the forms of one, with
 * enantiomers and racemates as one group; or as a laboratory says. */
#include "match/match_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double same_mass = 1e-4; /* relative */

/* One form in question, and what it counts with. */
struct entry {
    int form;
    int system; /* first acid of its group, or acid_count for hydroxides alone */
    double molar_mass;
    double share; /* even share, then the laboratory's */
    bool listed;
};

/* Enantiomers and racemates have systems of their own, joined by a group. */
static int system_of(const struct wa_table *table, int acid)
{
    if (acid < 0) {
        return (int)table->acid_count;
    }
    const char *group = table->acids[acid].group;
    for (int i = 0; group != NULL && group[0] != '\0' && i < acid; i++) {
        if (table->acids[i].group != NULL && strcmp(table->acids[i].group, group) == 0) {
            return i;
        }
    }
    return acid;
}

static int by_system_and_mass(const void *a, const void *b)
{
    const struct entry *x = a, *y = b;
    if (x->system != y->system) {
        return x->system < y->system ? -1 : 1;
    }
    return (x->molar_mass > y->molar_mass) - (x->molar_mass < y->molar_mass);
}

static size_t collect(const struct wa_table *table, const struct wa_group_list *list,
                      struct entry *entries)
{
    size_t count = 0;
    for (size_t g = 0; g < list->count; g++) {
        for (size_t i = 0; i < list->groups[g].form_count; i++) {
            const int form = list->groups[g].forms[i];
            entries[count++] = (struct entry){.form = form,
                                              .system = system_of(table, list->groups[g].acid),
                                              .molar_mass = table->forms[form].molar_mass};
        }
    }
    qsort(entries, count, sizeof *entries, by_system_and_mass);
    return count;
}

/* Number of entries from `first` on that weigh the same. */
static size_t alike(const struct entry *entries, size_t first, size_t end)
{
    size_t count = 1;
    while (first + count < end &&
           entries[first + count].molar_mass < entries[first].molar_mass * (1.0 + same_mass)) {
        count++;
    }
    return count;
}

/* One system: an even share for each distinct mass, shared by those that have it. */
static void share_system(struct entry *entries, size_t first, size_t end)
{
    size_t distinct = 0;
    for (size_t i = first; i < end; i += alike(entries, i, end)) {
        distinct++;
    }
    for (size_t i = first; i < end;) {
        const size_t count = alike(entries, i, end);
        for (size_t k = i; k < i + count; k++) {
            entries[k].share = 1.0 / (double)distinct / (double)count;
        }
        i += count;
    }
}

static void share_evenly(struct entry *entries, size_t count)
{
    size_t systems = 0;
    for (size_t first = 0, end; first < count; first = end) {
        end = first + 1;
        while (end < count && entries[end].system == entries[first].system) {
            end++;
        }
        share_system(entries, first, end);
        systems++;
    }
    for (size_t i = 0; i < count; i++) {
        entries[i].share /= (double)systems;
    }
}

static bool is_meant(const struct wa_table *table, const struct entry *entry,
                     const struct wa_weight *weight)
{
    if (weight->form >= 0) {
        return weight->form == entry->form;
    }
    const struct wa_form *form = &table->forms[entry->form];
    int part = 0;
    while (part + 1 < form->part_count && form->parts[part].acid == WA_PART_WATER) {
        part++;
    }
    return form->part_count > 0 && form->parts[part].acid == weight->acid;
}

/* Give the forms that a row means its weight, in the proportion of their even shares. Rows that
 * name a form come first, so that an acid's row means its other forms. */
static double spread(const struct wa_table *table, const struct wa_weight *weight,
                     struct entry *entries, size_t count, double *laid)
{
    double even = 0.0;
    for (size_t i = 0; i < count; i++) {
        even += !entries[i].listed && is_meant(table, &entries[i], weight) ? entries[i].share : 0.0;
    }
    for (size_t i = 0; even > 0.0 && i < count; i++) {
        if (!entries[i].listed && is_meant(table, &entries[i], weight)) {
            laid[i] = weight->weight * entries[i].share / even;
            entries[i].listed = true;
        }
    }
    return even > 0.0 ? weight->weight : 0.0;
}

static enum wa_status share_as_told(const struct wa_table *table, const struct wa_weight_list *told,
                                    struct entry *entries, size_t count, struct wa_group_list *list,
                                    struct wa_error *error)
{
    double *laid = calloc(count + 1, sizeof *laid);
    double listed = 0.0, others = 0.0;
    if (laid == NULL) {
        return wa_fail_memory(error);
    }
    for (int forms_first = 1; forms_first >= 0; forms_first--) {
        for (size_t w = 0; w < told->count; w++) {
            if ((told->weights[w].form >= 0) == (forms_first == 1)) {
                listed += spread(table, &told->weights[w], entries, count, laid);
            }
        }
    }
    for (size_t i = 0; i < count; i++) {
        others += entries[i].listed ? 0.0 : entries[i].share;
    }
    double rest = isnan(told->rest) ? listed * WA_WEIGHT_REST_SHARE / (1.0 - WA_WEIGHT_REST_SHARE)
                                    : told->rest;
    rest = others > 0.0 ? rest : 0.0;
    const double sum = listed + rest;
    for (size_t i = 0; i < count; i++) {
        entries[i].share = (entries[i].listed ? laid[i] : rest * entries[i].share / others) / sum;
    }
    if (!isnan(told->not_in_table)) {
        list->not_in_table = told->not_in_table / (told->not_in_table + sum);
    }
    free(laid);
    return sum > 0.0 ? WA_OK
                     : wa_fail(error, WA_ERROR_CALL, NULL, 0,
                               "No form that is compared has a prior weight above 0.");
}

static void observe(const struct wa_table *table, const struct wa_match_options *options,
                    struct wa_group_list *list)
{
    for (size_t k = 0; options != NULL && k < options->observed_count; k++) {
        for (size_t f = 0; f < table->form_count; f++) {
            list->form_observed[f] +=
                wa_observation_log_likelihood(table, &table->forms[f], &options->observed[k]);
        }
        list->unknown_observed += wa_observation_log_likelihood(table, NULL, &options->observed[k]);
    }
}

enum wa_status wa_groups_priors(const struct wa_table *table,
                                const struct wa_match_options *options, struct wa_group_list *list,
                                struct wa_error *error)
{
    const bool closed = options != NULL && options->among_count > 0;
    struct entry *entries = calloc(list->form_count + 1, sizeof *entries);
    list->form_prior = calloc(table->form_count + 1, sizeof *list->form_prior);
    list->form_observed = calloc(table->form_count + 1, sizeof *list->form_observed);
    if (entries == NULL || list->form_prior == NULL || list->form_observed == NULL) {
        free(entries);
        return wa_fail_memory(error);
    }
    const size_t count = collect(table, list, entries);
    enum wa_status status = WA_OK;
    list->not_in_table = WA_NOT_IN_TABLE_PRIOR;
    share_evenly(entries, count);
    if (options != NULL && options->prior != NULL) {
        status = share_as_told(table, options->prior, entries, count, list, error);
    }
    list->not_in_table = closed ? 0.0 : list->not_in_table;
    for (size_t f = 0; f < table->form_count; f++) {
        list->form_prior[f] = -INFINITY;
    }
    for (size_t i = 0; i < count; i++) {
        list->form_prior[entries[i].form] = log(entries[i].share * (1.0 - list->not_in_table));
    }
    observe(table, options, list);
    free(entries);
    return status;
}
