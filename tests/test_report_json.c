/* The JSON answer, read back by a JSON parser. Kinds of check are stated at each test. */
#include "base/sha256.h"
#include "report_sample.h"
#include "whichacid/report.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <jansson.h>

static const struct wa_report_options options = {.version = "0.0.0"};

static json_t *answer_of(const struct wa_result *result)
{
    char *text = NULL;
    assert_int_equal(wa_report_json(result, &options, &text, NULL), WA_OK);
    assert_int_equal(text[strlen(text) - 1], '\n');
    json_error_t error;
    json_t *json = json_loads(text, JSON_REJECT_DUPLICATES, &error);
    if (json == NULL) {
        fail_msg("line %d: %s", error.line, error.text);
    }
    free(text);
    return json;
}

static json_t *answer_with(const char *words)
{
    struct wa_result result;
    sample_result(&result, words);
    json_t *json = answer_of(&result);
    wa_result_free(&result);
    return json;
}

static void assert_keys(json_t *object, const char *const *keys)
{
    for (; *keys != NULL; keys++) {
        if (json_object_get(object, *keys) == NULL) {
            fail_msg("no key %s", *keys);
        }
    }
}

static json_t *first_of(json_t *json, const char *key)
{
    return json_array_get(json_object_get(json, key), 0);
}

static double number_of(json_t *object, const char *key)
{
    json_t *value = json_object_get(object, key);
    assert_true(json_is_number(value));
    return json_number_value(value);
}

static const char *const top_keys[] = {
    "program", "version",   "inputs",     "notes",      "equivalence_points",
    "protons", "pka",       "molar_mass", "candidates", "not_in_table",
    "verdict", "set_aside", "cautions",   "next_tests", NULL};

/* Own contract: the stable keys of the format, each of its type. */
static void stable_keys_are_there(void **state)
{
    (void)state;
    static const char *const point[] = {"volume_mL", "u_mL", "pH", "significance", "methods", NULL};
    static const char *const protons[] = {"count", "probability", "alternatives", "unseen", NULL};
    static const char *const pKa[] = {"step",           "half_equivalence", "value", "u",
                                      "ionic_strength", "temperature_C",    NULL};
    static const char *const mass[] = {"value", "u", "unit", "assumes", NULL};
    static const char *const candidate[] = {"rank",   "acid",       "form", "key", "probability",
                                            "misfit", "molar_mass", "pka",  "why", NULL};
    static const char *const verdict[] = {"kind", "forms", "probability", "sentence", NULL};
    static const char *const aside[] = {"file", "line", "text", "reason", NULL};
    static const char *const note[] = {"value", "u", "unit", "from", NULL};
    json_t *json = answer_with("Words.");
    assert_keys(json, top_keys);
    assert_keys(first_of(json, "equivalence_points"), point);
    assert_keys(json_object_get(json, "protons"), protons);
    assert_keys(first_of(json, "pka"), pKa);
    assert_keys(json_object_get(json, "molar_mass"), mass);
    assert_keys(first_of(json, "candidates"), candidate);
    assert_keys(json_object_get(json, "verdict"), verdict);
    assert_keys(first_of(json, "set_aside"), aside);
    assert_keys(json_object_get(json_object_get(json, "notes"), "sample mass"), note);
    static const char *const caution[] = {"code", "sentence", NULL};
    assert_keys(first_of(json, "cautions"), caution);
    static const char *const next[] = {"sentence", "separates", NULL};
    assert_keys(first_of(json, "next_tests"), next);
    json_decref(json);
}

/* Own contract: values come through in the units that the keys name. */
static void values_come_through(void **state)
{
    (void)state;
    json_t *json = answer_with("Words.");
    json_t *point = first_of(json, "equivalence_points");
    assert_true(number_of(point, "volume_mL") == 30.0);
    json_t *methods = json_object_get(point, "methods");
    assert_true(number_of(methods, "gran_before") == 30.02);
    assert_true(json_is_null(json_object_get(methods, "gran_after")));
    json_t *mass = json_object_get(json_object_get(json, "notes"), "sample mass");
    assert_true(number_of(mass, "value") == 0.1801);
    assert_string_equal(json_string_value(json_object_get(mass, "unit")), "g");
    assert_string_equal(json_string_value(json_object_get(mass, "from")), "note");
    json_t *analyst = json_object_get(json_object_get(json, "notes"), "analyst");
    assert_string_equal(json_string_value(json_object_get(analyst, "value")), "Words.");
    json_t *verdict = json_object_get(json, "verdict");
    assert_string_equal(json_string_value(json_object_get(verdict, "kind")), "identified");
    json_t *forms = json_object_get(verdict, "forms");
    assert_int_equal(json_array_size(forms), 2);
    assert_string_equal(json_string_value(json_array_get(forms, 1)), "propionic-acid");
    json_t *bound = json_array_get(json_object_get(json, "pka"), 1);
    assert_true(json_is_null(json_object_get(bound, "value")));
    assert_string_equal(json_string_value(json_object_get(bound, "bound")), "above 11.2");
    json_t *moved = json_object_get(first_of(json, "parameters"), "moved");
    assert_float_equal(json_number_value(moved), 0.5, 1e-12);
    json_decref(json);
}

