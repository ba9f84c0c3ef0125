/* The curve by itself. Each test says of which kind it is. */
#include "curve_model.h"

#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <string.h>

#include <cmocka.h>

/* cmocka compares single precision only. */
static void assert_near(double value, double expected, double tolerance)
{
    if (!(fabs(value - expected) <= tolerance)) {
        fail_msg("%.12g is not %.12g within %.3g", value, expected, tolerance);
    }
}

struct convolution {
    size_t half_width;
    int degree;
    int derivative;
    double divisor;
    double weights[9];
};

/* Outside check. Savitzky and Golay, Analytical Chemistry 36 (1964) 1627, tables of convolution
 * integers for equally spaced points (second-derivative integers are for half of the coefficient's
 * double, as printed). Red when the window is off by a point, the scaling of a derivative is wrong,
 * or the variance is not the sum of the squared weights. */
static void published_convolution_integers(void **state)
{
    (void)state;
    static const struct convolution table[] = {
        {2, 2, 0, 35, {-3, 12, 17, 12, -3}},
        {3, 2, 0, 21, {-2, 3, 6, 7, 6, 3, -2}},
        {4, 2, 0, 231, {-21, 14, 39, 54, 59, 54, 39, 14, -21}},
        {3, 4, 0, 231, {5, -30, 75, 131, 75, -30, 5}},
        {2, 2, 1, 10, {-2, -1, 0, 1, 2}},
        {3, 2, 1, 28, {-3, -2, -1, 0, 1, 2, 3}},
        {4, 2, 1, 60, {-4, -3, -2, -1, 0, 1, 2, 3, 4}},
        {2, 3, 1, 12, {1, -8, 0, 8, -1}},
        {3, 3, 1, 252, {22, -67, -58, 0, 58, 67, -22}},
        {2, 2, 2, 7, {2, -1, -2, -1, 2}},
        {3, 2, 2, 42, {5, 0, -3, -4, -3, 0, 5}},
    };
    for (size_t row = 0; row < sizeof table / sizeof table[0]; row++) {
        const struct convolution *entry = &table[row];
        const size_t count = 2 * entry->half_width + 1;
        double squares = 0.0, value[3], factor[3];
        for (size_t impulse = 0; impulse < count; impulse++) {
            double volume[9], reading[9] = {0.0};
            for (size_t i = 0; i < count; i++) {
                volume[i] = 3.0 + (double)i;
            }
            reading[impulse] = 1.0;
            assert_int_equal(wa_local_polynomial(volume, reading, count,
                                                 3.0 + (double)entry->half_width, entry->half_width,
                                                 entry->degree, value, factor, NULL),
                             WA_OK);
            const double weight = entry->weights[impulse] / entry->divisor;
            assert_near(value[entry->derivative], weight, 1e-12);
            squares += weight * weight;
        }
        assert_near(factor[entry->derivative], squares, 1e-12);
    }
}

/* Outside check against the closed form: a cubic on unequal spacing has exact derivatives, and the
 * sine's come out to the error of the next term. Red when spacing is taken as equal. */
static void derivatives_of_closed_forms(void **state)
{
    (void)state;
    double volume[40], cubic[40], sine[40], value[3], factor[3];
    for (size_t i = 0; i < 40; i++) {
        volume[i] = 0.1 * (double)i + 0.04 * sin(3.0 * (double)i);
        cubic[i] = 2.0 - volume[i] + 0.5 * pow(volume[i], 2.0) - 0.25 * pow(volume[i], 3.0);
        sine[i] = sin(volume[i]);
    }
    const double at = 2.037;
    assert_int_equal(wa_local_polynomial(volume, cubic, 40, at, 4, 3, value, factor, NULL), WA_OK);
    assert_near(value[0], 2.0 - at + 0.5 * at * at - 0.25 * at * at * at, 1e-10);
    assert_near(value[1], -1.0 + at - 0.75 * at * at, 1e-10);
    assert_near(value[2], 1.0 - 1.5 * at, 1e-9);
    assert_int_equal(wa_local_polynomial(volume, sine, 40, at, 3, 4, value, factor, NULL), WA_OK);
    assert_near(value[0], sin(at), 1e-5);
    assert_near(value[1], cos(at), 1e-4);
    assert_near(value[2], -sin(at), 1e-2);
}

static void analyse(struct simulation *simulation, struct wa_curve *curve)
{
    struct wa_error error = {0};
    if (wa_curve_analyse(&simulation->run, curve, &error) != WA_OK) {
        fail_msg("%s", error.message);
    }
}

static const struct model acetic = {1, {4.76}, 0.04, 0.1, 50.0, 0.0, false};

/* Common practice: pH at half-equivalence is pKa for a pKa near 5, and the equivalence volume is
 * the stoichiometric one. Self-consistency besides (own generator). Red when the half volume or the
 * sign of the correction is wrong. */
