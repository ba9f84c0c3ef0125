/* The forms that are weighed: their parts, molar mass and spectator ions. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define GRAMS_PER_100_ML_TO_G_PER_L 10.0

/* One word of a part: up to a space or ';'. */
static size_t word_length(const char *at)
{
    return strcspn(at, " \t;");
}

static const char *skip_spaces(const char *at)
{
    return at + strspn(at, " \t");
}

/* A whole number from 0 to 99 that is all of the word. */
static bool whole_number(const char *at, size_t length, int *number)
{
    if (length < 1 || length > 2 || !isdigit((unsigned char)at[0]) ||
        !isdigit((unsigned char)at[length - 1])) {
        return false;
    }
    *number = atoi(at);
    return true;
}

/* "×4", "x4", "X4", "*4", also with a space behind the sign. @return length taken, 0 when none */
static size_t take_count(const char *at, int *count)
{
    size_t sign = strncmp(at, "×", strlen("×")) == 0       ? strlen("×")
                  : *at == 'x' || *at == 'X' || *at == '*' ? 1
                                                           : 0;
    if (sign == 0) {
        return 0;
    }
    const char *number = skip_spaces(at + sign);
    size_t length = word_length(number);
    if (!whole_number(number, length, count) || *count < 1) {
        return 0;
    }
    return (size_t)(number - at) + length;
}

static bool find_part(const struct loader *loader, const char *at, size_t length,
                      struct wa_form_part *part)
{
    char key[NAME_FOLD_MAX];
    if (length >= sizeof key) {
        return false;
    }
    memcpy(key, at, length);
    key[length] = '\0';
    part->acid = WA_PART_WATER;
    if (strcasecmp(key, "water") == 0) {
        return true;
    }
    part->acid = keyed_find(loader, TABLE_ACIDS, key);
    return part->acid >= 0;
}

/* Most protons that these molecules can have lost. */
static int most_lost(const struct loader *loader, const struct wa_form_part *part)
{
    int each = part->acid == WA_PART_WATER ? 1 : loader->table.acids[part->acid].step_count;
    return each * part->count;
}

static bool parse_part(const struct loader *loader, const char **cursor, struct wa_form_part *part,
                       char *reason, size_t reason_size)
{
    const char *at = skip_spaces(*cursor);
    size_t length = word_length(at);
    *part = (struct wa_form_part){.count = 1};
    if (!find_part(loader, at, length, part)) {
        snprintf(reason, reason_size,
                 "there is no acid '%.*s' in acids.csv that can be used; give the key of one, or "
                 "'water' for hydroxide",
                 (int)(length > 60 ? 60 : length), at);
        return false;
    }
    at = skip_spaces(at + length);
    size_t taken = take_count(at, &part->count);
    at = skip_spaces(at + taken);
    if (strncasecmp(at, "lost", 4) == 0 && (at[4] == ' ' || at[4] == '\t')) {
        const char *number = skip_spaces(at + 4);
        length = word_length(number);
        if (!whole_number(number, length, &part->lost)) {
            snprintf(reason, reason_size, "a whole number is expected behind 'lost'");
            return false;
        }
        at = skip_spaces(number + length);
    }
    if (*at != '\0' && *at != ';') {
        snprintf(reason, reason_size, "'%.40s' is not understood; a part is written KEY ×N lost M",
                 at);
        return false;
    }
    if (part->lost > most_lost(loader, part)) {
        snprintf(reason, reason_size, "it cannot have lost %d protons, it has only %d to lose",
                 part->lost, most_lost(loader, part));
        return false;
    }
    *cursor = *at == ';' ? at + 1 : at;
    return true;
}

bool parts_parse(const struct loader *loader, const char *text,
                 struct wa_form_part parts[WA_PARTS_MAX], int *part_count, char *reason,
                 size_t reason_size)
{
    int count = 0;
    while (*skip_spaces(text) != '\0') {
        if (count == WA_PARTS_MAX) {
            snprintf(reason, reason_size, "it names more than %d parts", WA_PARTS_MAX);
            return false;
        }
        if (!parse_part(loader, &text, &parts[count], reason, reason_size)) {
            return false;
        }
        count++;
    }
    *part_count = count;
    return true;
}

