/* Cautions of a result. */
#ifndef WHICHACID_IDENTIFY_CAUTIONS_H
#define WHICHACID_IDENTIFY_CAUTIONS_H

#include "whichacid/reference.h"
#include "whichacid/result.h"

/**
 * Append what a reader must know before acting on a result, and fill the hazards and care of each
 * candidate from its form's row where they are still NULL.
 *
 * Codes: `screening-aid`, `responsible-analyst`, `unknown-sample` always; `acid-frees-gas` unless
 * every titrant is known to be a base; `candidate-hazards` and `candidate-care` for each candidate
 * whose row has them.
 * @param[in]     table   may be NULL: rows are then not looked up
 * @param[in,out] result  runs, curves, experiments and candidates are read
 */
enum wa_status wa_identify_cautions(const struct wa_table *table, struct wa_result *result,
                                    struct wa_error *error) WA_MUST_USE;

#endif
