/* Slope and offset of a glass electrode from readings in buffers, with their correlation. */
#ifndef WHICHACID_BENCH_CALIBRATE_H
#define WHICHACID_BENCH_CALIBRATE_H

#include "whichacid/quantity.h"
#include "whichacid/reference.h"

/** Most readings of one calibration. */
#define WA_BUFFER_READINGS_MAX 10

/** What stands in for what nobody stated. */
#define WA_DEFAULT_BUFFER_READING_U 0.01 /**< pH: repeatability and the junction together */
#define WA_DEFAULT_SLOPE_U 0.012         /**< of theory, when one buffer leaves the slope open */
#define WA_DEFAULT_BUFFER_U 0.01         /**< pH, of a buffer given by its value alone */

/** Limits by which an electrode is accepted. */
struct wa_electrode_limits {
    const char *name;  /**< of the standard */
    double slope_low;  /**< of theory */
    double slope_high; /**< of theory */
    double offset_mV;  /**< largest |potential at pH 7| */
    double check_pH;   /**< largest deviation of a buffer from the line through the others */
};

/** USP general chapter 791 as revised in USP 39, 1st supplement: slope 90 % to 105 %, potential at
 * pH 7 within 30 mV; the 0.05 pH of a third buffer is from memory. */
struct wa_electrode_limits wa_electrode_limits_default(void);

/** One reading in a buffer. */
struct wa_buffer_reading {
    char buffer[64]; /**< key in buffers.csv, or the value as written */
    double temperature_C;
    double reading; /**< pH or mV, as wa_calibration.in_mV says */
    long line;
    double pH;             /**< of the buffer at that temperature */
    double pH_u;           /**< its standard uncertainty */
    double shown;          /**< the reading as pH of an electrode without error */
    double residual;       /**< shown less what slope and offset say, pH */
    double against_others; /**< pH found by the line through the other buffers less its pH; NaN when
                              these are fewer than two */
};

/** A calibration. Plain data. shown = pivot + slope (pH - pivot) + offset_at_pivot. */
struct wa_electrode {
    struct wa_buffer_reading readings[WA_BUFFER_READINGS_MAX];
    size_t count;
    bool in_mV;
    double temperature_C;    /**< mean */
    double slope, slope_u;   /**< of theory */
    double offset, offset_u; /**< pH at pH 7, the isopotential point that is assumed */
    double offset_mV;        /**< potential at pH 7 */
    double correlation;      /**< of slope and offset at pH 7 */
    double pivot;            /**< pH at which slope and offset are not correlated */
    double pivot_offset, pivot_offset_u;
    double birge; /**< how much the buffers disagree, 1 or less when their u explain it; NaN */
    bool slope_assumed; /**< one buffer only */
};

/** What became of an electrode between two calibrations. */
struct wa_electrode_drift {
    double slope, slope_u;   /**< after less before */
    double offset, offset_u; /**< pH at pH 7 */
    bool significant;        /**< either is more than twice its u */
};

/**
 * Read buffer readings: `buffer,temperature,reading`, one a line, comma, semicolon or tab between;
 * the header word of the reading column says pH or mV. A buffer is a key or name of buffers.csv or
 * a value such as 4.005 or 4.005 ± 0.003. Lines that begin with # are remarks.
 * @param[out] electrode  readings with their buffers' pH at temperature
 * @return WA_ERROR_INPUT naming the line that cannot be used
 */
enum wa_status wa_electrode_read(const char *path, const struct wa_table *table,
                                 struct wa_electrode *electrode,
                                 struct wa_error *error) WA_MUST_USE;

/**
 * Slope and offset by weighted least squares; u grows by Birge's ratio when the buffers disagree.
 * @param[in] reading_u  of one reading, pH; 0: WA_DEFAULT_BUFFER_READING_U
 */
enum wa_status wa_electrode_calibrate(struct wa_electrode *electrode, double reading_u,
                                      struct wa_error *error) WA_MUST_USE;

/** Compare two calibrations of one electrode. */
struct wa_electrode_drift wa_electrode_compare(const struct wa_electrode *before,
                                               const struct wa_electrode *after);

/**
 * Whether an electrode is within limits; each limit that is broken is named in `why`.
 * @param[out] why  one sentence, "" when it is accepted
 */
bool wa_electrode_accepted(const struct wa_electrode *electrode,
                           const struct wa_electrode_limits *limits, char *why, size_t size);

/** pH and u of a buffer at a temperature, between the rows of the table; false outside them. */
bool wa_buffer_pH(const struct wa_table *table, const char *name, double temperature_C, double *pH,
                  double *u);

#endif