/* Composition and charge of the parts as they stand in the form. */
static bool add_parts(const struct loader *loader, const struct wa_form *form,
                      struct composition *sum)
{
    const struct wa_table_storage *storage = loader->table.storage;
    for (int i = 0; i < form->part_count; i++) {
        const struct wa_form_part *part = &form->parts[i];
        bool water = part->acid == WA_PART_WATER;
        const char *formula = water ? "H2O" : loader->table.acids[part->acid].formula;
        int charge = water ? 0 : loader->table.acids[part->acid].charge;
        struct composition composition;
        char reason[128];
        if (storage->hydrogen < 0 ||
            !formula_parse(storage, formula, &composition, reason, sizeof reason) ||
            !composition_add(sum, part->count, &composition) ||
            !composition_change(sum, storage->hydrogen, -part->lost)) {
            return false;
        }
        sum->charge += part->count * charge - part->lost;
    }
    return true;
}

static int organic_parts(const struct loader *loader, const struct wa_form *form)
{
    int count = 0;
    for (int i = 0; i < form->part_count; i++) {
        struct composition composition;
        char reason[128];
        int acid = form->parts[i].acid;
        count += acid != WA_PART_WATER &&
                 formula_parse(loader->table.storage, loader->table.acids[acid].formula,
                               &composition, reason, sizeof reason) &&
                 composition_atoms(&composition, loader->table.storage->carbon) > 0.0;
    }
    return count;
}

/* Formula, molar mass and spectators of a form whose parts are known. */
static bool settle_formula(struct loader *loader, const struct table_file *file,
                           const struct table_row *row, struct wa_form *form)
{
    const struct wa_table_storage *storage = loader->table.storage;
    struct composition composition;
    struct composition parts = {0};
    struct spectators spectators = {0};
    char reason[128];
    if (!formula_parse(storage, form->formula, &composition, reason, sizeof reason)) {
        loader_problem(loader, file, row->line, FORM_FORMULA, true,
                       "The formula '%.60s' cannot be read: %s.", form->formula, reason);
        return false;
    }
    if (composition.charge != 0) {
        loader_problem(loader, file, row->line, FORM_FORMULA, true,
                       "The formula '%.60s' carries a charge; what is weighed is neutral.",
                       form->formula);
        return false;
    }
    form->molar_mass = composition_mass(storage, &composition, &form->molar_mass_u);
    if (add_parts(loader, form, &parts)) {
        spectators_find(storage, &composition, &parts, &spectators);
    }
    form->spectator_charge = spectators.charge;
    form->spectator_z2 = spectators.z2;
    if (!spectators.balanced) {
        loader_problem(loader, file, row->line, FORM_PARTS, true,
                       "The formula '%.60s' and the parts '%.80s' do not add up: %s with charge "
                       "%+d is left, which is no set of ions and whole waters. Check 'lost', the "
                       "counts and the counter-ions.",
                       form->formula, table_cell(file, row, FORM_PARTS),
                       spectators.remainder[0] != '\0' ? spectators.remainder : "nothing",
                       spectators.charge);
        return false;
    }
    if (spectators.waters < -0.5 && organic_parts(loader, form) > 1) {
        loader_problem(loader, file, row->line, FORM_PARTS, false,
                       "The formula '%.60s' has %g waters less than the parts '%.80s' together; a "
                       "salt of organic parts has none to lose. Is a part mistaken for another?",
                       form->formula, -spectators.waters, table_cell(file, row, FORM_PARTS));
    }
    if (!spectators.split) {
        loader_problem(loader, file, row->line, FORM_PARTS, false,
                       "What '%.60s' holds beside its parts (%s, charge %+d) is no ion that is "
                       "known here: check the counts of the parts, or bear that single charges "
                       "are assumed for it.",
                       form->formula, spectators.remainder, spectators.charge);
    }
    return true;
}

