/* Statistical trials: forms drawn from the table are titrated by simulation and identified without
 * being named. Faults of the bench are of the size that the notes state, and the true constants lie
 * about the table's as its uncertainties say. Prints how often the answer was right; fails when it
 * was right less often than is asked for below.
 *
 * Kind of check: self-consistency. The simulation uses the program's own model, so this tests the
 * inference and its stated probabilities, not the chemistry.
 *
 * Usage: trials [COUNT [FIRST-SEED [one]]]; with `one` each trial is printed on a line. */
#include "whichacid/identify.h"
#include "whichacid/simulate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Shares asked for. The last two are what the program itself states. */
#define AMONG_THREE 0.85
#define IDENTIFIED_RIGHT 0.95
#define AMOUNT_WITHIN 0.90

/* A share of few trials may fall below what is asked by so many standard deviations. */
#define CHANCE 3.0

/* What has been counted. */
struct tally {
    int trials;
    int unfit;
    int among_three;
    int first;
    int identified, identified_right;
    int amounts, amounts_within;
};

/* A small generator of its own (Lehmer, by Park and Miller 1988): a trial depends on its seed. */
static double uniform(uint32_t *state)
{
    *state = (uint32_t)((uint64_t)*state * 48271U % 2147483647U);
    return (double)*state / 2147483647.0;
}

static double normal(uint32_t *state)
{
    const double radius = sqrt(-2.0 * log(uniform(state)));
    return radius * cos(2.0 * M_PI * uniform(state));
}

/* One modelled substance with a step that water lets one titrate. */
static bool can_be_drawn(const struct wa_table *table, const struct wa_form *form)
{
    if (!form->modelled || form->part_count != 1 || form->parts[0].acid == WA_PART_WATER ||
        form->parts[0].count != 1) {
        return false;
    }
    const struct wa_acid *acid = &table->acids[form->parts[0].acid];
    for (int i = 0; i < acid->step_count; i++) {
        if (acid->steps[i].pKa > 2.5 && acid->steps[i].pKa < 9.5) {
            return true;
        }
    }
    return false;
}

static const struct wa_form *draw_form(const struct wa_table *table, uint32_t *state)
{
    const struct wa_form *form;
    do {
        form = &table->forms[(size_t)(uniform(state) * (double)table->form_count)];
    } while (!can_be_drawn(table, form));
    return form;
}

/* A bench with faults: 0.3 % of the titrant, 0.02 pH of offset, 0.5 % of slope, all noted. */
static void draw_bench(struct wa_simulation_options *options, uint32_t *state)
{
    options->titrant_concentration = (struct wa_quantity){.value = 0.1, .u = 0.0003, .has_u = true};
    options->electrode_offset = (struct wa_quantity){.value = 0.0, .u = 0.02, .has_u = true};
    options->electrode_slope = (struct wa_quantity){.value = 0.995, .u = 0.005, .has_u = true};
    options->titrant_carbonate = (struct wa_quantity){.value = 0.01 * uniform(state)};
    options->carbon_dioxide = 1e-5;
    options->noise_reading = 0.005 + 0.015 * uniform(state);
    options->noise_volume = 0.005 + 0.010 * uniform(state);
    options->point_count = 25 + (int)(50.0 * uniform(state));
    options->dissolved = true;
}

/* Simulate with constants drawn about the table's, which are put back. */
static enum wa_status simulate_drawn(struct wa_table *table, int acid_index,
                                     const struct wa_simulation_options *options, uint32_t *state,
                                     struct wa_simulation *simulation, struct wa_error *error)
{
    struct wa_acid *acid = &table->acids[acid_index];
    const struct wa_acid as_listed = *acid;
    for (int i = 0; i < acid->step_count; i++) {
        acid->steps[i].pKa += acid->steps[i].u * normal(state);
    }
    const enum wa_status status = wa_simulate(table, options, simulation, error);
    *acid = as_listed;
    return status;
}

