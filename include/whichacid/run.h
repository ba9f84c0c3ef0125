/* A titration run: the points, what the analyst noted, and where each value came from. This is what
 * the reader hands to every later stage. */
#ifndef WHICHACID_RUN_H
#define WHICHACID_RUN_H

#include "whichacid/error.h"
#include "whichacid/quantity.h"

/** What the reading column holds. */
enum wa_reading_kind { WA_READING_PH, WA_READING_MV };

/** How the volume column was written; points always hold running totals. */
enum wa_volume_kind { WA_VOLUME_TOTAL, WA_VOLUME_BURETTE, WA_VOLUME_INCREMENT };

/** Where a value came from. */
enum wa_origin {
    WA_ORIGIN_DEFAULT, /**< nobody gave it; a stated default stands in */
    WA_ORIGIN_NOTE,    /**< a note in the run's file */
    WA_ORIGIN_OPTION,  /**< an option of the call */
};

/** One measured point. Absent extras are NaN. */
struct wa_point {
    double volume_mL;       /**< running total of titrant added */
    double reading;         /**< pH, or mV, as run.reading_kind says */
    double time_s;          /**< seconds, NaN when not recorded */
    double temperature_C;   /**< NaN when not recorded */
    long line;              /**< line in the file, from 1 */
    double written_volume;  /**< the volume cell as written, in run.volume_unit */
    double written_reading; /**< the reading cell as written, in run.reading_unit */
};

/** A note as written, kept for the report whether its name is known or not. */
struct wa_note {
    char *name; /**< lower case, single spaces: "sample mass" */
    char *text; /**< value as written, UTF-8 */
    enum wa_origin origin;
    long line;  /**< line in the file; 0 for an option */
    bool loose; /**< a line such as "name: value" without a comment mark, perhaps an instrument's:
                     a value that cannot be read is a remark then, not an error */
};

/** A row that is not used. */
struct wa_set_aside {
    long line;
    char *text;   /**< the row as written, UTF-8, shortened past 120 characters */
    char *reason; /**< one sentence */
};

/** A quantity with its origin. `known` is false when it is neither noted nor defaulted. */
struct wa_noted {
    struct wa_quantity quantity;
    bool known;
    enum wa_origin origin;
    long line;
};

/**
 * The notes that the computation uses, with units converted and defaults filled in. Defaults are
 * listed by wa_conditions_defaults().
 */
struct wa_conditions {
    struct wa_noted sample_mass;           /**< g */
    struct wa_noted solution_volume;       /**< mL, volume at the start of the titration */
    struct wa_noted titrant_concentration; /**< mol/L, total alkalinity or acidity */
    struct wa_noted titrant_carbonate;     /**< fraction of the titrant's alkalinity */
    struct wa_noted temperature;           /**< degree Celsius */
    struct wa_noted background;            /**< mol/L of 1:1 background electrolyte */
    struct wa_noted blank;                 /**< mL of titrant used by the blank */
    struct wa_noted electrode_slope;       /**< fraction of theoretical (0.992) */
    struct wa_noted electrode_offset;      /**< pH at pH 7 */
    struct wa_noted electrode_correlation; /**< of slope and offset, -1 to 1; unknown: 0 */
    struct wa_noted reading_uncertainty;   /**< pH or mV, standard deviation of one reading */
    struct wa_noted volume_uncertainty;    /**< mL, standard deviation of one volume reading */
    struct wa_noted sample_volume;         /**< mL of a liquid sample */
    struct wa_noted sample_density;        /**< g/mL */
    struct wa_noted aliquot; /**< fraction of the dissolved sample that was titrated */
    const char *titrant;     /**< as written, NULL when not noted; owned by the run */
    const char *solvent;     /**< as written, NULL when not noted; owned by the run */
    const char *sample;      /**< as written, NULL when not noted; owned by the run */
};

