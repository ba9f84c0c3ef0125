#include "command/bench_command.h"

#include "base/file.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { key_table = 0x3000, key_also, key_json, key_output };

static const struct argp_option common_options[] = {
    {.doc = "Table and result:", .group = 8},
    {.name = "table", .key = key_table, .arg = "DIR", .doc = "reference table to use", .group = 8},
    {.name = "also",
     .key = key_also,
     .arg = "FILE",
     .doc = "rows of your own laid over the table; may be repeated",
     .group = 8},
    {.name = "json", .key = key_json, .doc = "the result as JSON", .group = 8},
    {.name = "output", .key = key_output, .arg = "FILE", .doc = "write to FILE", .group = 8},
    {0},
};

static error_t parse_common(int key, char *argument, struct argp_state *state)
{
    struct bench_common *common = state->input;
    switch (key) {
    case key_table:
        common->folder = argument;
        return 0;
    case key_also:
        if (common->also_count == BENCH_REPEATS_MAX) {
            argp_error(state, "--also can be given %d times at most; put the files into a folder",
                       BENCH_REPEATS_MAX);
            return EINVAL;
        }
        common->also[common->also_count++] = argument;
        return 0;
    case key_json:
        common->json = true;
        return 0;
    case key_output:
        common->output = argument;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

const struct argp bench_common_argp = {.options = common_options, .parser = parse_common};

struct wa_quantity bench_quantity(const char *option, const char *text, enum wa_dimension dimension,
                                  struct argp_state *state)
{
    struct wa_quantity quantity = {.value = 0.0};
    struct wa_error error;
    if (wa_quantity_parse(text, dimension, &quantity, &error) != WA_OK) {
        argp_error(state, "%s: %s", option, error.message);
    }
    return quantity;
}

struct wa_quantity bench_share(const char *option, const char *text, struct argp_state *state)
{
    struct wa_quantity quantity = bench_quantity(option, text, WA_DIMENSION_FRACTION, state);
    if (quantity.value > 1.5) {
        quantity.value *= 0.01;
        quantity.u *= 0.01;
    }
    return quantity;
}

long bench_whole(const char *option, const char *text, long least, long most,
                 struct argp_state *state)
{
    char *end;
    errno = 0;
    const long value = strtol(text, &end, 10);
    if (end == text || *end != '\0' || errno != 0 || value < least || value > most) {
        argp_error(state, "%s: '%s' is no whole number from %ld to %ld", option, text, least, most);
    }
    return value;
}

enum wa_status bench_table(const struct bench_common *common, struct wa_table *table,
                           struct wa_error *error)
{
    return wa_table_load(common->folder != NULL ? common->folder : WHICHACID_REFERENCE_DIR,
                         common->also, common->also_count, table, error);
}

enum wa_status bench_write(const struct bench_common *common, const char *text,
                           struct wa_error *error)
{
    const size_t length = strlen(text);
    if (common->output != NULL && strcmp(common->output, "-") != 0) {
        return wa_file_write(common->output, text, length, error);
    }
    if (fwrite(text, 1, length, stdout) != length || fflush(stdout) != 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The result cannot be written: %s.",
                       strerror(errno));
    }
    return WA_OK;
}
