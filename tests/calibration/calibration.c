/* Are the stated probabilities earned? Unknowns are drawn from the table, and from outside it by
 * taking their system out of what is compared; each is titrated by the simulator with the faults of
 * a laboratory, identified, and the probabilities are set against what was true.
 * Self-consistency: simulator and matching share one forward model.
 *
 *   calibration COUNT [SEED] [FIGURES.csv]
 */
#include "whichacid/identify.h"
#include "whichacid/match.h"
#include "whichacid/simulate.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { BINS = 10, LISTED_MOST = 40 };

static const double outside_share = 0.2; /* the stated prior of "not in the table" */
static const double with_mass_share = 0.8;
static const double dissolved_part = 0.8; /* of the solubility: analysts weigh what dissolves */
static const double usual_titrant_mL = 20.0;
static const double least_concentration = 0.004; /* mol/L; what dissolves less is not titrated */

/* Sums over all stated probabilities. */
struct tally {
    int runs, inside, outside, unfit;
    int identified, wrong_identified, first, in_set, sets;
    int outside_told;
    double expected_first; /* what the stated probabilities themselves promise */
    double stated[BINS], observed[BINS];
    int count[BINS];
    double brier, spiegelhalter, spiegelhalter_variance;
};

static uint64_t state;

static double uniform(void)
{
    return wa_draw_uniform(&state);
}

static double between_logs(double low, double high)
{
    return low * exp(uniform() * log(high / low));
}

/* One stated probability and whether it came true. Spiegelhalter, Stat. Med. 5 (1986) 421. */
static void score(struct tally *tally, double p, bool came_true)
{
    const double y = came_true ? 1.0 : 0.0;
    int bin = (int)(p * BINS);
    bin = bin < BINS ? bin : BINS - 1;
    tally->stated[bin] += p;
    tally->observed[bin] += y;
    tally->count[bin]++;
    tally->brier += (p - y) * (p - y);
    tally->spiegelhalter += (y - p) * (1.0 - 2.0 * p);
    tally->spiegelhalter_variance += (1.0 - 2.0 * p) * (1.0 - 2.0 * p) * p * (1.0 - p);
}

static const char *first_system(const struct wa_table *table, const struct wa_form *form)
{
    for (int k = 0; k < form->part_count; k++) {
        if (form->parts[k].acid != WA_PART_WATER) {
            return table->acids[form->parts[k].acid].key;
        }
    }
    return NULL;
}

static bool is_modelled(const struct wa_table *table, const struct wa_form *form)
{
    bool modelled = true;
    for (int k = 0; k < form->part_count; k++) {
        const int acid = form->parts[k].acid;
        modelled = modelled && (acid == WA_PART_WATER || table->acids[acid].modelled);
    }
    return modelled;
}

/* Whether a form's first system is the truth's, or another of its enantiomers. */
static bool is_related(const struct wa_table *table, const struct wa_form *form,
                       const struct wa_form *truth)
{
    const char *own = first_system(table, form), *other = first_system(table, truth);
    if (own == NULL || other == NULL) {
        return false;
    }
    const int a = wa_table_find_acid(table, own), b = wa_table_find_acid(table, other);
    const char *group = table->acids[a].group;
    return a == b || (group[0] != '\0' && strcmp(group, table->acids[b].group) == 0);
}

/* Least solubility among the forms of one system: what may come out during a titration. */
static double least_solubility(const struct wa_table *table, const struct wa_form *truth)
{
    double least = INFINITY;
    for (size_t f = 0; f < table->form_count; f++) {
        const struct wa_form *form = &table->forms[f];
        if (is_related(table, form, truth) && form->solubility_mol_L > 0.0) {
            least = fmin(least, form->solubility_mol_L);
        }
    }
    return least;
}

/* A form by the prior: even over systems, then over their forms. */
static const struct wa_form *draw_form(const struct wa_table *table)
{
    for (;;) {
        const char *acid = table->acids[(size_t)(uniform() * (double)table->acid_count)].key;
        size_t found = 0;
        const struct wa_form *chosen = NULL;
        for (size_t f = 0; f < table->form_count; f++) {
            const struct wa_form *form = &table->forms[f];
            const char *system = first_system(table, form);
            if (form->modelled && system != NULL && strcmp(system, acid) == 0 &&
                uniform() * (double)++found < 1.0) {
                chosen = form;
            }
        }
        if (chosen != NULL && least_solubility(table, chosen) > least_concentration) {
            return chosen;
        }
    }
}

