/* The files beside acids, constants and forms: sources, atomic weights, indicators, buffers,
 * standards, hazard sentences. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

void take_sources(struct loader *loader, const struct table_file *file)
{
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        const char *key = required_cell(loader, file, row, SOURCE_KEY);
        const char *reference = required_cell(loader, file, row, SOURCE_REFERENCE);
        if (key == NULL || reference == NULL) {
            continue;
        }
        long place = keyed_place(loader, file, row, key, loader->table.source_count);
        if (place < 0) {
            continue;
        }
        if (!wa_grow(&loader->table.sources, &loader->source_capacity, (size_t)place + 1,
                     sizeof *loader->table.sources)) {
            loader->out_of_memory = true;
            return;
        }
        loader->table.sources[place] =
            (struct wa_source){key, reference, table_cell(file, row, SOURCE_KIND)};
        loader->table.source_count += (size_t)place == loader->table.source_count;
    }
}

/* Atomic weights rise with the number; the exceptions (argon, cobalt, tellurium, thorium) are off
 * by one unit at most. And no nucleus but hydrogen's has less than 1.9 or more than 2.7 times its
 * number. */
static void check_order_of_weights(struct loader *loader, const struct table_file *file)
{
    const struct wa_table_storage *storage = loader->table.storage;
    const struct element *by_number[ELEMENTS_MAX] = {NULL};
    for (int i = 0; i < storage->element_count; i++) {
        const struct element *element = &storage->elements[i];
        double ratio = element->number > 1 ? element->weight / element->number : 2.0;
        if (ratio >= 1.9 && ratio <= 2.7) {
            by_number[element->number] = element;
        } else if (element->file == file->name && element->number > 0) {
            loader_problem(loader, file, element->line, WEIGHT_WEIGHT, false,
                           "The weight %g cannot be that of %s, number %d.", element->weight,
                           element->symbol, element->number);
        }
    }
    const struct element *before = NULL;
    for (int number = 1; number < ELEMENTS_MAX; number++) {
        const struct element *element = by_number[number];
        if (element != NULL && before != NULL && before->weight > element->weight + 1.1) {
            const struct element *blamed = element->file == file->name ? element : before;
            loader_problem(loader, file, blamed->line, WEIGHT_WEIGHT, false,
                           "%s (%g) is lighter than %s before it (%g); one of the two is wrong.",
                           element->symbol, element->weight, before->symbol, before->weight);
        }
        before = element != NULL ? element : before;
    }
}

/* Atomic weights in two figures: the abridged weight and the ± that IUPAC gives with it. The ± is
 * a limit within which nearly all materials lie, so it is taken as the half-width of a rectangular
 * distribution (as in Eurachem/CITAC QUAM, example A2): u = ±/√3. */
void take_atomic_weights(struct loader *loader, const struct table_file *file)
{
    struct wa_table_storage *storage = loader->table.storage;
    for (size_t i = 0; i < file->row_count; i++) {
        const struct table_row *row = &file->rows[i];
        const char *symbol = required_cell(loader, file, row, WEIGHT_SYMBOL);
        double weight;
        double half_width;
        double number;
        if (symbol == NULL ||
            !numeric_cell(loader, file, row, WEIGHT_WEIGHT, 1.0, 400.0, true, NAN, &weight) ||
            !numeric_cell(loader, file, row, WEIGHT_U, 1e-9, 5.0, true, NAN, &half_width) ||
            !numeric_cell(loader, file, row, WEIGHT_NUMBER, 1, 118, false, 0.0, &number)) {
            continue;
        }
        size_t length = strlen(symbol);
        if (length < 1 || length > 2 || symbol[0] < 'A' || symbol[0] > 'Z' ||
            (length == 2 && (symbol[1] < 'a' || symbol[1] > 'z'))) {
            loader_problem(loader, file, row->line, WEIGHT_SYMBOL, true,
                           "'%.20s' is no symbol of an element; one capital letter and at most "
                           "one small letter are expected.",
                           symbol);
            continue;
        }
        int element = element_find(storage, symbol);
        if (element >= 0 && !loader->user) {
            loader_problem(loader, file, row->line, WEIGHT_SYMBOL, true,
                           "The element %s stands in an earlier row already.", symbol);
            continue;
        }
        if (element < 0) {
            if (storage->element_count == ELEMENTS_MAX) {
                loader_problem(loader, file, row->line, -1, true,
                               "The file holds more elements than there are.");
                return;
            }
            element = storage->element_count;
            storage->element_count++;
            storage->element_of[symbol[0] - 'A'][length == 2 ? symbol[1] - 'a' : 26] = element + 1;
        }
        if (half_width > 0.01 * weight) {
            loader_problem(loader, file, row->line, WEIGHT_U, false,
                           "± %g for %s is more than one per cent of its weight; no standard "
                           "atomic weight is as uncertain as that.",
                           half_width, symbol);
        }
        struct element entry = {
            .weight = weight, .u = half_width / sqrt(3.0), .number = (int)lround(number)};
        memcpy(entry.symbol, symbol, length);
        entry.file = file->name;
        entry.line = row->line;
        storage->elements[element] = entry;
    }
    check_order_of_weights(loader, file);
}

