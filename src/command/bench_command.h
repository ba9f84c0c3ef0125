/* What the commands around the titration share: quantities as options, the table, the output. */
#ifndef WHICHACID_COMMAND_BENCH_COMMAND_H
#define WHICHACID_COMMAND_BENCH_COMMAND_H

#include "whichacid/quantity.h"
#include "whichacid/reference.h"

#include <argp.h>

/** Most of anything that may be repeated on one command line. */
#define BENCH_REPEATS_MAX 32

/** Options that every one of these commands has. Texts belong to the argument vector. */
struct bench_common {
    const char *folder;
    const char *also[BENCH_REPEATS_MAX];
    size_t also_count;
    const char *output;
    bool json;
};

/** The argp that takes --table, --also, --json and --output; its input is a bench_common. */
extern const struct argp bench_common_argp;

/** Parse one quantity; a mistake ends the call with a sentence and status 2. */
struct wa_quantity bench_quantity(const char *option, const char *text, enum wa_dimension dimension,
                                  struct argp_state *state);

/** The same for a share, where a bare number above 1.5 means per cent. */
struct wa_quantity bench_share(const char *option, const char *text, struct argp_state *state);

/** A whole number from `least` to `most`. */
long bench_whole(const char *option, const char *text, long least, long most,
                 struct argp_state *state);

/** Load the table that the call asks for. */
enum wa_status bench_table(const struct bench_common *common, struct wa_table *table,
                           struct wa_error *error) WA_MUST_USE;

/** Write the answer to --output or standard output. */
enum wa_status bench_write(const struct bench_common *common, const char *text,
                           struct wa_error *error) WA_MUST_USE;

#endif
