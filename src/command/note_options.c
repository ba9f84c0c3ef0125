#include "command/note_options.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Keys of the options; beyond the characters, so that no short option arises. */
enum { key_first_note = 0x1000, key_strict = 0x2000 };

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct note_options *options = state->input;
    size_t count;
    const struct wa_note_name *names = wa_note_names(&count);
    if (key == key_strict) {
        options->reader.strict = true;
        return 0;
    }
    if (key < key_first_note || key >= key_first_note + (int)count) {
        return ARGP_ERR_UNKNOWN;
    }
    const char *name = names[key - key_first_note].name;
    size_t given = options->reader.given_count;
    for (size_t i = 0; i < given; i++) {
        if (options->given[i].name == name) {
            argp_error(state, "the option for '%s' is given twice", name);
            return EINVAL;
        }
    }
    options->given[given] = (struct wa_given_note){.name = name, .text = argument};
    options->reader.given = options->given;
    options->reader.given_count = given + 1;
    return 0;
}

enum wa_status note_options_init(struct note_options *options, struct wa_error *error)
{
    size_t count;
    const struct wa_note_name *names = wa_note_names(&count);
    *options = (struct note_options){.name_count = count};
    options->given = calloc(count, sizeof *options->given);
    options->options = calloc(count + 3, sizeof *options->options);
    options->long_names = calloc(count, sizeof *options->long_names);
    options->helps = calloc(count, sizeof *options->helps);
    if (options->helps == NULL || options->given == NULL || options->options == NULL ||
        options->long_names == NULL) {
        note_options_free(options);
        return wa_fail_memory(error);
    }
    options->options[0] = (struct argp_option){
        .doc = "Notes on the run, as they may also stand in its file; these win:", .group = 1};
    for (size_t i = 0; i < count; i++) {
        snprintf(options->long_names[i], sizeof options->long_names[i], "%s", names[i].name);
        for (char *at = options->long_names[i]; *at != '\0'; at++) {
            *at = *at == ' ' ? '-' : *at;
        }
        snprintf(options->helps[i], sizeof options->helps[i], "%s, such as \"%s\"", names[i].help,
                 names[i].example);
        options->options[i + 1] = (struct argp_option){.name = options->long_names[i],
                                                       .key = key_first_note + (int)i,
                                                       .arg = "VALUE",
                                                       .doc = options->helps[i],
                                                       .group = 1};
    }
    options->options[count + 1] =
        (struct argp_option){.name = "strict",
                             .key = key_strict,
                             .doc = "rows that cannot be right are errors, not set aside",
                             .group = 2};
    options->argp = (struct argp){.options = options->options, .parser = parse};
    return WA_OK;
}

void note_options_free(struct note_options *options)
{
    free(options->given);
    free(options->options);
    free(options->long_names);
    free(options->helps);
    *options = (struct note_options){0};
}