/* Each part as written against the key it was taken for. */
void check_part_spelling(struct loader *loader, const struct table_file *file,
                         const struct table_row *row, int column, const char *text,
                         const struct wa_form_part *parts)
{
    for (int i = 0; *(text = skip_spaces(text)) != '\0'; i++) {
        const char *key =
            parts[i].acid == WA_PART_WATER ? "water" : loader->table.acids[parts[i].acid].key;
        check_key_spelling(loader, file, row, column, text, word_length(text), key);
        text += strcspn(text, ";");
        text += *text == ';';
    }
}

/* Melting point: a number, perhaps with a d for decomposition or a range. */
static double read_melting_point(struct loader *loader, const struct table_file *file,
                                 const struct table_row *row, const char *text)
{
    char number[24];
    size_t length = strcspn(text, " d");
    double value = NAN;
    if (text[0] == '\0') {
        return NAN;
    }
    if (length < sizeof number) {
        memcpy(number, text, length);
        number[length] = '\0';
        const char *rest = skip_spaces(text + length);
        if (table_number(number, &value) && (*rest == '\0' || *rest == 'd')) {
            return value;
        }
    }
    loader_problem(loader, file, row->line, FORM_MELTING_POINT, false,
                   "The melting point '%.40s' is not used; a number of degrees Celsius is "
                   "expected, with ' d' behind it for decomposition.",
                   text);
    return NAN;
}

static bool read_form(struct loader *loader, const struct table_file *file,
                      const struct table_row *row, struct wa_form *form)
{
    double solubility;
    char reason[256];
    *form = (struct wa_form){
        .key = required_cell(loader, file, row, FORM_KEY),
        .name = required_cell(loader, file, row, FORM_NAME),
        .other_names = table_cell(file, row, FORM_OTHER),
        .formula = required_cell(loader, file, row, FORM_FORMULA),
        .melting_point = table_cell(file, row, FORM_MELTING_POINT),
        .cas = table_cell(file, row, FORM_CAS),
        .hazards = table_cell(file, row, FORM_HAZARDS),
        .care = table_cell(file, row, FORM_CARE),
        .source = table_cell(file, row, FORM_SOURCE),
        .modelled = true,
        .from_user = loader->user,
        .file = file->name,
        .line = row->line,
    };
    const char *parts = required_cell(loader, file, row, FORM_PARTS);
    if (form->key == NULL || form->name == NULL || form->formula == NULL || parts == NULL ||
        !numeric_cell(loader, file, row, FORM_SOLUBILITY, 0, 1e5, false, NAN, &solubility) ||
        !numeric_cell(loader, file, row, FORM_MOLAR_MASS, 1, 1e5, false, NAN,
                      &form->published_molar_mass)) {
        return false;
    }
    if (!parts_parse(loader, parts, form->parts, &form->part_count, reason, sizeof reason)) {
        loader_problem(loader, file, row->line, FORM_PARTS, true,
                       "The parts '%.80s' cannot be used: %s.", parts, reason);
        return false;
    }
    if (!settle_formula(loader, file, row, form)) {
        return false;
    }
    check_part_spelling(loader, file, row, FORM_PARTS, parts, form->parts);
    for (int i = 0; i < form->part_count; i++) {
        form->modelled = form->modelled && (form->parts[i].acid == WA_PART_WATER ||
                                            loader->table.acids[form->parts[i].acid].modelled);
    }
    form->solubility_mol_L = solubility * GRAMS_PER_100_ML_TO_G_PER_L / form->molar_mass;
    form->melting_point_C = read_melting_point(loader, file, row, form->melting_point);
    return true;
}

void take_forms(struct loader *loader, const struct table_file *file)
{
    struct wa_table *table = &loader->table;
    if (!wa_grow(&table->forms, &loader->form_capacity, table->form_count + file->row_count + 1,
                 sizeof *table->forms)) {
        loader->out_of_memory = true;
        return;
    }
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_form *form = &table->forms[table->form_count];
        if (!read_form(loader, file, row, form)) {
            continue;
        }
        long place = keyed_place(loader, file, row, form->key, table->form_count);
        if (place >= 0 && (size_t)place < table->form_count) {
            table->forms[place] = *form;
        }
        table->form_count += place == (long)table->form_count;
    }
}
