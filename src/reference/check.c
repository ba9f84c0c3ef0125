/* Mistakes that loading does not stumble over. */
#include "reference/reference_internal.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define PUBLISHED_MASS_TOLERANCE 0.01 /* g/mol, beside the last digit and the atomic weights */
#define DOUBTFUL_U 1.0
#define FAR_APART 0.8        /* pK */
#define ORGANIC_PKA_MIN -2.5 /* carbon without sulfur */

/* Elements whose compounds have an even number of electrons as a rule: the main groups. In the
 * transition metals an odd number is common. */
static const char *const main_group =
    " H Li Be B C N O F Na Mg Al Si P S Cl K Ca Zn Ga Ge As Se Br "
    "Rb Sr Ag Cd In Sn Sb Te I Cs Ba Tl Pb Bi ";

bool wa_cas_is_valid(const char *cas)
{
    size_t length = strlen(cas);
    if (length < 7 || length > 12 || cas[length - 2] != '-' || cas[length - 5] != '-') {
        return false;
    }
    int sum = 0;
    int weight = 1;
    for (size_t i = length - 2; i-- > 0;) {
        if (i == length - 5) {
            continue;
        }
        if (!isdigit((unsigned char)cas[i])) {
            return false;
        }
        sum += weight * (cas[i] - '0');
        weight++;
    }
    return cas[0] != '0' && cas[length - 1] == '0' + sum % 10;
}

/* What a check works on; the first failure (memory) is kept. */
struct check {
    struct wa_table *table;
    struct wa_error *error;
    enum wa_status status;
};

#define FOUND(check, row, column, ...)                                                             \
    do {                                                                                           \
        if ((check)->status == WA_OK) {                                                            \
            (check)->status = table_problem((check)->table, (row)->file, (row)->line, column,      \
                                            false, (check)->error, __VA_ARGS__);                   \
        }                                                                                          \
    } while (0)

static bool source_known(const struct wa_table *table, const char *source)
{
    int index = wa_table_find_source(table, source);
    return source[0] == '\0' || strcmp(source, "from memory") == 0 ||
           (index >= 0 && strcmp(table->sources[index].key, source) == 0);
}

bool formula_has_odd_electrons(const struct wa_table_storage *storage, const char *formula,
                               int charge)
{
    struct composition composition;
    char reason[128];
    if (!formula_parse(storage, formula, &composition, reason, sizeof reason)) {
        return false;
    }
    double electrons = -charge;
    for (int i = 0; i < composition.count; i++) {
        const struct element *element = &storage->elements[composition.element[i]];
        char word[8];
        snprintf(word, sizeof word, " %.3s ", element->symbol);
        if (element->number == 0 || strstr(main_group, word) == NULL) {
            return false;
        }
        electrons += composition.atoms[i] * element->number;
    }
    return fabs(fmod(fabs(electrons), 2.0) - 1.0) < 0.01;
}

static double hydrogens(const struct wa_table_storage *storage, const char *formula)
{
    struct composition composition;
    char reason[128];
    return formula_parse(storage, formula, &composition, reason, sizeof reason)
               ? composition_atoms(&composition, storage->hydrogen)
               : 0.0;
}

static void check_acid(struct check *check, const struct wa_acid *acid, bool in_a_form)
{
    const struct wa_table_storage *storage = check->table->storage;
    if (formula_has_odd_electrons(storage, acid->formula, acid->charge)) {
        FOUND(check, acid, "formula",
              "%s with charge %+d has an odd number of electrons; check the number of hydrogens "
              "and the charge of the fully protonated species.",
              acid->formula, acid->charge);
    }
    /* Aqua ions may be written without their waters. */
    if (acid->modelled && hydrogens(storage, acid->formula) < acid->step_count) {
        FOUND(check, acid, "formula",
              "%s has fewer hydrogens than the %d steps in constants.csv; give the formula of the "
              "fully protonated species.",
              acid->formula, acid->step_count);
    }
    if (acid->modelled && !in_a_form) {
        FOUND(check, acid, "key",
              "No form in forms.csv brings '%s', so it can never be found; add the solid or liquid "
              "that is weighed.",
              acid->key);
    }
}

/* A value far from the others of its step is a slip of somebody's; and an organic acid as strong as
 * the mineral acids is hardly one. */
static void check_disagreement(struct check *check, const struct wa_acid *acid,
                               const struct wa_constant_row *row)
{
    const struct wa_step *step = &acid->steps[row->step - 1];
    double off = fabs(row->pKa_standard - step->pKa);
    if (step->row_count > 1 && row->used && off > FAR_APART && off > 3.0 * row->u_standard) {
        FOUND(
            check, row, "pKa",
            "%g for step %d of '%s' lies %.1f from the mean of its rows; one of them is wrong, or "
            "its u is too small.",
            row->pKa, row->step, acid->key, off);
    }
    struct composition composition;
    char reason[128];
    const struct wa_table_storage *storage = check->table->storage;
    if (row->pKa < ORGANIC_PKA_MIN &&
        formula_parse(storage, acid->formula, &composition, reason, sizeof reason) &&
        composition_atoms(&composition, storage->carbon) > 0.0 &&
        composition_atoms(&composition, element_find(storage, "S")) <= 0.0) {
        FOUND(check, row, "pKa", "%g is far too low for an organic acid; check the sign.",
              row->pKa);
    }
}

