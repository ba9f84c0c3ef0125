/* When the data prefer more than one pure acid: what is in the beaker, in words, and which pairs of
 * the table would explain two acids. */
#include "identify/identify_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdlib.h>

static const double named_from = 0.5;        /* probability from which an explanation is named */
static const double constant_model_u = 0.06; /* pK, activity type included */
static const double pair_mass_u = 0.015;     /* relative: purity of two substances */
static const double within = 3.0;            /* combined u */
static const size_t pairs_listed = 3;

/* How far an acid's constants lie from those of one fitted substance, as a sum of squares; INFINITY
 * when the steps that the run could see do not match. */
static double distance(const struct wa_acid *acid, const struct wa_fit *fit, int part, int steps,
                       double temperature_C)
{
    double sum = 0.0;
    if (!acid->modelled || acid->step_count < steps) {
        return INFINITY;
    }
    for (int i = 0; i < steps; i++) {
        const int index = wa_fit_find(fit, WA_PARAMETER_PK, part, i);
        const struct wa_parameter *fitted = &fit->parameters[index];
        double u;
        const double pKa = wa_step_pKa_at(&acid->steps[i], temperature_C, &u);
        const double deviation =
            (fitted->value - pKa) / hypot(hypot(fitted->u, u), constant_model_u);
        sum += deviation * deviation;
    }
    return sum < within * within * steps ? sum : INFINITY;
}

struct pair {
    int form[2];
    double score;
};

/* A pair's score: constants, and the mass when it was noted. */
static double pair_score(const struct wa_identification *work, const struct wa_explanations *found,
                         const struct wa_form *const form[2], const double constants[2])
{
    double score = constants[0] + constants[1];
    if (work->mass.known) {
        double mass = 0.0;
        for (int a = 0; a < 2; a++) {
            const int index = wa_fit_find(&found->two_fit, WA_PARAMETER_LN_AMOUNT, a, 0);
            mass += exp(found->two_fit.parameters[index].value) * form[a]->molar_mass;
        }
        const double deviation = (mass / work->mass.mass_g - 1.0) / pair_mass_u;
        score += deviation * deviation;
    }
    return score;
}

static void keep_pair(struct pair *best, size_t *count, struct pair pair)
{
    size_t at = *count;
    while (at > 0 && pair.score < best[at - 1].score) {
        if (at < pairs_listed) {
            best[at] = best[at - 1];
        }
        at--;
    }
    if (at < pairs_listed) {
        best[at] = pair;
        *count += *count < pairs_listed ? 1 : 0;
    }
}

/* Whether a form brings one molecule of one acid system, in the state the fit took it in. */
static bool is_plain(const struct wa_form *form, const struct wa_model_part *part,
                     const struct wa_acid *acid)
{
    const int lost = form->part_count == 1 ? form->parts[0].lost : -1;
    const bool fresh = part->charge == 0 ? lost == 0 : lost == acid->step_count;
    return form->modelled && form->part_count == 1 && form->parts[0].acid != WA_PART_WATER &&
           form->parts[0].count == 1 && fresh;
}

/* Distance of every form from one of the two substances. */
static double *form_distances(const struct wa_identification *work,
                              const struct wa_explanations *found, int substance,
                              double temperature_C)
{
    const struct wa_table *table = work->table;
    const struct wa_model_part *part = &found->two_sample.parts[substance];
    double *result = malloc((table->form_count + 1) * sizeof *result);
    for (size_t f = 0; result != NULL && f < table->form_count; f++) {
        const struct wa_form *form = &table->forms[f];
        result[f] = INFINITY;
        if (form->part_count == 1 && form->parts[0].acid >= 0) {
            const struct wa_acid *acid = &table->acids[form->parts[0].acid];
            if (is_plain(form, part, acid)) {
                result[f] =
                    distance(acid, &found->two_fit, substance, part->step_count, temperature_C);
            }
        }
    }
    return result;
}

