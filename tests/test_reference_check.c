/* Mistakes in a table: each file of tests/cases/table holds one and says on its first lines which
 * finding it must give: `# expect: LINE | COLUMN | words`, or `# expect: error | words` when the
 * file as a whole is refused.
 * Kinds of check: own contract (the corpus), outside check (CAS check digits). */
#include "whichacid/reference.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#define EXPECTS_MAX 8

struct expectation {
    char line[16];
    char column[40];
    char words[120];
};

/* Cut a field off at the next '|' and trim it. */
static char *take_field(char **cursor)
{
    char *start = *cursor + strspn(*cursor, " ");
    char *end = start + strcspn(start, "|\r\n");
    *cursor = *end == '|' ? end + 1 : end;
    while (end > start && end[-1] == ' ') {
        end--;
    }
    *end = '\0';
    return start;
}

static size_t read_expectations(const char *path, struct expectation *expectations)
{
    FILE *stream = fopen(path, "r");
    char line[512];
    size_t count = 0;
    assert_non_null(stream);
    while (fgets(line, sizeof line, stream) != NULL && strncmp(line, "# expect:", 9) == 0) {
        assert_true(count < EXPECTS_MAX);
        struct expectation *expectation = &expectations[count];
        char *cursor = line + 9;
        snprintf(expectation->line, sizeof expectation->line, "%s", take_field(&cursor));
        bool whole = strcmp(expectation->line, "error") == 0;
        snprintf(expectation->column, sizeof expectation->column, "%s",
                 whole ? "" : take_field(&cursor));
        snprintf(expectation->words, sizeof expectation->words, "%s", take_field(&cursor));
        count++;
    }
    fclose(stream);
    return count;
}

static bool meets(const struct wa_table_problem *problem, const char *path,
                  const struct expectation *expectation)
{
    return strcmp(problem->file, path) == 0 && problem->line == atol(expectation->line) &&
           strcmp(problem->column, expectation->column) == 0 &&
           strstr(problem->sentence, expectation->words) != NULL;
}

/* @return number of failures, each printed */
static int check_findings(const struct wa_table *table, const char *path,
                          const struct expectation *expectations, size_t count)
{
    int failures = 0;
    size_t found = 0;
    for (size_t i = 0; i < table->problem_count; i++) {
        found += strcmp(table->problems[i].file, path) == 0;
    }
    for (size_t j = 0; j < count; j++) {
        bool met = false;
        for (size_t i = 0; i < table->problem_count; i++) {
            met = met || meets(&table->problems[i], path, &expectations[j]);
        }
        if (!met) {
            print_message("%s: nothing says '%s | %s | %s'\n", path, expectations[j].line,
                          expectations[j].column, expectations[j].words);
            failures++;
        }
    }
    if (found != count) {
        print_message("%s: %zu findings, %zu expected\n", path, found, count);
        failures++;
    }
    if (failures > 0) {
        for (size_t i = 0; i < table->problem_count; i++) {
            print_message("   %s:%ld: %s: %s\n", table->problems[i].file, table->problems[i].line,
                          table->problems[i].column, table->problems[i].sentence);
        }
    }
    return failures;
}

static int check_case(const char *path)
{
    struct expectation expectations[EXPECTS_MAX];
    size_t count = read_expectations(path, expectations);
    struct wa_table table;
    struct wa_error error = {0};
    assert_true(count > 0);
    enum wa_status status = wa_table_load(WHICHACID_REFERENCE_DIR, &path, 1, &table, &error);
    if (strcmp(expectations[0].line, "error") == 0) {
        bool met = status == WA_ERROR_INPUT && strstr(error.message, expectations[0].words) != NULL;
        if (!met) {
            print_message("%s: expected '%s', got '%s'\n", path, expectations[0].words,
                          status == WA_OK ? "no error" : error.message);
        }
        if (status == WA_OK) {
            wa_table_free(&table);
        }
        return met ? 0 : 1;
    }
    if (status != WA_OK) {
        print_message("%s: %s\n", path, error.message);
        return 1;
    }
    assert_int_equal(wa_table_check(&table, &error), WA_OK);
    int failures = check_findings(&table, path, expectations, count);
    wa_table_free(&table);
    return failures;
}

static int is_csv(const struct dirent *entry)
{
    const char *dot = strrchr(entry->d_name, '.');
    return dot != NULL && strcmp(dot, ".csv") == 0;
}

/* Turns red when a mistake goes unnoticed, is put on the wrong line or column, or when one mistake
 * raises findings elsewhere. */
static void every_spoiled_file_is_found_out(void **state)
{
    (void)state;
    struct dirent **entries = NULL;
    int count = scandir(WHICHACID_CASES_DIR "/table", &entries, is_csv, alphasort);
    int failures = 0;
    assert_true(count >= 60);
    for (int i = 0; i < count; i++) {
        char path[1024];
        snprintf(path, sizeof path, "%s/table/%s", WHICHACID_CASES_DIR, entries[i]->d_name);
        failures += check_case(path);
        free(entries[i]);
    }
    free(entries);
    print_message("%d spoiled files\n", count);
    assert_int_equal(failures, 0);
}

/* The check digit by the rule of the registry: digits weighted from the right, sum modulo ten; the
 * numbers are those of water, caffeine, acetic acid, sodium hydroxide and potassium hydrogen
 * phthalate as printed on any bottle. */
static void registry_numbers_are_verified(void **state)
{
    (void)state;
    const char *good[] = {"7732-18-5", "58-08-2", "64-19-7", "1310-73-2", "877-24-7"};
    const char *bad[] = {"7732-18-4", "58-80-2",    "64-19-17",  "1310732", "",
                         "877-24-",   "064-19-7",   "877-24-7 ", "a7-24-7", "877/24/7",
                         "877-2-47",  "1234567890", "2019-01-05"};
    for (size_t i = 0; i < sizeof good / sizeof good[0]; i++) {
        assert_true(wa_cas_is_valid(good[i]));
    }
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        assert_false(wa_cas_is_valid(bad[i]));
    }
}

/* Turns red when the shipped table itself has a mistake that the check knows. */
static void shipped_table_passes_the_check(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_table_statistics statistics;
    struct wa_error error = {0};
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    assert_int_equal(wa_table_check(&table, &error), WA_OK);
    for (size_t i = 0; i < table.problem_count; i++) {
        print_message("%s:%ld: %s: %s\n", table.problems[i].file, table.problems[i].line,
                      table.problems[i].column, table.problems[i].sentence);
    }
    assert_int_equal(table.problem_count, 0);
    wa_table_count(&table, &statistics);
    print_message("%zu acids, %zu with a source for every step, %zu with an enthalpy; %zu forms\n",
                  statistics.acids, statistics.acids_sourced, statistics.acids_enthalpy,
                  statistics.forms);
    assert_true(statistics.acids >= 350);
    assert_true(statistics.acids_sourced >= 150);
    assert_true(statistics.acids_enthalpy >= 60);
    assert_true(statistics.forms >= 550);
    assert_true(table.indicator_count >= 25);
    wa_table_free(&table);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(every_spoiled_file_is_found_out),
        cmocka_unit_test(registry_numbers_are_verified),
        cmocka_unit_test(shipped_table_passes_the_check),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