static void weak_acid(void **state)
{
    (void)state;
    static struct simulation simulation;
    uint64_t seed = 11;
    simulate(&simulation, &acetic, 61, 30.0, 0.005, 0.002, &seed);
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    const struct wa_inflection *inflection = &curve.inflections[0];
    assert_near(inflection->equivalence.volume_mL, 20.0, 0.1);
    assert_true(inflection->equivalence.u_mL > 0.0 && inflection->equivalence.u_mL < 0.06);
    assert_true(inflection->reading > 7.5 && inflection->reading < 10.0);
    assert_int_equal(inflection->protons, 1);
    assert_int_equal(curve.half_count, 1);
    assert_near(curve.halves[0].pH, 4.76, 0.02);
    assert_near(curve.halves[0].pKa, 4.76, 0.02);
    assert_true(curve.halves[0].u > 0.05 && curve.halves[0].u < 0.12);
    assert_false(curve.halves[0].merged);
    assert_int_equal(curve.direction, 1);
    assert_int_equal(curve.buffer_count, 2);
    assert_near(curve.buffers[0].volume_mL, 10.0, 2.0);
    wa_curve_free(&curve);
}

/* Common practice: a weak base titrated with strong acid ends below pH 7, a strong acid with strong
 * base in the middle of the jump at 7. */
static void place_of_the_jump(void **state)
{
    (void)state;
    static struct simulation simulation;
    const struct model ammonia = {1, {9.25}, 0.04, 0.1, 50.0, 0.0, true};
    const struct model strong = {1, {-4.0}, 0.04, 0.1, 50.0, 0.0, false};
    uint64_t seed = 5;
    struct wa_curve curve;
    simulate(&simulation, &ammonia, 61, 30.0, 0.005, 0.002, &seed);
    analyse(&simulation, &curve);
    assert_int_equal(curve.direction, -1);
    assert_int_equal(curve.inflection_count, 1);
    assert_true(curve.inflections[0].reading < 7.0 && curve.inflections[0].slope < 0.0);
    assert_near(curve.inflections[0].equivalence.volume_mL, 20.0, 0.05);
    assert_near(curve.halves[0].pKa, 9.25, 0.03);
    wa_curve_free(&curve);
    simulate(&simulation, &strong, 61, 30.0, 0.005, 0.002, &seed);
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    assert_near(curve.inflections[0].reading, 7.0, 1.5);
    assert_near(curve.inflections[0].equivalence.volume_mL, 20.0, 0.1);
    assert_int_equal(curve.half_count, 0);
    assert_true(curve.remark_count > 0);
    wa_curve_free(&curve);
}

/* Outside check against the closed form: for an exactly computed strong acid both of Gran's lines
 * are straight but for the water term, and meet the axis at the equivalence volume. Red when the
 * dilution V0 + V is left out (the line then bends by a few tenths of a per cent). */
static void gran_lines_of_a_strong_acid(void **state)
{
    (void)state;
    static struct simulation simulation;
    const struct model strong = {1, {-6.0}, 0.03, 0.1, 40.0, 0.0, false};
    uint64_t seed = 3;
    simulate(&simulation, &strong, 101, 20.0, 0.0, 0.0, &seed);
    simulation.run.conditions.titrant_carbonate =
        (struct wa_noted){{0.0, 0.0001, true}, true, WA_ORIGIN_NOTE, 4};
    simulation.run.conditions.reading_uncertainty =
        (struct wa_noted){{0.001, 0.0, false}, true, WA_ORIGIN_NOTE, 5};
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    assert_near(curve.inflections[0].gran_before.volume_mL, 12.0, 0.005);
    assert_near(curve.inflections[0].gran_after.volume_mL, 12.0, 0.005);
    assert_near(curve.inflections[0].equivalence.volume_mL, 12.0, 0.005);
    wa_curve_free(&curve);
}

/* Self-consistency: two clear steps, their constants and the ratio of their volumes, the first
 * constant near 2 (its free hydrogen ions move the half-way pH by several tenths). */
static void two_steps(void **state)
{
    (void)state;
    static struct simulation simulation;
    const struct model maleic = {2, {1.92, 6.23}, 0.02, 0.1, 50.0, 0.0, false};
    uint64_t seed = 9;
    simulate(&simulation, &maleic, 101, 25.0, 0.005, 0.002, &seed);
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 2);
    assert_int_equal(curve.inflections[0].protons, 1);
    assert_int_equal(curve.inflections[1].protons, 2);
    assert_true(curve.spacing_explained);
    assert_non_null(strstr(curve.spacing, "1:2"));
    assert_int_equal(curve.half_count, 2);
    assert_true(curve.halves[0].correction < -0.2);
    assert_near(curve.halves[0].pKa, 1.92, 2.0 * curve.halves[0].u);
    assert_near(curve.halves[1].pKa, 6.23, 0.05);
    wa_curve_free(&curve);
}

