/* Kind of check: own contract of the reader, one file of tests/cases/reader/ for each quirk.
 *
 * Beside every input stands a file of the same name with .expect added: lines "key: value", with
 * '#' for comments. Keys: runs, points, first volume, last volume (mL), first reading,
 * last reading, kind (pH or mV), volume kind (total, burette, increment), set aside (lines),
 * heading, encoding, delimiter (comma, semicolon, tab, space, bar), decimal (point, comma),
 * remark (words that one remark contains), note (name = text), value and u (name = number, of the
 * conditions), error (words the sentence must contain), error line. "run: 2" turns to the second
 * run; "option: name = text" and "strict: yes" are given to the reader. */
#include "whichacid/reader.h"

#include "base/file.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <dirent.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define FOLDER WHICHACID_CASES_DIR "/reader"
#define SUFFIX ".expect"
#define OPTIONS_MAX 16

/* One case while it is checked. */
struct checking {
    const char *name;
    struct wa_reader_options options;
    struct wa_given_note given[OPTIONS_MAX];
    struct wa_run_list list;
    struct wa_error error;
    enum wa_status status;
    const struct wa_run *run;
    bool expects_error;
    int complaints;
};

static void complain(struct checking *checking, const char *key, const char *wanted,
                     const char *got)
{
    fprintf(stderr, "%s: %s: wanted '%s', got '%s'\n", checking->name, key, wanted, got);
    checking->complaints++;
}

static void check_number(struct checking *checking, const char *key, const char *wanted, double got)
{
    char text[40];
    snprintf(text, sizeof text, "%.9g", got);
    double number = strtod(wanted, NULL);
    /* Nine digits: what is written in a file must come through, not merely come near. */
    if (!(fabs(number - got) <= 1e-9 * fmax(1, fabs(number)))) {
        complain(checking, key, wanted, text);
    }
}

static void check_text(struct checking *checking, const char *key, const char *wanted,
                       const char *got)
{
    if (got == NULL || strcmp(wanted, got) != 0) {
        complain(checking, key, wanted, got != NULL ? got : "nothing");
    }
}

static const char *delimiter_word(char delimiter)
{
    switch (delimiter) {
    case ',':
        return "comma";
    case ';':
        return "semicolon";
    case '\t':
        return "tab";
    case '|':
        return "bar";
    default:
        return "space";
    }
}

static void check_set_aside(struct checking *checking, const char *wanted)
{
    char got[512] = "";
    for (size_t i = 0; i < checking->run->set_aside_count; i++) {
        size_t used = strlen(got);
        snprintf(got + used, sizeof got - used, "%s%ld", used > 0 ? " " : "",
                 checking->run->set_aside[i].line);
    }
    check_text(checking, "set aside", wanted, got[0] != '\0' ? got : "none");
}

static void check_remark(struct checking *checking, const char *wanted)
{
    for (size_t i = 0; i < checking->run->remark_count; i++) {
        if (strstr(checking->run->remarks[i], wanted) != NULL) {
            return;
        }
    }
    complain(checking, "remark", wanted, "no such remark");
}

/* "name = text" */
static bool split_pair(char *pair, char **right)
{
    char *between = strstr(pair, " = ");
    if (between == NULL) {
        return false;
    }
    *between = '\0';
    *right = between + 3;
    return true;
}

static void check_note(struct checking *checking, char *pair)
{
    char *text;
    if (!split_pair(pair, &text)) {
        complain(checking, "note", "name = text", pair);
        return;
    }
    for (size_t i = 0; i < checking->run->note_count; i++) {
        const struct wa_note *note = &checking->run->notes[i];
        if (strcmp(note->name, pair) == 0 && strcmp(note->text, text) == 0) {
            return;
        }
    }
    complain(checking, "note", pair, "no such note with that text");
}

