/* A simulated run: what acts is drawn first, then the points are placed and read. */
#include "whichacid/simulate.h"

#include "simulate/simulate_internal.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>

#include <math.h>
#include <stdlib.h>

static const double usual_volume_mL = 20.0; /* of titrant, when no mass is given */
static const double beyond_equivalence = 1.3;
static const int fewest_points = 3;

void wa_simulation_defaults(struct wa_simulation_options *options)
{
    *options = (struct wa_simulation_options){
        .solution_volume = {.value = 50.0},
        .titrant_concentration = {.value = 0.1},
        .electrode_slope = {.value = 1.0},
        .temperature_C = 25.0,
        .noise_reading = 0.01,
        .noise_volume = 0.005,
        .point_count = 60,
        .seed = 1,
    };
}

/* One value that may be given, and what is possible for it. */
struct limit {
    const char *what;
    double value, lowest, highest;
    const char *unit;
};

static enum wa_status check_values(const struct wa_simulation_options *o, struct wa_error *error)
{
    const struct limit limits[] = {
        {"solution volume", o->solution_volume.value, 1e-3, 1e6, "mL"},
        {"titrant concentration", o->titrant_concentration.value, 1e-6, 20.0, "mol/L"},
        {"carbonate fraction", o->titrant_carbonate.value, 0.0, 1.0, ""},
        {"electrode slope", o->electrode_slope.value, 0.5, 1.3, "of theory"},
        {"electrode offset", o->electrode_offset.value, -5.0, 5.0, "pH"},
        {"carbon dioxide concentration", o->carbon_dioxide, 0.0, 1.0, "mol/L"},
        {"temperature", o->temperature_C, 0.0, 100.0, "°C"},
        {"noise of the reading", o->noise_reading, 0.0, 2.0, "pH"},
        {"noise of the volume", o->noise_volume, 0.0, 100.0, "mL"},
        {"last volume", o->end_mL, 0.0, 1e6, "mL"},
        {"step", o->step_mL, 0.0, 1e6, "mL"},
        {"number of points", o->point_count, fewest_points, WA_SIMULATED_POINTS_MAX, ""},
        {"seed", o->seed, 1.0, UINT32_MAX, ""},
    };
    for (size_t i = 0; i < sizeof limits / sizeof limits[0]; i++) {
        const struct limit *limit = &limits[i];
        if (!(limit->value >= limit->lowest && limit->value <= limit->highest)) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                           "A %s of %g is not possible; give one from %.10g to %.10g%s%s.",
                           limit->what, limit->value, limit->lowest, limit->highest,
                           limit->unit[0] != '\0' ? " " : "", limit->unit);
        }
    }
    for (int f = 0; f < o->form_count; f++) {
        if (!(o->mass[f].value >= 0.0 && o->mass[f].value <= 1e5)) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0, "A mass of %g g is not possible.",
                           o->mass[f].value);
        }
    }
    return WA_OK;
}

static enum wa_status find_forms(const struct wa_table *table, struct wa_simulation *simulation,
                                 struct wa_error *error)
{
    const struct wa_simulation_options *options = &simulation->options;
    if (options->form_count < 1 || options->form_count > WA_SIMULATED_FORMS_MAX) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0, "A sample is one to %d forms.",
                       WA_SIMULATED_FORMS_MAX);
    }
    for (int f = 0; f < options->form_count; f++) {
        const int form = wa_simulation_find_form(table, options->forms[f]);
        if (form < 0) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                           "The table has no form or acid '%.80s'; 'whichacid table list' shows "
                           "the keys.",
                           options->forms[f]);
        }
        simulation->forms[f] = &table->forms[form];
        if (!simulation->forms[f]->modelled) {
            return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                           "%s is in the table, but its solutions cannot be modelled.",
                           simulation->forms[f]->name);
        }
    }
    return WA_OK;
}

static enum wa_status find_titrant(const struct wa_table *table, struct wa_simulation *simulation,
                                   struct wa_error *error)
{
    const struct wa_simulation_options *options = &simulation->options;
    const bool base = wa_simulation_suits_base(table, simulation->forms, options->form_count);
    const char *words = options->titrant != NULL
                            ? options->titrant
                            : (base ? "sodium hydroxide" : "hydrochloric acid");
    const int titrant = wa_table_find_titrant(table, words);
    if (titrant < 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0, "The table has no titrant '%.80s'.", words);
    }
    simulation->titrant = &table->titrants[titrant];
    return WA_OK;
}