/* Own contract: mV without a calibration are analysed as mV, with the same equivalence volume and
 * no pKa; with one they become pH. */
static void millivolts(void **state)
{
    (void)state;
    static struct simulation simulation;
    uint64_t seed = 21;
    simulate(&simulation, &acetic, 61, 30.0, 0.005, 0.002, &seed);
    simulation.run.reading_kind = WA_READING_MV;
    for (size_t i = 0; i < simulation.run.point_count; i++) {
        simulation.points[i].reading = -59.16 * 0.99 * (simulation.points[i].reading - 7.0) - 8.0;
    }
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_true(curve.in_mV);
    assert_int_equal(curve.direction, -1);
    assert_int_equal(curve.inflection_count, 1);
    assert_int_equal(curve.half_count, 0);
    assert_near(curve.inflections[0].equivalence.volume_mL, 20.0, 0.15);
    wa_curve_free(&curve);
    simulation.run.conditions.electrode_slope =
        (struct wa_noted){{0.99, 0.004, true}, true, WA_ORIGIN_NOTE, 6};
    simulation.run.conditions.electrode_offset =
        (struct wa_noted){{8.0 / 59.16, 0.01, true}, true, WA_ORIGIN_NOTE, 7};
    analyse(&simulation, &curve);
    assert_false(curve.in_mV);
    assert_int_equal(curve.half_count, 1);
    assert_near(curve.halves[0].pKa, 4.76, 0.02);
    wa_curve_free(&curve);
}

/* Own contract: the volume of a jump between two coarse points is no better known than the gap
 * implies by the inflection, and the stated equivalence interval holds the true volume. */
static void coarse_points(void **state)
{
    (void)state;
    static struct simulation simulation;
    const struct model acid = {1, {4.76}, 0.0168, 0.1, 50.0, 0.0, false};
    uint64_t seed = 2;
    simulate(&simulation, &acid, 12, 11.0, 0.02, 0.02, &seed);
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    const struct wa_inflection *inflection = &curve.inflections[0];
    assert_true(inflection->u_mL >= 1.0 / sqrt(12.0) - 1e-9);
    assert_near(inflection->volume_mL, 8.4, 2.0 * inflection->u_mL);
    assert_near(inflection->equivalence.volume_mL, 8.4, 2.5 * inflection->equivalence.u_mL);
    wa_curve_free(&curve);
}

/* Own contract: repeated and unordered volumes, values that are no numbers, and a long run. */
static void awkward_points(void **state)
{
    (void)state;
    static struct simulation simulation;
    uint64_t seed = 31;
    simulate(&simulation, &acetic, 2001, 30.0, 0.005, 0.002, &seed);
    simulation.points[100].volume_mL = simulation.points[99].volume_mL;
    simulation.points[200].reading = NAN;
    simulation.points[300].volume_mL = NAN;
    const struct wa_point swapped = simulation.points[400];
    simulation.points[400] = simulation.points[401];
    simulation.points[401] = swapped;
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.point_count, 1998);
    for (size_t i = 0; i < curve.point_count; i++) {
        assert_true(isfinite(curve.smooth[i]) && isfinite(curve.first[i]) &&
                    isfinite(curve.second[i]) && curve.smooth_u[i] > 0.0);
    }
    assert_int_equal(curve.inflection_count, 1);
    assert_near(curve.inflections[0].equivalence.volume_mL, 20.0, 0.05);
    assert_near(curve.noise, 0.005, 0.002);
    wa_curve_free(&curve);
}

/* Self-consistency, statistical: over repeated noise the stated 95 % interval of the equivalence
 * volume holds the stoichiometric one in at least 90 % (here 88 % of 60 runs, one binomial standard
 * deviation less), is a few tenths of a per cent wide, and noise makes no jump and hides none. Red
 * when the shift by carbonate is forgotten or the noise is underestimated. */