/** One titration. Strings and arrays are owned by the run. */
struct wa_run {
    char *file;    /**< name as given */
    char *heading; /**< block or column heading of this run inside its file, or NULL */
    enum wa_reading_kind reading_kind;
    enum wa_volume_kind volume_kind;
    struct wa_point *points;
    size_t point_count;
    struct wa_note *notes;
    size_t note_count;
    struct wa_set_aside *set_aside;
    size_t set_aside_count;
    char **remarks; /**< sentences on what was assumed or dropped while reading */
    size_t remark_count;
    struct wa_conditions conditions;
    char encoding[16];      /**< "UTF-8", "UTF-16LE", "ISO-8859-1" */
    char delimiter;         /**< ',' ';' '\t' or ' ' */
    char decimal_mark;      /**< '.' or ',' */
    char volume_header[64]; /**< header words the volume column had, "" when none */
    char reading_header[64];
    char volume_unit[8];  /**< unit of points[].written_volume: "mL", "µL", "L" */
    char reading_unit[8]; /**< unit of points[].written_reading: "pH", "mV", "V" */
    int volume_decimals;  /**< most decimals that the volume column was written with */
    int reading_decimals; /**< the same of the reading column */
    int volume_direction; /**< +1; -1 for a burette that was read counting down */
    bool reading_from_mV; /**< readings were mV and are pH now, by a noted calibration */
};

/** The runs of one or more files. */
struct wa_run_list {
    struct wa_run *runs;
    size_t count;
};

/** Free everything the list owns and leave it empty. NULL is allowed. */
void wa_run_list_free(struct wa_run_list *list);

/** Free everything one run owns. NULL is allowed. */
void wa_run_free(struct wa_run *run);

/** Append a remark (copied). */
enum wa_status wa_run_remark(struct wa_run *run, struct wa_error *error, const char *format,
                             ...) WA_MUST_USE WA_PRINTF(3, 4);

/**
 * Append a note (copied); the name is folded to lower case with single spaces.
 * @param[in] line  line in the file, 0 for an option
 */
enum wa_status wa_run_note(struct wa_run *run, const char *name, const char *text,
                           enum wa_origin origin, long line, struct wa_error *error) WA_MUST_USE;

/**
 * Append a row that is not used (text and reason copied; text is shortened past 120 bytes).
 * @param[in] text  UTF-8, `length` bytes
 */
enum wa_status wa_run_set_aside(struct wa_run *run, long line, const char *text, size_t length,
                                const char *reason, struct wa_error *error) WA_MUST_USE;

/**
 * The text of a note by its known name or one of its other names: the option if there is one, else
 * the last in the file; NULL when nobody gave it.
 */
const struct wa_note *wa_run_find_note(const struct wa_run *run, const char *name);

/** One name of design 3.1 that an option may carry, in the order of a help text. */
struct wa_note_name {
    const char *name;    /**< "sample mass" */
    const char *example; /**< "0.3127 g" */
    const char *help;    /**< what it means, one line */
};

/** The names known. @param[out] count  how many */
const struct wa_note_name *wa_note_names(size_t *count);

/**
 * The known name that a folded name stands for ("einwaage" is "sample mass"), or NULL.
 */
const char *wa_note_known_name(const char *folded);

/** Sentences on what wa_run_apply_notes assumes for a note nobody gave; NULL ends the list. */
const char *const *wa_conditions_defaults(void);

/**
 * Compute run->conditions from run->notes and defaults. An mV run whose notes calibrate the
 * electrode becomes a pH run: slope and offset are then corrected for and their uncertainties
 * stay. Each default is said in a remark. To be called once a run. Options count as notes with
 * origin WA_ORIGIN_OPTION and win over notes; a note given twice in the file with different numbers
 * is WA_ERROR_INPUT naming both lines.
 */
enum wa_status wa_run_apply_notes(struct wa_run *run, struct wa_error *error) WA_MUST_USE;

#endif
