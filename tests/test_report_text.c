/* The text report. Kinds of check are stated at each test. */
#include "report_sample.h"
#include "whichacid/report.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>

#include <cmocka.h>

static const char plain_words[] = "The sample is acetic acid.";

/* Escape sequences, a bell, a return to the line's start, broken and overlong UTF-8, a surrogate,
 * a character that turns the direction of writing, format specifiers, wide and combining ones, and
 * a word longer than any line. */
static const char hostile_words[] =
    "\x1B[2J\x07\r%s%n \xFF\xC0\x80\xED\xA0\x80 \xE2\x80\xAE right \xC2\x9B \"quoted\\\" "
    "\xE6\xB0\xB4\xE6\xBA\xB6\xE6\xB6\xB2 e\xCC\x81 "
    "wordwithoutanyendwordwithoutanyendwordwithoutanyendwordwithoutanyendwordwithoutanyend"
    "wordwithoutanyendwordwithoutanyend\n# next\tline";

/* Kept out of line: inlined, gcc 12 takes the returned text for the local pointer to it. */
__attribute__((noinline)) static char *report(const struct wa_result *result, int columns,
                                              bool colour)
{
    struct wa_report_options options = {.columns = columns, .colour = colour, .version = "0.0.0"};
    char *text = NULL;
    assert_int_equal(wa_report_text(result, &options, &text, NULL), WA_OK);
    assert_non_null(text);
    return text;
}

static char *report_of(const char *words, int columns)
{
    struct wa_result result;
    sample_result(&result, words);
    char *text = report(&result, columns, false);
    wa_result_free(&result);
    return text;
}

/* Columns of a line; the wide characters of the hostile words count two, the combining one none. */
static size_t line_columns(const char *line, size_t length)
{
    size_t columns = 0;
    for (size_t i = 0; i < length; i++) {
        unsigned char byte = (unsigned char)line[i];
        bool starts = (byte & 0xC0) != 0x80;
        columns += starts ? (byte == 0xE6 ? 2 : byte == 0xCC ? 0 : 1) : 0;
    }
    return columns;
}

static void assert_width(const char *text, size_t most)
{
    while (*text != '\0') {
        size_t length = strcspn(text, "\n");
        if (line_columns(text, length) > most) {
            fail_msg("wider than %zu: %.*s", most, (int)length, text);
        }
        text += length + (text[length] == '\n');
    }
}

/* Own contract: no line is wider than asked for, whatever the words are. */
static void lines_keep_to_the_width(void **state)
{
    (void)state;
    static const int widths[] = {40, 57, 72, 80, 100};
    static const char *const words[] = {plain_words, hostile_words};
    for (size_t i = 0; i < sizeof widths / sizeof widths[0]; i++) {
        for (size_t k = 0; k < 2; k++) {
            char *text = report_of(words[k], widths[i]);
            assert_width(text, (size_t)widths[i]);
            free(text);
        }
    }
    char *text = report_of(plain_words, 0);
    assert_width(text, 80);
    free(text);
    text = report_of(plain_words, 500);
    assert_width(text, 100);
    free(text);
}

/* Own contract: the verdict is the first line, with its share and the share demanded below. */
static void verdict_comes_first(void **state)
{
    (void)state;
    char *text = report_of(plain_words, 80);
    assert_memory_equal(text, "The sample is acetic acid.\n", 27);
    const char *second = text + 27;
    assert_non_null(strstr(second, "identified, probability 98.1 % (at least 95.0 %"));
    assert_true(strstr(second, "identified") < strstr(second, "WHAT WAS MEASURED"));
    free(text);
}

/* Outside check: JCGM 100:2008, 7.2.6 rounds 10.057 62 ohm with u = 27 milliohm to 10.058 ohm, and
 * 7.2.2 writes 100.021 47 g with u = 0.35 mg. */