static void check_constants(struct check *check, const struct wa_acid *acid)
{
    const struct wa_constant_row *rows = check->table->constants + acid->constant_first;
    for (size_t i = 0; i < acid->constant_count; i++) {
        if (!source_known(check->table, rows[i].source)) {
            FOUND(check, &rows[i], "source",
                  "The source '%.60s' is not in sources.csv; add it there, or write 'from memory'.",
                  rows[i].source);
        }
        /* Strong acids, far below what water can show, may be as uncertain as they are. */
        if (rows[i].u > DOUBTFUL_U && rows[i].pKa > 0.0) {
            FOUND(check, &rows[i], "u",
                  "u = %g is too large to tell anything; a standard uncertainty in pK, such as "
                  "0.02, is expected.",
                  rows[i].u);
        }
        check_disagreement(check, acid, &rows[i]);
        for (size_t j = 0; j < i; j++) {
            if (rows[j].step == rows[i].step && strcmp(rows[j].source, rows[i].source) == 0 &&
                fabs(rows[j].temperature_C - rows[i].temperature_C) < 1e-9 &&
                fabs(rows[j].ionic_strength - rows[i].ionic_strength) < 1e-9 &&
                fabs(rows[j].pKa - rows[i].pKa) < 1e-9) {
                FOUND(check, &rows[i], "pKa",
                      "The same value for step %d of '%s' from the same source stands in line %ld "
                      "already; remove one.",
                      rows[i].step, acid->key, rows[j].line);
            }
        }
    }
}

/* Digits behind the mark, from the double: a printed mass has at most four. */
static double half_last_digit(double value)
{
    double place = 1.0;
    while (place > 1e-4 && fabs(value / place - round(value / place)) > 1e-6 / place) {
        place /= 10.0;
    }
    return place / 2.0;
}

static void check_hazards(struct check *check, const struct wa_form *form)
{
    const char *at = form->hazards;
    while (*at != '\0' && check->table->storage->hazard_count > 0) {
        char code[16];
        size_t length = strcspn(at, " ,;");
        snprintf(code, sizeof code, "%.*s", (int)(length > 15 ? 15 : length), at);
        if (code[0] != '\0' && wa_table_hazard_sentence(check->table, code) == NULL) {
            FOUND(check, form, "hazards",
                  "'%s' is no GHS hazard statement code; codes such as H302, joined by spaces, are "
                  "expected.",
                  code);
        }
        at += length;
        at += strspn(at, " ,;");
    }
}

static void check_form(struct check *check, const struct wa_form *form)
{
    if (form->cas[0] != '\0' && !wa_cas_is_valid(form->cas)) {
        FOUND(check, form, "CAS",
              "'%.30s' is no CAS registry number: the check digit or the form is wrong. Correct it "
              "or leave the cell empty.",
              form->cas);
    }
    double off = fabs(form->published_molar_mass - form->molar_mass);
    if (off > PUBLISHED_MASS_TOLERANCE + half_last_digit(form->published_molar_mass) +
                  2.0 * form->molar_mass_u) {
        FOUND(check, form, "molar mass",
              "The published %.10g g/mol contradicts the formula %s, which gives %.3f; one of them "
              "is wrong.",
              form->published_molar_mass, form->formula, form->molar_mass);
    }
    if (formula_has_odd_electrons(check->table->storage, form->formula, 0)) {
        FOUND(check, form, "formula",
              "%s has an odd number of electrons; check its number of hydrogens.", form->formula);
    }
    if (!source_known(check->table, form->source)) {
        FOUND(check, form, "source",
              "The source '%.60s' is not in sources.csv; add it there, or write 'from memory'.",
              form->source);
    }
    check_hazards(check, form);
}

/* A registry number belongs to one form. Sorted by number, doubles stand side by side, the table's
 * before the user's, so that the finding is put to the user's row. */
static int compare_cas(const void *left, const void *right)
{
    const struct wa_form *first = *(const struct wa_form *const *)left;
    const struct wa_form *second = *(const struct wa_form *const *)right;
    int order = strcmp(first->cas, second->cas);
    if (order == 0) {
        order = (int)first->from_user - (int)second->from_user;
    }
    return order != 0 ? order : (first->line > second->line) - (first->line < second->line);
}

static void check_cas_doubles(struct check *check)
{
    const struct wa_table *table = check->table;
    const struct wa_form **sorted = malloc((table->form_count + 1) * sizeof *sorted);
    if (sorted == NULL) {
        check->status = wa_fail_memory(check->error);
        return;
    }
    for (size_t i = 0; i < table->form_count; i++) {
        sorted[i] = &table->forms[i];
    }
    qsort(sorted, table->form_count, sizeof *sorted, compare_cas);
    for (size_t i = 1; i < table->form_count; i++) {
        if (sorted[i]->cas[0] != '\0' && strcmp(sorted[i]->cas, sorted[i - 1]->cas) == 0) {
            FOUND(check, sorted[i], "CAS",
                  "The CAS registry number %s also stands at '%s' (%s:%ld); it belongs to one "
                  "substance.",
                  sorted[i]->cas, sorted[i - 1]->key, sorted[i - 1]->file, sorted[i - 1]->line);
        }
    }
    free(sorted);
}

