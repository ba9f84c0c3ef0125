/* Synthetic runs: the forward model of known forms from the table, read at chosen volumes by an
 * electrode and a burette with stated errors. For practice, planning and tests. */
#ifndef WHICHACID_SIMULATE_H
#define WHICHACID_SIMULATE_H

#include "whichacid/equilibrium.h"
#include "whichacid/quantity.h"
#include "whichacid/reference.h"

#include <stdint.h>

/** Most forms in one simulated sample. */
#define WA_SIMULATED_FORMS_MAX 4

/** Most points of one simulated run. */
#define WA_SIMULATED_POINTS_MAX 100000

/**
 * What to simulate; start from wa_simulation_defaults. A quantity with an uncertainty is what the
 * analyst notes, and the value that acts is drawn from it; without one it acts as it stands.
 */
struct wa_simulation_options {
    const char *forms[WA_SIMULATED_FORMS_MAX]; /**< key, name or other name of form or acid */
    int form_count;
    struct wa_quantity mass[WA_SIMULATED_FORMS_MAX]; /**< g; 0: for about 20 mL of titrant */
    struct wa_quantity solution_volume;              /**< mL */
    const char *titrant; /**< words as in a note, NULL: the strong base or acid that suits */
    struct wa_quantity titrant_concentration; /**< mol/L */
    struct wa_quantity titrant_carbonate;     /**< fraction of a strong base's alkalinity */
    struct wa_quantity electrode_slope;       /**< of theory, 1 is right */
    struct wa_quantity electrode_offset;      /**< pH at pH 7 */
    double carbon_dioxide;                    /**< mol/L dissolved in the sample's water */
    double temperature_C;
    double noise_reading; /**< pH, standard deviation of one reading */
    double noise_volume;  /**< mL, standard deviation of one volume */
    double end_mL;        /**< last volume; 0: 1.3 times the equivalence volume */
    int point_count;      /**< points, denser where the pH moves; not used with a step */
    double step_mL;       /**< volumes at even steps; 0: point_count points */
    bool dissolved;       /**< everything dissolves, whatever the table's solubility */
    uint32_t seed;        /**< from 1; the same seed gives the same run */
};

/** A simulated run. Forms and titrant point into the table. */
struct wa_simulation {
    struct wa_simulation_options options; /**< as asked for, masses and end filled in */
    const struct wa_form *forms[WA_SIMULATED_FORMS_MAX];
    double mass[WA_SIMULATED_FORMS_MAX]; /**< g, what acts */
    const struct wa_titrant *titrant;
    double titrant_concentration;  /**< mol/L, what acts */
    double titrant_carbonate;      /**< what acts */
    double electrode_slope;        /**< what acts */
    double electrode_offset;       /**< what acts */
    double solid_until_mL;         /**< volume up to which some solid remains, 0 when none */
    struct wa_titration titration; /**< what is in beaker and burette */
    size_t count;
    double *volume_mL; /**< as read from the burette */
    double *reading;   /**< as shown by the meter, rounded to its decimals */
    int volume_decimals;
    int reading_decimals;
};

/** 50 mL of solution, 0.1 mol/L titrant, 25 degree Celsius, noise of 0.01 pH and 0.005 mL, 60
 * points, no other error, seed 1. */
void wa_simulation_defaults(struct wa_simulation_options *options);

/**
 * Simulate a run.
 * @param[in]  table       must outlive the simulation
 * @param[out] simulation  to be freed with wa_simulation_free; untouched on failure
 * @return WA_ERROR_CALL for a name the table lacks or a value that is not possible
 *
 * Random numbers: the Mersenne twister of Matsumoto and Nishimura (1998) as in GSL. Readings are
 * rounded as printed, so that the last bits of a machine's arithmetic do not show.
 */
enum wa_status wa_simulate(const struct wa_table *table,
                           const struct wa_simulation_options *options,
                           struct wa_simulation *simulation, struct wa_error *error) WA_MUST_USE;

/**
 * The run as a file that the reader takes, headed as synthetic, with what the analyst would note
 * as notes and what was simulated besides on lines of its own.
 * @param[out] text  malloc'd, terminated
 */
enum wa_status wa_simulation_write(const struct wa_simulation *simulation, char **text,
                                   size_t *length, struct wa_error *error) WA_MUST_USE;

/** Free what a simulation owns. NULL is allowed. */
void wa_simulation_free(struct wa_simulation *simulation);

#endif
