/* `identify`: the arguments, and where the answer goes. */
#include "command/command.h"
#include "command/identify_request.h"

#include "base/file.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

enum {
    key_table = 0x100,
    key_also,
    key_among,
    key_prior,
    key_observed,
    key_compare,
    key_threshold,
    key_explain,
    key_each,
    key_json,
    key_output,
    key_figure,
    key_figure_kind,
    key_paper
};

static const char documentation[] =
    "Name the acid or base behind a titration curve, with the probability of each candidate, its "
    "constants, amount and molar mass. Several files are replicates of one sample unless --each "
    "is given.\v"
    "Example:\n"
    "  whichacid identify vial17.csv --sample-mass \"0.3127 g\" \\\n"
    "    --solution-volume \"50.0 mL\" --titrant \"sodium hydroxide\" \\\n"
    "    --titrant-concentration \"0.1023 ± 0.0002 mol/L\"\n\n"
    "RUN may be - for standard input. Exit status: 0 an answer, whatever it is; 1 input that "
    "cannot be used; 2 a wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "What is compared:", .group = 3},
    {.name = "table", .key = key_table, .arg = "DIR", .doc = "reference table to use", .group = 3},
    {.name = "also",
     .key = key_also,
     .arg = "FILE",
     .doc = "rows of your own laid over the table; may be repeated",
     .group = 3},
    {.name = "among",
     .key = key_among,
     .arg = "KEY,...|FILE",
     .doc = "compare these acids or forms only, or those that a file lists; may be repeated",
     .group = 3},
    {.name = "prior",
     .key = key_prior,
     .arg = "FILE",
     .doc = "rows key,weight: how often the laboratory meets each acid or form",
     .group = 3},
    {.name = "observed",
     .key = key_observed,
     .arg = "WHAT",
     .doc = "a further observation, as \"melting point: 122 ± 1 °C\", \"loss on drying: "
            "8.5 ± 0.2 %\" or \"chloride: yes\"; may be repeated",
     .group = 3},
    {.name = "compare",
     .key = key_compare,
     .arg = "KEY,... KEY,...",
     .doc = "the evidence for the first against the second, which may be the word rest",
     .group = 3},
    {.name = "threshold",
     .key = key_threshold,
     .arg = "0.95",
     .doc = "probability that one candidate must hold to be called identified",
     .group = 3},
    {.name = "explain",
     .key = key_explain,
     .arg = "KEY",
     .doc = "say why this acid or form is not the answer",
     .group = 3},
    {.name = "each",
     .key = key_each,
     .doc = "each file is a sample of its own, not a replicate",
     .group = 3},
    {.doc = "Result:", .group = 4},
    {.name = "json",
     .key = key_json,
     .doc = "the result as JSON; with --each a list of results",
     .group = 4},
    {.name = "output",
     .key = key_output,
     .arg = "FILE",
     .doc = "write to FILE; its ending .html or .pdf asks for a page to print and sign, .md for a "
            "short form",
     .group = 4},
    {.name = "paper",
     .key = key_paper,
     .arg = "A4|letter",
     .doc = "paper of the page; A4 if none is named",
     .group = 4},
    {.name = "figure",
     .key = key_figure,
     .arg = "FILE",
     .doc = "draw a figure into FILE, by its ending .svg, .pdf or .png",
     .group = 4},
    {.name = "figure-kind",
     .key = key_figure_kind,
     .arg = "KIND",
     .doc = "what the figure shows: curve (if none is named), derivative, gran, residuals, "
            "runner-up or species",
     .group = 4},
    {0},
};

