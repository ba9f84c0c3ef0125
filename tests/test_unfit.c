/* Data that cannot support an answer, and the reason that is given. Own contract throughout: the
 * runs are simulated, the words that a chemist acts on are looked for. */
#include "whichacid/identify.h"
#include "whichacid/simulate.h"

#include "base/text.h"

#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

static struct wa_table table;

/* The verdict on the rows of a simulated run up to a volume. */
static struct wa_result judged(const struct wa_simulation_options *options, double up_to_mL)
{
    struct wa_simulation simulation;
    struct wa_run_list list = {.count = 0};
    struct wa_result result;
    struct wa_error error;
    struct wa_text text = {.bytes = NULL};
    assert_int_equal(wa_simulate(&table, options, &simulation, &error), WA_OK);
    wa_text_append(&text,
                   "# sample mass: %.4f g\n# solution volume: 50.0 mL\n"
                   "# titrant: sodium hydroxide\n# titrant concentration: 0.1000 mol/L\n"
                   "volume (mL),pH\n",
                   simulation.mass[0]);
    for (size_t i = 0; i < simulation.count && simulation.volume_mL[i] <= up_to_mL; i++) {
        wa_text_append(&text, "%.3f,%.3f\n", simulation.volume_mL[i], simulation.reading[i]);
    }
    wa_simulation_free(&simulation);
    assert_false(text.failed);
    assert_int_equal(wa_read_memory(text.bytes, text.length, "test", NULL, &list, &error), WA_OK);
    wa_text_free(&text);
    assert_int_equal(wa_identify(&list, &table, NULL, &result, &error), WA_OK);
    return result;
}

static struct wa_simulation_options ask(const char *form)
{
    struct wa_simulation_options options;
    wa_simulation_defaults(&options);
    options.forms[0] = form;
    options.form_count = 1;
    options.mass[0].value = 0.0;
    return options;
}

static void assert_reason(const struct wa_simulation_options *options, double up_to_mL,
                          const char *words)
{
    struct wa_result result = judged(options, up_to_mL);
    if (result.verdict.kind != WA_VERDICT_UNFIT || strstr(result.verdict.sentence, words) == NULL) {
        fail_msg("\"%s\" is not in: %s", words, result.verdict.sentence);
    }
    wa_result_free(&result);
}

/* Hydrogen peroxide, pKa 11.6. Red when a weak acid is blamed on the dilution or on the points. */
static void too_weak(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("hydrogen-peroxide");
    options.mass[0].value = 0.05;
    assert_reason(&options, INFINITY, "too weak to be titrated in water");
    assert_reason(&options, INFINITY, "K times c is about");
}

/* Stopped at 3 of 20 mL, with readings that scatter. Red when the bound that still follows is lost,
 * or is no bound: the acid has 60 g/mol, and 0.3 mmol were met. */
static void stopped_early(void **state)
{
    (void)state;
    struct wa_simulation_options options = ask("acetic-acid");
    options.step_mL = 0.5;
    options.end_mL = 26.0;
    options.noise_reading = 0.06;
    assert_reason(&options, 3.1, "before the first equivalence point");
    assert_reason(&options, 3.1, "more than 0.3 mmol of acidic protons");
}

static int load(void **state)
{
    (void)state;
    struct wa_error error;
    return wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) == WA_OK ? 0 : -1;
}

static int unload(void **state)
{
    (void)state;
    wa_table_free(&table);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(too_weak),
        cmocka_unit_test(stopped_early),
    };
    return cmocka_run_group_tests(tests, load, unload);
}
