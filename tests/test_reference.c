/* The reference table: that the shipped one loads whole.
 * Kind of check: own contract. */
#include "whichacid/reference.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

static void shipped_table_loads_without_a_problem(void **state)
{
    (void)state;
    struct wa_table table;
    struct wa_error error = {0};
    assert_int_equal(wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error), WA_OK);
    for (size_t i = 0; i < table.problem_count; i++) {
        print_message("%s:%ld: %s: %s\n", table.problems[i].file, table.problems[i].line,
                      table.problems[i].column, table.problems[i].sentence);
    }
    assert_int_equal(table.problem_count, 0);
    assert_true(table.acid_count >= 60);
    assert_true(table.form_count >= 90);
    wa_table_free(&table);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(shipped_table_loads_without_a_problem)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