static struct wa_quantity with_u(double value, double u)
{
    return (struct wa_quantity){.value = value, .u = u, .has_u = true};
}

/* The constants that act differ from the table's by its own uncertainty, and one row in twenty by
 * four times that, as the prior says. */
static void perturb(struct wa_table *table, double saved[][WA_PROTONS_MAX], int sign)
{
    for (size_t a = 0; a < table->acid_count; a++) {
        struct wa_acid *acid = &table->acids[a];
        const double wider = sign > 0 && uniform() < WA_ROW_WRONG_SHARE ? WA_ROW_WRONG_WIDER : 1.0;
        for (int i = 0; i < acid->step_count; i++) {
            if (sign > 0) {
                saved[a][i] = acid->steps[i].pKa;
                acid->steps[i].pKa +=
                    wider * hypot(acid->steps[i].u, 0.012) * wa_draw_normal(&state);
            } else {
                acid->steps[i].pKa = saved[a][i];
            }
        }
    }
}

/* `most` is the concentration up to which everything dissolves, mol/L. */
static void faults(struct wa_simulation_options *options, const char *key, double most)
{
    wa_simulation_defaults(options);
    options->forms[0] = key;
    options->form_count = 1;
    options->solution_volume = with_u(20.0 + 40.0 * uniform(), 0.05);
    const double asked = between_logs(0.02, 0.5);
    options->titrant_concentration = with_u(
        fmin(asked, dissolved_part * most * options->solution_volume.value / usual_titrant_mL),
        0.0);
    options->titrant_concentration.u = 0.003 * options->titrant_concentration.value;
    options->electrode_slope = with_u(1.0, 0.006);
    options->electrode_offset = with_u(0.0, 0.03);
    options->titrant_carbonate = with_u(0.006, 0.004);
    options->carbon_dioxide = 3e-5 * uniform();
    options->noise_reading = between_logs(0.003, 0.03);
    options->noise_volume = between_logs(0.003, 0.03);
    options->point_count = (int)(15.0 + 60.0 * uniform());
    options->seed = 1 + (uint32_t)(uniform() * 4e9);
}

/* The run as text, with the mass that the analyst would have weighed: more than acts, by the
 * purity; or without one. */
static enum wa_status write_run(const struct wa_table *table, const struct wa_form *truth,
                                char **text, size_t *length, struct wa_error *error)
{
    struct wa_simulation_options options;
    struct wa_simulation simulation;
    faults(&options, truth->key, least_solubility(table, truth));
    enum wa_status status = wa_simulate(table, &options, &simulation, error);
    if (status != WA_OK) {
        return status;
    }
    const double ln_purity =
        uniform() < WA_PURITY_REAGENT_SHARE
            ? WA_PURITY_REAGENT_LN_MEAN + WA_PURITY_REAGENT_LN_U * wa_draw_normal(&state)
            : -fabs(WA_PURITY_FOUND_LN_S * wa_draw_normal(&state));
    const bool weighed = uniform() < with_mass_share;
    char *body = NULL;
    size_t body_length;
    const double mass = simulation.mass[0] * exp(-ln_purity) + 0.0002 * wa_draw_normal(&state);
    status = wa_simulation_write(&simulation, &body, &body_length, error);
    wa_simulation_free(&simulation);
    if (status != WA_OK) {
        return status;
    }
    /* Its own mass note is dropped, the analyst's put first. */
    char *line = strstr(body, "# sample mass:");
    if (line != NULL) {
        char *end = strchr(line, '\n');
        memmove(line, end + 1, strlen(end + 1) + 1);
    }
    const int written = weighed ? asprintf(text, "# sample mass: %.4f ± 0.0002 g\n%s", mass, body)
                                : asprintf(text, "%s", body);
    free(body);
    *length = written > 0 ? (size_t)written : 0;
    return written > 0 ? WA_OK : wa_fail_memory(error);
}

