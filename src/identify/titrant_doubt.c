/* Wrong titrant concentration: every volume fits, and the mass fits no substance unless the titrant
 * was stronger or weaker than noted. The curve alone hardly shows it, because the amount follows
 * the concentration; a mass and a substance whose constants fit do. */
#include "identify/identify_internal.h"

#include "match/match_internal.h"

#include <math.h>
#include <stdlib.h>

static const double wrong_ln_u = 0.09; /* of the concentration, when it is wrong */
static const double least_wrong = 0.03;
static const double said_from = 2.3; /* ln of the evidence ratio */

static double log_normal(double value, double mean, double u)
{
    const double deviation = (value - mean) / u;
    return -0.5 * deviation * deviation - log(u) - 0.5 * log(2.0 * M_PI);
}

/* ln of the amount found over that which the mass would give of this form. */
static double surplus_of(const struct wa_identification *work, const struct wa_candidate *candidate)
{
    const double molar_mass = work->table->forms[candidate->form].molar_mass;
    return candidate->ln_amount - log(work->mass.mass_g / molar_mass);
}

/* What a wrong titrant does to the weight of a candidate: the purity explains the mass no more, the
 * concentration does. */
static double change_of(const struct wa_identification *work, const struct wa_candidate *candidate,
                        double surplus)
{
    const double u = hypot(candidate->ln_amount_u, work->mass.u_g / work->mass.mass_g);
    const int index = wa_fit_find(candidate->fit, WA_PARAMETER_LN_AMOUNT, 0, 0);
    const struct wa_prior *broad = &candidate->fit->parameters[index].prior;
    const struct wa_purity purity = wa_purity_default();
    const double right =
        wa_log_mass_evidence(&work->mass, &purity, work->table->forms[candidate->form].molar_mass,
                             candidate->ln_amount, candidate->ln_amount_u, broad);
    const double wrong = log_normal(surplus, WA_PURITY_REAGENT_LN_MEAN, hypot(u, wrong_ln_u)) -
                         log_normal(candidate->ln_amount, broad->mean, broad->u);
    return wrong - right;
}

enum wa_status wa_find_titrant_doubt(const struct wa_identification *work, struct wa_result *result,
                                     struct wa_error *error)
{
    const struct wa_match *match = &work->match;
    const struct wa_conditions *conditions = &result->runs.runs[0].conditions;
    const struct wa_noted *noted = &conditions->titrant_concentration;
    if (!work->matched || !work->mass.known || !noted->known ||
        noted->origin == WA_ORIGIN_DEFAULT || match->candidate_count == 0) {
        return WA_OK;
    }
    /* Weights relative to the best candidate; "not in the table" weighs alike with either titrant.
     */
    const double reference = match->candidates[0].log_weight;
    const double unknown = match->candidates[0].probability > 0.0
                               ? log(match->not_in_table / match->candidates[0].probability)
                               : INFINITY;
    double right = unknown, wrong = unknown, best = -INFINITY;
    const struct wa_candidate *found = NULL;
    for (size_t i = 0; i < match->candidate_count && isfinite(unknown); i++) {
        const struct wa_candidate *candidate = &match->candidates[i];
        const double surplus = surplus_of(work, candidate);
        const double weight = candidate->log_weight - reference;
        const double changed = weight + change_of(work, candidate, surplus);
        right = wa_log_sum(right, weight);
        wrong = wa_log_sum(wrong, changed);
        if (changed > best) {
            best = changed;
            found = candidate;
        }
    }
    const double surplus = found != NULL ? surplus_of(work, found) : 0.0;
    if (!(wrong - right > said_from) || fabs(surplus) < least_wrong) {
        return WA_OK;
    }
    const struct wa_form *form = &work->table->forms[found->form];
    return wa_add_sentence(
        &result->findings, &result->finding_count, "titrant-concentration",
        wa_sentence("The titrant concentration is doubtful: the curve is that of %s, but at the "
                    "noted %.4g mol/L it would hold %.0f %% of the mass weighed; about %.4g mol/L "
                    "would fit. Standardize the titrant, and check the mass and the volume of an "
                    "aliquot.",
                    form->name, noted->quantity.value, 100.0 * exp(surplus),
                    noted->quantity.value * exp(-surplus)),
        error);
}
