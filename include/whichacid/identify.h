/* The main job: runs and a table in, one result out. */
#ifndef WHICHACID_IDENTIFY_H
#define WHICHACID_IDENTIFY_H

#include "whichacid/observation.h"
#include "whichacid/reader.h"
#include "whichacid/reference.h"
#include "whichacid/result.h"
#include "whichacid/weights.h"

/** What the caller may set. Zero-initialised means the defaults. */
struct wa_identify_options {
    double threshold;         /**< share for `identified`; 0: 0.95 */
    double amount_limit;      /**< u(amount)/amount beyond which the data are unfit; 0: 0.05 */
    double pKa_limit;         /**< u(pKa) beyond which a constant says nothing; 0: 0.5 */
    const char *const *among; /**< closed set of keys, NULL: the whole table */
    size_t among_count;
    const struct wa_weight_list *prior;    /**< what the laboratory expects, or NULL */
    const char *prior_file;                /**< its name, for the report */
    const struct wa_observation *observed; /**< what was observed besides the titration */
    size_t observed_count;
    const char *compare[2]; /**< keys with commas between, the second may be "rest"; NULL: none */
    const char *explain;    /**< key of a form whose absence is to be explained, or NULL */
};

/**
 * Identify the sample behind the runs (replicates of one sample when there are several).
 * @param[in,out] runs    taken over by the result, also on failure
 * @param[in]     table   borrowed; must outlive the call only
 * @param[out]    result  to be freed with wa_result_free
 * @return WA_OK whatever the verdict is; WA_ERROR_INPUT when the runs cannot be used
 */
enum wa_status wa_identify(struct wa_run_list *runs, const struct wa_table *table,
                           const struct wa_identify_options *options, struct wa_result *result,
                           struct wa_error *error) WA_MUST_USE;

#endif
