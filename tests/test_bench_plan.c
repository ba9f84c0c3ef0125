/* Planning a titration. Kinds: common practice (stated beside each), self-consistency, own
 * contract. */
#include "whichacid/bench_report.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static int load(void **state)
{
    static struct wa_table table;
    struct wa_error error;
    *state = &table;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    wa_table_free(*state);
    return 0;
}

static void near(double value, double expected, double within)
{
    if (!(fabs(value - expected) <= within)) {
        fail_msg("%.9g is not %.9g within %g", value, expected, within);
    }
}

static struct wa_plan *make(const struct wa_table *table, const struct wa_plan_options *options)
{
    struct wa_plan *plan = malloc(sizeof *plan);
    struct wa_error error;
    assert_non_null(plan);
    if (wa_plan_make(table, options, plan, &error) != WA_OK) {
        fail_msg("%s", error.message);
    }
    return plan;
}

static struct wa_plan_options options_for(const char *form)
{
    struct wa_plan_options options;
    wa_plan_defaults(&options);
    options.form = form;
    options.trials = 0;
    return options;
}

/* Common practice: Ka 4.9e-10 with Kb 1.76e-5 gives K = Ka Kb / Kw = 0.86, useless. */
static void cyanide_with_ammonia(void **state)
{
    near(wa_plan_reaction_constant(-log10(4.9e-10), 14.0 + log10(1.76e-5), 14.0), 0.86, 0.005);
    struct wa_plan_options options = options_for("hydrocyanic-acid");
    options.titrant = "ammonia";
    struct wa_plan *plan = make(*state, &options);
    assert_int_equal(plan->chosen, -1);
    assert_true(plan->steps[0].K > 0.5 && plan->steps[0].K < 2.0);
    assert_true(plan->steps[0].unconverted > 0.4);
    near(plan->molar_mass, 27.026, 0.01);
    free(plan);
}

/* Common practice: weak acids down to about pKa 8 can be titrated at 0.1 mol/L, above it not. */
static void completeness(void **state)
{
    near(log10(wa_plan_reaction_constant(4.76, 14.0, 14.0)), 9.24, 1e-9);
    near(log10(wa_plan_reaction_constant(-6.0, 14.0, 14.0)), 14.0, 1e-9);
    struct wa_plan_options options = options_for("acetic-acid");
    struct wa_plan *plan = make(*state, &options);
    assert_int_equal(plan->chosen, 0);
    near(plan->steps[0].volume_mL, 20.0, 0.02);
    near(plan->mass_g, 60.052e-3 * 2.0, 1e-4);
    assert_true(plan->steps[0].pH > 8.4 && plan->steps[0].pH < 8.9);
    free(plan);
    options.form = "boric-acid";
    plan = make(*state, &options);
    assert_int_equal(plan->chosen, -1);
    free(plan);
}

/* Common practice: a weak acid of Ka 1e-8 has its equivalence point near pH 10. */
static void weak_acid_ends_near_10(void **state)
{
    struct wa_plan_options options = options_for(NULL);
    options.pKa_low = options.pKa_high = 8.0;
    options.titrant_concentration = (struct wa_quantity){0.1, 0.0001, true};
    struct wa_plan *plan = make(*state, &options);
    near(plan->steps[1].pH, 10.0, 0.25);
    free(plan);
}

/* Common practice: a weak base with strong acid ends below pH 7. */
static void base_ends_below_7(void **state)
{
    struct wa_plan_options options = options_for("tris");
    struct wa_plan *plan = make(*state, &options);
    assert_string_equal(plan->titrant->key, "hydrochloric-acid");
    assert_int_equal(plan->chosen, 0);
    assert_true(plan->steps[0].pH > 4.5 && plan->steps[0].pH < 5.5);
    free(plan);
}

static const struct wa_plan_indicator *indicator(const struct wa_plan *plan, const char *key)
{
    for (int i = 0; i < plan->indicator_count; i++) {
        if (strcmp(plan->indicators[i].indicator->key, key) == 0) {
            return &plan->indicators[i];
        }
    }
    return NULL;
}

/* Common practice: phenolphthalein, first pink a little above pH 8, suits acetic acid; methyl
 * orange and methyl red do not. Its error is the volume between that pH and the equivalence point:
 * the Henderson-Hasselbalch equation tells it before the jump. */
