/* `whichacid identify` as it is called. Kind of check: own contract of the command line. */
#include <errno.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cmocka.h>
#include <jansson.h>

/* A folder of its own for every test, with a good run and a file that is none. */
struct place {
    char folder[64];
};

static void write_file(const char *folder, const char *name, const char *text)
{
    char path[160];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    FILE *file = fopen(path, "w");
    assert_non_null(file);
    fputs(text, file);
    assert_int_equal(fclose(file), 0);
}

/* Acetic acid, 3 mmol in 50 mL, by the closed formula: enough to be read and answered. */
static const char good_run[] = "# sample mass: 0.1802 g\n# solution volume: 50.0 mL\n"
                               "# titrant: sodium hydroxide\n"
                               "# titrant concentration: 0.1000 ± 0.0002 mol/L\n"
                               "volume (mL),pH\n0,2.99\n3,3.80\n6,4.15\n9,4.39\n12,4.58\n15,4.76\n"
                               "18,4.94\n21,5.13\n24,5.36\n27,5.71\n28,5.90\n29,6.22\n29.5,6.53\n"
                               "30,8.79\n30.5,10.79\n31,11.09\n32,11.39\n34,11.68\n37,11.91\n";

static int set_up(void **state)
{
    struct place *place = calloc(1, sizeof *place);
    if (place == NULL) {
        return -1;
    }
    strcpy(place->folder, "report-command-XXXXXX");
    if (mkdtemp(place->folder) == NULL) {
        free(place);
        return -1;
    }
    *state = place;
    write_file(place->folder, "good.csv", good_run);
    write_file(place->folder, "bad.csv", "no titration at all\n");
    return 0;
}

static int tear_down(void **state)
{
    struct place *place = *state;
    char command[160];
    snprintf(command, sizeof command, "rm -r %s", place->folder);
    int result = system(command);
    free(place);
    return result;
}

/* Run `identify` in the folder with these arguments; standard output, or standard error when
 * `errors` is set, goes to `text`. Returns the exit status. */
static int call(const struct place *place, const char *arguments, bool errors, char *text,
                size_t size)
{
    char command[1024];
    snprintf(command, sizeof command, "cd %s && %s identify %s %s", place->folder,
             WHICHACID_PROGRAM, arguments, errors ? "2>&1 >/dev/null" : "2>/dev/null");
    FILE *pipe = popen(command, "r");
    assert_non_null(pipe);
    size_t length = fread(text, 1, size - 1, pipe);
    text[length] = '\0';
    while (fgetc(pipe) != EOF) {
    }
    int status = pclose(pipe);
    assert_true(WIFEXITED(status));
    return WEXITSTATUS(status);
}

static json_t *call_json(const struct place *place, const char *arguments, int expected)
{
    size_t size = 1 << 20;
    char *text = malloc(size);
    assert_non_null(text);
    assert_int_equal(call(place, arguments, false, text, size), expected);
    json_error_t error;
    json_t *json = json_loads(text, JSON_REJECT_DUPLICATES, &error);
    if (json == NULL) {
        fail_msg("line %d: %s", error.line, error.text);
    }
    free(text);
    return json;
}

static void an_answer_exits_with_0(void **state)
{
    char text[16384];
    assert_int_equal(call(*state, "good.csv", false, text, sizeof text), 0);
    assert_non_null(strstr(text, "Verdict: "));
    assert_non_null(strstr(text, "CANDIDATES"));
    assert_null(strchr(text, 0x1B));
}

static void an_unusable_file_exits_with_1(void **state)
{
    char text[4096];
    assert_int_equal(call(*state, "bad.csv", true, text, sizeof text), 1);
    assert_non_null(strstr(text, "bad.csv"));
    assert_int_equal(call(*state, "absent.csv", true, text, sizeof text), 1);
    assert_non_null(strstr(text, "absent.csv"));
    assert_int_equal(call(*state, "good.csv --table absent", true, text, sizeof text), 1);
}

static void a_wrong_call_exits_with_2(void **state)
{
    static const char *const calls[] = {"",
                                        "good.csv --no-such-option",
                                        "good.csv --among no-such-acid",
                                        "good.csv --explain no-such-acid",
                                        "good.csv --threshold 1.5",
                                        "good.csv --threshold often",
                                        "good.csv --sample-mass heavy",
                                        "- -"};
    for (size_t i = 0; i < sizeof calls / sizeof calls[0]; i++) {
        char text[4096];
        if (call(*state, calls[i], true, text, sizeof text) != 2) {
            fail_msg("'%s' does not exit with 2: %s", calls[i], text);
        }
        assert_true(strlen(text) > 0);
    }
}

