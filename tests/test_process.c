/* Running another program as a filter. Kinds of check are stated at each test. */
#include "base/process.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#define LONG_INPUT ((size_t)3000000)

static char *long_input(void)
{
    char *input = malloc(LONG_INPUT);
    assert_non_null(input);
    for (size_t i = 0; i < LONG_INPUT; i++) {
        input[i] = (char)('a' + i % 23);
    }
    return input;
}

/* Own contract: more than a pipe holds goes in and comes out whole, at the same time. */
static void all_bytes_pass(void **state)
{
    (void)state;
    static const char *const cat[] = {"cat", NULL};
    char *input = long_input();
    struct wa_process_output output;
    assert_int_equal(wa_process_run(cat, input, LONG_INPUT, 60, &output, NULL), WA_OK);
    assert_int_equal(output.size, LONG_INPUT);
    assert_memory_equal(output.bytes, input, LONG_INPUT);
    assert_int_equal(output.bytes[LONG_INPUT], '\0');
    free(output.bytes);
    free(input);
}

/* Own contract: a program that reads nothing ends the run, not this process by SIGPIPE. */
static void unread_input_is_no_signal(void **state)
{
    (void)state;
    static const char *const nothing[] = {"true", NULL};
    char *input = long_input();
    struct wa_process_output output;
    assert_int_equal(wa_process_run(nothing, input, LONG_INPUT, 60, &output, NULL), WA_OK);
    assert_int_equal(output.size, 0);
    free(output.bytes);
    free(input);
}

/* Own contract: a bad exit status is an error that carries the program's own first words. */
static void exit_status_is_checked(void **state)
{
    (void)state;
    static const char *const failing[] = {"sh", "-c", "echo half; echo why >&2; exit 3", NULL};
    struct wa_process_output output;
    struct wa_error error;
    assert_int_equal(wa_process_run(failing, "", 0, 60, &output, &error), WA_ERROR_FILE);
    assert_non_null(strstr(error.message, "sh failed: why"));
    assert_null(output.bytes);
    assert_false(output.missing);
}

/* Own contract: a program that does not end is ended. */
static void endless_program_is_killed(void **state)
{
    (void)state;
    static const char *const endless[] = {"sleep", "1000", NULL};
    struct wa_process_output output;
    struct wa_error error;
    assert_int_equal(wa_process_run(endless, "", 0, 1, &output, &error), WA_ERROR_FILE);
    assert_non_null(strstr(error.message, "took too long"));
}

/* Own contract: a program that is not there is told apart from one that fails. */
static void missing_program_is_told(void **state)
{
    (void)state;
    static const char *const missing[] = {"whichacid-has-no-such-program", NULL};
    struct wa_process_output output;
    struct wa_error error;
    assert_int_equal(wa_process_run(missing, "", 0, 60, &output, &error), WA_ERROR_FILE);
    assert_true(output.missing);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(all_bytes_pass),          cmocka_unit_test(unread_input_is_no_signal),
        cmocka_unit_test(exit_status_is_checked),  cmocka_unit_test(endless_program_is_killed),
        cmocka_unit_test(missing_program_is_told),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