/* Whether a candidate stands for the form, or for one that weighs the same in the same system. */
static bool is_true(const struct wa_table *table, const struct wa_result_candidate *candidate,
                    const struct wa_form *truth, bool weighed)
{
    const struct wa_form *form = &table->forms[candidate->form];
    const char *own = first_system(table, form), *other = first_system(table, truth);
    if (own == NULL || other == NULL) {
        return form == truth;
    }
    const int a = wa_table_find_acid(table, own), b = wa_table_find_acid(table, other);
    const char *group_a = table->acids[a].group, *group_b = table->acids[b].group;
    const bool same = a == b || (group_a[0] != '\0' && strcmp(group_a, group_b) == 0);
    const bool ions = form->part_count == truth->part_count &&
                      form->parts[0].lost == truth->parts[0].lost &&
                      form->parts[0].count == truth->parts[0].count;
    return same && ions && (!weighed || fabs(form->molar_mass / truth->molar_mass - 1.0) < 1e-4);
}

static void count_run(struct tally *tally, const struct wa_table *table,
                      const struct wa_result *result, const struct wa_form *truth, bool inside)
{
    const bool weighed = isfinite(result->molar_mass);
    bool found = false;
    tally->runs++;
    tally->inside += inside ? 1 : 0;
    tally->outside += inside ? 0 : 1;
    if (result->verdict.kind == WA_VERDICT_UNFIT) {
        tally->unfit++;
        return;
    }
    for (size_t i = 0; i < result->candidate_count && i < LISTED_MOST; i++) {
        const bool right = inside && is_true(table, &result->candidates[i], truth, weighed);
        score(tally, result->candidates[i].probability, right);
        tally->first += i == 0 && right ? 1 : 0;
        tally->expected_first += i == 0 ? result->candidates[i].probability : 0.0;
        if (i == 0 && result->verdict.kind == WA_VERDICT_IDENTIFIED) {
            tally->identified++;
            tally->wrong_identified += right ? 0 : 1;
            if (!right) {
                printf("wrong: %s (%s the table) taken for %s with %.4f, not in the table %.4f\n",
                       truth->key, inside ? "in" : "outside", result->candidates[i].key,
                       result->candidates[i].probability, result->not_in_table);
            }
        }
        found = found || (right && (i < result->verdict.form_count || i == 0));
    }
    score(tally, result->not_in_table, !inside);
    if (inside) {
        tally->sets++;
        tally->in_set += found ? 1 : 0;
    } else {
        tally->outside_told +=
            result->verdict.kind == WA_VERDICT_NOT_IN_TABLE || result->not_in_table >= 0.05 ? 1 : 0;
    }
}

/* Take what the truth is out of what is compared, or put it back. */
static void hide(struct wa_table *table, const struct wa_form *truth, bool hidden)
{
    for (size_t f = 0; f < table->form_count; f++) {
        if (is_related(table, &table->forms[f], truth)) {
            table->forms[f].modelled = !hidden && is_modelled(table, &table->forms[f]);
        }
    }
}

static enum wa_status trial(struct wa_table *table, double saved[][WA_PROTONS_MAX],
                            struct tally *tally, struct wa_error *error)
{
    const struct wa_form *truth = draw_form(table);
    const bool inside = uniform() >= outside_share;
    struct wa_run_list runs = {0};
    struct wa_result result;
    char *text = NULL;
    size_t length = 0;
    perturb(table, saved, 1);
    enum wa_status status = write_run(table, truth, &text, &length, error);
    perturb(table, saved, -1);
    if (status != WA_OK) {
        return status == WA_ERROR_MEMORY ? status : WA_OK; /* no titration of this form */
    }
    status = wa_read_memory(text, length, "simulated", NULL, &runs, error);
    free(text);
    if (status == WA_OK) {
        hide(table, truth, !inside);
        status = wa_identify(&runs, table, NULL, &result, error);
        hide(table, truth, false);
    }
    if (status == WA_OK) {
        count_run(tally, table, &result, truth, inside);
        wa_result_free(&result);
    }
    wa_run_list_free(&runs);
    return status == WA_ERROR_INPUT ? WA_OK : status;
}