static enum wa_status find_pairs(const struct wa_identification *work,
                                 const struct wa_explanations *found, double temperature_C,
                                 struct pair *best, size_t *count, struct wa_error *error)
{
    const struct wa_table *table = work->table;
    double *distances[2];
    for (int a = 0; a < 2; a++) {
        distances[a] = form_distances(work, found, a, temperature_C);
    }
    const bool enough = distances[0] != NULL && distances[1] != NULL;
    for (size_t f = 0; enough && f < table->form_count; f++) {
        for (size_t g = 0; isfinite(distances[0][f]) && g < table->form_count; g++) {
            if (isfinite(distances[1][g])) {
                const struct wa_form *const forms[2] = {&table->forms[f], &table->forms[g]};
                const double constants[2] = {distances[0][f], distances[1][g]};
                keep_pair(
                    best, count,
                    (struct pair){{(int)f, (int)g}, pair_score(work, found, forms, constants)});
            }
        }
    }
    free(distances[0]);
    free(distances[1]);
    return enough ? WA_OK : wa_fail_memory(error);
}

static void append_substance(const struct wa_explanations *found, int substance,
                             struct wa_text *text)
{
    const struct wa_fit *fit = &found->two_fit;
    const int amount = wa_fit_find(fit, WA_PARAMETER_LN_AMOUNT, substance, 0);
    wa_text_append(text, "%.3f mmol with pKa", 1e3 * exp(fit->parameters[amount].value));
    for (int i = 0; i < found->two_sample.parts[substance].step_count; i++) {
        const int index = wa_fit_find(fit, WA_PARAMETER_PK, substance, i);
        wa_text_append(text, "%s %.2f", i == 0 ? "" : " and", fit->parameters[index].value);
    }
}

static char *two_acids_sentence(const struct wa_identification *work,
                                const struct wa_explanations *found, const struct pair *pairs,
                                size_t count)
{
    struct wa_text text = {.bytes = NULL};
    wa_text_append(&text, "The data prefer two %s (probability %s%.1f %%): ",
                   found->two_sample.parts[0].charge == 0 ? "acids" : "bases",
                   found->probability[WA_EXPLANATION_TWO_ACIDS] > 0.999 ? "above " : "",
                   fmin(100.0 * found->probability[WA_EXPLANATION_TWO_ACIDS], 99.9));
    append_substance(found, 0, &text);
    wa_text_append(&text, ", and ");
    append_substance(found, 1, &text);
    wa_text_append(&text, ".");
    for (size_t i = 0; i < count; i++) {
        wa_text_append(&text, "%s%s with %s", i == 0 ? " Pairs of the table that fit: " : "; ",
                       work->table->forms[pairs[i].form[0]].name,
                       work->table->forms[pairs[i].form[1]].name);
    }
    wa_text_append(&text, "%s", count > 0 ? "." : "");
    if (text.failed) {
        wa_text_free(&text);
        return NULL;
    }
    return text.bytes;
}

static char *excess_sentence(const struct wa_experiment *experiment,
                             const struct wa_explanations *found)
{
    const bool acid = found->excess_mol > 0.0;
    const char *what = acid ? "strong acid" : "strong base";
    const bool used_up = acid != experiment->titrant_is_base;
    char amount[64];
    wa_quantity_format(amount, sizeof amount, 1e3 * fabs(found->excess_mol), 1e3 * found->excess_u);
    return wa_sentence("The data prefer %s beside the sample, %s mmol (probability %s%.1f %%)%s.",
                       what, amount,
                       found->probability[WA_EXPLANATION_EXCESS] > 0.999 ? "above " : "",
                       fmin(100.0 * found->probability[WA_EXPLANATION_EXCESS], 99.9),
                       used_up ? ": the sample is partly neutralized, or partly a salt" : "");
}

enum wa_status wa_fill_mixture(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error)
{
    const struct wa_explanations *found = &work->explanations;
    enum wa_status status = WA_OK;
    if (found->probability[WA_EXPLANATION_EXCESS] > named_from) {
        status = wa_add_sentence(&result->findings, &result->finding_count, "strong-acid-or-base",
                                 excess_sentence(&result->experiments[0], found), error);
    }
    if (status == WA_OK && found->probability[WA_EXPLANATION_TWO_ACIDS] > named_from) {
        struct pair pairs[3];
        size_t count = 0;
        status =
            find_pairs(work, found, result->experiments[0].temperature_C, pairs, &count, error);
        if (status == WA_OK) {
            status = wa_add_sentence(&result->findings, &result->finding_count, "two-acids",
                                     two_acids_sentence(work, found, pairs, count), error);
        }
    }
    return status;
}
