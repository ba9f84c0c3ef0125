/* Figures as a report writes them, and the conditions of a run by name. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define KEYS_SHOWN 12

void report_quantity(char *text, size_t size, double value, double u)
{
    if (!isfinite(value)) {
        snprintf(text, size, "not known");
        return;
    }
    wa_quantity_format(text, size, value, u);
}

void report_keys(struct wa_text *text, const char *keys)
{
    size_t count = 1;
    size_t shown = strlen(keys);
    for (const char *at = strstr(keys, "; "); at != NULL; at = strstr(at + 2, "; "), count++) {
        if (count == KEYS_SHOWN) {
            shown = (size_t)(at - keys);
        }
    }
    wa_text_append(text, "%.*s", (int)shown, keys);
    if (count > KEYS_SHOWN) {
        wa_text_append(text, "; and %zu more", count - KEYS_SHOWN);
    }
}

void report_probability(char *text, size_t size, double probability)
{
    if (!isfinite(probability)) {
        snprintf(text, size, "not known");
    } else if (probability > 0.999) {
        snprintf(text, size, "> 99.9 %%");
    } else if (probability < 0.001) {
        snprintf(text, size, "< 0.1 %%");
    } else {
        snprintf(text, size, "%.1f %%", 100.0 * probability);
    }
}

void report_threshold(char *text, size_t size, const struct wa_verdict *verdict)
{
    char asked[32];
    report_probability(asked, sizeof asked, verdict->threshold);
    snprintf(text, size,
             verdict->probability < verdict->threshold ? "below the %s that is asked for"
                                                       : "at least %s is asked for",
             asked);
}

void report_deviation(char *text, size_t size, double deviation)
{
    if (!isfinite(deviation)) {
        snprintf(text, size, "%s", "");
    } else if (fabs(deviation) < 0.05) {
        snprintf(text, size, "0.0 u");
    } else if (fabs(deviation) < 100.0) {
        snprintf(text, size, "%+.1f u", deviation);
    } else {
        snprintf(text, size, "%s100 u", deviation < 0.0 ? "beyond -" : "beyond +");
    }
}

void report_origin(char *text, size_t size, enum wa_origin origin, long line)
{
    if (origin == WA_ORIGIN_OPTION) {
        snprintf(text, size, "option");
    } else if (origin == WA_ORIGIN_NOTE && line > 0) {
        snprintf(text, size, "line %ld", line);
    } else {
        snprintf(text, size, "%s", origin == WA_ORIGIN_NOTE ? "note" : "assumed");
    }
}

size_t report_conditions(const struct wa_conditions *conditions, struct report_condition list[16])
{
    const struct report_condition all[] = {
        {"sample mass", WA_DIMENSION_MASS, &conditions->sample_mass},
        {"sample volume", WA_DIMENSION_VOLUME, &conditions->sample_volume},
        {"sample density", WA_DIMENSION_DENSITY, &conditions->sample_density},
        {"aliquot", WA_DIMENSION_FRACTION, &conditions->aliquot},
        {"solution volume", WA_DIMENSION_VOLUME, &conditions->solution_volume},
        {"titrant concentration", WA_DIMENSION_CONCENTRATION, &conditions->titrant_concentration},
        {"titrant carbonate", WA_DIMENSION_FRACTION, &conditions->titrant_carbonate},
        {"blank", WA_DIMENSION_VOLUME, &conditions->blank},
        {"temperature", WA_DIMENSION_TEMPERATURE, &conditions->temperature},
        {"background electrolyte", WA_DIMENSION_CONCENTRATION, &conditions->background},
        {"electrode slope", WA_DIMENSION_NUMBER, &conditions->electrode_slope},
        {"electrode offset", WA_DIMENSION_PH, &conditions->electrode_offset},
        {"reading uncertainty", WA_DIMENSION_NUMBER, &conditions->reading_uncertainty},
        {"volume uncertainty", WA_DIMENSION_VOLUME, &conditions->volume_uncertainty},
    };
    memcpy(list, all, sizeof all);
    return sizeof all / sizeof all[0];
}

const char *report_note_name(const struct wa_note *note)
{
    const char *known = wa_note_known_name(note->name);
    return known != NULL ? known : note->name;
}

bool report_is_condition(const char *name)
{
    static const struct wa_conditions none;
    struct report_condition list[16];
    size_t count = report_conditions(&none, list);
    for (size_t i = 0; i < count; i++) {
        if (strcmp(list[i].name, name) == 0) {
            return true;
        }
    }
    return strcmp(name, "sample") == 0 || strcmp(name, "titrant") == 0 ||
           strcmp(name, "solvent") == 0;
}
