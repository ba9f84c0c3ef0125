/* Kind of check: common practice. Half of a weak acid has lost its proton where pH equals pKa. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

/* The species plot has a column each quarter of a pH unit from 0, after "  NNN % |". */
#define FIRST_COLUMN 9
#define COLUMN(pH) (FIRST_COLUMN + (int)((pH)*4.0 + 0.5))

static void species_of_acetic_acid_cross_at_its_pKa(void **state)
{
    (void)state;
    FILE *page = popen(WHICHACID_PROGRAM " table show acetic-acid", "r");
    assert_non_null(page);
    char line[512];
    int rows = 0;
    while (fgets(line, sizeof line, page) != NULL) {
        if (strncmp(line, "  100 % |", FIRST_COLUMN) == 0) {
            assert_int_equal(line[COLUMN(1.0)], '0');
            assert_int_equal(line[COLUMN(9.0)], '1');
            rows++;
        } else if (strncmp(line, "   50 % |", FIRST_COLUMN) == 0) {
            const char mark = line[COLUMN(4.75)];
            assert_true(mark == '0' || mark == '1');
            assert_int_equal(line[COLUMN(2.0)], ' ');
            rows++;
        }
    }
    assert_int_equal(pclose(page), 0);
    assert_int_equal(rows, 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(species_of_acetic_acid_cross_at_its_pKa)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
