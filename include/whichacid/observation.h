/* Observations that are no titration, as further evidence: melting point, loss on drying, and spot
 * tests of the trade, each with a likelihood of its own that is stated in the report. */
#ifndef WHICHACID_OBSERVATION_H
#define WHICHACID_OBSERVATION_H

#include "whichacid/quantity.h"
#include "whichacid/reference.h"

#include <stdint.h>

/** What can be observed. */
enum wa_observation_kind {
    WA_OBSERVED_MELTING_POINT,  /**< degree Celsius */
    WA_OBSERVED_LOSS_ON_DRYING, /**< mass fraction */
    WA_OBSERVED_SODIUM,         /**< from here on spot tests, answered by yes or no */
    WA_OBSERVED_POTASSIUM,
    WA_OBSERVED_AMMONIUM,
    WA_OBSERVED_CHLORIDE,
    WA_OBSERVED_BROMIDE,
    WA_OBSERVED_SULFATE,
    WA_OBSERVED_KINDS,
};

/** One observation. Plain data. */
struct wa_observation {
    enum wa_observation_kind kind;
    struct wa_quantity quantity; /**< of a melting point or a loss, with a default u if none */
    bool positive;               /**< of a spot test */
};

/**
 * Read "melting point: 122 ± 1 °C", "loss on drying: 8.5 ± 0.2 %" or "chloride: yes".
 * @return WA_ERROR_CALL with a sentence that lists what can be observed
 */
enum wa_status wa_observation_parse(const char *text, struct wa_observation *observation,
                                    struct wa_error *error) WA_MUST_USE;

/**
 * ln of the likelihood (per degree Celsius, per unit of mass fraction, or a probability).
 * @param[in] form  NULL: a substance that nobody named
 */
double wa_observation_log_likelihood(const struct wa_table *table, const struct wa_form *form,
                                     const struct wa_observation *observation);

/**
 * Draw what would be observed for a form.
 * @param[in]     form   NULL: a substance that nobody named
 * @param[in,out] state  of the generator (xorshift, G. Marsaglia, J. Stat. Softw. 8 (2003) 14), not
 * 0
 */
void wa_observation_draw(const struct wa_table *table, const struct wa_form *form,
                         enum wa_observation_kind kind, uint64_t *state,
                         struct wa_observation *observation);

/** Uniform deviate in (0, 1) and standard normal deviate from the same generator. */
double wa_draw_uniform(uint64_t *state);
double wa_draw_normal(uint64_t *state);

/** What it is called: "melting point", "loss on drying", "chloride". */
const char *wa_observation_name(enum wa_observation_kind kind);

/** How the likelihood was taken, one sentence. */
const char *wa_observation_assumption(enum wa_observation_kind kind);

/** Mass fraction of water of crystallization, from the formula. */
double wa_form_water(const struct wa_table *table, const struct wa_form *form);

#endif
