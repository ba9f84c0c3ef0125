/* Kind of check: own contract of the program: exit status, JSON that parses, lines of 80 columns,
 * and the file that --output leaves. */
#include "base/file.h"
#include "base/text.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <jansson.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#define CASES WHICHACID_CASES_DIR "/reader/"

/* Run "whichacid inspect ARGUMENTS" and collect its standard output. */
static int run(const char *arguments, struct wa_text *output)
{
    char command[2048];
    snprintf(command, sizeof command, "'%s' inspect %s 2>/dev/null", WHICHACID_PROGRAM, arguments);
    FILE *pipe = popen(command, "r");
    assert_non_null(pipe);
    char buffer[4096];
    for (size_t got = fread(buffer, 1, sizeof buffer, pipe); got > 0;
         got = fread(buffer, 1, sizeof buffer, pipe)) {
        wa_text_append_bytes(output, buffer, got);
    }
    int status = pclose(pipe);
    assert_true(WIFEXITED(status));
    assert_false(output->failed);
    return WEXITSTATUS(status);
}

static int status_of(const char *arguments)
{
    struct wa_text output = {0};
    int status = run(arguments, &output);
    wa_text_free(&output);
    return status;
}

static void exit_status_tells_what_went_wrong(void **state)
{
    (void)state;
    assert_int_equal(status_of("'" CASES "comma.csv'"), 0);
    assert_int_equal(status_of("--help"), 0);
    assert_int_equal(status_of("'" CASES "not-empty.csv'"), 1);
    assert_int_equal(status_of("'" CASES "there-is-no-such-file.csv'"), 1);
    assert_int_equal(status_of("'" CASES "slip-out-of-range.csv' --strict"), 1);
    assert_int_equal(status_of(""), 2);
    assert_int_equal(status_of("--no-such-option x"), 2);
    assert_int_equal(status_of("'" CASES "comma.csv' --sample-mass '3 mL'"), 2);
    assert_int_equal(status_of("- < '" CASES "comma.csv'"), 0);
}

static void text_keeps_to_80_columns(void **state)
{
    (void)state;
    static const char *const files[] = {"notes-all.csv", "preamble.txt", "mv-two-buffers.csv",
                                        "runs-side-by-side-pairs.csv", "utf16-little.csv"};
    for (size_t i = 0; i < sizeof files / sizeof files[0]; i++) {
        char arguments[1024];
        struct wa_text output = {0};
        snprintf(arguments, sizeof arguments, "- < '" CASES "%s'", files[i]);
        assert_int_equal(run(arguments, &output), 0);
        char *rest = NULL;
        for (char *line = strtok_r(output.bytes, "\n", &rest); line != NULL;
             line = strtok_r(NULL, "\n", &rest)) {
            if (wa_text_columns(line) > 80) {
                fail_msg("%s: %s", files[i], line);
            }
        }
        wa_text_free(&output);
    }
}

static void json_holds_points_and_what_was_set_aside(void **state)
{
    (void)state;
    struct wa_text output = {0};
    assert_int_equal(run("'" CASES "slip-decade.csv' --json", &output), 0);
    json_error_t why;
    json_t *root = json_loads(output.bytes, 0, &why);
    assert_non_null(root);
    json_t *only = json_array_get(json_object_get(root, "runs"), 0);
    assert_int_equal(json_array_size(json_object_get(only, "points")), 13);
    json_t *row = json_array_get(json_object_get(only, "set_aside"), 0);
    assert_int_equal(json_integer_value(json_object_get(row, "line")), 6);
    assert_string_equal(json_string_value(json_object_get(row, "text")), "8.00,0.536");
    json_decref(root);
    wa_text_free(&output);
}

static void output_option_leaves_a_whole_file(void **state)
{
    (void)state;
    char folder[] = "inspect-output-XXXXXX";
    assert_non_null(mkdtemp(folder));
    char path[256];
    char arguments[1024];
    snprintf(path, sizeof path, "%s/result.json", folder);
    snprintf(arguments, sizeof arguments, "'" CASES "comma.csv' --json --output '%s'", path);
    assert_int_equal(status_of(arguments), 0);
    char *bytes;
    size_t size;
    struct wa_error error;
    assert_int_equal(wa_file_read(path, 1 << 20, &bytes, &size, &error), WA_OK);
    json_t *root = json_loads(bytes, 0, NULL);
    assert_non_null(root);
    json_decref(root);
    free(bytes);
    snprintf(arguments, sizeof arguments, "'" CASES "comma.csv' --output '%s/no/result'", folder);
    assert_int_equal(status_of(arguments), 1);
    assert_int_equal(unlink(path), 0);
    /* An empty folder can be removed: nothing half-written was left beside the result. */
    assert_int_equal(rmdir(folder), 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(exit_status_tells_what_went_wrong),
        cmocka_unit_test(text_keeps_to_80_columns),
        cmocka_unit_test(json_holds_points_and_what_was_set_aside),
        cmocka_unit_test(output_option_leaves_a_whole_file),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
