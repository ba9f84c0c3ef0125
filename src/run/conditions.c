/* Notes to conditions: units converted, doubles refused, defaults filled in and said. */
#include "run/run_internal.h"

#include "base/text.h"

#include <math.h>
#include <stddef.h>
#include <stdio.h>
#include <string.h>

/* The plain quantities: where they go and what is possible for them. */
struct plain {
    const char *name;
    size_t offset;
    enum wa_dimension dimension;
    double lowest, highest; /* possible values, in the dimension's unit */
    bool above_zero;
};

#define AT(field) offsetof(struct wa_conditions, field)

static const struct plain plains[] = {
    {"sample mass", AT(sample_mass), WA_DIMENSION_MASS, 0, 1e5, true},
    {"solution volume", AT(solution_volume), WA_DIMENSION_VOLUME, 0, 1e6, true},
    {"titrant concentration", AT(titrant_concentration), WA_DIMENSION_CONCENTRATION, 0, 20, true},
    {"titrant carbonate", AT(titrant_carbonate), WA_DIMENSION_FRACTION, 0, 1, false},
    {"temperature", AT(temperature), WA_DIMENSION_TEMPERATURE, -10, 110, false},
    {"background electrolyte", AT(background), WA_DIMENSION_CONCENTRATION, 0, 20, false},
    {"blank", AT(blank), WA_DIMENSION_VOLUME, -1e3, 1e3, false},
    {"electrode correlation", AT(electrode_correlation), WA_DIMENSION_NUMBER, -1, 1, false},
    {"volume uncertainty", AT(volume_uncertainty), WA_DIMENSION_VOLUME, 0, 1e3, false},
    {"sample volume", AT(sample_volume), WA_DIMENSION_VOLUME, 0, 1e6, true},
    {"sample density", AT(sample_density), WA_DIMENSION_DENSITY, 0, 25, true},
};

/* A note that computes: options count only against options. */
static enum wa_status parse_any(const struct wa_run *run, const struct wa_note *note,
                                enum wa_dimension dimension, struct wa_quantity *quantity,
                                struct wa_error *error)
{
    enum wa_status status = wa_quantity_parse_within(note->text, dimension, quantity, error);
    if (status != WA_OK && error != NULL) {
        char said[sizeof error->message];
        snprintf(said, sizeof said, "%s", error->message);
        bool option = note->origin == WA_ORIGIN_OPTION;
        return wa_fail(error, option ? WA_ERROR_CALL : WA_ERROR_INPUT, option ? NULL : run->file,
                       note->line, "%s '%.60s': %.600s", option ? "Option" : "Note", note->name,
                       said);
    }
    return status;
}

static bool has_digit(const char *text)
{
    return strpbrk(text, "0123456789") != NULL;
}

static bool stands_for(const struct wa_note *note, const char *name)
{
    const char *known = wa_note_known_name(note->name);
    return known != NULL && strcmp(known, name) == 0;
}

static bool same_number(double a, double b)
{
    return fabs(a - b) <= 1e-9 * fmax(fabs(a), fabs(b));
}

/* How one note's text becomes a quantity; most go by their dimension alone. */
typedef enum wa_status note_parser(struct wa_run *run, const struct wa_note *note,
                                   enum wa_dimension dimension, struct wa_quantity *quantity,
                                   struct wa_error *error);

static enum wa_status parse_plain(struct wa_run *run, const struct wa_note *note,
                                  enum wa_dimension dimension, struct wa_quantity *quantity,
                                  struct wa_error *error)
{
    return parse_any(run, note, dimension, quantity, error);
}

/* Several notes of one name: the option wins; two in the file must agree. */
static enum wa_status take(struct wa_run *run, const char *name, enum wa_dimension dimension,
                           note_parser *parse, struct wa_noted *noted, struct wa_error *error)
{
    long line = 0;
    struct wa_quantity first = {0};
    *noted = (struct wa_noted){.origin = WA_ORIGIN_DEFAULT};
    for (size_t i = 0; i < run->note_count; i++) {
        const struct wa_note *note = &run->notes[i];
        if (!stands_for(note, name)) {
            continue;
        }
        if (note->origin != WA_ORIGIN_OPTION && !has_digit(note->text)) {
            enum wa_status said =
                wa_run_remark(run, error,
                              "The note '%s' on line %ld ('%.40s') holds no number "
                              "and is not used.",
                              name, note->line, note->text);
            if (said != WA_OK) {
                return said;
            }
            continue;
        }
        struct wa_quantity quantity;
        enum wa_status status = parse(run, note, dimension, &quantity, error);
        if (status == WA_ERROR_INPUT && note->loose) {
            status = wa_run_remark(run, error,
                                   "The line '%s: %.60s' (line %ld) is not understood "
                                   "as a %s and is not used.",
                                   note->name, note->text, note->line, name);
            if (status == WA_OK) {
                continue;
            }
        }
        if (status != WA_OK) {
            return status;
        }
        bool from_file = note->origin != WA_ORIGIN_OPTION;
        if (from_file && line != 0 && !same_number(first.value, quantity.value)) {
            return wa_fail(error, WA_ERROR_INPUT, run->file, note->line,
                           "The note '%s' has another value here than on line %ld; keep the one "
                           "that is right.",
                           name, line);
        }
        if (from_file && line == 0) {
            line = note->line;
            first = quantity;
        }
        if (!from_file || noted->origin != WA_ORIGIN_OPTION) {
            *noted = (struct wa_noted){
                .quantity = quantity, .known = true, .origin = note->origin, .line = note->line};
        }
    }
    return WA_OK;
}