static void check_condition(struct checking *checking, const char *key, char *pair)
{
    const struct wa_conditions *c = &checking->run->conditions;
    const struct {
        const char *name;
        const struct wa_noted *noted;
    } all[] = {
        {"sample mass", &c->sample_mass},
        {"solution volume", &c->solution_volume},
        {"titrant concentration", &c->titrant_concentration},
        {"titrant carbonate", &c->titrant_carbonate},
        {"temperature", &c->temperature},
        {"background electrolyte", &c->background},
        {"blank", &c->blank},
        {"electrode slope", &c->electrode_slope},
        {"electrode offset", &c->electrode_offset},
        {"reading uncertainty", &c->reading_uncertainty},
        {"volume uncertainty", &c->volume_uncertainty},
        {"sample volume", &c->sample_volume},
        {"sample density", &c->sample_density},
        {"aliquot", &c->aliquot},
    };
    char *number;
    if (!split_pair(pair, &number)) {
        complain(checking, key, "name = number", pair);
        return;
    }
    for (size_t i = 0; i < sizeof all / sizeof all[0]; i++) {
        if (strcmp(all[i].name, pair) == 0) {
            const struct wa_quantity *quantity = &all[i].noted->quantity;
            if (!all[i].noted->known) {
                check_text(checking, pair, number, "unknown");
            } else {
                check_number(checking, pair, number,
                             strcmp(key, "u") == 0 ? quantity->u : quantity->value);
            }
            return;
        }
    }
    complain(checking, key, "a known name", pair);
}

static void check_run(struct checking *checking, const char *key, char *value)
{
    static const char *const kinds[] = {"total", "burette", "increment"};
    const struct wa_run *run = checking->run;
    const struct wa_point *first = &run->points[0];
    const struct wa_point *last = &run->points[run->point_count - 1];
    if (strcmp(key, "points") == 0) {
        check_number(checking, key, value, (double)run->point_count);
    } else if (strcmp(key, "first volume") == 0) {
        check_number(checking, key, value, first->volume_mL);
    } else if (strcmp(key, "last volume") == 0) {
        check_number(checking, key, value, last->volume_mL);
    } else if (strcmp(key, "first reading") == 0) {
        check_number(checking, key, value, first->reading);
    } else if (strcmp(key, "last reading") == 0) {
        check_number(checking, key, value, last->reading);
    } else if (strcmp(key, "last time") == 0) {
        check_number(checking, key, value, last->time_s);
    } else if (strcmp(key, "last temperature") == 0) {
        check_number(checking, key, value, last->temperature_C);
    } else if (strcmp(key, "kind") == 0) {
        check_text(checking, key, value, run->reading_kind == WA_READING_PH ? "pH" : "mV");
    } else if (strcmp(key, "volume kind") == 0) {
        check_text(checking, key, value, kinds[run->volume_kind]);
    } else if (strcmp(key, "set aside") == 0) {
        check_set_aside(checking, value);
    } else if (strcmp(key, "heading") == 0) {
        check_text(checking, key, value, run->heading);
    } else if (strcmp(key, "encoding") == 0) {
        check_text(checking, key, value, run->encoding);
    } else if (strcmp(key, "delimiter") == 0) {
        check_text(checking, key, value, delimiter_word(run->delimiter));
    } else if (strcmp(key, "decimal") == 0) {
        check_text(checking, key, value, run->decimal_mark == ',' ? "comma" : "point");
    } else if (strcmp(key, "remark") == 0) {
        check_remark(checking, value);
    } else if (strcmp(key, "note") == 0) {
        check_note(checking, value);
    } else if (strcmp(key, "value") == 0 || strcmp(key, "u") == 0) {
        check_condition(checking, key, value);
    } else {
        complain(checking, key, "a known key", "an unknown one");
    }
}

