/* `calibrate`: slope and offset of an electrode from buffer readings. */
#include "command/bench_command.h"
#include "command/command.h"

#include "whichacid/bench_report.h"

#include <errno.h>
#include <stdlib.h>

enum { key_after = 0x100, key_reading_u, key_least_slope };

/* What the call asks for. */
struct request {
    struct bench_common common;
    const char *path;
    const char *after;
    double reading_u;
    struct wa_electrode_limits limits;
};

static const char documentation[] =
    "Slope and offset of a glass electrode from one to five buffer readings, with their "
    "uncertainties and correlation, and whether the electrode is fit for use.\v"
    "BUFFERS is a list like\n"
    "  buffer,temperature,mV\n"
    "  phthalate,24.8,172.3\n"
    "  phosphate,24.8,6.1\n"
    "  borax,24.9,-128.4\n"
    "with keys of buffers.csv or pH values, and readings in mV or pH.\n\n"
    "Examples:\n"
    "  whichacid calibrate buffers.csv\n"
    "  whichacid calibrate buffers.csv --after later.csv --json \\\n"
    "    --output electrode.json\n"
    "  whichacid identify vial17.csv --electrode electrode.json\n\n"
    "Exit status: 0 an answer, also when the electrode is not accepted; 1 input that cannot be "
    "used; 2 a wrong call.";

static const struct argp_option own_options[] = {
    {"after", key_after, "FILE", 0, "buffer readings after the work, to see the drift", 1},
    {"reading-uncertainty", key_reading_u, "PH", 0,
     "standard uncertainty of one reading, repeatability and junction together (0.01)", 1},
    {"least-slope", key_least_slope, "SHARE", 0,
     "lowest slope that is accepted, such as \"95 %\" (90 %, USP <791>)", 1},
    {0},
};

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &request->common;
        return 0;
    case key_after:
        request->after = argument;
        return 0;
    case key_reading_u:
        request->reading_u =
            bench_quantity("--reading-uncertainty", argument, WA_DIMENSION_PH, state).value;
        return 0;
    case key_least_slope:
        request->limits.slope_low = bench_share("--least-slope", argument, state).value;
        request->limits.name = "USP <791> with a lowest slope of your own";
        return 0;
    case ARGP_KEY_ARG:
        if (request->path != NULL) {
            argp_error(state, "one list of buffers at a time; a later one goes with --after");
            return EINVAL;
        }
        request->path = argument;
        return 0;
    case ARGP_KEY_END:
        if (request->path == NULL) {
            argp_error(state, "name the list of buffer readings");
            return EINVAL;
        }
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static enum wa_status read_one(const struct request *request, const char *path,
                               const struct wa_table *table, struct wa_electrode *electrode,
                               struct wa_error *error)
{
    const enum wa_status status = wa_electrode_read(path, table, electrode, error);
    return status == WA_OK ? wa_electrode_calibrate(electrode, request->reading_u, error) : status;
}

static enum wa_status calibrate(const struct request *request, struct wa_error *error)
{
    struct wa_table table;
    struct wa_electrode before, after;
    char *text = NULL;
    enum wa_status status = bench_table(&request->common, &table, error);
    if (status != WA_OK) {
        return status;
    }
    status = read_one(request, request->path, &table, &before, error);
    if (status == WA_OK && request->after != NULL) {
        status = read_one(request, request->after, &table, &after, error);
    }
    const struct wa_electrode *second = request->after != NULL ? &after : NULL;
    if (status == WA_OK) {
        status = request->common.json
                     ? wa_electrode_json(&before, second, &request->limits, &text, error)
                     : wa_electrode_text(&before, second, &request->limits, &text, error);
    }
    if (status == WA_OK) {
        status = bench_write(&request->common, text, error);
    }
    free(text);
    wa_table_free(&table);
    return status;
}

int command_calibrate(int argument_count, char **arguments)
{
    const struct argp_child children[] = {{.argp = &bench_common_argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "BUFFERS",
                              .doc = documentation,
                              .children = children};
    struct request request = {.limits = wa_electrode_limits_default()};
    struct wa_error error;
    char name[] = "whichacid calibrate";
    arguments[0] = name;
    argp_err_exit_status = 2;
    if (argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0) {
        return 2;
    }
    return calibrate(&request, &error) == WA_OK ? 0 : command_report_error(&error);
}
