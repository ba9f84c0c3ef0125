/* Proton counts, constants, amount and molar mass from the generic fits. */
#include "identify/identify_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

static const double least_unknown = 0.1;   /* the table alone never rules out a charge */
static const double davies_trusted = 0.05; /* mol/L */
static const double edge_of_window = 0.3;  /* pH */

/* Charge that the acid's species starts from. */
static int start_charge(const struct wa_generic *generic)
{
    return generic->charge - generic->lost;
}

/* Of the start charges that generic acids with this many shown protons have, the one nearest to a
 * given charge. */
static int nearest_charge(const struct wa_proton_study *study, int shown, int charge)
{
    int best = 0, distance = 1000;
    for (int i = 0; i < study->count; i++) {
        const int here = start_charge(&study->generic[i]);
        if (study->generic[i].shown == shown && abs(here - charge) < distance) {
            distance = abs(here - charge);
            best = here;
        }
    }
    return best;
}

/* Share of one start charge by the table: of the candidates, those that it is nearest to. */
static double share_by_table(const struct wa_identification *work, int shown, int charge)
{
    double share = 0.0;
    for (int slot = 0; slot < WA_START_CHARGES; slot++) {
        if (nearest_charge(&work->study, shown, slot - WA_START_CHARGES / 2) == charge) {
            share += work->charge_weight[slot];
        }
    }
    return share;
}

/* Weights of the generic fits that show the same protons as the best: their evidence, shared out
 * between start charges as the candidates are, as far as the table is believed. */
static double fit_weight(const struct wa_identification *work, const struct wa_generic *generic)
{
    const struct wa_proton_study *study = &work->study;
    const int shown = study->generic[0].shown;
    double of_charge = 0.0, of_all = 0.0;
    if (generic->shown != shown) {
        return 0.0;
    }
    for (int i = 0; i < study->count; i++) {
        if (study->generic[i].shown == shown) {
            of_all += study->generic[i].probability;
            of_charge += start_charge(&study->generic[i]) == start_charge(generic)
                             ? study->generic[i].probability
                             : 0.0;
        }
    }
    const double unknown = fmax(work->match.not_in_table, least_unknown);
    const double by_table = share_by_table(work, shown, start_charge(generic));
    return generic->probability / of_charge *
           ((1.0 - unknown) * by_table + unknown * of_charge / of_all);
}

/* The step of a generic acid that is the k-th proton of this run, counted from the start. */
static int step_of(bool base, const struct wa_generic *generic, int k)
{
    return base ? generic->lost + k : generic->lost - 1 - k;
}

struct moments {
    double weight, mean, square;
};

static void add_moment(struct moments *moments, double weight, double value, double u)
{
    moments->weight += weight;
    moments->mean += weight * value;
    moments->square += weight * (value * value + u * u);
}

static void settle(const struct moments *moments, double *value, double *u)
{
    *value = moments->mean / moments->weight;
    *u = sqrt(fmax(moments->square / moments->weight - *value * *value, 0.0));
}

/* Mixed constant at the run's ionic strength: activity of H+, concentrations of the rest. */
static double apparent_shift(const struct wa_generic *generic, int step)
{
    const struct wa_fit *fit = &generic->fit;
    const double log10_gamma =
        wa_davies_log10_gamma(fit->ionic_strength, fit->titration.medium.debye_huckel_A,
                              fit->titration.davies_coefficient);
    const int z = generic->charge - step;
    /* K' = a(H) [A]/[HA] = K gamma_HA / gamma_A, and z^2 - (z-1)^2 = 2z - 1. */
    return -(2 * z - 1) * log10_gamma;
}

/* What the Davies equation leaves open for one step beyond its coefficient (design 2.2). */
static double davies_step_u(const struct wa_generic *generic, int step)
{
    const int z = generic->charge - step;
    return generic->fit.ionic_strength > davies_trusted ? 0.02 * abs(1 - 2 * z) / 2.0 : 0.0;
}

