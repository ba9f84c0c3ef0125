/* Expected information of further observations, by simulation from the posterior. */
#include "whichacid/expected.h"

#include "match/expected_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const int draws = 200;
static const double ln2 = 0.69314718055994531;
static const double considered_from = 1e-4; /* probability */
static const double same_mass = 1e-4;       /* relative */

/* Expand candidates into forms of distinct mass. */
static void add_entities(const struct wa_table *table, const struct wa_candidate *candidate,
                         struct wa_outlook *outlook)
{
    const size_t first = outlook->count;
    for (size_t i = 0; i < candidate->form_count; i++) {
        const double molar_mass = table->forms[candidate->forms[i]].molar_mass;
        const double share = candidate->probability / (double)candidate->form_count;
        size_t k = first;
        while (k < outlook->count &&
               fabs(outlook->entities[k].molar_mass / molar_mass - 1.0) > same_mass) {
            k++;
        }
        if (k == outlook->count && k < OUTLOOK_FORMS_MAX) {
            outlook->entities[outlook->count++] =
                (struct wa_outlook_form){.form = candidate->forms[i],
                                         .molar_mass = molar_mass,
                                         .fit = candidate->fit,
                                         .sample = candidate->sample};
        }
        if (k < outlook->count) {
            outlook->entities[k].probability += share;
        }
    }
}

static void collect(const struct wa_proton_study *study, const struct wa_table *table,
                    const struct wa_match *match, struct wa_outlook *outlook)
{
    double sum = 0.0;
    for (size_t i = 0; i < match->candidate_count; i++) {
        if (match->candidates[i].probability > considered_from) {
            add_entities(table, &match->candidates[i], outlook);
        }
    }
    if (match->not_in_table > considered_from && outlook->count < OUTLOOK_FORMS_MAX) {
        outlook->entities[outlook->count++] =
            (struct wa_outlook_form){.form = -1,
                                     .probability = match->not_in_table,
                                     .fit = &study->generic[0].fit,
                                     .sample = &study->generic[0].sample};
    }
    for (size_t k = 0; k < outlook->count; k++) {
        sum += outlook->entities[k].probability;
    }
    for (size_t k = 0; k < outlook->count; k++) {
        outlook->entities[k].probability /= sum;
    }
}

static int descending(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x < y) - (x > y);
}

/* Entropy in bits, and how many hold the threshold. */
static double entropy(const double *probability, size_t count, double threshold, double *set_size)
{
    double sorted[OUTLOOK_FORMS_MAX], bits = 0.0, share = 0.0;
    memcpy(sorted, probability, count * sizeof *sorted);
    qsort(sorted, count, sizeof *sorted, descending);
    *set_size = 0.0;
    for (size_t k = 0; k < count; k++) {
        bits -= sorted[k] > 0.0 ? sorted[k] * log(sorted[k]) / ln2 : 0.0;
        *set_size += share < threshold ? 1.0 : 0.0;
        share += sorted[k];
    }
    return bits;
}

static size_t draw_form(const struct wa_outlook *outlook, uint64_t *state)
{
    double left = wa_draw_uniform(state);
    size_t k = 0;
    while (k + 1 < outlook->count && left > outlook->entities[k].probability) {
        left -= outlook->entities[k++].probability;
    }
    return k;
}

void wa_outlook_simulate(const struct wa_outlook *outlook, double threshold, wa_outlook_draw *draw,
                         void *context, struct wa_expected *expected)
{
    uint64_t state = 0x9E3779B97F4A7C15u;
    double bits = 0.0, sets = 0.0, before_set;
    double now[OUTLOOK_FORMS_MAX], log_likelihood[OUTLOOK_FORMS_MAX];
    for (size_t k = 0; k < outlook->count; k++) {
        now[k] = outlook->entities[k].probability;
    }
    const double before = entropy(now, outlook->count, threshold, &before_set);
    for (int i = 0; i < draws; i++) {
        double total = -INFINITY, set_size;
        draw(outlook, draw_form(outlook, &state), &state, context, log_likelihood);
        for (size_t k = 0; k < outlook->count; k++) {
            log_likelihood[k] += log(outlook->entities[k].probability);
            total = wa_log_sum(total, log_likelihood[k]);
        }
        for (size_t k = 0; k < outlook->count; k++) {
            now[k] =
                isfinite(total) ? exp(log_likelihood[k] - total) : outlook->entities[k].probability;
        }
        bits += entropy(now, outlook->count, threshold, &set_size) / draws;
        sets += set_size / draws;
    }
    expected->bits = before - bits;
    expected->set_size = sets;
}

