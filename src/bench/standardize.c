/* Titrations of a primary standard to the concentration of the titrant. */
#include "whichacid/bench_standardize.h"

#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Air and the weights of a balance (OIML R 111: conventional mass, 1.2 kg/m3 and 8000 kg/m3). */
static const double air_density = 0.0012;    /* g/cm3 */
static const double air_density_u = 0.00005; /* rooms between 15 and 25 degree Celsius */
static const double weight_density = 8.0;

/* Places of the inputs in the budget; -1 for one that is not there. */
struct places {
    int repeatability, linearity, mass, purity, molar_mass, volume, burette, temperature, blank;
    int air, density;
    int second_end_point, second_burette, second_temperature, second_blank;
    int second_volume, pipette, pipette_temperature;
};

/* What the model needs beside the inputs. */
struct context {
    const struct wa_standardization *work;
    struct places at;
    double mass;   /* mean over the titrations used */
    double volume; /* likewise */
    double factor; /* 1000 equivalents of the standard over those of the titrant */
};

int wa_bench_find_standard(const struct wa_table *table, const char *name)
{
    char wanted[128], folded[128];
    wa_text_fold(name, strlen(name), wanted, sizeof wanted);
    for (size_t i = 0; i < table->standard_count; i++) {
        const char *const names[] = {table->standards[i].key, table->standards[i].name};
        for (size_t k = 0; k < 2; k++) {
            wa_text_fold(names[k], strlen(names[k]), folded, sizeof folded);
            if (strcmp(folded, wanted) == 0) {
                return (int)i;
            }
        }
    }
    /* The forms know more names ("KHP") under the same keys. */
    const int form = wa_table_find_form(table, name);
    for (size_t i = 0; form >= 0 && i < table->standard_count; i++) {
        if (strcmp(table->standards[i].key, table->forms[form].key) == 0) {
            return (int)i;
        }
    }
    return -1;
}

static double value_at(const double *values, int place, double otherwise)
{
    return place >= 0 ? values[place] : otherwise;
}

/* Mass over buoyant mass (J. Pratt's form in any textbook of weighing): what a balance in air
 * shows is too small for everything lighter than its weights. */
static double buoyancy_factor(double air, double density)
{
    return (1.0 - air / weight_density) / (1.0 - air / density);
}

static double second_factor(const struct places *at, const double *values)
{
    if (at->second_end_point < 0) {
        return 1.0;
    }
    const double taken = values[at->second_volume] + value_at(values, at->pipette, 0.0) +
                         value_at(values, at->pipette_temperature, 0.0);
    const double used = values[at->second_end_point] + value_at(values, at->second_burette, 0.0) +
                        value_at(values, at->second_temperature, 0.0) -
                        value_at(values, at->second_blank, 0.0);
    return used / taken;
}

/* The mean over the titrations of mass over volume, with the errors common to them. */
static double model(const double *values, const void *context)
{
    const struct context *c = context;
    const struct places *at = &c->at;
    const double mass_error = values[at->mass] - c->mass + value_at(values, at->linearity, 0.0);
    const double volume_error =
        values[at->volume] - c->volume + value_at(values, at->burette, 0.0) +
        value_at(values, at->temperature, 0.0) - value_at(values, at->blank, 0.0);
    double sum = 0.0;
    for (size_t i = 0; i < c->work->replicate_count; i++) {
        const struct wa_replicate *replicate = &c->work->replicates[i];
        if (!replicate->left_out) {
            sum += (replicate->mass.value + mass_error) / (replicate->volume.value + volume_error);
        }
    }
    double result = c->factor * sum / (double)c->work->used_count * values[at->repeatability] *
                    values[at->purity] / values[at->molar_mass] * second_factor(at, values);
    if (at->air >= 0) {
        result *= buoyancy_factor(values[at->air], values[at->density]);
    }
    return result;
}

static void assume(struct wa_standardization *work, const char *sentence)
{
    if (work->assumed_count < sizeof work->assumed / sizeof work->assumed[0]) {
        work->assumed[work->assumed_count++] = sentence;
    }
}

static bool given(const struct wa_quantity *quantity)
{
    return quantity->value > 0.0;
}