/* A group joins systems of one formula. */
static int compare_groups(const void *left, const void *right)
{
    const struct wa_acid *const *first = left;
    const struct wa_acid *const *second = right;
    return strcmp((*first)->group, (*second)->group);
}

static void check_group_pair(struct check *check, const struct wa_acid *acid,
                             const struct wa_acid *before, const struct wa_acid *after)
{
    bool joins_before = before != NULL && strcmp(before->group, acid->group) == 0;
    bool joins_after = after != NULL && strcmp(after->group, acid->group) == 0;
    if (!joins_before && !joins_after) {
        FOUND(check, acid, "group",
              "The group '%.60s' has no other member; a group joins the enantiomers and racemates "
              "of one substance.",
              acid->group);
    }
    double mass;
    double other;
    if (joins_before &&
        wa_table_molar_mass(check->table, acid->formula, &mass, NULL, NULL) == WA_OK &&
        wa_table_molar_mass(check->table, before->formula, &other, NULL, NULL) == WA_OK &&
        fabs(mass - other) > 1e-6) {
        FOUND(check, acid, "group", "'%s' and '%s' share the group '%.60s' but not the formula.",
              acid->key, before->key, acid->group);
    }
}

static void check_groups(struct check *check)
{
    const struct wa_table *table = check->table;
    const struct wa_acid **sorted = malloc((table->acid_count + 1) * sizeof *sorted);
    if (sorted == NULL) {
        check->status = wa_fail_memory(check->error);
        return;
    }
    size_t count = 0;
    for (size_t i = 0; i < table->acid_count; i++) {
        if (table->acids[i].group[0] != '\0') {
            sorted[count] = &table->acids[i];
            count++;
        }
    }
    qsort(sorted, count, sizeof *sorted, compare_groups);
    for (size_t i = 0; i < count; i++) {
        check_group_pair(check, sorted[i], i > 0 ? sorted[i - 1] : NULL,
                         i + 1 < count ? sorted[i + 1] : NULL);
    }
    free(sorted);
}

static int compare_problems(const void *left, const void *right)
{
    const struct wa_table_problem *first = left;
    const struct wa_table_problem *second = right;
    int order = strcmp(first->file, second->file);
    return order != 0 ? order : (first->line > second->line) - (first->line < second->line);
}

enum wa_status wa_table_check(struct wa_table *table, struct wa_error *error)
{
    struct check check = {table, error, WA_OK};
    bool *in_a_form = calloc(table->acid_count + 1, sizeof *in_a_form);
    if (in_a_form == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < table->form_count; i++) {
        for (int j = 0; j < table->forms[i].part_count; j++) {
            if (table->forms[i].parts[j].acid >= 0) {
                in_a_form[table->forms[i].parts[j].acid] = true;
            }
        }
        check_form(&check, &table->forms[i]);
    }
    for (size_t i = 0; i < table->acid_count; i++) {
        check_acid(&check, &table->acids[i], in_a_form[i]);
        check_constants(&check, &table->acids[i]);
    }
    free(in_a_form);
    check_cas_doubles(&check);
    check_groups(&check);
    if (table->problem_count > 1) {
        qsort(table->problems, table->problem_count, sizeof *table->problems, compare_problems);
    }
    return check.status;
}

void wa_table_count(const struct wa_table *table, struct wa_table_statistics *statistics)
{
    *statistics = (struct wa_table_statistics){
        .acids = table->acid_count, .constants = table->constant_count, .forms = table->form_count};
    for (size_t i = 0; i < table->acid_count; i++) {
        const struct wa_acid *acid = &table->acids[i];
        bool sourced = acid->step_count > 0;
        bool enthalpy = false;
        for (int j = 0; j < acid->step_count; j++) {
            sourced = sourced && !acid->steps[j].from_memory;
            enthalpy = enthalpy || acid->steps[j].enthalpy_known;
        }
        statistics->acids_modelled += acid->modelled;
        statistics->acids_sourced += sourced;
        statistics->acids_enthalpy += enthalpy;
        statistics->acids_from_user += acid->from_user;
    }
    for (size_t i = 0; i < table->constant_count; i++) {
        statistics->constants_sourced += strcmp(table->constants[i].source, "from memory") != 0;
    }
    for (size_t i = 0; i < table->form_count; i++) {
        const struct wa_form *form = &table->forms[i];
        statistics->forms_with_cas += form->cas[0] != '\0';
        statistics->forms_with_hazards += form->hazards[0] != '\0';
        statistics->forms_with_solubility += isfinite(form->solubility_mol_L) ? 1U : 0U;
        statistics->forms_with_melting_point += isfinite(form->melting_point_C) ? 1U : 0U;
        statistics->forms_of_several_parts += form->part_count > 1;
        statistics->forms_from_user += form->from_user;
    }
}
