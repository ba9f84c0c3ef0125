#include "command/command.h"

#include <stdio.h>
#include <string.h>

static const struct command commands[] = {
    {"identify", "name the acid or base behind a titration curve", command_identify},
    {"inspect", "show how a file was understood, row by row", command_inspect},
    {"standardize", "concentration of a titrant against a primary standard", command_standardize},
    {"calibrate", "slope and offset of an electrode from buffer readings", command_calibrate},
    {"plan", "will it work, what to weigh, which volumes to add", command_plan},
    {"amount", "amounts from weighings, flasks and end points, without a curve", command_amount},
    {"table", "check, list or show the reference table", command_table},
    {"simulate", "write a synthetic run from the model", command_simulate},
};

static void print_usage(FILE *stream)
{
    fprintf(stream, "Usage: whichacid COMMAND [OPTION...] [FILE...]\n\nCommands:\n");
    for (size_t i = 0; i < sizeof commands / sizeof commands[0]; i++) {
        fprintf(stream, "  %-12s %s\n", commands[i].word, commands[i].summary);
    }
    fprintf(stream, "\n'whichacid COMMAND --help' tells more and gives an example.\n");
}

int command_report_error(const struct wa_error *error)
{
    if (error->file[0] != '\0' && error->line > 0) {
        fprintf(stderr, "whichacid: %s:%ld: %s\n", error->file, error->line, error->message);
    } else if (error->file[0] != '\0') {
        fprintf(stderr, "whichacid: %s: %s\n", error->file, error->message);
    } else {
        fprintf(stderr, "whichacid: %s\n", error->message);
    }
    return error->status == WA_ERROR_CALL ? 2 : 1;
}

int main(int argument_count, char **arguments)
{
    if (argument_count < 2) {
        print_usage(stderr);
        return 2;
    }
    if (strcmp(arguments[1], "--help") == 0) {
        print_usage(stdout);
        return 0;
    }
    if (strcmp(arguments[1], "--version") == 0) {
        printf("whichacid %s\n", WHICHACID_VERSION);
        return 0;
    }
    for (size_t i = 0; i < sizeof commands / sizeof commands[0]; i++) {
        if (strcmp(arguments[1], commands[i].word) == 0) {
            return commands[i].run(argument_count - 1, arguments + 1);
        }
    }
    fprintf(stderr, "whichacid: there is no command '%s'.\n\n", arguments[1]);
    print_usage(stderr);
    return 2;
}