static void assert_no_odd_number(json_t *json)
{
    const char *key;
    json_t *value;
    size_t index;
    if (json_is_object(json)) {
        json_object_foreach(json, key, value)
        {
            assert_no_odd_number(value);
        }
    } else if (json_is_array(json)) {
        json_array_foreach(json, index, value)
        {
            assert_no_odd_number(value);
        }
    } else if (json_is_number(json)) {
        assert_true(isfinite(json_number_value(json)));
    }
}

/* Own contract: what is not known is null, and every stable key is there all the same. */
static void nothing_known_is_null(void **state)
{
    (void)state;
    struct wa_result result;
    sample_nothing(&result);
    json_t *json = answer_of(&result);
    wa_result_free(&result);
    assert_keys(json, top_keys);
    assert_true(json_is_null(json_object_get(json, "molar_mass")));
    json_t *not_in_table = json_object_get(json, "not_in_table");
    assert_true(json_is_null(json_object_get(not_in_table, "probability")));
    assert_no_odd_number(json);
    json_decref(json);
}

/* Own contract: infinities and NaN anywhere become null. */
static void odd_numbers_become_null(void **state)
{
    (void)state;
    struct wa_result result;
    sample_result(&result, "Words.");
    result.equivalence_points[0].pH = NAN;
    result.equivalence_points[0].u_mL = INFINITY;
    result.candidates[0].misfit = -INFINITY;
    result.candidates[0].pKa[0] = NAN;
    result.pKa[0].half_equivalence = NAN;
    result.molar_mass_u = NAN;
    result.runs.runs[0].conditions.sample_mass.quantity.value = INFINITY;
    json_t *json = answer_of(&result);
    wa_result_free(&result);
    assert_true(json_is_null(json_object_get(first_of(json, "equivalence_points"), "pH")));
    assert_true(json_is_null(json_object_get(first_of(json, "equivalence_points"), "u_mL")));
    assert_true(json_is_null(json_object_get(first_of(json, "candidates"), "misfit")));
    assert_no_odd_number(json);
    json_decref(json);
}

/* Own contract: control characters and quotes come back as they were, broken UTF-8 as U+FFFD. */
static void hostile_text_comes_back(void **state)
{
    (void)state;
    json_t *json = answer_with("a\"b\\c\x1B[2J\n\x01</script> \xC3\xA9\xFF\xC0\x80\xED\xA0\x80 z");
    const char *reason = json_string_value(json_object_get(first_of(json, "set_aside"), "reason"));
    assert_string_equal(reason, "a\"b\\c\x1B[2J\n\x01</script> \xC3\xA9"
                                "\xEF\xBF\xBD\xEF\xBF\xBD\xEF\xBF\xBD\xEF\xBF\xBD\xEF\xBF\xBD\xEF"
                                "\xBF\xBD z");
    json_decref(json);
}

/* Outside check: FIPS 180-4 example values, published by NIST, for "abc" and the empty message. */
static void fingerprints_are_those_of_the_standard(void **state)
{
    (void)state;
    char text[65];
    wa_sha256("abc", 3, text);
    assert_string_equal(text, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    wa_sha256(NULL, 0, text);
    assert_string_equal(text, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
}

/* Own contract: an input keeps its name, gets its fingerprint once, and is listed. */
static void inputs_are_listed(void **state)
{
    (void)state;
    struct wa_result result;
    sample_nothing(&result);
    char text[65];
    wa_sha256("abc", 3, text);
    assert_int_equal(wa_result_add_input(&result, "a.csv", "", 2, NULL), WA_OK);
    assert_int_equal(wa_result_add_input(&result, "a.csv", text, 2, NULL), WA_OK);
    assert_int_equal(wa_result_add_input(&result, "b.csv", text, 1, NULL), WA_OK);
    assert_int_equal(result.input_count, 2);
    json_t *json = answer_of(&result);
    wa_result_free(&result);
    json_t *input = first_of(json, "inputs");
    assert_string_equal(json_string_value(json_object_get(input, "file")), "a.csv");
    assert_string_equal(json_string_value(json_object_get(input, "sha256")), text);
    assert_int_equal(json_integer_value(json_object_get(input, "runs")), 2);
    json_decref(json);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(stable_keys_are_there),
        cmocka_unit_test(values_come_through),
        cmocka_unit_test(nothing_known_is_null),
        cmocka_unit_test(odd_numbers_become_null),
        cmocka_unit_test(hostile_text_comes_back),
        cmocka_unit_test(fingerprints_are_those_of_the_standard),
        cmocka_unit_test(inputs_are_listed),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