/* The names of the call looked up, and values that cannot be refused. */
static enum wa_status look_up(const struct wa_table *table,
                              const struct wa_standardize_options *options,
                              struct wa_standardization *work, struct wa_error *error)
{
    const int index =
        options->standard != NULL ? wa_bench_find_standard(table, options->standard) : -1;
    if (index < 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The table has no primary standard '%.100s'; standards.csv lists them, such "
                       "as potassium-hydrogen-phthalate or sodium-carbonate.",
                       options->standard != NULL ? options->standard : "");
    }
    work->standard = &table->standards[index];
    work->second = given(&options->second_volume) || given(&options->second_end_point);
    const bool base = work->standard->for_base != work->second;
    const char *words = work->second ? options->second_titrant : options->titrant;
    work->titrant_assumed = words == NULL;
    const char *wanted = words != NULL ? words : base ? "sodium hydroxide" : "hydrochloric acid";
    const int titrant = wa_table_find_titrant(table, wanted);
    if (titrant < 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The table has no titrant '%.100s'; titrants.csv lists them.", wanted);
    }
    work->titrant = &table->titrants[titrant];
    if (work->titrant->is_base != base) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "%s does not react with %s, so it cannot standardize it.",
                       work->second ? "The first titrant" : work->standard->name,
                       work->titrant->name);
    }
    if (work->second && (!given(&options->second_volume) || !given(&options->second_end_point))) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "A second solution needs both its volume and its end-point volume.");
    }
    return WA_OK;
}

static enum wa_status check_replicates(const struct wa_standardize_options *options,
                                       struct wa_standardization *work, struct wa_error *error)
{
    work->used_count = 0;
    for (size_t i = 0; i < work->replicate_count; i++) {
        const struct wa_replicate *replicate = &work->replicates[i];
        work->used_count += !replicate->left_out;
        if (!given(&replicate->mass) || !(replicate->volume.value - options->blank.value > 0.0)) {
            return wa_fail(error, WA_ERROR_INPUT, replicate->label, 0,
                           "Titration %zu has no mass or no volume above that of the blank.",
                           i + 1);
        }
    }
    return work->used_count > 0
               ? WA_OK
               : wa_fail(error, WA_ERROR_CALL, NULL, 0,
                         "No titration is left to compute from; give at least one sample mass and "
                         "its end-point volume, or a run.");
}

/* Means over the titrations used, and the mean of the stated uncertainties: errors of calibration
 * are common to all titrations and do not average out. */
struct means {
    double mass, mass_u, volume, volume_u, fit_u;
    bool mass_stated, volume_stated;
};

static struct means means_of(const struct wa_standardization *work)
{
    struct means means = {.mass_stated = true, .volume_stated = true};
    const double n = (double)work->used_count;
    for (size_t i = 0; i < work->replicate_count; i++) {
        const struct wa_replicate *r = &work->replicates[i];
        if (r->left_out) {
            continue;
        }
        means.mass += r->mass.value / n;
        means.volume += r->volume.value / n;
        means.mass_u += (r->mass.has_u ? r->mass.u : WA_DEFAULT_MASS_U) / n;
        means.mass_stated = means.mass_stated && r->mass.has_u;
        if (r->from_curve) {
            means.fit_u += r->volume.u * r->volume.u / (n * n);
        } else {
            means.volume_u += (r->volume.has_u ? r->volume.u : WA_DEFAULT_END_POINT_U) / n;
            means.volume_stated = means.volume_stated && r->volume.has_u;
        }
    }
    means.fit_u = sqrt(means.fit_u);
    return means;
}

static int add(struct wa_standardization *work, const char *name, const char *unit, double value,
               double u)
{
    wa_bench_add(&work->budget, name, unit, value, u, WA_TYPE_B);
    return (int)work->budget.input_count - 1;
}

static int add_limits(struct wa_standardization *work, const char *name, const char *unit,
                      double half_width, enum wa_distribution distribution)
{
    wa_bench_add_limits(&work->budget, name, unit, 0.0, half_width, distribution);
    return (int)work->budget.input_count - 1;
}

static void add_mass(const struct wa_standardize_options *options, const struct means *means,
                     struct wa_standardization *work, struct places *at)
{
    const bool linearity = options->balance_linearity > 0.0;
    const bool own_u = means->mass_stated || !linearity;
    at->mass = add(work, "mass of standard", "g", means->mass, own_u ? means->mass_u : 0.0);
    /* Two weighings give a mass, each with its own error within the limits: a triangle. */
    at->linearity = linearity ? add_limits(work, "linearity of balance, twice", "g",
                                           2.0 * options->balance_linearity, WA_TRIANGULAR)
                              : -1;
    if (!means->mass_stated && !linearity) {
        assume(work, "The uncertainty of the mass was not stated: 0.3 mg is assumed.");
    }
}