static enum wa_status check_possible(const struct wa_run *run, const struct plain *plain,
                                     const struct wa_noted *noted, struct wa_error *error)
{
    double value = noted->quantity.value;
    if (!noted->known ||
        (value >= plain->lowest && value <= plain->highest && !(plain->above_zero && value <= 0))) {
        return WA_OK;
    }
    return wa_fail(error, noted->origin == WA_ORIGIN_OPTION ? WA_ERROR_CALL : WA_ERROR_INPUT,
                   noted->origin == WA_ORIGIN_OPTION ? NULL : run->file, noted->line,
                   "A %s of %g %s is not possible; check the number and its unit.", plain->name,
                   value, wa_dimension_unit(plain->dimension));
}

static enum wa_status take_plains(struct wa_run *run, struct wa_error *error)
{
    for (size_t i = 0; i < sizeof plains / sizeof plains[0]; i++) {
        struct wa_noted *noted =
            (struct wa_noted *)(void *)((char *)&run->conditions + plains[i].offset);
        enum wa_status status =
            take(run, plains[i].name, plains[i].dimension, parse_plain, noted, error);
        if (status == WA_OK) {
            status = check_possible(run, &plains[i], noted, error);
        }
        if (status != WA_OK) {
            return status;
        }
    }
    return WA_OK;
}

/* "25 mL of 250 mL", "25/250", "10 %". */
static enum wa_status parse_aliquot(struct wa_run *run, const struct wa_note *note,
                                    enum wa_dimension dimension, struct wa_quantity *quantity,
                                    struct wa_error *error)
{
    static const char *const betweens[] = {" of ", " from ", " von ", " aus ", " de ",
                                           " di ", " van ",  " in ",  "/"};
    char folded[256];
    wa_text_fold(note->text, strlen(note->text), folded, sizeof folded);
    for (size_t i = 0; i < sizeof betweens / sizeof betweens[0]; i++) {
        char *between = strstr(folded, betweens[i]);
        struct wa_quantity part;
        struct wa_quantity whole;
        if (between == NULL) {
            continue;
        }
        *between = '\0';
        if (wa_quantity_parse(folded, WA_DIMENSION_VOLUME, &part, NULL) == WA_OK &&
            wa_quantity_parse(between + strlen(betweens[i]), WA_DIMENSION_VOLUME, &whole, NULL) ==
                WA_OK &&
            part.value > 0 && whole.value >= part.value) {
            quantity->value = part.value / whole.value;
            quantity->has_u = part.has_u || whole.has_u;
            quantity->u = quantity->value * hypot(part.u / part.value, whole.u / whole.value);
            return WA_OK;
        }
        *between = betweens[i][0];
    }
    enum wa_status status = parse_any(run, note, dimension, quantity, error);
    if (status == WA_OK && !(quantity->value > 0 && quantity->value <= 1)) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, note->line,
                       "The aliquot '%.60s' is not a part of the whole; write it like '25 mL of "
                       "250 mL'.",
                       note->text);
    }
    return status;
}

/* In a pH run the noted temperature, not yet defaulted, sets the theoretical slope. */
static double temperature_of(const struct wa_run *run)
{
    const struct wa_noted *temperature = &run->conditions.temperature;
    return temperature->known ? temperature->quantity.value : 25;
}

enum wa_status wa_run_parse_slope(const struct wa_run *run, const struct wa_note *note,
                                  double temperature_C, struct wa_quantity *quantity,
                                  struct wa_error *error)
{
    char folded[256];
    wa_text_fold(note->text, strlen(note->text), folded, sizeof folded);
    char *per_pH = strstr(folded, "/ph");
    if (per_pH != NULL) {
        *per_pH = '\0';
    }
    bool in_mV = strstr(folded, "mv") != NULL;
    struct wa_note trimmed = *note;
    trimmed.text = folded;
    enum wa_status status = parse_any(
        run, &trimmed, in_mV ? WA_DIMENSION_VOLTAGE : WA_DIMENSION_FRACTION, quantity, error);
    if (status != WA_OK) {
        return status;
    }
    double size = fabs(quantity->value);
    double divisor = 1;
    if (in_mV || (size > 40 && size < 72)) {
        divisor = wa_nernst_slope(temperature_C);
    } else if (size > 2) {
        divisor = 100;
    }
    quantity->value = size / divisor;
    quantity->u /= divisor;
    if (!(quantity->value > 0.5 && quantity->value < 1.3)) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, note->line,
                       "An electrode slope of '%.60s' is not possible; write it like '99.2 %%' "
                       "or '58.7 mV'.",
                       note->text);
    }
    return WA_OK;
}

