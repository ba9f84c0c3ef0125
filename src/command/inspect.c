/* `inspect`: how a file was understood, row by row. */
#include "command/command.h"
#include "command/inspect_report.h"
#include "command/note_options.h"

#include "base/file.h"

#include <string.h>

enum { key_json = 0x100, key_output };

/* What the call asks for. */
struct request {
    struct note_options *notes;
    const char *path;
    const char *output;
    bool json;
};

static const char documentation[] =
    "Show how a file was understood, row by row: which rows are used and which are set aside and "
    "why, what was assumed, and which notes were found.\v"
    "Example:\n"
    "  whichacid inspect vial17.csv --sample-mass \"0.3127 g\"\n\n"
    "FILE may be - for standard input. Exit status: 0 understood, 1 not usable, 2 wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "Result:", .group = 3},
    {.name = "json", .key = key_json, .doc = "the result as JSON", .group = 3},
    {.name = "output", .key = key_output, .arg = "FILE", .doc = "write to FILE", .group = 3},
    {0},
};

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = request->notes;
        return 0;
    case key_json:
        request->json = true;
        return 0;
    case key_output:
        request->output = argument;
        return 0;
    case ARGP_KEY_ARG:
        if (request->path != NULL) {
            argp_error(state, "one file at a time");
            return EINVAL;
        }
        request->path = argument;
        return 0;
    case ARGP_KEY_END:
        if (request->path == NULL) {
            argp_error(state, "name the file to inspect");
            return EINVAL;
        }
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static enum wa_status hand_over(const struct request *request, const struct wa_text *text,
                                struct wa_error *error)
{
    if (request->output != NULL && strcmp(request->output, "-") != 0) {
        return wa_file_write(request->output, text->bytes, text->length, error);
    }
    if (fwrite(text->bytes, 1, text->length, stdout) != text->length || fflush(stdout) != 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The result cannot be written.");
    }
    return WA_OK;
}

static enum wa_status inspect(const struct request *request, struct wa_error *error)
{
    struct wa_run_list list = {0};
    struct wa_text text = {0};
    enum wa_status status = wa_read_file(request->path, &request->notes->reader, &list, error);
    if (status == WA_OK) {
        status = request->json ? inspect_report_json(&list, &text, error)
                               : inspect_report_text(&list, &text, error);
    }
    if (status == WA_OK) {
        status = hand_over(request, &text, error);
    }
    wa_text_free(&text);
    wa_run_list_free(&list);
    return status;
}

int command_inspect(int argument_count, char **arguments)
{
    struct note_options notes;
    struct wa_error error;
    if (note_options_init(&notes, &error) != WA_OK) {
        return command_report_error(&error);
    }
    const struct argp_child children[] = {{.argp = &notes.argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "FILE",
                              .doc = documentation,
                              .children = children};
    struct request request = {.notes = &notes};
    char name[] = "whichacid inspect";
    arguments[0] = name;
    argp_err_exit_status = 2;
    int result = argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0 ? 2 : 0;
    if (result == 0 && inspect(&request, &error) != WA_OK) {
        result = command_report_error(&error);
    }
    note_options_free(&notes);
    return result;
}
