/* The words of `whichacid table`, run as a person runs them: exit status, what is printed, JSON.
 * Kind of check: own contract; the landmarks of acetic acid are common practice. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <jansson.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <unistd.h>

#include <cmocka.h>

#define OUTPUT_MAX 400000

static char output[OUTPUT_MAX];
static char folder[64];

/* Run the program with these words; what it prints goes to `output`. @return exit status */
static int run(const char *words)
{
    char command[2048];
    snprintf(command, sizeof command, "cd %s && %s table %s 2>errors", folder, WHICHACID_PROGRAM,
             words);
    FILE *stream = popen(command, "r");
    assert_non_null(stream);
    size_t length = fread(output, 1, sizeof output - 1, stream);
    output[length] = '\0';
    int status = pclose(stream);
    assert_true(WIFEXITED(status));
    return WEXITSTATUS(status);
}

static void assert_printed(const char *words)
{
    if (strstr(output, words) == NULL) {
        fail_msg("'%s' is missing in:\n%.2000s", words, output);
    }
}

static void assert_complained(const char *words)
{
    char path[128];
    char text[8192] = {0};
    snprintf(path, sizeof path, "%s/errors", folder);
    FILE *stream = fopen(path, "r");
    assert_non_null(stream);
    size_t length = fread(text, 1, sizeof text - 1, stream);
    text[length] = '\0';
    fclose(stream);
    if (strstr(text, words) == NULL) {
        fail_msg("'%s' is missing in:\n%.2000s", words, text);
    }
}

static json_t *parse_output(void)
{
    json_error_t error;
    json_t *value = json_loads(output, JSON_REJECT_DUPLICATES, &error);
    if (value == NULL) {
        fail_msg("no JSON: %s", error.text);
    }
    return value;
}

static int make_folder(void **state)
{
    (void)state;
    strcpy(folder, "/tmp/whichacid-command-XXXXXX");
    return mkdtemp(folder) != NULL ? 0 : -1;
}

static int remove_folder(void **state)
{
    (void)state;
    char command[128];
    snprintf(command, sizeof command, "rm -r %s", folder);
    return system(command);
}

/* No line wider than a terminal, not counting what a name alone makes wide. */
static void assert_fits_terminal(void)
{
    const char *line = output;
    while (*line != '\0') {
        size_t length = strcspn(line, "\n");
        size_t columns = 0;
        size_t indent = strspn(line, " ");
        bool one_word = indent >= length || memchr(line + indent, ' ', length - indent) == NULL;
        for (size_t i = 0; i < length; i++) {
            columns += ((unsigned char)line[i] & 0xC0) != 0x80;
        }
        if (columns > 80 && !one_word) {
            fail_msg("%zu columns: %.*s", columns, (int)length, line);
        }
        line += length + (line[length] == '\n');
    }
}

static void list_finds_by_a_word(void **state)
{
    (void)state;
    assert_int_equal(run("list phosphoric"), 0);
    assert_printed("phosphoric-acid");
    assert_null(strstr(output, "citric-acid"));
    assert_int_equal(run("list --json"), 0);
    json_t *list = parse_output();
    assert_true(json_array_size(list) >= 350);
    json_decref(list);
}

/* 0.1 mol/L acetic acid with 0.1 mol/L sodium hydroxide: 2.88, 4.75, 8.7 in every textbook. */
static void show_gives_the_landmarks_of_acetic_acid(void **state)
{
    (void)state;
    assert_int_equal(run("show acetic acid --json"), 0);
    json_t *page = parse_output();
    json_t *first = json_array_get(json_object_get(page, "landmarks"), 0);
    json_t *point = json_array_get(json_object_get(first, "points"), 0);
    assert_true(fabs(json_real_value(json_object_get(first, "start_pH")) - 2.88) < 0.03);
    assert_true(fabs(json_real_value(json_object_get(point, "half_way_pH")) - 4.75) < 0.15);
    assert_true(fabs(json_real_value(json_object_get(point, "equivalence_pH")) - 8.73) < 0.1);
    bool phenolphthalein = false;
    json_t *indicators = json_object_get(point, "indicators");
    for (size_t i = 0; i < json_array_size(indicators); i++) {
        const char *key = json_string_value(json_array_get(indicators, i));
        assert_string_not_equal(key, "methyl-orange");
        phenolphthalein = phenolphthalein || strcmp(key, "phenolphthalein") == 0;
    }
    assert_true(phenolphthalein);
    json_decref(page);
}

static void show_prints_a_page_that_fits(void **state)
{
    (void)state;
    assert_int_equal(run("show citric acid --temperature 37 --ionic-strength 0.1"), 0);
    assert_printed("at 37 °C and I = 0.1 mol/L");
    assert_printed("Species against pH");
    assert_printed("Forms that are weighed");
    assert_printed("citric acid monohydrate");
    assert_printed("Sources");
    assert_fits_terminal();
    assert_int_equal(run("show sodium acetate"), 0);
    assert_printed("(acetic-acid)");
    assert_int_equal(run("show ammonia --output page.txt"), 0);
    assert_string_equal(output, "");
    assert_int_equal(run("show 'no such thing'"), 1);
    assert_complained("no acid or form");
}