void take_indicators(struct loader *loader, const struct table_file *file)
{
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_indicator indicator = {
            .key = required_cell(loader, file, row, INDICATOR_KEY),
            .name = required_cell(loader, file, row, INDICATOR_NAME),
            .colour_acid = table_cell(file, row, INDICATOR_ACID_COLOUR),
            .colour_base = table_cell(file, row, INDICATOR_BASE_COLOUR),
            .source = table_cell(file, row, INDICATOR_SOURCE),
        };
        if (indicator.key == NULL || indicator.name == NULL ||
            !numeric_cell(loader, file, row, INDICATOR_LOW, -2, 16, true, NAN, &indicator.low_pH) ||
            !numeric_cell(loader, file, row, INDICATOR_HIGH, -2, 16, true, NAN,
                          &indicator.high_pH) ||
            !numeric_cell(loader, file, row, INDICATOR_PKA, -5, 20, false, NAN, &indicator.pKa)) {
            continue;
        }
        if (indicator.low_pH >= indicator.high_pH) {
            loader_problem(loader, file, row->line, INDICATOR_HIGH, true,
                           "The range runs from %g to %g; the higher pH belongs into 'high pH'.",
                           indicator.low_pH, indicator.high_pH);
            continue;
        }
        if (indicator.pKa < indicator.low_pH - 1.0 || indicator.pKa > indicator.high_pH + 1.0 ||
            indicator.high_pH - indicator.low_pH > 4.0) {
            loader_problem(loader, file, row->line, INDICATOR_LOW, false,
                           "A range from %g to %g does not go with a pKa of %g; an indicator turns "
                           "within about one unit of its pKa.",
                           indicator.low_pH, indicator.high_pH, indicator.pKa);
        }
        long place = keyed_place(loader, file, row, indicator.key, loader->table.indicator_count);
        if (place < 0) {
            continue;
        }
        if (!wa_grow(&loader->table.indicators, &loader->indicator_capacity, (size_t)place + 1,
                     sizeof *loader->table.indicators)) {
            loader->out_of_memory = true;
            return;
        }
        loader->table.indicators[place] = indicator;
        loader->table.indicator_count += (size_t)place == loader->table.indicator_count;
    }
}

void take_buffers(struct loader *loader, const struct table_file *file)
{
    for (size_t i = 0; i < file->row_count; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_buffer buffer = {
            .key = required_cell(loader, file, row, BUFFER_KEY),
            .name = table_cell(file, row, BUFFER_NAME),
            .composition = table_cell(file, row, BUFFER_COMPOSITION),
            .amount = table_cell(file, row, BUFFER_AMOUNT),
            .source = table_cell(file, row, BUFFER_SOURCE),
        };
        if (buffer.key == NULL ||
            !numeric_cell(loader, file, row, BUFFER_TEMPERATURE, -5, 150, true, NAN,
                          &buffer.temperature_C) ||
            !numeric_cell(loader, file, row, BUFFER_PH, 0, 14, true, NAN, &buffer.pH) ||
            !numeric_cell(loader, file, row, BUFFER_U, 0, 1, true, NAN, &buffer.u)) {
            continue;
        }
        if (!wa_grow(&loader->table.buffers, &loader->buffer_capacity,
                     loader->table.buffer_count + 1, sizeof *loader->table.buffers)) {
            loader->out_of_memory = true;
            return;
        }
        loader->table.buffers[loader->table.buffer_count] = buffer;
        loader->table.buffer_count++;
        loader->table.overlaid_count += loader->user;
    }
}

