/* Prior weights that a laboratory knows, and lists of keys, from CSV files. */
#ifndef WHICHACID_WEIGHTS_H
#define WHICHACID_WEIGHTS_H

#include "whichacid/reference.h"

/** Words that stand for no key: every form that is not listed, and what the table lacks. */
#define WA_WEIGHT_REST "rest"
#define WA_WEIGHT_NOT_IN_TABLE "not-in-table"

/** Share of all forms that a file does not list, together, when it has no row for them. */
#define WA_WEIGHT_REST_SHARE 0.05

/** One row. */
struct wa_weight {
    char *key;     /**< as written */
    int acid;      /**< index into table.acids, -1 when the key names a form */
    int form;      /**< index into table.forms, -1 when the key names an acid */
    double weight; /**< not negative; 1 when the file gives none */
    long line;
};

/** The rows of a file. */
struct wa_weight_list {
    struct wa_weight *weights;
    size_t count;
    double rest;         /**< weight of all other forms together; NaN when there is no row */
    double not_in_table; /**< weight of what the table lacks; NaN when there is no row */
};

/**
 * Read `key` or `key,weight` rows: comma, semicolon or tab between, double quotes about a key that
 * holds one of them, `#` before a comment, a first row `key,weight` passed over. Weights are
 * relative to one another.
 * @param[out] list  to be freed with wa_weights_free; untouched on failure
 * @return WA_ERROR_CALL with file and line for a key that the table has not, a key given twice or a
 *         weight that is no number from 0; WA_ERROR_INPUT when no row has a weight above 0
 */
enum wa_status wa_weights_load(const char *path, const struct wa_table *table,
                               struct wa_weight_list *list, struct wa_error *error) WA_MUST_USE;

/** Free what a list owns. NULL is allowed. */
void wa_weights_free(struct wa_weight_list *list);

#endif
