/* What the faces of the bench room share: tables, bars and JSON. */
#ifndef WHICHACID_BENCH_INTERNAL_H
#define WHICHACID_BENCH_INTERNAL_H

#include "base/text.h"
#include "whichacid/bench_budget.h"

#include <jansson.h>

/** Append `text` and spaces up to `columns` terminal columns; at least one space follows. */
void bench_cell(struct wa_text *out, const char *text, size_t columns);

/** A bar of block characters, eight steps to a column; a share of 1 fills `columns`. */
void bench_bar(struct wa_text *out, double share, size_t columns);

/** A paragraph of running text, broken before 80 columns, `indent` spaces in front. */
void bench_paragraph(struct wa_text *out, const char *text, size_t indent);

/** The budget as a table and as bars, the expanded uncertainty, and the comparison with Monte Carlo
 * (NULL: none). */
void bench_budget_text(struct wa_text *out, const struct wa_bench_budget *budget,
                       const struct wa_monte_carlo *monte_carlo);

/** A number, or null when it is not finite. NULL when memory is out. */
json_t *bench_number(double value);

/** Text or null. */
json_t *bench_words(const char *text);

/** The budget as JSON; NULL when memory is out. */
json_t *bench_budget_json(const struct wa_bench_budget *budget);

/** The Monte Carlo run as JSON. */
json_t *bench_monte_carlo_json(const struct wa_monte_carlo *monte_carlo);

/** Print a finished value (taken over) into text; a NULL is memory that ran out. */
enum wa_status bench_dump(json_t *json, struct wa_text *out, struct wa_error *error) WA_MUST_USE;

#endif