/* Weighing the sample. */
static void draw_mass(const struct wa_outlook *outlook, size_t truth, uint64_t *state,
                      void *context, double *log_likelihood)
{
    const struct wa_purity purity = wa_purity_default();
    const struct wa_outlook_form *form = &outlook->entities[truth];
    (void)context;
    double ln_molar_mass = log(form->molar_mass);
    if (form->form < 0) {
        ln_molar_mass = log(WA_MOLAR_MASS_LOW) +
                        wa_draw_uniform(state) * log(WA_MOLAR_MASS_HIGH / WA_MOLAR_MASS_LOW);
    }
    const double ln_purity =
        wa_draw_uniform(state) < purity.reagent_share
            ? purity.reagent_ln_mean + purity.reagent_ln_u * wa_draw_normal(state)
            : -fabs(purity.found_ln_s * wa_draw_normal(state));
    int index = wa_fit_find(form->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &form->fit->parameters[index];
    const double ln_mass =
        ln_molar_mass + amount->value + amount->u * wa_draw_normal(state) - ln_purity;
    const struct wa_titrated_mass mass = {
        .known = true, .mass_g = exp(ln_mass), .u_g = 1e-3 * exp(ln_mass)};
    for (size_t k = 0; k < outlook->count; k++) {
        const struct wa_outlook_form *other = &outlook->entities[k];
        index = wa_fit_find(other->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
        amount = &other->fit->parameters[index];
        log_likelihood[k] = other->form < 0
                                ? wa_log_mass_evidence_generic(&mass, amount->value, &amount->prior)
                                : wa_log_mass_evidence(&mass, &purity, other->molar_mass,
                                                       amount->value, amount->u, &amount->prior);
    }
}

/* An observation that is no titration. */
struct looking {
    const struct wa_table *table;
    enum wa_observation_kind kind;
};

static void draw_observation(const struct wa_outlook *outlook, size_t truth, uint64_t *state,
                             void *context, double *log_likelihood)
{
    const struct looking *looking = context;
    struct wa_observation seen;
    const int form = outlook->entities[truth].form;
    wa_observation_draw(looking->table, form >= 0 ? &looking->table->forms[form] : NULL,
                        looking->kind, state, &seen);
    for (size_t k = 0; k < outlook->count; k++) {
        const int other = outlook->entities[k].form;
        log_likelihood[k] = wa_observation_log_likelihood(
            looking->table, other >= 0 ? &looking->table->forms[other] : NULL, &seen);
    }
}

static void add(struct wa_expectations *expectations, const struct wa_expected *expected)
{
    size_t at = expectations->count < WA_EXPECTED_MAX ? expectations->count++ : WA_EXPECTED_MAX - 1;
    while (at > 0 && expectations->list[at - 1].bits < expected->bits) {
        expectations->list[at] = expectations->list[at - 1];
        at--;
    }
    expectations->list[at] = *expected;
}

enum wa_status wa_match_expect(const struct wa_experiment *experiment,
                               const struct wa_proton_study *study,
                               const struct wa_titrated_mass *mass, const struct wa_table *table,
                               const struct wa_match *match, double threshold,
                               struct wa_expectations *expectations, struct wa_error *error)
{
    struct wa_outlook outlook = {.count = 0};
    double now[OUTLOOK_FORMS_MAX];
    *expectations = (struct wa_expectations){.count = 0};
    collect(study, table, match, &outlook);
    if (outlook.count < 2) {
        return WA_OK;
    }
    for (size_t k = 0; k < outlook.count; k++) {
        now[k] = outlook.entities[k].probability;
    }
    expectations->bits = entropy(now, outlook.count, threshold, &expectations->set_size);
    if (!mass->known) {
        struct wa_expected expected = {.kind = WA_EXPECTED_MASS};
        wa_outlook_simulate(&outlook, threshold, draw_mass, NULL, &expected);
        add(expectations, &expected);
    }
    for (int kind = 0; kind < WA_OBSERVED_KINDS; kind++) {
        struct looking looking = {.table = table, .kind = (enum wa_observation_kind)kind};
        struct wa_expected expected = {.kind = WA_EXPECTED_OBSERVATION,
                                       .observation = looking.kind};
        wa_outlook_simulate(&outlook, threshold, draw_observation, &looking, &expected);
        add(expectations, &expected);
    }
    struct wa_expected runs[OUTLOOK_RUNS_MAX];
    size_t run_count;
    const enum wa_status status =
        wa_outlook_runs(experiment, &outlook, threshold, runs, &run_count, error);
    for (size_t i = 0; status == WA_OK && i < run_count; i++) {
        add(expectations, &runs[i]);
    }
    return status;
}
