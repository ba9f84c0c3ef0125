/* Kind of check: own contract of the error value. */
#include "whichacid/error.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

static void error_carries_place_and_words(void **state)
{
    (void)state;
    struct wa_error error;
    assert_int_equal(wa_fail(&error, WA_ERROR_INPUT, "run.csv", 7, "The pH %s.", "is odd"),
                     WA_ERROR_INPUT);
    assert_string_equal(error.file, "run.csv");
    assert_int_equal(error.line, 7);
    assert_string_equal(error.message, "The pH is odd.");
    assert_int_equal(wa_fail_memory(NULL), WA_ERROR_MEMORY);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(error_carries_place_and_words)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
