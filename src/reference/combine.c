/* From the rows of constants.csv to one thermodynamic constant a step at 25 degree Celsius. */
#include "reference/reference_internal.h"
#include "whichacid/activity.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define STANDARD_TEMPERATURE_C 25.0
#define SAME_TEMPERATURE_K 0.5
#define ENTHALPY_GIVEN_U 2.0 /* kJ/mol, of one published enthalpy; the rows give none */
#define MODEL_U 0.02         /* pK per |change of z^2| / 2 beyond WEAK_IONIC_STRENGTH */
#define WEAK_IONIC_STRENGTH 0.05
#define OUT_OF_RANGE_U 0.2 /* the same beyond WA_DAVIES_LIMIT, where the equation does not hold */

/* A concentration constant Kc = [H][A]/[HA] at ionic strength I and K = Kc γ(H) γ(A)/γ(HA), with
 * lg γ = z^2 g (Davies 1962), give pK = pKc + 2 g (z - 1) for HA of charge z; a mixed constant,
 * which holds the activity of H, pK = pKm + g (2 z - 1). The uncertainty is that of the Davies
 * coefficient and of the model itself. */
double wa_constant_to_zero_ionic_strength(double pK, enum wa_constant_kind kind, int charge,
                                          double ionic_strength, double temperature_C, double *u)
{
    struct wa_medium medium = wa_medium_at(temperature_C);
    double weight = kind == WA_CONSTANT_CONCENTRATION ? 2.0 * (charge - 1)
                    : kind == WA_CONSTANT_MIXED       ? 2.0 * charge - 1.0
                                                      : 0.0;
    double at = wa_davies_log10_gamma(ionic_strength, medium.debye_huckel_A, WA_DAVIES_COEFFICIENT);
    double beside = wa_davies_log10_gamma(ionic_strength, medium.debye_huckel_A,
                                          WA_DAVIES_COEFFICIENT + WA_DAVIES_COEFFICIENT_U);
    double model = ionic_strength > WA_DAVIES_LIMIT       ? OUT_OF_RANGE_U
                   : ionic_strength > WEAK_IONIC_STRENGTH ? MODEL_U
                                                          : 0.0;
    if (u != NULL) {
        *u = hypot(weight * (beside - at), model * fabs(weight) / 2.0);
    }
    return pK + weight * at;
}

double wa_step_pKa_at(const struct wa_step *step, double temperature_C, double *u)
{
    double pKa =
        wa_pK_at_temperature(step->pKa, step->enthalpy, step->heat_capacity, temperature_C);
    if (u != NULL) {
        double per_enthalpy = wa_pK_at_temperature(0.0, 1.0, 0.0, temperature_C);
        *u = hypot(step->u, per_enthalpy * step->enthalpy_u);
    }
    return pKa;
}

/* What the enthalpy of a step usually is when nobody gives it, in kJ/mol: near zero for carboxylic
 * and other oxygen acids, about 20 for phenols and weak inorganic acids, and for protonated
 * nitrogen rising with the basicity (pyridinium 20, imidazolium 37, ammonium 52). Rough groups of
 * published values, hence the wide uncertainties. */
static void usual_enthalpy(const struct wa_table_storage *storage, const struct wa_acid *acid,
                           double pKa, double *enthalpy, double *u)
{
    struct composition composition;
    char reason[128];
    if (acid->charge > 0 && pKa > 4.0 &&
        formula_parse(storage, acid->formula, &composition, reason, sizeof reason) &&
        composition_atoms(&composition, storage->nitrogen) > 0.0) {
        *enthalpy = fmin(5.0 * pKa, 55.0);
        *u = 12.0;
    } else if (pKa > 7.0) {
        *enthalpy = 20.0;
        *u = 12.0;
    } else {
        *enthalpy = 2.0;
        *u = 8.0;
    }
}

/* Mean of the enthalpies and heat capacities that the rows of a step give. */
static void combine_enthalpy(const struct wa_table_storage *storage, const struct wa_acid *acid,
                             const struct wa_constant_row *rows, size_t count, struct wa_step *step)
{
    double sum = 0.0;
    double squares = 0.0;
    double capacity = 0.0;
    int given = 0;
    int capacities = 0;
    for (size_t i = 0; i < count; i++) {
        if (isfinite(rows[i].enthalpy)) {
            sum += rows[i].enthalpy;
            squares += rows[i].enthalpy * rows[i].enthalpy;
            given++;
        }
        if (isfinite(rows[i].heat_capacity)) {
            capacity += rows[i].heat_capacity;
            capacities++;
        }
    }
    step->enthalpy_known = given > 0;
    step->heat_capacity = capacities > 0 ? capacity / capacities : 0.0;
    if (given == 0) {
        usual_enthalpy(storage, acid, rows[0].pKa, &step->enthalpy, &step->enthalpy_u);
        return;
    }
    step->enthalpy = sum / given;
    double variance = fmax(squares / given - step->enthalpy * step->enthalpy, 0.0);
    step->enthalpy_u = hypot(ENTHALPY_GIVEN_U, sqrt(variance));
}

