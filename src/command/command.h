/* The commands of the program: each takes its own arguments and returns the exit status (0 an
 * answer, 1 input that cannot be used, 2 a wrong call). */
#ifndef WHICHACID_COMMAND_H
#define WHICHACID_COMMAND_H

#include "whichacid/error.h"

#include <stdio.h>

/** A command: its word, what it does in a line, and the function that runs it. */
struct command {
    const char *word;
    const char *summary;
    int (*run)(int argument_count, char **arguments);
};

int command_inspect(int argument_count, char **arguments);
int command_standardize(int argument_count, char **arguments);
int command_calibrate(int argument_count, char **arguments);
int command_plan(int argument_count, char **arguments);
int command_amount(int argument_count, char **arguments);
int command_table(int argument_count, char **arguments);
int command_identify(int argument_count, char **arguments);
int command_simulate(int argument_count, char **arguments);

/** Print an error to standard error as "file:line: sentence" and return its exit status. */
int command_report_error(const struct wa_error *error);

#endif