static void digits_follow_the_uncertainty(void **state)
{
    (void)state;
    struct wa_result result;
    sample_result(&result, plain_words);
    result.molar_mass = 10.05762;
    result.molar_mass_u = 0.027;
    result.equivalent_mass = 100.02147;
    result.equivalent_mass_u = 0.00035;
    char *text = report(&result, 80, false);
    assert_non_null(strstr(text, "10.058 ± 0.027 g/mol"));
    assert_non_null(strstr(text, "100.02147 ± 0.00035 g/mol"));
    assert_non_null(strstr(text, "30.000 ± 0.023"));
    assert_non_null(strstr(text, "4.761 ± 0.012"));
    assert_non_null(strstr(text, "3.0012 ± 0.0070 mmol"));
    free(text);
    wa_result_free(&result);
}

/* Own contract: a result in which nothing is known still reads, and shows no machine's words. */
static void nothing_known_still_reads(void **state)
{
    (void)state;
    struct wa_result result;
    sample_nothing(&result);
    char *text = report(&result, 80, false);
    assert_memory_equal(text, "No verdict could be reached.\n", 29);
    assert_null(strstr(text, "nan"));
    assert_null(strstr(text, "inf"));
    assert_null(strstr(text, "(null)"));
    assert_width(text, 80);
    free(text);
    wa_result_free(&result);
}

/* Own contract: a file's text can neither move the cursor nor end a line; it is valid UTF-8. */
static void hostile_text_is_harmless(void **state)
{
    (void)state;
    char *text = report_of(hostile_words, 80);
    for (const char *at = text; *at != '\0'; at++) {
        unsigned char byte = (unsigned char)*at;
        assert_true(byte == '\n' || byte >= 0x20);
        assert_true(byte != 0x7F && byte != 0xFF && byte != 0xC0 && byte != 0xED);
    }
    assert_null(strstr(text, "\xE2\x80\xAE"));
    assert_null(strstr(text, "\xC2\x9B"));
    assert_non_null(strstr(text, "%s%n"));
    free(text);
}

/* Own contract: what was set aside, read as a slip, assumed, and moved by the fit is told. */
static void rows_and_priors_are_told(void **state)
{
    (void)state;
    char *text = report_of(plain_words, 80);
    assert_non_null(strstr(text, "SET ASIDE"));
    assert_non_null(strstr(text, "line 33: \"The sample is acetic acid.\": The sample"));
    assert_non_null(strstr(text, "line 14: 3.6 mL"));
    assert_non_null(strstr(text, "97.0 %"));
    assert_non_null(strstr(text, "sample mass             0.18010 ± 0.00020 g (line 3)"));
    assert_non_null(strstr(text, "0.10230 ± 0.00020 mol/L (option)"));
    assert_non_null(strstr(text, "0.50 ± 0.20 % (line 5)"));
    assert_non_null(strstr(text, "0.000 ± 0.060 pH (assumed)"));
    assert_non_null(strstr(text, "+0.5 u"));
    assert_non_null(strstr(text, "above 11.2"));
    free(text);
}

/* Own contract: deviations, unseen steps and the entry for what the table lacks are listed. */
static void candidates_can_be_checked(void **state)
{
    (void)state;
    char *text = report_of(plain_words, 100);
    const char *list = strstr(text, "CANDIDATES");
    assert_non_null(list);
    assert_non_null(strstr(list, "1.   98.1 %"));
    assert_non_null(strstr(list, "molar mass 60.05 g/mol (-0.4 u)"));
    assert_non_null(strstr(list, "pKa 4.756 ± 0.010 (+0.5 u), 13.10 ± 0.30 (not seen)"));
    assert_non_null(strstr(list, "0.4 %  something that is not in the table"));
    assert_non_null(strstr(list, "3.  < 0.1 %"));
    free(text);
}

/* Own contract: a name too long for its column is folded, and the figures stay in their columns. */
static void long_names_are_folded(void **state)
{
    (void)state;
    struct wa_result result;
    sample_result(&result, plain_words);
    free(result.parameters[0].name);
    result.parameters[0].name = strdup("a parameter with a long name");
    result.parameters[0].prior = 0.12345;
    result.parameters[0].prior_u = 0.00012;
    result.parameters[0].value = 0.12345;
    char *text = report(&result, 80, false);
    assert_width(text, 80);
    const char *table = strstr(text, "  parameter ");
    assert_non_null(table);
    const char *row = strchr(table, '\n') + 1;
    assert_memory_equal(row, "  a parameter", 13);
    const char *figure = strstr(row, "0.12345 ± 0.00012");
    assert_non_null(figure);
    assert_int_equal(figure - row, strstr(table, "before the fit") - table);
    assert_memory_equal(strchr(row, '\n') + 1, "    ", 4);
    assert_non_null(strstr(row, " 0.0 u\n"));
    free(text);
    wa_result_free(&result);
}