enum wa_status wa_run_parse_offset(const struct wa_run *run, const struct wa_note *note,
                                   double temperature_C, struct wa_quantity *quantity,
                                   struct wa_error *error)
{
    char folded[256];
    wa_text_fold(note->text, strlen(note->text), folded, sizeof folded);
    bool in_mV = strstr(folded, "mv") != NULL ||
                 (run->reading_kind == WA_READING_MV && strstr(folded, "ph") == NULL);
    enum wa_status status =
        parse_any(run, note, in_mV ? WA_DIMENSION_VOLTAGE : WA_DIMENSION_PH, quantity, error);
    if (status == WA_OK && in_mV) {
        double slope = wa_nernst_slope(temperature_C);
        quantity->value = -quantity->value / slope;
        quantity->u /= slope;
    }
    return status;
}

static enum wa_status parse_slope(struct wa_run *run, const struct wa_note *note,
                                  enum wa_dimension dimension, struct wa_quantity *quantity,
                                  struct wa_error *error)
{
    (void)dimension;
    return wa_run_parse_slope(run, note, temperature_of(run), quantity, error);
}

static enum wa_status parse_offset(struct wa_run *run, const struct wa_note *note,
                                   enum wa_dimension dimension, struct wa_quantity *quantity,
                                   struct wa_error *error)
{
    (void)dimension;
    return wa_run_parse_offset(run, note, temperature_of(run), quantity, error);
}

static enum wa_status parse_reading_u(struct wa_run *run, const struct wa_note *note,
                                      enum wa_dimension dimension, struct wa_quantity *quantity,
                                      struct wa_error *error)
{
    (void)dimension;
    return parse_any(run, note,
                     run->reading_kind == WA_READING_MV ? WA_DIMENSION_VOLTAGE : WA_DIMENSION_PH,
                     quantity, error);
}

static enum wa_status take_special(struct wa_run *run, struct wa_error *error)
{
    struct wa_conditions *conditions = &run->conditions;
    enum wa_status status =
        take(run, "aliquot", WA_DIMENSION_FRACTION, parse_aliquot, &conditions->aliquot, error);
    if (status == WA_OK) {
        status = take(run, "reading uncertainty", WA_DIMENSION_PH, parse_reading_u,
                      &conditions->reading_uncertainty, error);
    }
    if (status == WA_OK && run->reading_kind == WA_READING_PH) {
        status = take(run, "electrode slope", WA_DIMENSION_FRACTION, parse_slope,
                      &conditions->electrode_slope, error);
    }
    if (status == WA_OK && run->reading_kind == WA_READING_PH) {
        status = take(run, "electrode offset", WA_DIMENSION_PH, parse_offset,
                      &conditions->electrode_offset, error);
    }
    return status;
}

/* "0.1 M NaOH" as the titrant tells a nominal concentration when no other note does. */
static enum wa_status concentration_from_titrant(struct wa_run *run, struct wa_error *error)
{
    const struct wa_note *titrant = wa_run_find_note(run, "titrant");
    struct wa_noted *noted = &run->conditions.titrant_concentration;
    struct wa_quantity quantity;
    if (noted->known || titrant == NULL ||
        !wa_quantity_find(titrant->text, WA_DIMENSION_CONCENTRATION, &quantity) ||
        !(quantity.value > 0 && quantity.value <= 20)) {
        return WA_OK;
    }
    if (!quantity.has_u) {
        quantity.u = 0.02 * quantity.value;
        quantity.has_u = true;
    }
    *noted = (struct wa_noted){
        .quantity = quantity, .known = true, .origin = titrant->origin, .line = titrant->line};
    return wa_run_remark(run, error,
                         "The titrant concentration is taken from the titrant's name, '%.60s', "
                         "with a relative standard uncertainty of %.2g %%.",
                         titrant->text, 100 * quantity.u / quantity.value);
}

enum wa_status wa_run_apply_notes(struct wa_run *run, struct wa_error *error)
{
    static const char *const words[] = {"titrant", "solvent", "sample"};
    run->conditions = (struct wa_conditions){0};
    enum wa_status status = take_plains(run, error);
    if (status == WA_OK) {
        status = take_special(run, error);
    }
    if (status == WA_OK) {
        status = concentration_from_titrant(run, error);
    }
    const char **targets[] = {&run->conditions.titrant, &run->conditions.solvent,
                              &run->conditions.sample};
    for (size_t i = 0; status == WA_OK && i < sizeof words / sizeof words[0]; i++) {
        const struct wa_note *note = wa_run_find_note(run, words[i]);
        *targets[i] = note != NULL && note->text[0] != '\0' ? note->text : NULL;
    }
    return status == WA_OK ? wa_run_fill_defaults(run, error) : status;
}