/* Fill in masses and the last volume where they are left open. */
static void fill_amounts(const struct wa_table *table, struct wa_simulation *simulation)
{
    struct wa_simulation_options *options = &simulation->options;
    const double per_mL =
        1e-3 * options->titrant_concentration.value * simulation->titrant->protons;
    double equivalents = 0.0;
    for (int f = 0; f < options->form_count; f++) {
        const struct wa_form *form = simulation->forms[f];
        const double each = wa_simulation_equivalents(table, form, simulation->titrant->is_base);
        if (!(options->mass[f].value > 0.0)) {
            const double moles =
                per_mL * usual_volume_mL / options->form_count / fmax(fabs(each), 1.0);
            const double decimals = fmax(4.0, 3.0 - floor(log10(moles * form->molar_mass)));
            const double scale = pow(10.0, decimals);
            options->mass[f].value = round(moles * form->molar_mass * scale) / scale;
        }
        equivalents += each * options->mass[f].value / form->molar_mass;
    }
    if (!(options->end_mL > 0.0)) {
        options->end_mL = equivalents > 0.0 ? beyond_equivalence * equivalents / per_mL
                                            : beyond_equivalence * usual_volume_mL;
        const double grid = pow(10.0, floor(log10(options->end_mL)) - 1.0);
        options->end_mL = ceil(options->end_mL / grid) * grid;
    }
}

/* What acts: the value, or a draw when an uncertainty is stated. */
static double draw(gsl_rng *random, const struct wa_quantity *quantity)
{
    const double deviate = gsl_ran_ugaussian(random);
    return quantity->has_u ? quantity->value + quantity->u * deviate : quantity->value;
}

static void draw_all(gsl_rng *random, struct wa_simulation *simulation)
{
    const struct wa_simulation_options *options = &simulation->options;
    for (int f = 0; f < options->form_count; f++) {
        simulation->mass[f] = fmax(draw(random, &options->mass[f]), 0.0);
    }
    const double least = 0.01 * options->titrant_concentration.value;
    simulation->titrant_concentration = fmax(draw(random, &options->titrant_concentration), least);
    simulation->titrant_carbonate = fmin(fmax(draw(random, &options->titrant_carbonate), 0.0), 1.0);
    simulation->electrode_slope = draw(random, &options->electrode_slope);
    simulation->electrode_offset = draw(random, &options->electrode_offset);
}

static enum wa_status read_points(gsl_rng *random, struct wa_simulation *simulation,
                                  struct wa_error *error)
{
    const struct wa_simulation_options *options = &simulation->options;
    simulation->reading_decimals = options->noise_reading >= 0.01   ? 2
                                   : options->noise_reading > 0.001 ? 3
                                                                    : 4;
    const double scale = pow(10.0, simulation->reading_decimals);
    double guess = 7.0;
    simulation->solid_until_mL = 0.0;
    for (size_t p = 0; p < simulation->count; p++) {
        struct wa_solution solution;
        const double volume_deviate = gsl_ran_ugaussian(random);
        const double reading_deviate = gsl_ran_ugaussian(random);
        /* Before the first drop there is no volume to misread. */
        const double read = simulation->volume_mL[p];
        const double volume =
            read > 0.0 ? fmax(read + options->noise_volume * volume_deviate, 0.0) : 0.0;
        const enum wa_status status =
            wa_titration_pH(&simulation->titration, volume, guess, &solution, NULL, error);
        if (status != WA_OK) {
            return status;
        }
        guess = solution.pH;
        const double reading = 7.0 + simulation->electrode_slope * (solution.pH - 7.0) +
                               simulation->electrode_offset +
                               options->noise_reading * reading_deviate;
        simulation->reading[p] = round(reading * scale) / scale;
        for (int k = 0; k < simulation->titration.component_count; k++) {
            if (solution.saturated[k]) {
                simulation->solid_until_mL =
                    fmax(simulation->volume_mL[p], 1e-9); /* also at the start alone */
            }
        }
    }
    return WA_OK;
}

static enum wa_status run(const struct wa_table *table, gsl_rng *random,
                          struct wa_simulation *simulation, struct wa_error *error)
{
    enum wa_status status = check_values(&simulation->options, error);
    if (status == WA_OK) {
        status = find_forms(table, simulation, error);
    }
    if (status == WA_OK) {
        status = find_titrant(table, simulation, error);
    }
    if (status == WA_OK) {
        fill_amounts(table, simulation);
        draw_all(random, simulation);
        status = wa_simulation_compose(table, simulation, error);
    }
    if (status == WA_OK) {
        status = wa_simulation_place(simulation, error);
    }
    return status == WA_OK ? read_points(random, simulation, error) : status;
}

enum wa_status wa_simulate(const struct wa_table *table,
                           const struct wa_simulation_options *options,
                           struct wa_simulation *simulation, struct wa_error *error)
{
    gsl_rng *random = gsl_rng_alloc(gsl_rng_mt19937);
    if (random == NULL) {
        return wa_fail_memory(error);
    }
    gsl_rng_set(random, options->seed);
    struct wa_simulation made = {.options = *options};
    const enum wa_status status = run(table, random, &made, error);
    gsl_rng_free(random);
    if (status == WA_OK) {
        *simulation = made;
    } else {
        wa_simulation_free(&made);
    }
    return status;
}

void wa_simulation_free(struct wa_simulation *simulation)
{
    if (simulation != NULL) {
        free(simulation->volume_mL);
        free(simulation->reading);
        simulation->volume_mL = NULL;
        simulation->reading = NULL;
        simulation->count = 0;
    }
}