static void check_expectation(struct checking *checking, const char *key, char *value)
{
    if (strcmp(key, "option") == 0 || strcmp(key, "strict") == 0) {
        return;
    }
    if (strcmp(key, "error") == 0 || strcmp(key, "error line") == 0) {
        char line[24];
        snprintf(line, sizeof line, "%ld", checking->error.line);
        checking->expects_error = true;
        if (checking->status == WA_OK) {
            complain(checking, key, value, "no error");
        } else if (strcmp(key, "error") == 0 && strstr(checking->error.message, value) == NULL) {
            complain(checking, key, value, checking->error.message);
        } else if (strcmp(key, "error line") == 0) {
            check_text(checking, key, value, line);
        }
    } else if (checking->status != WA_OK) {
        complain(checking, key, value, checking->error.message);
    } else if (strcmp(key, "runs") == 0) {
        check_number(checking, key, value, (double)checking->list.count);
    } else if (strcmp(key, "run") == 0) {
        size_t index = strtoul(value, NULL, 10);
        if (index < 1 || index > checking->list.count) {
            complain(checking, key, value, "no such run");
        } else {
            checking->run = &checking->list.runs[index - 1];
        }
    } else {
        check_run(checking, key, value);
    }
}

/* Call `act` for each "key: value" line of text, which is cut up. */
static void for_each_line(char *text, struct checking *checking,
                          void (*act)(struct checking *, const char *, char *))
{
    char *rest = NULL;
    for (char *line = strtok_r(text, "\n", &rest); line != NULL;
         line = strtok_r(NULL, "\n", &rest)) {
        char *between = strstr(line, ": ");
        if (line[0] == '#') {
            continue;
        }
        if (between == NULL) {
            complain(checking, "line", "key: value", line);
            continue;
        }
        *between = '\0';
        act(checking, line, between + 2);
    }
}

static void take_option(struct checking *checking, const char *key, char *value)
{
    char *text;
    if (strcmp(key, "strict") == 0) {
        checking->options.strict = true;
    } else if (strcmp(key, "option") == 0 && split_pair(value, &text) &&
               checking->options.given_count < OPTIONS_MAX) {
        checking->given[checking->options.given_count++] =
            (struct wa_given_note){.name = value, .text = text};
    }
}

static int check_case(const char *expect_name)
{
    char path[1024];
    snprintf(path, sizeof path, "%s/%s", FOLDER, expect_name);
    char *expectation = NULL;
    size_t size;
    struct checking checking = {.name = expect_name};
    if (wa_file_read(path, 1 << 16, &expectation, &size, NULL) != WA_OK) {
        complain(&checking, "file", "an expectation that can be read", path);
        return 1;
    }
    path[strlen(path) - strlen(SUFFIX)] = '\0';
    char *options = strdup(expectation);
    assert_non_null(options);
    for_each_line(options, &checking, take_option);
    checking.options.given = checking.given;
    checking.status = wa_read_file(path, &checking.options, &checking.list, &checking.error);
    checking.run = checking.list.count > 0 ? &checking.list.runs[0] : NULL;
    for_each_line(expectation, &checking, check_expectation);
    if (checking.status == WA_OK && checking.expects_error) {
        complain(&checking, "status", "an error", "none");
    }
    wa_run_list_free(&checking.list);
    free(options);
    free(expectation);
    return checking.complaints;
}

static bool is_expectation(const char *name)
{
    size_t length = strlen(name);
    size_t suffix = strlen(SUFFIX);
    return length > suffix && strcmp(name + length - suffix, SUFFIX) == 0;
}

static void every_case_reads_as_expected(void **state)
{
    (void)state;
    DIR *folder = opendir(FOLDER);
    assert_non_null(folder);
    int complaints = 0;
    int expectations = 0;
    int inputs = 0;
    for (struct dirent *entry = readdir(folder); entry != NULL; entry = readdir(folder)) {
        if (is_expectation(entry->d_name)) {
            complaints += check_case(entry->d_name);
            expectations++;
        } else if (entry->d_name[0] != '.') {
            inputs++;
        }
    }
    closedir(folder);
    assert_int_equal(complaints, 0);
    assert_int_equal(inputs, expectations);
    assert_true(expectations >= 60);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(every_case_reads_as_expected)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