/* Whether a strong acid would fit as well: then the constant is only bounded from above. */
static enum wa_status could_be_strong(const struct wa_experiment *experiment,
                                      const struct wa_generic *generic, int step, bool *strong,
                                      struct wa_error *error)
{
    static const double strong_pK = -2.0;
    struct wa_sample_model sample = generic->sample;
    double start[WA_PARAMETERS_MAX];
    int count = 0;
    for (int i = 0; i < generic->fit.parameter_count; i++) {
        const struct wa_parameter *parameter = &generic->fit.parameters[i];
        if (parameter->kind != WA_PARAMETER_PK || parameter->step != step) {
            start[count++] = parameter->value;
        }
    }
    sample.parts[0].pK[step] = strong_pK;
    sample.parts[0].pK_u[step] = 0.0;
    struct wa_fit fit;
    const enum wa_status status = wa_fit_run(experiment, &sample, NULL, start, &fit, error);
    if (status == WA_OK) {
        /* 2 ln of the likelihood ratio against the 95 % point of chi squared. */
        *strong = fit.converged && 2.0 * (generic->fit.log_likelihood - fit.log_likelihood) < 3.84;
        wa_fit_free(&fit);
    }
    return status;
}

static void half_equivalence_of(const struct wa_curve *curve, int step, struct wa_result_pKa *pKa)
{
    pKa->half_equivalence = NAN;
    pKa->half_equivalence_u = NAN;
    for (size_t i = 0; i < curve->half_count; i++) {
        if (curve->halves[i].step == step && !curve->halves[i].merged) {
            pKa->half_equivalence = curve->halves[i].pKa;
            pKa->half_equivalence_u = curve->halves[i].u;
        }
    }
}

static enum wa_status set_bound(const struct wa_result *result, const struct wa_generic *best,
                                int step, struct wa_result_pKa *pKa, struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    double lowest = INFINITY, highest = -INFINITY;
    for (size_t p = 0; p < experiment->count; p++) {
        lowest = fmin(lowest, experiment->reading[p]);
        highest = fmax(highest, experiment->reading[p]);
    }
    enum wa_status status = WA_OK;
    bool strong = false;
    if (step == 0 && pKa->value < lowest + 1.0) {
        status = could_be_strong(experiment, best, step, &strong, error);
    }
    if (strong) {
        pKa->is_bound = true;
        snprintf(pKa->bound, sizeof pKa->bound, "below %.1f", pKa->value + 1.64 * pKa->u);
    } else if (pKa->value > highest - edge_of_window && pKa->u > 0.2) {
        pKa->is_bound = true;
        snprintf(pKa->bound, sizeof pKa->bound, "above %.1f", pKa->value - 1.64 * pKa->u);
    } else if (pKa->value < lowest + edge_of_window && pKa->u > 0.2) {
        pKa->is_bound = true;
        snprintf(pKa->bound, sizeof pKa->bound, "below %.1f", pKa->value + 1.64 * pKa->u);
    }
    return status;
}

/* One constant, averaged over the generic fits that show the same protons. */
static enum wa_status fill_pKa(const struct wa_identification *work, int k,
                               struct wa_result *result, struct wa_error *error)
{
    const bool base = result->experiments[0].titrant_is_base;
    const struct wa_generic *best = &work->study.generic[0];
    struct wa_result_pKa *pKa = &result->pKa[result->pKa_count];
    struct moments thermodynamic = {0.0, 0.0, 0.0}, apparent = {0.0, 0.0, 0.0};
    for (int i = 0; i < work->study.count; i++) {
        const struct wa_generic *generic = &work->study.generic[i];
        const double weight = fit_weight(work, generic);
        const int step = step_of(base, generic, k);
        const int index = wa_fit_find(&generic->fit, WA_PARAMETER_PK, 0, step);
        if (weight > 0.0 && index >= 0) {
            const struct wa_parameter *parameter = &generic->fit.parameters[index];
            const double activity_u = davies_step_u(generic, step);
            add_moment(&thermodynamic, weight, parameter->value, hypot(parameter->u, activity_u));
            add_moment(&apparent, weight, parameter->value + apparent_shift(generic, step),
                       parameter->u);
        }
    }
    *pKa = (struct wa_result_pKa){.step = k + 1,
                                  .ionic_strength = best->fit.ionic_strength,
                                  .temperature_C = result->experiments[0].temperature_C};
    settle(&thermodynamic, &pKa->value, &pKa->u);
    settle(&apparent, &pKa->apparent, &pKa->apparent_u);
    half_equivalence_of(&result->curves[0], k + 1, pKa);
    result->pKa_count++;
    return set_bound(result, best, step_of(base, best, k), pKa, error);
}

