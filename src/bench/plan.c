/* Making a plan: conditions, sample, amount to weigh. */
#include "bench/plan_internal.h"

#include "whichacid/match.h"
#include "whichacid/reader.h"
#include "whichacid/simulate.h"

#include <math.h>
#include <stdlib.h>

static const double usual_volume_mL = 20.0; /* what a simulation weighs for by itself */
static const double open_pKa_u = 2.0;       /* a constant that the run is to find */
static const double open_low = 1.5, open_high = 12.5;
static const double open_ln_amount_u = 1.0;
static const double usual_ionic_strength = 0.05;

void wa_plan_defaults(struct wa_plan_options *options)
{
    *options = (struct wa_plan_options){
        .pKa_low = 2.0,
        .pKa_high = 6.0,
        .mass_low = 60.0,
        .mass_high = 300.0,
        .titrant_concentration = {0.1, 0.0001, true},
        .electrode_slope = {1.0, 0.0, false},
        .electrode_offset = {0.0, 0.0, false},
        .end_point_mL = usual_volume_mL,
        .solution_mL = 50.0,
        .temperature_C = 25.0,
        .noise_reading = 0.01,
        .noise_volume = 0.01,
        .mass_u = 0.0003,
        .additions = 30,
        .trials = 200,
        .seed = 1,
    };
}

static enum wa_status check(const struct wa_plan_options *o, struct wa_error *error)
{
    const struct {
        const char *name;
        double value, low, high;
    } limits[] = {
        {"titrant concentration in mol/L", o->titrant_concentration.value, 1e-4, 5.0},
        {"end-point volume in mL", o->end_point_mL, 0.1, 1000.0},
        {"solution volume in mL", o->solution_mL, 1.0, 10000.0},
        {"temperature in °C", o->temperature_C, 0.0, 100.0},
        {"noise of readings in pH", o->noise_reading, 1e-4, 1.0},
        {"noise of volumes in mL", o->noise_volume, 1e-5, 10.0},
        {"number of readings", o->additions, 8, WA_PLAN_ADDITIONS_MAX},
        {"lowest pKa", o->pKa_low, -1.0, 14.0},
        {"highest pKa", o->pKa_high, o->pKa_low, 14.0},
        {"lowest molar mass in g/mol", o->mass_low, 10.0, 5000.0},
        {"highest molar mass in g/mol", o->mass_high, o->mass_low, 5000.0},
    };
    for (size_t i = 0; i < sizeof limits / sizeof limits[0]; i++) {
        if (!(limits[i].value >= limits[i].low && limits[i].value <= limits[i].high)) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0, "The %s must be from %g to %g, not %g.",
                           limits[i].name, limits[i].low, limits[i].high, limits[i].value);
        }
    }
    return WA_OK;
}

/* A simulated run of the sample, or of a stand-in that the same titrant suits. */
static enum wa_status simulate(const struct plan_work *work, const char *form, double mass_g,
                               struct wa_simulation *simulation, struct wa_error *error)
{
    const struct wa_plan_options *o = work->options;
    struct wa_simulation_options options;
    wa_simulation_defaults(&options);
    options.forms[0] = form;
    options.form_count = 1;
    options.mass[0] = (struct wa_quantity){mass_g, 0.0, false};
    options.solution_volume = (struct wa_quantity){o->solution_mL, 0.0, false};
    options.titrant = o->titrant;
    options.titrant_concentration = o->titrant_concentration;
    options.titrant_carbonate = o->titrant_carbonate;
    options.electrode_slope = o->electrode_slope;
    options.electrode_offset = o->electrode_offset;
    options.temperature_C = o->temperature_C;
    options.noise_reading = o->noise_reading;
    options.noise_volume = o->noise_volume;
    options.dissolved = true;
    options.seed = o->seed;
    return wa_simulate(work->table, &options, simulation, error);
}

/* The simulated run read as identify would read it: every note and every default becomes a prior.
 */
