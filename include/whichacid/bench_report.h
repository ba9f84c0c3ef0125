/* The faces of the bench room's results: text for a page of 80 columns, and JSON. The JSON of a
 * standardization or a calibration is also the file that later commands take. */
#ifndef WHICHACID_BENCH_REPORT_H
#define WHICHACID_BENCH_REPORT_H

#include "whichacid/bench_amount.h"
#include "whichacid/bench_calibrate.h"
#include "whichacid/bench_plan.h"
#include "whichacid/bench_standardize.h"

/** Value of "kind" in a file that holds a titrant, and in one that holds an electrode. */
#define WA_TITRANT_FILE_KIND "titrant"
#define WA_ELECTRODE_FILE_KIND "electrode"

/**
 * A standardization for people.
 * @param[out] text  malloc'd, terminated
 */
enum wa_status wa_standardization_text(const struct wa_standardization *work, char **text,
                                       struct wa_error *error) WA_MUST_USE;

/** A standardization as JSON; ownership as above. */
enum wa_status wa_standardization_json(const struct wa_standardization *work, char **text,
                                       struct wa_error *error) WA_MUST_USE;

/**
 * A calibration for people; `after` (NULL: none) is a second one of the same electrode, whose drift
 * is told.
 * @param[out] text  malloc'd, terminated
 */
enum wa_status wa_electrode_text(const struct wa_electrode *electrode,
                                 const struct wa_electrode *after,
                                 const struct wa_electrode_limits *limits, char **text,
                                 struct wa_error *error) WA_MUST_USE;

/** A calibration as JSON, the drift carried in its uncertainties; ownership as above. */
enum wa_status wa_electrode_json(const struct wa_electrode *electrode,
                                 const struct wa_electrode *after,
                                 const struct wa_electrode_limits *limits, char **text,
                                 struct wa_error *error) WA_MUST_USE;

/** A plan for people; ownership as above. */
enum wa_status wa_plan_text(const struct wa_plan *plan, const struct wa_plan_options *options,
                            char **text, struct wa_error *error) WA_MUST_USE;

/** The sheet to take to the bench: what to weigh, the volumes to add, and room for the readings. */
enum wa_status wa_plan_sheet(const struct wa_plan *plan, const struct wa_plan_options *options,
                             char **text, struct wa_error *error) WA_MUST_USE;

/** A plan as JSON. */
enum wa_status wa_plan_json(const struct wa_plan *plan, const struct wa_plan_options *options,
                            char **text, struct wa_error *error) WA_MUST_USE;

/** Amounts for people; `with_candidates` lists the forms that agree by mass. Ownership as above. */
enum wa_status wa_amount_text(const struct wa_amount_result *result, bool with_candidates,
                              char **text, struct wa_error *error) WA_MUST_USE;

/** Amounts as JSON. */
enum wa_status wa_amount_json(const struct wa_amount_result *result, char **text,
                              struct wa_error *error) WA_MUST_USE;

/** What a file of this room says of a titrant or an electrode, as notes for a run. */
struct wa_bench_file {
    char kind[16];
    char titrant[128];
    struct wa_quantity concentration; /**< mol/L */
    struct wa_quantity slope;         /**< of theory */
    struct wa_quantity offset;        /**< pH at pH 7 */
    double correlation;               /**< of slope and offset */
};

/**
 * Read a file that wa_standardization_json or wa_electrode_json wrote.
 * @param[out] ours  whether there is such a file and it is one of these. A name that is no file, or
 *                   a file of another kind, gives WA_OK and false: the caller then knows it is
 *                   something else. A name that ends in .json must be one of these.
 * @return WA_ERROR_INPUT for a file of ours that is damaged, or a .json file of another kind
 */
enum wa_status wa_bench_read(const char *path, const char *kind, struct wa_bench_file *file,
                             bool *ours, struct wa_error *error) WA_MUST_USE;

#endif
