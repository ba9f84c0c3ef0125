/* A simulated run as a file: notes that an analyst would have made, what was simulated besides on
 * lines that name it so, and the points. */
#include "whichacid/simulate.h"

#include "base/text.h"

#include <math.h>

static void note(struct wa_text *text, const char *name, const struct wa_quantity *quantity,
                 double factor, const char *unit)
{
    wa_text_append(text, "# %s: %.10g", name, factor * quantity->value);
    if (quantity->has_u) {
        wa_text_append(text, " ± %.10g", factor * quantity->u);
    }
    wa_text_append(text, " %s\n", unit);
}

static void write_truth(struct wa_text *text, const struct wa_simulation *simulation)
{
    const struct wa_simulation_options *options = &simulation->options;
    for (int f = 0; f < options->form_count; f++) {
        wa_text_append(text, "%s%.6g g of %s", f == 0 ? "# simulated sample: " : " and ",
                       simulation->mass[f], simulation->forms[f]->key);
    }
    wa_text_append(text,
                   "\n# simulated titrant: %.6g mol/L of %s\n# simulated carbonate: %.4g %%"
                   "\n# simulated electrode slope: %.5g %%\n# simulated electrode offset: %.4g pH"
                   "\n# simulated noise: %.4g pH and %.4g mL\n",
                   simulation->titrant_concentration, simulation->titrant->key,
                   100.0 * simulation->titrant_carbonate, 100.0 * simulation->electrode_slope,
                   simulation->electrode_offset, options->noise_reading, options->noise_volume);
    if (options->carbon_dioxide > 0.0) {
        wa_text_append(text, "# simulated carbon dioxide: %.4g mol/L\n", options->carbon_dioxide);
    }
    if (simulation->solid_until_mL > 0.0) {
        wa_text_append(text, "# simulated solid: not all of the sample dissolves before %.2f mL\n",
                       simulation->solid_until_mL);
    }
}

/* What the analyst knows: a value with an uncertainty is known as such; slope, offset and
 * carbonate without one are faults that nobody noticed. */
static void write_notes(struct wa_text *text, const struct wa_simulation *simulation)
{
    const struct wa_simulation_options *options = &simulation->options;
    struct wa_quantity mass = {.value = 0.0};
    double variance = 0.0;
    for (int f = 0; f < options->form_count; f++) {
        mass.value += options->mass[f].value;
        mass.has_u = mass.has_u || options->mass[f].has_u;
        variance += options->mass[f].has_u ? options->mass[f].u * options->mass[f].u : 0.0;
    }
    mass.u = sqrt(variance);
    const struct wa_quantity temperature = {.value = options->temperature_C};
    note(text, "sample mass", &mass, 1.0, "g");
    note(text, "solution volume", &options->solution_volume, 1.0, "mL");
    wa_text_append(text, "# titrant: %s\n", simulation->titrant->name);
    note(text, "titrant concentration", &options->titrant_concentration, 1.0, "mol/L");
    note(text, "temperature", &temperature, 1.0, "°C");
    if (options->titrant_carbonate.has_u) {
        note(text, "titrant carbonate", &options->titrant_carbonate, 100.0, "%");
    }
    if (options->electrode_slope.has_u) {
        note(text, "electrode slope", &options->electrode_slope, 100.0, "%");
    }
    if (options->electrode_offset.has_u) {
        note(text, "electrode offset", &options->electrode_offset, 1.0, "pH");
    }
}

enum wa_status wa_simulation_write(const struct wa_simulation *simulation, char **text,
                                   size_t *length, struct wa_error *error)
{
    struct wa_text made = {.bytes = NULL};
    wa_text_append(&made,
                   "# origin: synthetic, computed from a model with seed %lu; not a measurement\n",
                   (unsigned long)simulation->options.seed);
    write_truth(&made, simulation);
    write_notes(&made, simulation);
    wa_text_append(&made, "volume (mL),pH\n");
    for (size_t p = 0; p < simulation->count; p++) {
        wa_text_append(&made, "%.*f,%.*f\n", simulation->volume_decimals, simulation->volume_mL[p],
                       simulation->reading_decimals, simulation->reading[p]);
    }
    if (made.failed) {
        wa_text_free(&made);
        return wa_fail_memory(error);
    }
    *text = made.bytes;
    *length = made.length;
    return WA_OK;
}
