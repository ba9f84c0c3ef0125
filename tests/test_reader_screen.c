/* Kind of check: self-consistency. Curves from the closed form of a weak acid with a strong base
 * are read with and without a slip: no honest row may be set aside, however steep the jump, coarse
 * the steps or loud the noise; a reading off by a decade must be, where that is 1.4 pH or more. */
#include "base/text.h"
#include "whichacid/reader.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <math.h>

#define CURVES 400

/* Titrant volume that brings V0 mL of acid (c, pKa) to a pH, titrant of the same c: the charge
 * balance solved for the volume. */
static double volume_at(double pH, double pKa, double c)
{
    double h = pow(10, -pH);
    double oh = 1e-14 / h;
    double alpha = 1 / (1 + h / pow(10, -pKa));
    return 25 * (c * alpha - h + oh) / (c + h - oh);
}

static double pH_at(double volume, double pKa, double c)
{
    double low = 0;
    double high = 14 + log10(c);
    for (int i = 0; i < 60; i++) {
        double middle = 0.5 * (low + high);
        double here = volume_at(middle, pKa, c);
        if (here < volume) {
            low = middle;
        } else {
            high = middle;
        }
    }
    return 0.5 * (low + high);
}

/* A run as text; the reading of row `slip` is ten times too small, or none is. */
static void write_run(struct wa_text *text, gsl_rng *rng, size_t points, double noise, size_t slip)
{
    double pKa = 2.5 + 6.5 * gsl_rng_uniform(rng);
    double c = pow(10, -3 + 2 * gsl_rng_uniform(rng));
    wa_text_append(text, "volume (mL),pH\n");
    for (size_t i = 0; i < points; i++) {
        double volume = 40.0 * (double)i / (double)(points - 1);
        double pH = pH_at(volume, pKa, c) + gsl_ran_gaussian(rng, noise);
        wa_text_append(text, "%.3f,%.3f\n", volume, i == slip ? pH / 10 : pH);
    }
}

static size_t rows_set_aside(const struct wa_text *text, long *line)
{
    struct wa_run_list list = {0};
    struct wa_error error;
    assert_false(text->failed);
    assert_int_equal(wa_read_memory(text->bytes, text->length, "run", NULL, &list, &error), WA_OK);
    assert_int_equal(list.count, 1);
    size_t count = list.runs[0].set_aside_count;
    *line = count > 0 ? list.runs[0].set_aside[0].line : 0;
    wa_run_list_free(&list);
    return count;
}

static void honest_rows_are_kept(void **state)
{
    (void)state;
    static const double noises[] = {0.002, 0.02, 0.1, 0.3};
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    assert_non_null(rng);
    for (size_t i = 0; i < CURVES; i++) {
        struct wa_text text = {0};
        long line;
        size_t points = 12 + (size_t)gsl_rng_uniform_int(rng, 200);
        write_run(&text, rng, points, noises[i % 4], SIZE_MAX);
        if (rows_set_aside(&text, &line) != 0) {
            fail_msg("curve %zu, noise %g: line %ld was set aside:\n%s", i, noises[i % 4], line,
                     text.bytes);
        }
        wa_text_free(&text);
    }
    gsl_rng_free(rng);
}

static void decades_are_found(void **state)
{
    (void)state;
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    assert_non_null(rng);
    for (size_t i = 0; i < CURVES; i++) {
        struct wa_text text = {0};
        long line;
        size_t points = 14 + (size_t)gsl_rng_uniform_int(rng, 200);
        size_t slip = 2 + (size_t)gsl_rng_uniform_int(rng, points - 4);
        write_run(&text, rng, points, 0.01, slip);
        if (rows_set_aside(&text, &line) != 1 || line != (long)slip + 2) {
            fail_msg("curve %zu: line %zu should be set aside, not %ld:\n%s", i, slip + 2, line,
                     text.bytes);
        }
        wa_text_free(&text);
    }
    gsl_rng_free(rng);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(honest_rows_are_kept),
        cmocka_unit_test(decades_are_found),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