static void count_result(struct tally *tally, const struct wa_result *result,
                         const struct wa_form *hidden, double moles)
{
    const int acid = hidden->parts[0].acid;
    int rank = 0;
    for (size_t i = 0; i < result->candidate_count && rank == 0; i++) {
        rank = result->candidates[i].acid == acid ? result->candidates[i].rank : 0;
    }
    tally->trials++;
    tally->unfit += result->verdict.kind == WA_VERDICT_UNFIT;
    tally->first += rank == 1;
    tally->among_three += rank >= 1 && rank <= 3;
    if (result->verdict.kind == WA_VERDICT_IDENTIFIED) {
        tally->identified++;
        tally->identified_right += rank == 1;
    }
    if (isfinite(result->amount_mol) && result->amount_u > 0.0) {
        tally->amounts++;
        tally->amounts_within += fabs(result->amount_mol - moles) <= 1.96 * result->amount_u;
    }
}

static enum wa_status identify_text(const char *text, size_t length, const struct wa_table *table,
                                    struct wa_result *result, struct wa_error *error)
{
    const struct wa_reader_options reader = {0};
    const struct wa_identify_options options = {0};
    struct wa_run_list runs = {0};
    const enum wa_status status = wa_read_memory(text, length, "trial", &reader, &runs, error);
    return status != WA_OK ? status : wa_identify(&runs, table, &options, result, error);
}

static enum wa_status run_trial(struct wa_table *table, uint32_t seed, bool one,
                                struct tally *tally, struct wa_error *error)
{
    uint32_t state = seed * 2654435761U % 2147483646U + 1U;
    const struct wa_form *hidden = draw_form(table, &state);
    struct wa_simulation_options options;
    wa_simulation_defaults(&options);
    options.forms[0] = hidden->key;
    options.form_count = 1;
    options.seed = seed;
    draw_bench(&options, &state);
    struct wa_simulation simulation;
    enum wa_status status =
        simulate_drawn(table, hidden->parts[0].acid, &options, &state, &simulation, error);
    if (status != WA_OK) {
        return status;
    }
    char *text = NULL;
    size_t length = 0;
    struct wa_result result;
    status = wa_simulation_write(&simulation, &text, &length, error);
    if (status == WA_OK) {
        status = identify_text(text, length, table, &result, error);
    }
    if (status == WA_OK) {
        count_result(tally, &result, hidden, simulation.mass[0] / hidden->molar_mass);
        if (one) {
            printf("%u %s: %s\n", seed, hidden->key, result.verdict.sentence);
        }
        wa_result_free(&result);
    }
    free(text);
    wa_simulation_free(&simulation);
    return status;
}

/* Print a share and tell whether it is as large as asked for, chance allowed. */
static bool share(const char *what, int part, int whole, double asked)
{
    const double found = whole > 0 ? (double)part / whole : 1.0;
    const double chance = whole > 0 ? CHANCE * sqrt(asked * (1.0 - asked) / whole) : 1.0;
    const bool enough = found >= asked - chance;
    printf("  %-44s %5d of %5d  %5.1f %%  (asked: %.0f %%)%s\n", what, part, whole, 100.0 * found,
           100.0 * asked, enough ? "" : "  TOO FEW");
    return enough;
}

static bool print_tally(const struct tally *tally)
{
    printf("%d trials, %d of them unfit, right form's acid first in %d\n", tally->trials,
           tally->unfit, tally->first);
    bool good =
        share("true acid among the first three", tally->among_three, tally->trials, AMONG_THREE);
    good &=
        share("identified and right", tally->identified_right, tally->identified, IDENTIFIED_RIGHT);
    good &= share("amount within its 95 % interval", tally->amounts_within, tally->amounts,
                  AMOUNT_WITHIN);
    return good;
}

int main(int argument_count, char **arguments)
{
    const long count = argument_count > 1 ? strtol(arguments[1], NULL, 10) : 1000;
    const long first = argument_count > 2 ? strtol(arguments[2], NULL, 10) : 1;
    const bool one = argument_count > 3 && strcmp(arguments[3], "one") == 0;
    struct wa_table table;
    struct wa_error error;
    if (wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) != WA_OK) {
        fprintf(stderr, "trials: %s\n", error.message);
        return 1;
    }
    struct tally tally = {0};
    bool good = true;
    for (long i = 0; i < count && good; i++) {
        if (run_trial(&table, (uint32_t)(first + i), one, &tally, &error) != WA_OK) {
            fprintf(stderr, "trials: seed %ld: %s\n", first + i, error.message);
            good = false;
        }
    }
    good = print_tally(&tally) && good;
    wa_table_free(&table);
    return good ? 0 : 1;
}
