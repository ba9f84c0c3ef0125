/* From the forms of the table to the distinct models of what is in the beaker. */
#include "match/match_internal.h"

#include "base/grow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Constants this far outside any reading are held: nothing could move them. */
static const double held_below = -1.0;
static const double held_above = 14.5;
static const double least_pKa_u = 0.012;
static const double davies_step_u = 0.02;  /* for |delta z^2| = 2, beyond the limit below */
static const double davies_trusted = 0.05; /* mol/L */

static void set_part(const struct wa_table *table, const struct wa_form_part *from,
                     double temperature_C, double ionic_strength, struct wa_model_part *part)
{
    const struct wa_acid *acid = &table->acids[from->acid];
    *part = (struct wa_model_part){.charge = acid->charge,
                                   .step_count = acid->step_count,
                                   .count = from->count,
                                   .solubility = INFINITY};
    for (int i = 0; i < acid->step_count; i++) {
        double u;
        const double pK = wa_step_pKa_at(&acid->steps[i], temperature_C, &u);
        /* Davies is several hundredths off for highly charged ions (design 2.2). */
        const int z = acid->charge - i;
        const double davies_u =
            ionic_strength > davies_trusted ? davies_step_u * abs(1 - 2 * z) / 2.0 : 0.0;
        part->pK[i] = pK;
        part->pK_u[i] = pK < held_below || pK > held_above
                            ? 0.0
                            : sqrt(u * u + davies_u * davies_u + least_pKa_u * least_pKa_u);
        part->pK_slope[i] = wa_step_pKa_at(&acid->steps[i], temperature_C + 0.5, NULL) -
                            wa_step_pKa_at(&acid->steps[i], temperature_C - 0.5, NULL);
    }
}

void wa_match_sample(const struct wa_table *table, const struct wa_form *form,
                     const struct wa_experiment *experiment, double ionic_strength,
                     const struct wa_prior *ln_amount, struct wa_sample_model *sample)
{
    *sample = (struct wa_sample_model){.substance_count = 1};
    sample->ln_amount[0] = *ln_amount;
    sample->spectator_charge[0] = form->spectator_charge;
    sample->spectator_z2[0] = form->spectator_z2;
    for (int k = 0; k < form->part_count; k++) {
        if (form->parts[k].acid != WA_PART_WATER) {
            set_part(table, &form->parts[k], experiment->temperature_C, ionic_strength,
                     &sample->parts[sample->part_count++]);
        }
    }
}

/* Whether two forms bring the same ions: the same systems in the same state. */
static int compare_models(const struct wa_form *a, const struct wa_form *b)
{
    if (a->part_count != b->part_count) {
        return a->part_count < b->part_count ? -1 : 1;
    }
    for (int k = 0; k < a->part_count; k++) {
        const struct wa_form_part *x = &a->parts[k], *y = &b->parts[k];
        const int order[3] = {x->acid - y->acid, x->count - y->count, x->lost - y->lost};
        for (int i = 0; i < 3; i++) {
            if (order[i] != 0) {
                return order[i];
            }
        }
    }
    return (a->spectator_z2 > b->spectator_z2) - (a->spectator_z2 < b->spectator_z2);
}

static int compare_form_pointers(const void *a, const void *b)
{
    const struct wa_form *x = *(const struct wa_form *const *)a;
    const struct wa_form *y = *(const struct wa_form *const *)b;
    const int order = compare_models(x, y);
    return order != 0 ? order : (x > y) - (x < y);
}

static int first_acid(const struct wa_form *form)
{
    for (int k = 0; k < form->part_count; k++) {
        if (form->parts[k].acid != WA_PART_WATER) {
            return form->parts[k].acid;
        }
    }
    return WA_PART_WATER;
}