static void phenolphthalein_suits_acetic_acid(void **state)
{
    struct wa_plan_options options = options_for("acetic-acid");
    struct wa_plan *plan = make(*state, &options);
    const struct wa_plan_indicator *found = indicator(plan, "phenolphthalein");
    assert_non_null(found);
    assert_true(found->within);
    near(found->pH, 8.2, 1e-9);
    const double left = pow(10.0, 4.76 - 0.07 - 8.2); /* acid over acetate, activity in */
    const double hydroxide = pow(10.0, 8.2 - 13.92) * 0.07 / 2e-3;
    near(found->error_mL, 20.0 * (hydroxide - left), 0.002);
    assert_null(indicator(plan, "methyl-orange"));
    assert_null(indicator(plan, "methyl-red"));
    free(plan);
}

/* Own contract: additions rise from 0 and differ; the design is nowhere worse than even spacing in
 * what it optimises. */
static void design_is_better_than_even(void **state)
{
    static const char *const forms[] = {"acetic-acid", "citric-acid", "oxalic-acid", "tris"};
    for (size_t f = 0; f < sizeof forms / sizeof forms[0]; f++) {
        struct wa_plan_options options = options_for(forms[f]);
        struct wa_plan *plan = make(*state, &options);
        double design = log(plan->design.amount_u), even = log(plan->even.amount_u);
        for (int i = 0; i < plan->free_pKa_count; i++) {
            design += log(plan->design.pKa_u[i]);
            even += log(plan->even.pKa_u[i]);
        }
        assert_true(design < even);
        near(plan->additions_mL[0], 0.0, 0.0);
        for (int i = 1; i < plan->addition_count; i++) {
            assert_true(plan->additions_mL[i] > plan->additions_mL[i - 1] + 0.009);
            assert_true(plan->expected_pH[i] > 0.0 && plan->expected_pH[i] < 14.0);
        }
        free(plan);
    }
}

/* Self-consistency: what the sensitivities promise is what simulated runs give, with everything
 * noted so that no unknown is far from normal. A thousand runs tell a spread to about 4 %. */
static void promise_is_kept(void **state)
{
    struct wa_plan_options options = options_for("acetic-acid");
    options.trials = 1000;
    options.titrant_carbonate = (struct wa_quantity){0.005, 0.0005, true};
    options.electrode_offset = (struct wa_quantity){0.0, 0.01, true};
    options.electrode_slope = (struct wa_quantity){1.0, 0.002, true};
    struct wa_plan *plan = make(*state, &options);
    assert_true(plan->design.converged >= 995 && plan->even.converged >= 995);
    near(plan->design.pKa_error[0] / plan->design.pKa_u[0], 1.0, 0.15);
    near(plan->design.amount_error / plan->design.amount_u, 1.0, 0.15);
    near(plan->even.pKa_error[0] / plan->even.pKa_u[0], 1.0, 0.15);
    near(plan->even.amount_error / plan->even.amount_u, 1.0, 0.15);
    free(plan);
}

/* Common practice: acids far apart are told by a few readings, isomers of one pKa by none. */
static void rivals(void **state)
{
    struct wa_plan_options options = options_for("acetic-acid");
    options.rival = "benzoic-acid";
    struct wa_plan *plan = make(*state, &options);
    assert_true(plan->rival_told);
    assert_true(plan->power[0].share > 0.9);
    free(plan);
    options.rival = "no such acid";
    plan = malloc(sizeof *plan);
    struct wa_error error;
    assert_non_null(plan);
    assert_int_equal(wa_plan_make(*state, &options, plan, &error), WA_ERROR_CALL);
    free(plan);
}

/* Own contract: every face is written, and the sheet has a row for each reading. */
static void faces(void **state)
{
    struct wa_plan_options options = options_for(NULL);
    options.additions = 12;
    struct wa_plan *plan = make(*state, &options);
    struct wa_error error;
    char *text = NULL;
    int rows = 0;
    assert_int_equal(wa_plan_sheet(plan, &options, &text, &error), WA_OK);
    for (const char *at = text; (at = strstr(at, "   ________   ____________\n")) != NULL; at++) {
        rows++;
    }
    assert_int_equal(rows, 12);
    free(text);
    assert_int_equal(wa_plan_text(plan, &options, &text, &error), WA_OK);
    assert_non_null(strstr(text, "It will work"));
    free(text);
    assert_int_equal(wa_plan_json(plan, &options, &text, &error), WA_OK);
    assert_non_null(strstr(text, "\"additions_mL\""));
    free(text);
    free(plan);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(cyanide_with_ammonia),
        cmocka_unit_test(completeness),
        cmocka_unit_test(weak_acid_ends_near_10),
        cmocka_unit_test(base_ends_below_7),
        cmocka_unit_test(phenolphthalein_suits_acetic_acid),
        cmocka_unit_test(design_is_better_than_even),
        cmocka_unit_test(promise_is_kept),
        cmocka_unit_test(rivals),
        cmocka_unit_test(faces),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
