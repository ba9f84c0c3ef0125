#include "command/note_options.h"

#include "base/text.h"
#include "whichacid/bench_report.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Keys of the options; beyond the characters, so that no short option arises. */
enum { key_first_note = 0x1000, key_strict = 0x2000, key_electrode };

static error_t give(struct note_options *options, const char *name, const char *text,
                    struct argp_state *state)
{
    const size_t given = options->reader.given_count;
    for (size_t i = 0; i < given; i++) {
        if (strcmp(options->given[i].name, name) == 0) {
            argp_error(state, "the option for '%s' is given twice", name);
            return EINVAL;
        }
    }
    options->given[given] = (struct wa_given_note){.name = name, .text = text};
    options->reader.given = options->given;
    options->reader.given_count = given + 1;
    return 0;
}

/* A note made of what a file says; the text is kept until the options are freed. */
static error_t give_text(struct note_options *options, const char *name, struct wa_text *text,
                         struct argp_state *state)
{
    if (text->failed) {
        wa_text_free(text);
        return ENOMEM;
    }
    options->owned[options->owned_count++] = text->bytes;
    return give(options, name, text->bytes, state);
}

static error_t give_figure(struct note_options *options, const char *name,
                           const struct wa_quantity *figure, const char *unit,
                           struct argp_state *state)
{
    struct wa_text text = {.bytes = NULL};
    wa_text_append(&text, "%.10g ± %.6g%s", figure->value, figure->u, unit);
    return give_text(options, name, &text, state);
}

static error_t give_file(struct note_options *options, const struct wa_bench_file *file,
                         struct argp_state *state)
{
    if (strcmp(file->kind, WA_TITRANT_FILE_KIND) == 0) {
        struct wa_text words = {.bytes = NULL};
        wa_text_append(&words, "%s", file->titrant);
        const error_t result = give_text(options, "titrant", &words, state);
        return result != 0 ? result
                           : give_figure(options, "titrant concentration", &file->concentration,
                                         " mol/L", state);
    }
    struct wa_text correlation = {.bytes = NULL};
    error_t result = give_figure(options, "electrode slope", &file->slope, "", state);
    if (result == 0) {
        result = give_figure(options, "electrode offset", &file->offset, " pH", state);
    }
    wa_text_append(&correlation, "%.6g", file->correlation);
    if (result != 0) {
        wa_text_free(&correlation);
        return result;
    }
    return give_text(options, "electrode correlation", &correlation, state);
}

/* Take a value that names a file of ours. @return whether it did, as `taken` */
static error_t take_file(struct note_options *options, const char *kind, const char *path,
                         bool *taken, struct argp_state *state)
{
    struct wa_bench_file file;
    struct wa_error error;
    if (wa_bench_read(path, kind, &file, taken, &error) != WA_OK) {
        argp_failure(state, 1, 0, "%s: %s", path, error.message);
        return EINVAL;
    }
    if (*taken && options->owned_count + 3 > sizeof options->owned / sizeof options->owned[0]) {
        argp_error(state, "%s: one file of a titrant and one of an electrode at most", path);
        return EINVAL;
    }
    return *taken ? give_file(options, &file, state) : 0;
}

static error_t parse_electrode(struct note_options *options, const char *path,
                               struct argp_state *state)
{
    bool taken = false;
    const error_t result = take_file(options, WA_ELECTRODE_FILE_KIND, path, &taken, state);
    if (result == 0 && !taken) {
        argp_error(state, "--electrode: '%s' is no file that calibrate wrote", path);
        return EINVAL;
    }
    return result;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct note_options *options = state->input;
    size_t count;
    const struct wa_note_name *names = wa_note_names(&count);
    if (key == key_strict) {
        options->reader.strict = true;
        return 0;
    }
    if (key == key_electrode) {
        return parse_electrode(options, argument, state);
    }
    if (key < key_first_note || key >= key_first_note + (int)count) {
        return ARGP_ERR_UNKNOWN;
    }
    const char *name = names[key - key_first_note].name;
    bool taken = false;
    if (strcmp(name, "titrant") == 0) {
        const error_t result = take_file(options, WA_TITRANT_FILE_KIND, argument, &taken, state);
        if (result != 0) {
            return result;
        }
    }
    return taken ? 0 : give(options, name, argument, state);
}

enum wa_status note_options_init(struct note_options *options, struct wa_error *error)
{
    size_t count;
    const struct wa_note_name *names = wa_note_names(&count);
    *options = (struct note_options){.name_count = count};
    options->given = calloc(count, sizeof *options->given);
    options->options = calloc(count + 4, sizeof *options->options);
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
    options->options[count + 1] = (struct argp_option){
        .name = "electrode",
        .key = key_electrode,
        .arg = "FILE",
        .doc = "slope and offset from a file that calibrate wrote; --titrant takes one that "
               "standardize wrote",
        .group = 1};
    options->options[count + 2] =
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
    for (size_t k = 0; k < options->owned_count; k++) {
        free(options->owned[k]);
    }
    *options = (struct note_options){0};
}
