/* Acid systems and the rows of their constants. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define STANDARD_TEMPERATURE_C 25.0

/* "yes" unless it says no; anything else is a problem. */
static bool read_yes(struct loader *loader, const struct table_file *file,
                     const struct table_row *row, int column)
{
    const char *text = table_cell(file, row, column);
    if (strcasecmp(text, "no") == 0) {
        return false;
    }
    if (text[0] != '\0' && strcasecmp(text, "yes") != 0) {
        loader_problem(loader, file, row->line, column, false,
                       "'%.30s' is taken for yes; 'yes' or 'no' is expected.", text);
    }
    return true;
}

static bool read_acid(struct loader *loader, const struct table_file *file,
                      const struct table_row *row, struct wa_acid *acid)
{
    double charge;
    *acid = (struct wa_acid){
        .key = required_cell(loader, file, row, ACID_KEY),
        .name = required_cell(loader, file, row, ACID_NAME),
        .other_names = table_cell(file, row, ACID_OTHER),
        .formula = required_cell(loader, file, row, ACID_FORMULA),
        .group = table_cell(file, row, ACID_GROUP),
        .modelled = read_yes(loader, file, row, ACID_MODELLED),
        .note = table_cell(file, row, ACID_NOTE),
        .from_user = loader->user,
        .file = file->name,
        .line = row->line,
    };
    if (acid->key == NULL || acid->name == NULL || acid->formula == NULL ||
        !numeric_cell(loader, file, row, ACID_CHARGE, -6, 12, true, NAN, &charge)) {
        return false;
    }
    struct composition composition;
    char reason[128];
    if (!formula_parse(loader->table.storage, acid->formula, &composition, reason, sizeof reason)) {
        loader_problem(loader, file, row->line, ACID_FORMULA, true,
                       "The formula '%.60s' cannot be read: %s.", acid->formula, reason);
        return false;
    }
    acid->charge = (int)lround(charge);
    if (fabs(charge - acid->charge) > 1e-9) {
        loader_problem(loader, file, row->line, ACID_CHARGE, true,
                       "The charge %g cannot be right; a whole number is expected.", charge);
        return false;
    }
    if (composition.charge != 0 && composition.charge != acid->charge) {
        loader_problem(loader, file, row->line, ACID_CHARGE, true,
                       "The charge %d contradicts the formula '%.60s'.", acid->charge,
                       acid->formula);
        return false;
    }
    return true;
}

/* Rows are read straight into their place at the end of the array: a system with room for all its
 * steps is too large to be copied about without need. */
void take_acids(struct loader *loader, const struct table_file *file)
{
    struct wa_table *table = &loader->table;
    if (!wa_grow(&table->acids, &loader->acid_capacity, table->acid_count + file->row_count + 1,
                 sizeof *table->acids)) {
        loader->out_of_memory = true;
        return;
    }
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_acid *acid = &table->acids[table->acid_count];
        if (!read_acid(loader, file, row, acid)) {
            continue;
        }
        if (strcmp(acid->key, "water") == 0) {
            loader_problem(loader, file, row->line, ACID_KEY, true,
                           "The key 'water' stands for hydroxide in parts and cannot be an acid "
                           "of the table.");
            continue;
        }
        long place = keyed_place(loader, file, row, acid->key, table->acid_count);
        if (place >= 0 && (size_t)place < table->acid_count) {
            table->acids[place] = *acid;
        }
        table->acid_count += place == (long)table->acid_count;
    }
}

/* The kind of constant; an empty cell means thermodynamic at zero ionic strength only. */
static bool read_kind(struct loader *loader, const struct table_file *file,
                      const struct table_row *row, struct wa_constant_row *constant)
{
    const char *kind = table_cell(file, row, CONSTANT_KIND);
    if (strcasecmp(kind, "thermodynamic") == 0 ||
        (kind[0] == '\0' && constant->ionic_strength == 0.0)) {
        constant->thermodynamic = true;
        if (constant->ionic_strength > 0.0) {
            loader_problem(loader, file, row->line, CONSTANT_IONIC_STRENGTH, false,
                           "A thermodynamic constant stands at ionic strength 0, not %g; at an "
                           "ionic strength of its own the kind is 'concentration'.",
                           constant->ionic_strength);
        }
        return true;
    }
    bool mixed = strcasecmp(kind, "mixed") == 0;
    constant->kind = mixed ? WA_CONSTANT_MIXED : WA_CONSTANT_CONCENTRATION;
    if (mixed || strcasecmp(kind, "concentration") == 0) {
        return true;
    }
    loader_problem(loader, file, row->line, CONSTANT_KIND, true,
                   "'%.30s' is no kind of constant; 'thermodynamic', 'concentration' or 'mixed' "
                   "(activity of H+, concentrations of the others) is expected.",
                   kind);
    return false;
}