/* Bring a row to 25 degree Celsius and I = 0. @return whether it may join the combination */
static bool standardize_row(const struct wa_acid *acid, const struct wa_step *step,
                            bool standard_row_exists, struct wa_constant_row *row)
{
    double variance = row->u * row->u;
    row->pKa_standard = row->pKa;
    if (!row->thermodynamic && row->ionic_strength > 0.0) {
        double u;
        row->pKa_standard =
            wa_constant_to_zero_ionic_strength(row->pKa, row->kind, acid->charge - (row->step - 1),
                                               row->ionic_strength, row->temperature_C, &u);
        variance += u * u;
    }
    bool elsewhere = fabs(row->temperature_C - STANDARD_TEMPERATURE_C) > SAME_TEMPERATURE_K;
    if (elsewhere) {
        double shift =
            wa_pK_at_temperature(0.0, step->enthalpy, step->heat_capacity, row->temperature_C);
        double per_enthalpy = wa_pK_at_temperature(0.0, 1.0, 0.0, row->temperature_C);
        row->pKa_standard -= shift;
        variance += per_enthalpy * per_enthalpy * step->enthalpy_u * step->enthalpy_u;
    }
    row->u_standard = sqrt(variance);
    return !elsewhere || step->enthalpy_known || !standard_row_exists;
}

/* Combine the rows of one step: mean weighted by 1/u^2; when the rows disagree by more than their
 * u allow, u grows by the Birge ratio (R. T. Birge, Phys. Rev. 40 (1932) 207). Tables copy from
 * each other, so agreement never makes u smaller than that of the best row. */
static void combine_step(const struct wa_table_storage *storage, const struct wa_acid *acid,
                         struct wa_constant_row *rows, size_t count, struct wa_step *step)
{
    *step = (struct wa_step){.from_memory = true};
    combine_enthalpy(storage, acid, rows, count, step);
    bool standard_row_exists = false;
    for (size_t i = 0; i < count; i++) {
        standard_row_exists =
            standard_row_exists ||
            fabs(rows[i].temperature_C - STANDARD_TEMPERATURE_C) <= SAME_TEMPERATURE_K;
    }
    double weights = 0.0;
    double sum = 0.0;
    double smallest_u = INFINITY;
    for (size_t i = 0; i < count; i++) {
        rows[i].used = standardize_row(acid, step, standard_row_exists, &rows[i]);
        if (!rows[i].used) {
            continue;
        }
        double weight = 1.0 / (rows[i].u_standard * rows[i].u_standard);
        weights += weight;
        sum += weight * rows[i].pKa_standard;
        smallest_u = fmin(smallest_u, rows[i].u_standard);
        step->row_count++;
        step->converted =
            step->converted || (!rows[i].thermodynamic && rows[i].ionic_strength > 0.0);
        step->from_memory = step->from_memory && strcmp(rows[i].source, "from memory") == 0;
    }
    step->pKa = sum / weights;
    double chi_squared = 0.0;
    for (size_t i = 0; i < count; i++) {
        if (rows[i].used) {
            double off = (rows[i].pKa_standard - step->pKa) / rows[i].u_standard;
            chi_squared += off * off;
        }
    }
    step->birge_ratio = step->row_count > 1 ? sqrt(chi_squared / (step->row_count - 1)) : 0.0;
    step->u = fmax(fmax(step->birge_ratio, 1.0) / sqrt(weights), smallest_u);
}

/* ---- all systems ------------------------------------------------------------------------------
 */

static int compare_constants(const void *left, const void *right)
{
    const struct wa_constant_row *first = left;
    const struct wa_constant_row *second = right;
    if (first->acid != second->acid) {
        return first->acid < second->acid ? -1 : 1;
    }
    if (first->step != second->step) {
        return first->step < second->step ? -1 : 1;
    }
    return (first->line > second->line) - (first->line < second->line);
}