static void stated_intervals_hold(void **state)
{
    (void)state;
    static struct simulation simulation;
    static const struct {
        struct model model;
        size_t points;
        size_t jumps;
        double widest; /* mean u / V allowed */
    } cases[] = {
        {{1, {4.76}, 0.04, 0.1, 50.0, 0.0, false}, 60, 1, 0.004},
        {{1, {9.5}, 0.05, 0.1, 50.0, 0.0, false}, 60, 1, 0.013},
        {{2, {4.2, 5.6}, 0.02, 0.1, 50.0, 0.0, false}, 80, 1, 0.004},
        {{1, {9.25}, 0.04, 0.1, 50.0, 0.0, true}, 200, 1, 0.002},
    };
    uint64_t seed = 77;
    for (size_t k = 0; k < sizeof cases / sizeof cases[0]; k++) {
        int inside = 0;
        double width = 0.0;
        const double true_volume = model_equivalence(&cases[k].model, cases[k].model.steps);
        for (int run = 0; run < 60; run++) {
            struct model model = cases[k].model;
            struct wa_curve curve;
            model.carbonate = 0.02 * noise_uniform(&seed);
            simulate(&simulation, &model, cases[k].points, 1.5 * true_volume, 0.01, 0.01, &seed);
            analyse(&simulation, &curve);
            assert_int_equal(curve.inflection_count, cases[k].jumps);
            const struct wa_volume_estimate *found = &curve.inflections[0].equivalence;
            inside += fabs(found->volume_mL - true_volume) < 1.96 * found->u_mL;
            width += found->u_mL / true_volume / 60.0;
            wa_curve_free(&curve);
        }
        if (inside < 53 || width > cases[k].widest) {
            fail_msg("case %zu: %d of 60 inside, mean u/V %.4f", k, inside, width);
        }
    }
}

/* Own contract: a mistyped reading is left out and named; a misread volume, which shifts the curve
 * by a few tenths of a pH between two points, is no jump. */
static void slips_are_no_jumps(void **state)
{
    (void)state;
    static struct simulation simulation;
    uint64_t seed = 41;
    simulate(&simulation, &acetic, 61, 30.0, 0.005, 0.002, &seed);
    simulation.points[20].reading -= 0.4;
    for (size_t i = 10; i < 61; i++) {
        simulation.points[i].reading += 0.12;
    }
    struct wa_curve curve;
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    assert_int_equal(curve.point_count, 60);
    assert_non_null(strstr(curve.remarks[0], "10.00 mL"));
    wa_curve_free(&curve);
}

/* Self-consistency: an acid with a neighbour's spacing: 1:2 is explained, a mixture of a strong and
 * a weak acid in an odd ratio is not; overlapped steps show as merged. Red when the uncertainty of
 * the ratio is far too wide or the shape of a step is ignored. */
static void spacing_and_shape(void **state)
{
    (void)state;
    static struct simulation simulation;
    const struct model succinic = {2, {4.21, 5.64}, 0.02, 0.1, 50.0, 0.0, false};
    const struct model acid = {2, {3.0, 8.5}, 0.02, 0.1, 50.0, 0.0, false};
    uint64_t seed = 13;
    struct wa_curve curve;
    simulate(&simulation, &succinic, 101, 30.0, 0.005, 0.002, &seed);
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 1);
    assert_int_equal(curve.inflections[0].protons, 2);
    assert_true(curve.half_count == 1 && curve.halves[0].merged);
    wa_curve_free(&curve);
    simulate(&simulation, &acid, 121, 30.0, 0.005, 0.002, &seed);
    for (size_t i = 0; i < 121; i++) {
        simulation.points[i].volume_mL += 3.27; /* a strong acid before it, 3.27 mL worth */
    }
    analyse(&simulation, &curve);
    assert_int_equal(curve.inflection_count, 2);
    assert_false(curve.spacing_explained);
    assert_non_null(strstr(curve.spacing, "mixture"));
    wa_curve_free(&curve);
}

/* Own contract: no curve, no answer, and the result is untouched. */
static void too_few_points(void **state)
{
    (void)state;
    static struct simulation simulation;
    uint64_t seed = 1;
    simulate(&simulation, &acetic, 4, 30.0, 0.0, 0.0, &seed);
    struct wa_curve curve = {.point_count = 77};
    struct wa_error error;
    assert_int_equal(wa_curve_analyse(&simulation.run, &curve, &error), WA_ERROR_INPUT);
    assert_int_equal(curve.point_count, 77);
    double value[3], factor[3];
    const double same[3] = {1.0, 1.0, 1.0};
    assert_int_equal(wa_local_polynomial(same, same, 3, 1.0, 1, 2, value, factor, &error),
                     WA_ERROR_INPUT);
    assert_int_equal(wa_local_polynomial(same, same, 3, 1.0, 1, 5, value, factor, &error),
                     WA_ERROR_CALL);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(published_convolution_integers),
        cmocka_unit_test(derivatives_of_closed_forms),
        cmocka_unit_test(weak_acid),
        cmocka_unit_test(place_of_the_jump),
        cmocka_unit_test(gran_lines_of_a_strong_acid),
        cmocka_unit_test(two_steps),
        cmocka_unit_test(millivolts),
        cmocka_unit_test(coarse_points),
        cmocka_unit_test(awkward_points),
        cmocka_unit_test(stated_intervals_hold),
        cmocka_unit_test(slips_are_no_jumps),
        cmocka_unit_test(spacing_and_shape),
        cmocka_unit_test(too_few_points),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
