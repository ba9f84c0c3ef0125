/* Kinds of check: outside check (theoretical slope 59.16 mV at 25 °C, Buck et al., IUPAC
 * recommendations 2002) and own contract of notes, options and remarks. */
#include "run/run_internal.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void note(struct wa_run *run, const char *name, const char *text, enum wa_origin origin,
                 long line)
{
    struct wa_error error;
    assert_int_equal(wa_run_note(run, name, text, origin, line, &error), WA_OK);
}

static struct wa_run run_with_file(void)
{
    struct wa_run run = {0};
    run.file = strdup("run.csv");
    assert_non_null(run.file);
    return run;
}

static bool says(const struct wa_run *run, const char *words)
{
    for (size_t i = 0; i < run->remark_count; i++) {
        if (strstr(run->remarks[i], words) != NULL) {
            return true;
        }
    }
    return false;
}

static void names_disregard_case_and_spacing(void **state)
{
    (void)state;
    struct wa_run run = run_with_file();
    struct wa_error error;
    note(&run, "  Sample   MASS ", "0.5 g", WA_ORIGIN_NOTE, 3);
    note(&run, "solution-volume", "50 mL", WA_ORIGIN_OPTION, 0);
    assert_int_equal(wa_run_apply_notes(&run, &error), WA_OK);
    assert_true(run.conditions.sample_mass.known);
    assert_int_equal(run.conditions.sample_mass.line, 3);
    assert_int_equal(run.conditions.solution_volume.origin, WA_ORIGIN_OPTION);
    wa_run_free(&run);
}

static void options_win_and_doubles_must_agree(void **state)
{
    (void)state;
    struct wa_run run = run_with_file();
    struct wa_error error;
    note(&run, "temperature", "30 °C", WA_ORIGIN_OPTION, 0);
    note(&run, "temperature", "25 °C", WA_ORIGIN_NOTE, 1);
    note(&run, "temperature", "298.15 K", WA_ORIGIN_NOTE, 2);
    assert_int_equal(wa_run_apply_notes(&run, &error), WA_OK);
    assert_true(run.conditions.temperature.quantity.value == 30);
    note(&run, "temperature", "26 °C", WA_ORIGIN_NOTE, 9);
    assert_int_equal(wa_run_apply_notes(&run, &error), WA_ERROR_INPUT);
    assert_int_equal(error.line, 9);
    assert_non_null(strstr(error.message, "line 1"));
    wa_run_free(&run);
}

static void what_nobody_gave_is_assumed_and_said(void **state)
{
    (void)state;
    struct wa_run run = run_with_file();
    struct wa_error error;
    note(&run, "titrant concentration", "0.1 mol/L", WA_ORIGIN_NOTE, 1);
    assert_int_equal(wa_run_apply_notes(&run, &error), WA_OK);
    const struct wa_conditions *c = &run.conditions;
    assert_true(fabs(c->titrant_concentration.quantity.u - 0.0005) < 1e-15);
    assert_true(c->electrode_offset.quantity.u >= 0.06);
    assert_true(c->electrode_slope.quantity.u >= 0.012);
    assert_true(c->titrant_carbonate.quantity.value == 0);
    assert_true(c->titrant_carbonate.quantity.u >= 0.015);
    assert_false(c->solution_volume.known);
    assert_false(c->sample_mass.known);
    assert_true(says(&run, "0.5 % relative"));
    assert_true(says(&run, "electrode offset was not noted"));
    assert_true(says(&run, "25 ± 2 °C"));
    wa_run_free(&run);
}

static void theoretical_slope(void **state)
{
    (void)state;
    assert_true(fabs(wa_nernst_slope(25) - 59.16) < 0.005);
}

/* The electrode of 98 % slope and 5 mV at pH 7, read at 20 °C. */
static void mV_become_pH_by_two_buffers(void **state)
{
    (void)state;
    struct wa_run run = run_with_file();
    struct wa_error error;
    double per_pH = 0.98 * wa_nernst_slope(20);
    run.reading_kind = WA_READING_MV;
    run.points = calloc(2, sizeof *run.points);
    assert_non_null(run.points);
    run.point_count = 2;
    run.points[0].reading = 5 - per_pH * (3.0 - 7);
    run.points[1].reading = 5 - per_pH * (11.0 - 7);
    char text[64];
    snprintf(text, sizeof text, "4.00 = %.6f mV", 5 + 3 * per_pH);
    note(&run, "buffer 1", text, WA_ORIGIN_NOTE, 1);
    snprintf(text, sizeof text, "pH 9.22: %.6f mV", 5 - 2.22 * per_pH);
    note(&run, "buffer 2", text, WA_ORIGIN_NOTE, 2);
    note(&run, "temperature", "20 °C", WA_ORIGIN_NOTE, 3);
    assert_int_equal(wa_run_apply_notes(&run, &error), WA_OK);
    assert_int_equal(run.reading_kind, WA_READING_PH);
    assert_true(run.reading_from_mV);
    assert_true(fabs(run.points[0].reading - 3) < 1e-6);
    assert_true(fabs(run.points[1].reading - 11) < 1e-6);
    wa_run_free(&run);
}

static void long_rows_are_cut_between_letters(void **state)
{
    (void)state;
    struct wa_run run = {0};
    struct wa_error error;
    char row[200];
    for (size_t i = 0; i < sizeof row; i += 2) {
        memcpy(row + i, "é", 2);
    }
    memmove(row + 1, row, sizeof row - 1);
    row[0] = 'x';
    assert_int_equal(wa_run_set_aside(&run, 4, row, sizeof row, "Words.", &error), WA_OK);
    assert_int_equal(strlen(run.set_aside[0].text), 119);
    wa_run_free(&run);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(names_disregard_case_and_spacing),
        cmocka_unit_test(options_win_and_doubles_must_agree),
        cmocka_unit_test(what_nobody_gave_is_assumed_and_said),
        cmocka_unit_test(theoretical_slope),
        cmocka_unit_test(mV_become_pH_by_two_buffers),
        cmocka_unit_test(long_rows_are_cut_between_letters),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