static void add_volume(const struct wa_standardize_options *options, const struct means *means,
                       struct wa_standardization *work, struct places *at)
{
    const bool tolerance = options->burette_tolerance > 0.0;
    const bool own_u = means->volume_stated || !tolerance;
    const double u = hypot(own_u ? means->volume_u : 0.0, means->fit_u);
    at->volume = add(work, "volume of titrant", "mL", means->volume, u);
    if (!means->volume_stated && !tolerance) {
        assume(work, "The uncertainty of the end-point volume was not stated: 0.02 mL is assumed.");
    }
    at->burette = tolerance ? add_limits(work, "calibration of burette", "mL",
                                         options->burette_tolerance, WA_TRIANGULAR)
                            : -1;
    at->temperature =
        options->temperature_spread > 0.0
            ? add_limits(work, "temperature of titrant", "mL",
                         means->volume * WA_WATER_EXPANSION * options->temperature_spread,
                         WA_RECTANGULAR)
            : -1;
    const bool blank = options->blank.value != 0.0 || options->blank.has_u;
    at->blank = blank ? add(work, "blank", "mL", options->blank.value,
                            options->blank.has_u ? options->blank.u : 0.0)
                      : -1;
}

static double u_or(const struct wa_quantity *quantity, double otherwise)
{
    return quantity->has_u ? quantity->u : otherwise;
}

static void add_second(const struct wa_standardize_options *options,
                       struct wa_standardization *work, struct places *at)
{
    const struct wa_quantity *used = &options->second_end_point;
    const struct wa_quantity *taken = &options->second_volume;
    const bool tolerance = options->burette_tolerance > 0.0;
    const bool pipette = options->pipette_tolerance > 0.0;
    const double spread = options->temperature_spread * WA_WATER_EXPANSION;
    at->second_end_point = add(work, "titrant for 2nd solution", "mL", used->value,
                               u_or(used, tolerance ? 0.0 : WA_DEFAULT_END_POINT_U));
    at->second_burette = tolerance ? add_limits(work, "calibration of burette, 2nd", "mL",
                                                options->burette_tolerance, WA_TRIANGULAR)
                                   : -1;
    at->second_volume = add(work, "volume of 2nd solution", "mL", taken->value,
                            u_or(taken, pipette ? 0.0 : WA_DEFAULT_END_POINT_U));
    at->pipette = pipette ? add_limits(work, "calibration of pipette", "mL",
                                       options->pipette_tolerance, WA_TRIANGULAR)
                          : -1;
    at->second_temperature = spread > 0.0 ? add_limits(work, "temperature of titrant, 2nd", "mL",
                                                       used->value * spread, WA_RECTANGULAR)
                                          : -1;
    at->pipette_temperature = spread > 0.0 ? add_limits(work, "temperature of 2nd solution", "mL",
                                                        taken->value * spread, WA_RECTANGULAR)
                                           : -1;
    at->second_blank = at->blank >= 0 ? add(work, "blank, 2nd", "mL", options->blank.value,
                                            options->blank.has_u ? options->blank.u : 0.0)
                                      : -1;
    if ((!used->has_u && !tolerance) || (!taken->has_u && !pipette)) {
        assume(work, "An uncertainty of the second titration was not stated: 0.02 mL is assumed.");
    }
}

static enum wa_status add_standard(const struct wa_standardize_options *options,
                                   struct wa_standardization *work, struct places *at,
                                   struct wa_error *error)
{
    const struct wa_standard *standard = work->standard;
    struct wa_quantity purity = options->purity, molar_mass = options->molar_mass;
    if (!given(&purity)) {
        purity = (struct wa_quantity){standard->purity, standard->purity_u, true};
    }
    if (!given(&molar_mass)) {
        molar_mass = (struct wa_quantity){standard->molar_mass, standard->molar_mass_u, true};
    }
    if (!(purity.value > 0.0) || !(molar_mass.value > 0.0)) {
        return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                       "The table gives no purity for %s; state it with --purity.", standard->name);
    }
    if (!purity.has_u) {
        purity.u = 0.0005;
        assume(work, "The purity was given without an uncertainty: 0.0005 is assumed.");
    }
    at->purity = add(work, "purity of standard", "", purity.value, purity.u);
    at->molar_mass = add(work, "molar mass of standard", "g/mol", molar_mass.value,
                         molar_mass.has_u ? molar_mass.u : 0.0);
    return WA_OK;
}

static void add_buoyancy(const struct wa_standardize_options *options,
                         struct wa_standardization *work, struct places *at)
{
    at->air = at->density = -1;
    work->buoyancy = 1.0;
    if (given(&options->density)) {
        const double u =
            options->density.has_u ? options->density.u : 0.02 * options->density.value;
        at->air = add(work, "density of air", "g/cm3", air_density, air_density_u);
        at->density = add(work, "density of standard", "g/cm3", options->density.value, u);
        work->buoyancy = buoyancy_factor(air_density, options->density.value);
    }
}