static bool read_constant(struct loader *loader, const struct table_file *file,
                          const struct table_row *row, struct wa_constant_row *constant)
{
    double step;
    *constant = (struct wa_constant_row){
        .source = required_cell(loader, file, row, CONSTANT_SOURCE),
        .note = table_cell(file, row, CONSTANT_NOTE),
        .from_user = loader->user,
        .file = file->name,
        .line = row->line,
    };
    const char *key = required_cell(loader, file, row, CONSTANT_ACID);
    if (key == NULL || constant->source == NULL ||
        !numeric_cell(loader, file, row, CONSTANT_STEP, 1, WA_PROTONS_MAX, true, NAN, &step) ||
        !numeric_cell(loader, file, row, CONSTANT_PKA, -12, 18, true, NAN, &constant->pKa) ||
        !numeric_cell(loader, file, row, CONSTANT_U, 1e-4, 3, true, NAN, &constant->u) ||
        !numeric_cell(loader, file, row, CONSTANT_TEMPERATURE, -5, 150, false,
                      STANDARD_TEMPERATURE_C, &constant->temperature_C) ||
        !numeric_cell(loader, file, row, CONSTANT_IONIC_STRENGTH, 0, 5, false, 0.0,
                      &constant->ionic_strength) ||
        !numeric_cell(loader, file, row, CONSTANT_ENTHALPY, -200, 200, false, NAN,
                      &constant->enthalpy) ||
        !numeric_cell(loader, file, row, CONSTANT_HEAT_CAPACITY, -1000, 1000, false, NAN,
                      &constant->heat_capacity) ||
        !read_kind(loader, file, row, constant)) {
        return false;
    }
    if (fabs(step - round(step)) > 1e-9) {
        loader_problem(loader, file, row->line, CONSTANT_STEP, true,
                       "The step %g cannot be right; a whole number is expected.", step);
        return false;
    }
    constant->step = (int)lround(step);
    constant->acid = keyed_find(loader, TABLE_ACIDS, key);
    if (constant->acid < 0) {
        loader_problem(loader, file, row->line, CONSTANT_ACID, true,
                       "There is no acid '%.60s' in acids.csv; the constant belongs to nothing.",
                       key);
        return false;
    }
    check_key_spelling(loader, file, row, CONSTANT_ACID, key, strlen(key),
                       loader->table.acids[constant->acid].key);
    return true;
}

/* Mark the table's rows of a step that the user's rows replace, by step 0: settle_acids leaves
 * them out. */
static void replace_constants(struct loader *loader, const struct wa_constant_row *constant,
                              size_t table_rows)
{
    for (size_t i = 0; i < table_rows; i++) {
        struct wa_constant_row *row = &loader->table.constants[i];
        if (row->acid == constant->acid && row->step == constant->step && !row->from_user) {
            row->step = 0;
        }
    }
}

void take_constants(struct loader *loader, const struct table_file *file)
{
    size_t table_rows = loader->table.constant_count;
    if (!wa_grow(&loader->table.constants, &loader->constant_capacity,
                 table_rows + file->row_count + 1, sizeof *loader->table.constants)) {
        loader->out_of_memory = true;
        return;
    }
    for (size_t i = 0; i < file->row_count; i++) {
        struct wa_constant_row constant;
        if (!read_constant(loader, file, &file->rows[i], &constant)) {
            continue;
        }
        loader->table.constants[loader->table.constant_count] = constant;
        loader->table.constant_count++;
        if (loader->user) {
            loader->table.overlaid_count++;
            replace_constants(loader, &constant, table_rows);
        }
    }
}