/* Column of the first `mark` in the line, or -1. */
static long column_of(const char *line, char mark)
{
    size_t length = strcspn(line, "\n");
    const char *found = memchr(line, mark, length);
    return found != NULL ? found - line : -1;
}

/* Own contract: the plot has axes with units, the points, and the equivalence point at its volume:
 * the column of colons stands under the tick of 30 mL. */
static void plot_marks_the_equivalence_point(void **state)
{
    (void)state;
    char *text = report_of(plain_words, 80);
    const char *plot = strstr(text, "THE CURVE\n");
    assert_non_null(plot);
    plot = strchr(plot, '\n') + 1;
    assert_non_null(strstr(plot, "pH\n"));
    const char *rows = strchr(plot, '\n') + 1;
    long colon = -1;
    const char *line = rows;
    while (column_of(line, '-') < 0) {
        long here = column_of(line, ':');
        assert_true(here < 0 || colon < 0 || here == colon);
        colon = here >= 0 ? here : colon;
        line = strchr(line, '\n') + 1;
    }
    assert_true(colon > 0);
    assert_int_equal(line[colon], '+');
    const char *labels = strchr(line, '\n') + 1;
    assert_memory_equal(labels + colon - 1, "30", 2);
    const char *marks = strchr(labels, '\n') + 1;
    assert_memory_equal(marks + colon - 1, "E1", 2);
    assert_non_null(memchr(rows, 'o', (size_t)(line - rows)));
    assert_non_null(strstr(marks, "titrant volume / mL"));
    free(text);
    text = report_of(plain_words, 60);
    assert_null(strstr(text, "THE CURVE"));
    free(text);
}

/* Own contract: readings that never change, or are no numbers, leave no plot and do no harm. */
static void plot_survives_flat_readings(void **state)
{
    (void)state;
    static const double values[] = {7.0, NAN, INFINITY};
    for (size_t i = 0; i < sizeof values / sizeof values[0]; i++) {
        struct wa_result result;
        sample_result(&result, plain_words);
        for (size_t k = 0; k < SAMPLE_POINTS; k++) {
            result.runs.runs[0].points[k].reading = values[i];
        }
        char *text = report(&result, 80, false);
        assert_null(strstr(text, "THE CURVE"));
        free(text);
        wa_result_free(&result);
    }
}

/* Own contract: colour adds escape sequences and changes nothing else. */
static void colour_carries_no_meaning(void **state)
{
    (void)state;
    struct wa_result result;
    sample_result(&result, plain_words);
    char *without = report(&result, 80, false);
    char *with = report(&result, 80, true);
    assert_null(strchr(without, 0x1B));
    assert_non_null(strchr(with, 0x1B));
    char *to = with;
    for (const char *from = with; *from != '\0';) {
        if (*from == 0x1B) {
            from = strchr(from, 'm') + 1;
        } else {
            *to++ = *from++;
        }
    }
    *to = '\0';
    assert_string_equal(with, without);
    free(with);
    free(without);
    wa_result_free(&result);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(lines_keep_to_the_width),
        cmocka_unit_test(verdict_comes_first),
        cmocka_unit_test(digits_follow_the_uncertainty),
        cmocka_unit_test(nothing_known_still_reads),
        cmocka_unit_test(hostile_text_is_harmless),
        cmocka_unit_test(rows_and_priors_are_told),
        cmocka_unit_test(candidates_can_be_checked),
        cmocka_unit_test(long_names_are_folded),
        cmocka_unit_test(plot_marks_the_equivalence_point),
        cmocka_unit_test(plot_survives_flat_readings),
        cmocka_unit_test(colour_carries_no_meaning),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