static void fill_counts(const struct wa_proton_study *study, struct wa_result *result)
{
    result->proton_count = study->generic[0].shown;
    result->proton_probability = study->by_count[result->proton_count];
    for (int count = 0; count <= WA_PROTONS_MAX; count++) {
        if (study->by_count[count] > result->proton_probability) {
            result->proton_count = count;
            result->proton_probability = study->by_count[count];
        }
    }
    for (int count = 0; count <= WA_PROTONS_MAX; count++) {
        const size_t slot = result->proton_alternative_count;
        if (count != result->proton_count && study->by_count[count] > 1e-4 &&
            slot < sizeof result->proton_alternatives / sizeof result->proton_alternatives[0]) {
            result->proton_alternatives[slot] =
                (struct wa_proton_count){count, study->by_count[count]};
            result->proton_alternative_count++;
        }
    }
}

static char *unseen_sentence(const struct wa_experiment *experiment)
{
    double lowest = INFINITY, highest = -INFINITY;
    for (size_t p = 0; p < experiment->count; p++) {
        lowest = fmin(lowest, experiment->reading[p]);
        highest = fmax(highest, experiment->reading[p]);
    }
    if (experiment->titrant_is_base) {
        return wa_sentence("Protons with a pKa above about %.1f cannot be seen by this "
                           "titration; one with a pKa below about %.1f shows as strong acid, "
                           "without its constant.",
                           highest - 0.5, fmax(lowest - 0.5, 1.0));
    }
    return wa_sentence("Protons taken up with a pKa below about %.1f cannot be seen by this "
                       "titration; a base with a pKa above about %.1f shows as strong base, "
                       "without its constant.",
                       lowest + 0.5, highest + 0.5);
}

static void fill_amount(const struct wa_identification *work, struct wa_result *result)
{
    const struct wa_generic *best = &work->study.generic[0];
    const int index = wa_fit_find(&best->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_parameter *amount = &best->fit.parameters[index];
    const struct wa_titrated_mass *mass = &work->mass;
    result->amount_mol = exp(amount->value);
    result->amount_u = result->amount_mol * amount->u;
    if (mass->known) {
        const double u = hypot(amount->u, mass->u_g / mass->mass_g);
        result->molar_mass = mass->mass_g / result->amount_mol;
        result->molar_mass_u = result->molar_mass * u;
        const int shown = best->shown > 0 ? best->shown : 1;
        result->equivalent_mass = result->molar_mass / shown;
        result->equivalent_mass_u = result->molar_mass_u / shown;
    }
}

enum wa_status wa_fill_protons(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error)
{
    result->amount_mol = result->amount_u = NAN;
    result->molar_mass = result->molar_mass_u = NAN;
    result->equivalent_mass = result->equivalent_mass_u = NAN;
    result->unseen = unseen_sentence(&result->experiments[0]);
    if (result->unseen == NULL) {
        return wa_fail_memory(error);
    }
    if (work->study.count == 0) {
        return WA_OK;
    }
    fill_counts(&work->study, result);
    fill_amount(work, result);
    result->molar_mass_assumes =
        wa_sentence("one formula unit %s %d proton%s in this titration and the sample is pure",
                    result->experiments[0].titrant_is_base ? "gives up" : "takes up",
                    work->study.generic[0].shown, work->study.generic[0].shown == 1 ? "" : "s");
    if (result->molar_mass_assumes == NULL) {
        return wa_fail_memory(error);
    }
    enum wa_status status = WA_OK;
    for (int k = 0; status == WA_OK && k < work->study.generic[0].shown &&
                    !result->experiments[0].uncalibrated;
         k++) {
        status = fill_pKa(work, k, result, error);
    }
    return status;
}
