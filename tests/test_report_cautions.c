/* Cautions. Kind of check: own contract. */
#include "identify/cautions.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static const char *sentence_of(const struct wa_result *result, const char *code)
{
    for (size_t i = 0; i < result->caution_count; i++) {
        if (strcmp(result->cautions[i].code, code) == 0) {
            return result->cautions[i].sentence;
        }
    }
    return NULL;
}

/* A result of one run whose titrant was noted with these words and whose pH went that way. */
static void one_run(struct wa_result *result, const char *titrant, int direction)
{
    *result = (struct wa_result){0};
    result->runs.runs = calloc(1, sizeof *result->runs.runs);
    result->runs.count = 1;
    result->runs.runs[0].conditions.titrant = titrant;
    result->curves = calloc(1, sizeof *result->curves);
    result->curves[0].direction = direction;
}

static bool warns_of_gas(const struct wa_table *table, const char *titrant, int direction)
{
    struct wa_result result;
    one_run(&result, titrant, direction);
    assert_int_equal(wa_identify_cautions(table, &result, NULL), WA_OK);
    assert_non_null(sentence_of(&result, "screening-aid"));
    assert_non_null(sentence_of(&result, "responsible-analyst"));
    assert_non_null(sentence_of(&result, "unknown-sample"));
    const char *gas = sentence_of(&result, "acid-frees-gas");
    bool warned = gas != NULL && strstr(gas, "hydrogen cyanide") != NULL;
    wa_result_free(&result);
    return warned;
}

static void an_acid_titrant_warns_of_gas(void **state)
{
    const struct wa_table *table = *state;
    assert_true(warns_of_gas(table, "0.1 M HCl", 0));
    assert_true(warns_of_gas(table, "hydrochloric acid", 1));
    assert_false(warns_of_gas(table, "sodium hydroxide", -1));
    assert_true(warns_of_gas(table, NULL, -1));
    assert_false(warns_of_gas(table, NULL, 1));
    assert_true(warns_of_gas(table, NULL, 0));
    assert_true(warns_of_gas(NULL, NULL, -1));
}

static void hazards_come_from_the_row(void **state)
{
    const struct wa_table *table = *state;
    struct wa_result result;
    one_run(&result, "sodium hydroxide", 1);
    int form = wa_table_find_form(table, "nitric-acid");
    assert_true(form >= 0);
    result.candidates[0] = (struct wa_result_candidate){.form = form, .acid = -1};
    result.candidates[0].form_name = strdup("nitric acid");
    result.candidates[1] = (struct wa_result_candidate){.form = -1, .acid = -1};
    result.candidate_count = 2;
    assert_int_equal(wa_identify_cautions(table, &result, NULL), WA_OK);
    const char *hazards = sentence_of(&result, "candidate-hazards");
    assert_non_null(hazards);
    assert_memory_equal(hazards, "nitric acid: H", 14);
    const char *words = wa_table_hazard_sentence(table, "H314");
    assert_non_null(words);
    assert_non_null(strstr(hazards, words));
    assert_non_null(sentence_of(&result, "candidate-care"));
    assert_string_equal(result.candidates[1].hazards, "");
    wa_result_free(&result);
}

static int load(void **state)
{
    struct wa_table *table = calloc(1, sizeof *table);
    struct wa_error error;
    *state = table;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    wa_table_free(*state);
    free(*state);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(an_acid_titrant_warns_of_gas),
        cmocka_unit_test(hazards_come_from_the_row),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