static enum wa_status collect(struct plan_work *work, const struct wa_simulation *simulation,
                              struct wa_error *error)
{
    const struct wa_reader_options reader = {.given = NULL};
    struct wa_run_list runs = {.count = 0};
    struct wa_curve curve;
    char *text = NULL;
    size_t length = 0;
    enum wa_status status = wa_simulation_write(simulation, &text, &length, error);
    if (status == WA_OK) {
        status = wa_read_memory(text, length, "plan", &reader, &runs, error);
    }
    free(text);
    if (status == WA_OK) {
        status = wa_curve_analyse(&runs.runs[0], &curve, error);
    }
    if (status == WA_OK) {
        status = wa_experiment_collect(&runs.runs[0], &curve, work->table, simulation->titrant,
                                       &work->experiment, error);
        wa_curve_free(&curve);
    }
    wa_run_list_free(&runs);
    work->experiment.ln_noise_reading.mean = log(work->options->noise_reading);
    work->experiment.ln_noise_reading.u = 0.25;
    work->experiment.ln_noise_volume.mean = log(work->options->noise_volume);
    work->experiment.ln_noise_volume.u = 0.25;
    return status;
}

static double rounded_mass(double mass_g)
{
    return fmax(round(1e4 * mass_g), 1.0) / 1e4;
}

bool plan_finds(const struct wa_parameter *parameter)
{
    return parameter->kind == WA_PARAMETER_LN_AMOUNT ||
           (parameter->kind == WA_PARAMETER_PK && parameter->prior.u >= open_pKa_u);
}

static void open_sample(struct wa_sample_model *sample)
{
    for (int k = 0; k < sample->part_count; k++) {
        struct wa_model_part *part = &sample->parts[k];
        for (int i = 0; i < part->step_count; i++) {
            if (part->pK[i] > open_low && part->pK[i] < open_high) {
                part->pK_u[i] = open_pKa_u;
            }
        }
    }
}

/* An acid that no form of the table brings as such: its fully protonated species, with an ion that
 * makes it neutral. */
static bool acid_alone(const struct plan_work *work, struct wa_form *form)
{
    const char *name = work->options->form;
    const int acid =
        wa_table_find_form(work->table, name) < 0 ? wa_table_find_acid(work->table, name) : -1;
    for (size_t f = 0; acid >= 0 && f < work->table->form_count; f++) {
        const struct wa_form *known = &work->table->forms[f];
        if (known->part_count == 1 && known->parts[0].acid == acid && known->parts[0].lost == 0) {
            return false;
        }
    }
    if (acid < 0 || !work->table->acids[acid].modelled) {
        return false;
    }
    const struct wa_acid *from = &work->table->acids[acid];
    *form = (struct wa_form){.key = from->key,
                             .name = from->name,
                             .formula = from->formula,
                             .parts = {{.acid = acid, .count = 1, .lost = 0}},
                             .part_count = 1,
                             .spectator_charge = -from->charge,
                             .spectator_z2 = from->charge * from->charge,
                             .modelled = true};
    return wa_table_molar_mass(work->table, from->formula, &form->molar_mass, &form->molar_mass_u,
                               NULL) == WA_OK;
}

static void set_sample(struct plan_work *work)
{
    const struct wa_prior amount = {.mean = log(work->moles), .u = open_ln_amount_u};
    wa_match_sample(work->table, work->plan->form, &work->experiment, usual_ionic_strength, &amount,
                    &work->sample);
    open_sample(&work->sample);
}

/* The acid of own_form: as many protons as a base can take, the conditions of a stand-in. */
static enum wa_status lone_acid(struct plan_work *work, struct wa_error *error)
{
    const struct wa_plan_options *o = work->options;
    struct wa_plan *plan = work->plan;
    struct wa_simulation simulation;
    const enum wa_status status = simulate(work, "acetic-acid", 0.0, &simulation, error);
    if (status != WA_OK) {
        return status;
    }
    plan->form = &plan->own_form;
    plan->titrant = simulation.titrant;
    plan->molar_mass = plan->form->molar_mass;
    const struct wa_acid *acid = &work->table->acids[plan->form->parts[0].acid];
    int protons = 0;
    for (int i = 0; i < acid->step_count; i++) {
        protons += acid->steps[i].pKa < open_high;
    }
    work->moles = 1e-3 * o->end_point_mL * o->titrant_concentration.value * plan->titrant->protons /
                  fmax(protons, 1);
    plan->mass_g = rounded_mass(work->moles * plan->molar_mass);
    work->moles = plan->mass_g / plan->molar_mass;
    const enum wa_status collected = collect(work, &simulation, error);
    wa_simulation_free(&simulation);
    if (collected == WA_OK) {
        set_sample(work);
    }
    return collected;
}