/* Fill a standard from its row. @return false with the problem noted */
static bool read_standard(struct loader *loader, const struct table_file *file,
                          const struct table_row *row, struct wa_standard *standard)
{
    double equivalents;
    *standard = (struct wa_standard){
        .key = required_cell(loader, file, row, STANDARD_KEY),
        .name = required_cell(loader, file, row, STANDARD_NAME),
        .formula = required_cell(loader, file, row, STANDARD_FORM),
        .drying = table_cell(file, row, STANDARD_DRYING),
        .source = table_cell(file, row, STANDARD_SOURCE),
        .note = table_cell(file, row, STANDARD_NOTE),
    };
    const char *use = required_cell(loader, file, row, STANDARD_USE);
    if (standard->key == NULL || standard->name == NULL || standard->formula == NULL ||
        use == NULL ||
        !numeric_cell(loader, file, row, STANDARD_PURITY, 0.9, 1, false, NAN, &standard->purity) ||
        !numeric_cell(loader, file, row, STANDARD_U, 0, 0.5, false, NAN, &standard->purity_u) ||
        !numeric_cell(loader, file, row, STANDARD_EQUIVALENTS, 1, 8, true, NAN, &equivalents)) {
        return false;
    }
    if (strcmp(use, "base") != 0 && strcmp(use, "acid") != 0) {
        loader_problem(loader, file, row->line, STANDARD_USE, true,
                       "'%.30s' is not known; 'base' (it standardizes bases) or 'acid' is "
                       "expected.",
                       use);
        return false;
    }
    struct composition composition;
    char reason[128];
    if (!formula_parse(loader->table.storage, standard->formula, &composition, reason,
                       sizeof reason)) {
        loader_problem(loader, file, row->line, STANDARD_FORM, true,
                       "The formula '%.60s' cannot be read: %s.", standard->formula, reason);
        return false;
    }
    standard->molar_mass =
        composition_mass(loader->table.storage, &composition, &standard->molar_mass_u);
    if (formula_has_odd_electrons(loader->table.storage, standard->formula, 0)) {
        loader_problem(loader, file, row->line, STANDARD_FORM, false,
                       "%s has an odd number of electrons; check its number of hydrogens.",
                       standard->formula);
    }
    int form = keyed_find(loader, TABLE_FORMS, standard->key);
    if (form >= 0 && fabs(loader->table.forms[form].molar_mass - standard->molar_mass) > 0.01) {
        loader_problem(loader, file, row->line, STANDARD_FORM, false,
                       "The formula %s contradicts that of the form '%s' in forms.csv, %s.",
                       standard->formula, standard->key, loader->table.forms[form].formula);
    }
    standard->for_base = strcmp(use, "base") == 0;
    standard->equivalents = (int)lround(equivalents);
    return true;
}

void take_standards(struct loader *loader, const struct table_file *file)
{
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_standard standard;
        if (!read_standard(loader, file, row, &standard)) {
            continue;
        }
        long place = keyed_place(loader, file, row, standard.key, loader->table.standard_count);
        if (place < 0) {
            continue;
        }
        if (!wa_grow(&loader->table.standards, &loader->standard_capacity, (size_t)place + 1,
                     sizeof *loader->table.standards)) {
            loader->out_of_memory = true;
            return;
        }
        loader->table.standards[place] = standard;
        loader->table.standard_count += (size_t)place == loader->table.standard_count;
    }
}

static int compare_hazards(const void *left, const void *right)
{
    const struct hazard *first = left;
    const struct hazard *second = right;
    return strcmp(first->code, second->code);
}

void take_hazards(struct loader *loader, const struct table_file *file)
{
    struct wa_table_storage *storage = loader->table.storage;
    for (size_t i = 0; i < file->row_count; i++) {
        const struct table_row *row = &file->rows[i];
        const char *code = required_cell(loader, file, row, HAZARD_CODE);
        const char *sentence = required_cell(loader, file, row, HAZARD_SENTENCE);
        if (code == NULL || sentence == NULL) {
            continue;
        }
        if (!wa_grow(&storage->hazards, &loader->hazard_capacity, storage->hazard_count + 1,
                     sizeof *storage->hazards)) {
            loader->out_of_memory = true;
            return;
        }
        storage->hazards[storage->hazard_count] = (struct hazard){code, sentence};
        storage->hazard_count++;
    }
    if (storage->hazard_count > 0) {
        qsort(storage->hazards, storage->hazard_count, sizeof *storage->hazards, compare_hazards);
    }
}

const char *wa_table_hazard_sentence(const struct wa_table *table, const char *code)
{
    const struct wa_table_storage *storage = table->storage;
    const struct hazard wanted = {code, NULL};
    if (storage->hazard_count == 0) {
        return NULL;
    }
    const struct hazard *found = bsearch(&wanted, storage->hazards, storage->hazard_count,
                                         sizeof *storage->hazards, compare_hazards);
    return found != NULL ? found->sentence : NULL;
}