/* The titrations alone: concentrations, scatter, Grubbs' test. */
static void study_scatter(const struct places *at, struct wa_standardization *work)
{
    double ratios[WA_REPLICATES_MAX], used[WA_REPLICATES_MAX];
    size_t index[WA_REPLICATES_MAX] = {0};
    size_t count = 0;
    double sum = 0.0, square = 0.0;
    const double blank = at->blank >= 0 ? work->budget.inputs[at->blank].value : 0.0;
    for (size_t i = 0; i < work->replicate_count; i++) {
        const struct wa_replicate *r = &work->replicates[i];
        ratios[i] = r->mass.value / (r->volume.value - blank);
        sum += r->left_out ? 0.0 : ratios[i];
    }
    work->mean = work->budget.value;
    for (size_t i = 0; i < work->replicate_count; i++) {
        struct wa_replicate *r = &work->replicates[i];
        const double relative = ratios[i] / sum * (double)work->used_count;
        r->concentration = work->mean * relative;
        if (!r->left_out) {
            index[count] = i;
            used[count++] = r->concentration;
            square += (relative - 1.0) * (relative - 1.0);
        }
    }
    work->scatter = count > 1 ? sqrt(square / (double)(count - 1)) : (double)NAN;
    work->grubbs = wa_grubbs_test(used, count);
    work->grubbs.index = index[work->grubbs.index];
}

static void set_repeatability(const struct wa_standardize_options *options,
                              struct wa_standardization *work, struct wa_bench_input *input)
{
    const double n = (double)work->used_count;
    work->repeatability_stated = options->repeatability > 0.0;
    if (work->repeatability_stated) {
        work->repeatability = options->repeatability;
    } else if (work->used_count > 1) {
        work->repeatability = work->scatter;
        input->distribution = WA_STUDENT;
        input->degrees_of_freedom = n - 1.0;
    } else {
        work->repeatability = WA_DEFAULT_REPEATABILITY_U;
        input->type = WA_TYPE_B;
        assume(work, "One titration shows no scatter: a repeatability of 0.1 % is assumed.");
    }
    input->u = work->repeatability / sqrt(n);
}

static enum wa_status compose(const struct wa_standardize_options *options,
                              struct wa_standardization *work, struct context *context,
                              struct wa_error *error)
{
    const struct means means = means_of(work);
    struct places *at = &context->at;
    char name[64];
    snprintf(name, sizeof name, "concentration of %s", work->titrant->name);
    wa_bench_start(&work->budget, name, "mol/L");
    memset(at, -1, sizeof *at);
    wa_bench_add(&work->budget, "repeatability", "", 1.0, 0.0, WA_TYPE_A);
    at->repeatability = 0;
    add_mass(options, &means, work, at);
    const enum wa_status status = add_standard(options, work, at, error);
    if (status != WA_OK) {
        return status;
    }
    add_volume(options, &means, work, at);
    add_buoyancy(options, work, at);
    const int equivalents =
        options->equivalents > 0 ? options->equivalents : work->standard->equivalents;
    context->work = work;
    context->mass = means.mass;
    context->volume = means.volume;
    context->factor = 1000.0 * (equivalents > 0 ? equivalents : 1) /
                      (double)(work->titrant->protons > 0 ? work->titrant->protons : 1);
    if (work->second) {
        add_second(options, work, at);
    }
    return WA_OK;
}

enum wa_status wa_standardize(const struct wa_table *table,
                              const struct wa_standardize_options *options,
                              struct wa_standardization *work, struct wa_error *error)
{
    struct context context;
    work->assumed_count = 0;
    enum wa_status status = look_up(table, options, work, error);
    if (status == WA_OK) {
        status = check_replicates(options, work, error);
    }
    if (status == WA_OK) {
        status = compose(options, work, &context, error);
    }
    if (status == WA_OK) {
        status = wa_bench_compute(&work->budget, model, &context, error);
    }
    if (status != WA_OK) {
        return status;
    }
    study_scatter(&context.at, work);
    set_repeatability(options, work, &work->budget.inputs[context.at.repeatability]);
    status = wa_bench_compute(&work->budget, model, &context, error);
    if (status == WA_OK) {
        status =
            wa_bench_monte_carlo(&work->budget, model, &context,
                                 options->seed > 0 ? options->seed : 1, &work->monte_carlo, error);
    }
    return status;
}