static error_t finish(const struct identify_request *request, struct argp_state *state)
{
    if (request->path_count == 0) {
        argp_error(state, "name at least one run to identify");
        return EINVAL;
    }
    if (request->each && request->path_count > 1 &&
        (request->figure != NULL || identify_page_of(request) != IDENTIFY_TEXT)) {
        argp_error(state, "a page or a figure shows one sample: make it for one file at a time");
        return EINVAL;
    }
    if (request->figure_kind != NULL && request->figure == NULL) {
        argp_error(state, "--figure-kind needs --figure FILE");
        return EINVAL;
    }
    size_t standard_inputs = 0;
    for (size_t i = 0; i < request->path_count; i++) {
        standard_inputs += strcmp(request->paths[i], "-") == 0;
    }
    if (standard_inputs > 1) {
        argp_error(state, "standard input can be read once only");
        return EINVAL;
    }
    return 0;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct identify_request *request = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = request->notes;
        return 0;
    case ARGP_KEY_ARG:
        request->paths[request->path_count++] = argument;
        return 0;
    case ARGP_KEY_END:
        return finish(request, state);
    case key_table:
        request->table = argument;
        return 0;
    case key_also:
        request->also[request->also_count++] = argument;
        return 0;
    case key_among:
        request->among[request->among_count++] = argument;
        return 0;
    case key_prior:
        request->prior = argument;
        return 0;
    case key_observed:
        request->observed[request->observed_count++] = argument;
        return 0;
    case key_compare:
        if (state->next >= state->argc) {
            argp_error(state, "--compare needs two names, as --compare citric-acid rest");
            return EINVAL;
        }
        request->compare[0] = argument;
        request->compare[1] = state->argv[state->next++];
        return 0;
    case key_threshold:
        request->threshold = argument;
        return 0;
    case key_explain:
        request->explain = argument;
        return 0;
    case key_each:
        request->each = true;
        return 0;
    case key_json:
        request->json = true;
        return 0;
    case key_output:
        request->output = argument;
        return 0;
    case key_paper:
        if (strcasecmp(argument, "a4") != 0 && strcasecmp(argument, "letter") != 0) {
            argp_error(state, "there is no paper '%s' here: A4 or letter", argument);
            return EINVAL;
        }
        request->paper = strcasecmp(argument, "a4") == 0 ? WA_PAPER_A4 : WA_PAPER_LETTER;
        return 0;
    case key_figure:
        request->figure = argument;
        return 0;
    case key_figure_kind:
        request->figure_kind = argument;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static enum wa_status hand_over(const char *output, const struct wa_text *answer,
                                struct wa_error *error)
{
    if (output != NULL && strcmp(output, "-") != 0) {
        return wa_file_write(output, answer->bytes, answer->length, error);
    }
    if (fwrite(answer->bytes, 1, answer->length, stdout) != answer->length || fflush(stdout) != 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The result cannot be written: %s.",
                       strerror(errno));
    }
    return WA_OK;
}

static int answer_request(const struct identify_request *request)
{
    struct wa_text answer = {0};
    struct wa_error error;
    int result = identify_answer(request, &answer);
    if (answer.failed) {
        wa_fail_memory(&error);
        result = command_report_error(&error);
    } else if (answer.length > 0 && hand_over(request->output, &answer, &error) != WA_OK) {
        result = command_report_error(&error);
    }
    wa_text_free(&answer);
    return result;
}

static int parse_and_answer(int argument_count, char **arguments, struct identify_request *request)
{
    const struct argp_child children[] = {{.argp = &request->notes->argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "RUN...",
                              .doc = documentation,
                              .children = children};
    char name[] = "whichacid identify";
    arguments[0] = name;
    argp_err_exit_status = 2;
    return argp_parse(&argp, argument_count, arguments, 0, NULL, request) != 0
               ? 2
               : answer_request(request);
}

int command_identify(int argument_count, char **arguments)
{
    struct note_options notes;
    struct wa_error error;
    if (note_options_init(&notes, &error) != WA_OK) {
        return command_report_error(&error);
    }
    size_t most = (size_t)argument_count + 1;
    const char **lists = calloc(4 * most, sizeof *lists);
    int result;
    if (lists == NULL) {
        wa_fail_memory(&error);
        result = command_report_error(&error);
    } else {
        struct identify_request request = {.notes = &notes,
                                           .table = WHICHACID_REFERENCE_DIR,
                                           .paths = lists,
                                           .also = lists + most,
                                           .among = lists + 2 * most,
                                           .observed = lists + 3 * most};
        result = parse_and_answer(argument_count, arguments, &request);
    }
    free(lists);
    note_options_free(&notes);
    return result;
}