static void print_table(FILE *to, const struct tally *tally)
{
    fprintf(to, "from,to,count,stated,observed\n");
    for (int bin = 0; bin < BINS; bin++) {
        const double count = fmax(tally->count[bin], 1);
        fprintf(to, "%.1f,%.1f,%d,%.4f,%.4f\n", (double)bin / BINS, (bin + 1.0) / BINS,
                tally->count[bin], tally->stated[bin] / count, tally->observed[bin] / count);
    }
}

/* Mean difference between stated and observed over all stated probabilities. */
static double mean_difference(const struct tally *tally)
{
    double sum = 0.0, count = 0.0;
    for (int bin = 0; bin < BINS; bin++) {
        sum += fabs(tally->stated[bin] - tally->observed[bin]);
        count += tally->count[bin];
    }
    return sum / fmax(count, 1.0);
}

static double share(int part, int whole)
{
    return whole > 0 ? (double)part / whole : 0.0;
}

static double spiegelhalter(const struct tally *tally)
{
    return tally->spiegelhalter / sqrt(fmax(tally->spiegelhalter_variance, 1e-300));
}

static void print_summary(FILE *to, const struct tally *tally, const char *mark)
{
    const int answered = tally->runs - tally->unfit;
    fprintf(to, "%sruns %d, in the table %d, outside %d, unfit %d\n", mark, tally->runs,
            tally->inside, tally->outside, tally->unfit);
    fprintf(to, "%smean |stated - observed| %.4f; Spiegelhalter z %+.2f; Brier score a run %.4f\n",
            mark, mean_difference(tally), spiegelhalter(tally), tally->brier / fmax(answered, 1));
    fprintf(to, "%sidentified %d, of these wrong %d; true form in the set %d of %d\n", mark,
            tally->identified, tally->wrong_identified, tally->in_set, tally->sets);
    fprintf(to,
            "%sfirst is right %.4f of all runs; the best attainable, as the stated probabilities "
            "promise it, %.4f\n",
            mark, share(tally->first, answered), tally->expected_first / fmax(answered, 1));
    fprintf(to, "%soutside the table and told so %d of %d\n", mark, tally->outside_told,
            tally->outside);
}

/* What is promised of the matching; a run in CI is judged with the allowance of its size. */
static int judge(const struct tally *tally)
{
    const double wrong = share(tally->wrong_identified, tally->identified);
    const double in_set = share(tally->in_set, tally->sets);
    const double allowance_wrong = 2.33 * sqrt(0.02 * 0.98 / fmax(tally->identified, 1));
    const double allowance_set = 2.33 * sqrt(0.94 * 0.06 / fmax(tally->sets, 1));
    const bool passed = mean_difference(tally) < 0.03 && fabs(spiegelhalter(tally)) < 2.58 &&
                        wrong < 0.02 + allowance_wrong && in_set > 0.94 - allowance_set;
    printf("%s\n", passed ? "passed" : "FAILED");
    return passed ? 0 : 1;
}

static enum wa_status run_trials(int count, struct tally *tally, struct wa_error *error)
{
    struct wa_table table;
    enum wa_status status = wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, error);
    if (status != WA_OK) {
        return status;
    }
    double(*saved)[WA_PROTONS_MAX] = calloc(table.acid_count, sizeof *saved);
    status = saved != NULL ? WA_OK : wa_fail_memory(error);
    for (int i = 0; status == WA_OK && i < count; i++) {
        status = trial(&table, saved, tally, error);
    }
    free(saved);
    wa_table_free(&table);
    return status;
}

int main(int argument_count, char **arguments)
{
    const int count = argument_count > 1 ? atoi(arguments[1]) : 200;
    const int seed = argument_count > 2 ? atoi(arguments[2]) : 1;
    struct tally tally = {0};
    struct wa_error error;
    state = 0x9E3779B97F4A7C15u * (uint64_t)(seed > 0 ? seed : 1);
    if (run_trials(count, &tally, &error) != WA_OK) {
        fprintf(stderr, "%s\n", error.message);
        return 2;
    }
    print_table(stdout, &tally);
    print_summary(stdout, &tally, "");
    if (argument_count > 3) {
        FILE *file = fopen(arguments[3], "w");
        if (file == NULL) {
            perror(arguments[3]);
            return 2;
        }
        fprintf(file, "# calibration %d %d\n", count, seed);
        print_summary(file, &tally, "# ");
        print_table(file, &tally);
        fclose(file);
    }
    return judge(&tally);
}