static enum wa_status known_form(struct plan_work *work, struct wa_error *error)
{
    const struct wa_plan_options *o = work->options;
    struct wa_plan *plan = work->plan;
    struct wa_simulation first, second;
    enum wa_status status = simulate(work, o->form, 0.0, &first, error);
    if (status != WA_OK) {
        return status;
    }
    plan->mass_g = rounded_mass(first.options.mass[0].value * o->end_point_mL / usual_volume_mL);
    wa_simulation_free(&first);
    status = simulate(work, o->form, plan->mass_g, &second, error);
    if (status != WA_OK) {
        return status;
    }
    plan->form = second.forms[0];
    plan->titrant = second.titrant;
    plan->molar_mass = plan->form->molar_mass;
    work->moles = plan->mass_g / plan->molar_mass;
    status = collect(work, &second, error);
    wa_simulation_free(&second);
    if (status == WA_OK) {
        set_sample(work);
    }
    return status;
}

/* One proton, a pKa in the middle of the range, and what gives the wanted volume for the middle of
 * the masses. */
static enum wa_status unknown(struct plan_work *work, struct wa_error *error)
{
    const struct wa_plan_options *o = work->options;
    struct wa_plan *plan = work->plan;
    struct wa_simulation simulation;
    enum wa_status status =
        simulate(work, o->unknown_is_base ? "tris" : "acetic-acid", 0.0, &simulation, error);
    if (status != WA_OK) {
        return status;
    }
    plan->titrant = simulation.titrant;
    status = collect(work, &simulation, error);
    wa_simulation_free(&simulation);
    plan->molar_mass = sqrt(o->mass_low * o->mass_high);
    work->moles = 1e-3 * o->end_point_mL * o->titrant_concentration.value * plan->titrant->protons;
    plan->mass_g = rounded_mass(work->moles * plan->molar_mass);
    work->moles = plan->mass_g / plan->molar_mass;
    plan->volume_low = o->end_point_mL * plan->molar_mass / o->mass_high;
    plan->volume_high = o->end_point_mL * plan->molar_mass / o->mass_low;
    work->sample = (struct wa_sample_model){
        .parts = {{.charge = o->unknown_is_base ? 1 : 0,
                   .step_count = 1,
                   .count = 1,
                   .pK = {0.5 * (o->pKa_low + o->pKa_high)},
                   .pK_u = {open_pKa_u},
                   .solubility = INFINITY}},
        .part_count = 1,
        .substance_count = 1,
        .ln_amount = {{.mean = log(work->moles), .u = open_ln_amount_u}},
    };
    return status;
}

enum wa_status plan_experiment(const struct wa_experiment *from, const double *volume_mL,
                               size_t count, struct wa_experiment *experiment,
                               struct wa_error *error)
{
    *experiment = *from;
    experiment->count = count;
    experiment->volume_mL = calloc(count, sizeof *experiment->volume_mL);
    experiment->reading = calloc(count, sizeof *experiment->reading);
    experiment->line = calloc(count, sizeof *experiment->line);
    if (experiment->volume_mL == NULL || experiment->reading == NULL || experiment->line == NULL) {
        wa_experiment_free(experiment);
        return wa_fail_memory(error);
    }
    for (size_t p = 0; p < count; p++) {
        experiment->volume_mL[p] = volume_mL[p];
        experiment->reading[p] = 7.0;
        experiment->line[p] = (long)p + 1;
    }
    return WA_OK;
}

enum wa_status wa_plan_make(const struct wa_table *table, const struct wa_plan_options *options,
                            struct wa_plan *plan, struct wa_error *error)
{
    struct plan_work work = {.table = table, .options = options, .plan = plan};
    *plan = (struct wa_plan){.chosen = -1, .concentration = options->titrant_concentration.value};
    enum wa_status status = check(options, error);
    if (status == WA_OK) {
        status = options->form == NULL                ? unknown(&work, error)
                 : acid_alone(&work, &plan->own_form) ? lone_acid(&work, error)
                                                      : known_form(&work, error);
    }
    if (status == WA_OK) {
        status = plan_steps(&work, error);
    }
    if (status == WA_OK && plan->chosen >= 0) {
        status = plan_indicators(&work, error);
    }
    if (status == WA_OK && plan->step_count > 0) {
        status = plan_design(&work, error);
    }
    if (status == WA_OK && plan->step_count > 0 && options->trials > 0) {
        status = plan_trials(&work, error);
    }
    if (status == WA_OK && options->rival != NULL) {
        status = plan_power(&work, error);
    }
    wa_experiment_free(&work.experiment);
    return status;
}