static void help_shows_an_example(void **state)
{
    char text[16384];
    assert_int_equal(call(*state, "--help", false, text, sizeof text), 0);
    assert_non_null(strstr(text, "Example:"));
    assert_non_null(strstr(text, "--sample-mass"));
    assert_non_null(strstr(text, "--strict"));
}

static void json_names_the_input(void **state)
{
    json_t *json = call_json(*state, "--json - < good.csv", 0);
    json_t *input = json_array_get(json_object_get(json, "inputs"), 0);
    assert_string_equal(json_string_value(json_object_get(input, "file")), "standard input");
    assert_int_equal(json_string_length(json_object_get(input, "sha256")), 64);
    assert_int_equal(json_integer_value(json_object_get(input, "runs")), 1);
    json_decref(json);
}

/* An option wins over the note, and the answer says that it came from the call. */
static void options_win_over_notes(void **state)
{
    json_t *json = call_json(*state, "good.csv --json --sample-mass '0.25 g'", 0);
    json_t *mass = json_object_get(json_object_get(json, "notes"), "sample mass");
    assert_float_equal(json_number_value(json_object_get(mass, "value")), 0.25, 1e-12);
    assert_string_equal(json_string_value(json_object_get(mass, "from")), "option");
    json_decref(json);
}

static void among_closes_the_set(void **state)
{
    json_t *json = call_json(*state, "good.csv --json --among 'formic-acid, acetic-acid'", 0);
    size_t index;
    json_t *candidate;
    json_array_foreach(json_object_get(json, "candidates"), index, candidate)
    {
        const char *acid = json_string_value(json_object_get(candidate, "acid"));
        assert_true(strstr(acid, "cetic") != NULL || strstr(acid, "ormic") != NULL);
    }
    assert_true(index > 0);
    json_decref(json);
}

/* One file that cannot be used does not take the others' answers away. */
static void each_answers_what_it_can(void **state)
{
    json_t *json = call_json(*state, "--each --json good.csv bad.csv good.csv", 1);
    assert_true(json_is_array(json));
    assert_int_equal(json_array_size(json), 2);
    json_decref(json);
    json = call_json(*state, "--each --json bad.csv", 1);
    assert_int_equal(json_array_size(json), 0);
    json_decref(json);
    char text[32768];
    assert_int_equal(call(*state, "--each good.csv", false, text, sizeof text), 0);
    assert_memory_equal(text, "good.csv\n", 9);
}

/* The same bytes twice are one measurement. */
static void copies_are_no_replicates(void **state)
{
    char text[4096];
    assert_int_equal(call(*state, "good.csv ./good.csv", true, text, sizeof text), 1);
    assert_non_null(strstr(text, "same bytes"));
}

static void output_is_written_or_left(void **state)
{
    const struct place *place = *state;
    char text[4096];
    char path[160];
    assert_int_equal(call(place, "good.csv --output answer.txt", false, text, sizeof text), 0);
    assert_string_equal(text, "");
    snprintf(path, sizeof path, "%s/answer.txt", place->folder);
    FILE *file = fopen(path, "r");
    assert_non_null(file);
    assert_true(fread(text, 1, 100, file) == 100);
    fclose(file);
    assert_int_equal(call(place, "bad.csv --output other.txt", false, text, sizeof text), 1);
    snprintf(path, sizeof path, "%s/other.txt", place->folder);
    assert_int_equal(access(path, F_OK), -1);
    assert_int_equal(call(place, "good.csv --output absent/a.txt", true, text, sizeof text), 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(an_answer_exits_with_0),
        cmocka_unit_test(an_unusable_file_exits_with_1),
        cmocka_unit_test(a_wrong_call_exits_with_2),
        cmocka_unit_test(help_shows_an_example),
        cmocka_unit_test(json_names_the_input),
        cmocka_unit_test(options_win_over_notes),
        cmocka_unit_test(among_closes_the_set),
        cmocka_unit_test(each_answers_what_it_can),
        cmocka_unit_test(copies_are_no_replicates),
        cmocka_unit_test(output_is_written_or_left),
    };
    return cmocka_run_group_tests(tests, set_up, tear_down);
}
