/* What a further observation is expected to tell, by simulation from the posterior. */
#ifndef WHICHACID_EXPECTED_H
#define WHICHACID_EXPECTED_H

#include "whichacid/match.h"

/** Observations that are weighed before they are made. */
enum wa_expected_kind {
    WA_EXPECTED_MASS,
    WA_EXPECTED_POINTS,         /**< more points of this titration, in a window of pH */
    WA_EXPECTED_CONCENTRATED,   /**< a run with everything five times as concentrated */
    WA_EXPECTED_TEMPERATURE,    /**< a run at another temperature */
    WA_EXPECTED_IONIC_STRENGTH, /**< a run with added salt */
    WA_EXPECTED_OBSERVATION,    /**< one of enum wa_observation_kind */
};

/** One observation and what it is expected to do. */
struct wa_expected {
    enum wa_expected_kind kind;
    enum wa_observation_kind observation;
    double bits;         /**< expected drop of the entropy over the forms */
    double set_size;     /**< expected number of forms that hold the threshold afterwards */
    double pH[2];        /**< window of further points */
    double volume_mL[2]; /**< the same in volume */
    int points;
    double temperature_C;
};

/** Most that are ranked. */
#define WA_EXPECTED_MAX 16

/** Several, the most telling first. */
struct wa_expectations {
    double bits;     /**< entropy over the forms as it stands */
    double set_size; /**< forms that hold the threshold as it stands */
    struct wa_expected list[WA_EXPECTED_MAX];
    size_t count;
};

/**
 * Simulate further observations from the posterior: a form is drawn by its probability, data from
 * its model with its parameters' uncertainty, and every form is weighed anew (D. V. Lindley, Ann.
 * Math. Stat. 27 (1956) 986: expected information). New readings are taken as Gaussian about the
 * fitted models. The draws come from a fixed seed.
 * @param[in] threshold  share that a set must hold
 */
enum wa_status wa_match_expect(const struct wa_experiment *experiment,
                               const struct wa_proton_study *study,
                               const struct wa_titrated_mass *mass, const struct wa_table *table,
                               const struct wa_match *match, double threshold,
                               struct wa_expectations *expectations,
                               struct wa_error *error) WA_MUST_USE;

#endif