static void acid_problem(struct loader *loader, const struct wa_acid *acid, bool fatal,
                         const char *sentence, int step)
{
    const struct table_file place = {.name = acid->file, .kind = TABLE_ACIDS};
    loader_problem(loader, &place, acid->line, ACID_KEY, fatal, sentence, acid->key, step);
}

/* Combine the steps of one acid from its sorted rows. @return whether the system can be used */
static bool settle_acid(struct loader *loader, struct wa_acid *acid)
{
    struct wa_constant_row *rows = loader->table.constants + acid->constant_first;
    size_t at = 0;
    acid->step_count = 0;
    while (at < acid->constant_count) {
        size_t end = at;
        while (end < acid->constant_count && rows[end].step == rows[at].step) {
            end++;
        }
        if (rows[at].step != acid->step_count + 1) {
            acid_problem(loader, acid, true,
                         "The acid '%.60s' has no constant for step %d in constants.csv; every "
                         "step from 1 on is needed, and the acid is not used.",
                         acid->step_count + 1);
            return false;
        }
        combine_step(loader->table.storage, acid, rows + at, end - at,
                     &acid->steps[acid->step_count]);
        acid->step_count++;
        at = end;
    }
    if (acid->step_count == 0 && acid->modelled) {
        acid_problem(loader, acid, true,
                     "The acid '%.60s' has no constant for step %d in constants.csv; it cannot be "
                     "used without one.",
                     1);
        return false;
    }
    for (int i = 1; i < acid->step_count; i++) {
        if (acid->steps[i].pKa < acid->steps[i - 1].pKa) {
            acid_problem(loader, acid, false,
                         "The constants of '%.60s' are not in order: step %d has a lower pKa than "
                         "the step before it.",
                         i + 1);
        }
    }
    return true;
}

/* Take the systems that cannot be used out, with their constants, and renumber. */
static bool drop_acids(struct loader *loader, const bool *usable)
{
    struct wa_table *table = &loader->table;
    int *number = malloc((table->acid_count + 1) * sizeof *number);
    if (number == NULL) {
        return false;
    }
    size_t kept = 0;
    for (size_t i = 0; i < table->acid_count; i++) {
        number[i] = usable[i] ? (int)kept : -1;
        table->acids[kept] = table->acids[i];
        kept += usable[i];
    }
    table->acid_count = kept;
    size_t rows = 0;
    for (size_t i = 0; i < table->constant_count; i++) {
        struct wa_constant_row row = table->constants[i];
        if (number[row.acid] >= 0) {
            row.acid = number[row.acid];
            table->constants[rows] = row;
            rows++;
        }
    }
    table->constant_count = rows;
    free(number);
    return true;
}

static bool index_acid_keys(struct loader *loader)
{
    struct name_index *keys = &loader->keys[TABLE_ACIDS];
    name_index_free(keys);
    for (size_t i = 0; i < loader->table.acid_count; i++) {
        char folded[NAME_FOLD_MAX];
        const char *key = loader->table.acids[i].key;
        name_fold(key, strlen(key), folded);
        const char *kept = storage_copy(loader->table.storage, folded, strlen(folded));
        if (kept == NULL || name_index_add(keys, kept, (int)i * 2) == -2) {
            return false;
        }
    }
    return true;
}

static void find_ranges(struct wa_table *table)
{
    for (size_t i = 0; i < table->acid_count; i++) {
        table->acids[i].constant_count = 0;
    }
    for (size_t i = table->constant_count; i-- > 0;) {
        struct wa_acid *acid = &table->acids[table->constants[i].acid];
        acid->constant_first = i;
        acid->constant_count++;
    }
}

void settle_acids(struct loader *loader)
{
    struct wa_table *table = &loader->table;
    size_t kept = 0;
    for (size_t i = 0; i < table->constant_count; i++) {
        /* Step 0 marks a row that the user's rows replaced. */
        if (table->constants[i].step > 0) {
            table->constants[kept] = table->constants[i];
            kept++;
        }
    }
    table->constant_count = kept;
    if (kept > 1) {
        qsort(table->constants, kept, sizeof *table->constants, compare_constants);
    }
    find_ranges(table);
    bool *usable = calloc(table->acid_count + 1, sizeof *usable);
    if (usable == NULL) {
        loader->out_of_memory = true;
        return;
    }
    for (size_t i = 0; i < table->acid_count; i++) {
        usable[i] = settle_acid(loader, &table->acids[i]);
    }
    if (!drop_acids(loader, usable) || !index_acid_keys(loader)) {
        loader->out_of_memory = true;
    }
    find_ranges(table);
    free(usable);
}