/* Every system of the table has a page, as text and as JSON: nothing crashes on the odd ones. */
static void every_system_has_a_page(void **state)
{
    (void)state;
    assert_int_equal(run("list --json"), 0);
    json_t *list = parse_output();
    for (size_t i = 0; i < json_array_size(list); i += 47) {
        char words[256];
        const char *key = json_string_value(json_object_get(json_array_get(list, i), "key"));
        snprintf(words, sizeof words, "show %s --temperature 60 --ionic-strength 0.5", key);
        assert_int_equal(run(words), 0);
        snprintf(words, sizeof words, "show %s --json", key);
        assert_int_equal(run(words), 0);
        json_decref(parse_output());
    }
    json_decref(list);
}

static void near_ranks_by_distance(void **state)
{
    (void)state;
    assert_int_equal(run("near 3.13 4.76 6.40 --molar-mass 210.14 --json"), 0);
    json_t *list = parse_output();
    json_t *first = json_array_get(list, 0);
    assert_string_equal(json_string_value(json_object_get(first, "key")), "citric-acid");
    json_decref(list);
    assert_int_equal(run("near 4,76"), 0);
    assert_printed("acetic-acid");
    assert_int_equal(run("near"), 2);
    assert_int_equal(run("near four"), 2);
}

static void check_exits_by_what_it_finds(void **state)
{
    (void)state;
    assert_int_equal(run("check"), 0);
    assert_printed("no problem found");
    assert_int_equal(run("check " WHICHACID_REFERENCE_DIR), 0);
    assert_int_equal(run("check " WHICHACID_CASES_DIR "/table/form-lost-forgotten.csv"), 1);
    assert_printed("form-lost-forgotten.csv:3: parts: ");
    assert_printed("1 problem found");
    assert_int_equal(run("check --json " WHICHACID_CASES_DIR "/table/form-lost-forgotten.csv"), 1);
    json_t *result = parse_output();
    assert_int_equal(json_array_size(json_object_get(result, "problems")), 1);
    json_decref(result);
    assert_int_equal(run("check nowhere.csv"), 1);
    assert_complained("nowhere.csv");
}

static void wrong_calls_exit_with_two(void **state)
{
    (void)state;
    assert_int_equal(run(""), 2);
    assert_int_equal(run("bogus"), 2);
    assert_int_equal(run("show"), 2);
    assert_int_equal(run("show acetic-acid --temperature 500"), 2);
    assert_int_equal(run("list --no-such-option"), 2);
    assert_int_equal(run("--help"), 0);
    assert_int_equal(run("near --help"), 0);
    assert_printed("Example:");
    assert_int_equal(run("list --table nowhere"), 1);
}

/* Adding: by options, by answers, a salt of what was added; nothing is written when it is wrong. */
static void add_writes_only_what_passes_the_check(void **state)
{
    (void)state;
    assert_int_equal(run("add --to mine --name 'kestrel acid' --formula C7H6O4 --pka '3.52 ± 0.03; "
                         "9,14' --source 'Own book, 2031'"),
                     0);
    assert_int_equal(run("add --to mine --acid kestrel-acid --lost 1 --form-name 'sodium "
                         "kestrelate dihydrate' --form-formula 'NaC7H5O4·2H2O'"),
                     0);
    assert_int_equal(run("check mine"), 0);
    assert_int_equal(run("show sodium kestrelate dihydrate --also mine"), 0);
    assert_printed("3.520 ± 0.030");
    assert_printed("Own book, 2031");
    assert_int_equal(run("add --to mine --name 'plover acid' --formula C7H6O4 --pka 3 --cas "
                         "64-19-8"),
                     1);
    assert_complained("nothing was added");
    assert_int_equal(run("add --to mine --name 'plover acid' --formula C7H6Qx --pka 3"), 1);
    assert_int_equal(run("add --to mine --name 'plover acid' --formula C7H6O4 --pka '9; 3'"), 1);
    assert_int_equal(run("add --to mine --name 'kestrel acid' --formula C7H6O4 --pka 3"), 1);
    assert_int_equal(run("list plover --also mine"), 0);
    assert_printed("0 of ");
    assert_int_equal(run("add --to mine --name 'wren base' </dev/null"), 1);
    assert_int_equal(run("add --to mine --name 'wren base' --formula C4H12N --charge 1 --pka 10.6 "
                         "--form-formula C4H11N --lost 1"),
                     0);
    assert_int_equal(run("show wren base --also mine"), 0);
    assert_printed("with hydrochloric acid");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(list_finds_by_a_word),
        cmocka_unit_test(show_gives_the_landmarks_of_acetic_acid),
        cmocka_unit_test(show_prints_a_page_that_fits),
        cmocka_unit_test(every_system_has_a_page),
        cmocka_unit_test(near_ranks_by_distance),
        cmocka_unit_test(check_exits_by_what_it_finds),
        cmocka_unit_test(wrong_calls_exit_with_two),
        cmocka_unit_test(add_writes_only_what_passes_the_check),
    };
    return cmocka_run_group_tests(tests, make_folder, remove_folder);
}
