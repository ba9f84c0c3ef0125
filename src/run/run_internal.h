/* What the sources of the run room share. */
#ifndef WHICHACID_RUN_INTERNAL_H
#define WHICHACID_RUN_INTERNAL_H

#include "whichacid/run.h"

/** The last readable calibration of an mV electrode: E = E_at_7 - slope * k(T) * (pH - 7). */
struct wa_calibration {
    bool known;
    double slope;   /**< fraction of theoretical */
    double slope_u; /**< its standard uncertainty */
    double mV_at_7; /**< mV at pH 7 */
    double mV_at_7_u;
    char how[160]; /**< words for the remark */
};

/** Theoretical slope ln(10) R T / F in mV per pH (CODATA 2018, exact constants). */
double wa_nernst_slope(double temperature_C);

/** Find slope and offset of an mV run in its notes: slope and offset notes, or two buffers. */
enum wa_status wa_run_calibration(const struct wa_run *run, double temperature_C,
                                  struct wa_calibration *calibration, struct wa_error *error);

/** Turn an mV run into a pH run. */
enum wa_status wa_run_convert_mV(struct wa_run *run, const struct wa_calibration *calibration,
                                 double temperature_C, struct wa_error *error);

/** Electrode slope as a fraction of theory, from per cent, a fraction, or mV per pH. */
enum wa_status wa_run_parse_slope(const struct wa_run *run, const struct wa_note *note,
                                  double temperature_C, struct wa_quantity *quantity,
                                  struct wa_error *error);

/** Electrode offset in pH at pH 7; mV at pH 7 count as -mV / theoretical slope. A bare number on an
 * mV run is mV. */
enum wa_status wa_run_parse_offset(const struct wa_run *run, const struct wa_note *note,
                                   double temperature_C, struct wa_quantity *quantity,
                                   struct wa_error *error);

/** Fill what no note gave and say so in remarks; calibrate an mV run. */
enum wa_status wa_run_fill_defaults(struct wa_run *run, struct wa_error *error);

#endif