/* Whether a closed set asks for a form: by its own key or by its acid system. */
static enum wa_status mark_asked(const struct wa_table *table,
                                 const struct wa_match_options *options, bool *asked,
                                 struct wa_error *error)
{
    const bool closed = options != NULL && options->among_count > 0;
    for (size_t f = 0; f < table->form_count; f++) {
        asked[f] = !closed && table->forms[f].modelled;
    }
    for (size_t i = 0; closed && i < options->among_count; i++) {
        const int form = wa_table_find_form(table, options->among[i]);
        const int acid = wa_table_find_acid(table, options->among[i]);
        if (form < 0 && acid < 0) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                           "The table has no acid or form '%s'; 'whichacid table list' shows "
                           "the keys.",
                           options->among[i]);
        }
        if (form >= 0) {
            asked[form] = true;
        }
        for (size_t f = 0; acid >= 0 && f < table->form_count; f++) {
            asked[f] =
                asked[f] || (first_acid(&table->forms[f]) == acid && table->forms[f].modelled);
        }
    }
    return WA_OK;
}

bool wa_form_is_meant(const struct wa_table *table, int form, const char *name)
{
    return wa_table_find_form(table, name) == form ||
           (wa_table_find_acid(table, name) >= 0 &&
            wa_table_find_acid(table, name) == first_acid(&table->forms[form]));
}

static enum wa_status add_form(const struct wa_table *table, const struct wa_form *form,
                               struct wa_group *group, struct wa_error *error)
{
    int *larger = realloc(group->forms, (group->form_count + 1) * sizeof *larger);
    if (larger == NULL) {
        return wa_fail_memory(error);
    }
    group->forms = larger;
    group->forms[group->form_count++] = (int)(form - table->forms);
    return WA_OK;
}

static enum wa_status group_forms(const struct wa_table *table,
                                  const struct wa_experiment *experiment, double ionic_strength,
                                  const struct wa_prior *ln_amount, const struct wa_form **forms,
                                  size_t form_count, struct wa_group_list *list,
                                  struct wa_error *error)
{
    size_t capacity = 0;
    qsort(forms, form_count, sizeof *forms, compare_form_pointers);
    for (size_t i = 0; i < form_count; i++) {
        if (i == 0 || compare_models(forms[i - 1], forms[i]) != 0) {
            if (!wa_grow(&list->groups, &capacity, list->count + 1, sizeof *list->groups)) {
                return wa_fail_memory(error);
            }
            struct wa_group *group = &list->groups[list->count++];
            *group = (struct wa_group){.acid = first_acid(forms[i])};
            wa_match_sample(table, forms[i], experiment, ionic_strength, ln_amount, &group->sample);
            wa_group_solubility(table, experiment->temperature_C, group);
        }
        const enum wa_status status =
            add_form(table, forms[i], &list->groups[list->count - 1], error);
        if (status != WA_OK) {
            return status;
        }
    }
    list->form_count = form_count;
    return WA_OK;
}

enum wa_status wa_groups_collect(const struct wa_table *table,
                                 const struct wa_experiment *experiment, double ionic_strength,
                                 const struct wa_prior *ln_amount,
                                 const struct wa_match_options *options, struct wa_group_list *list,
                                 struct wa_error *error)
{
    *list = (struct wa_group_list){.count = 0};
    bool *asked = calloc(table->form_count + 1, sizeof *asked);
    const struct wa_form **forms = calloc(table->form_count + 1, sizeof *forms);
    enum wa_status status = WA_OK;
    size_t form_count = 0;
    if (asked == NULL || forms == NULL) {
        status = wa_fail_memory(error);
    }
    if (status == WA_OK) {
        status = mark_asked(table, options, asked, error);
    }
    for (size_t f = 0; status == WA_OK && f < table->form_count; f++) {
        if (asked[f]) {
            forms[form_count++] = &table->forms[f];
        }
    }
    if (status == WA_OK) {
        status = group_forms(table, experiment, ionic_strength, ln_amount, forms, form_count, list,
                             error);
    }
    if (status == WA_OK) {
        status = wa_groups_priors(table, options, list, error);
    }
    free(asked);
    free(forms);
    if (status != WA_OK) {
        wa_groups_free(list);
    }
    return status;
}

void wa_groups_free(struct wa_group_list *list)
{
    if (list != NULL) {
        for (size_t g = 0; g < list->count; g++) {
            free(list->groups[g].forms);
            wa_fit_free(list->groups[g].fit);
            free(list->groups[g].fit);
        }
        free(list->groups);
        free(list->form_prior);
        free(list->form_observed);
        *list = (struct wa_group_list){.count = 0};
    }
}
