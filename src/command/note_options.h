/* The notes of a run as options with hyphens, shared by every command that reads runs. --titrant
 * also takes the file that standardize wrote, and --electrode the one of calibrate. */
#ifndef WHICHACID_COMMAND_NOTE_OPTIONS_H
#define WHICHACID_COMMAND_NOTE_OPTIONS_H

#include "whichacid/reader.h"

#include <argp.h>

/** What was given, and the argp that takes it. */
struct note_options {
    struct wa_reader_options reader; /**< ready for wa_read_file after parsing */
    struct wa_given_note *given;
    struct argp_option *options;
    char (*long_names)[40];
    char (*helps)[128];
    size_t name_count;
    char *owned[6]; /**< texts made from files of standardize and calibrate */
    size_t owned_count;
    struct argp argp;
};

/**
 * Prepare. A command puts options->argp among its argp_child entries and passes `options` as that
 * child's input (state->child_inputs) when its parser sees ARGP_KEY_INIT.
 */
enum wa_status note_options_init(struct note_options *options, struct wa_error *error) WA_MUST_USE;

/** Free what note_options_init and parsing allocated; other texts belong to the argument vector. */
void note_options_free(struct note_options *options);

#endif
