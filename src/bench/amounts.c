/* Amounts by weighing, diluting and end points. */
#include "bench/amounts_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const double water_molar_mass = 18.015; /* g/mol */

/* What the builders below share. */
struct builder {
    const struct wa_table *table;
    const struct wa_amount_options *options;
    struct wa_amount_result *result;
    struct wa_bench_budget *budget; /* under construction */
    struct amount_model model;
};

struct amount_volume amount_plain(int place)
{
    return (struct amount_volume){place, -1, -1, -1};
}

static double volume_value(const double *values, const struct amount_volume *v)
{
    return values[v->value] + (v->calibration >= 0 ? values[v->calibration] : 0.0) +
           (v->temperature >= 0 ? values[v->temperature] : 0.0) -
           (v->blank >= 0 ? values[v->blank] : 0.0);
}

double amount_model_value(const double *values, const void *context)
{
    const struct amount_model *model = context;
    double result = model->constant, sum = 0.0;
    for (size_t i = 0; i < model->term_count; i++) {
        const struct amount_term *term = &model->terms[i];
        sum +=
            term->coefficient * values[term->concentration] * volume_value(values, &term->volume);
    }
    if (model->term_count > 0) {
        result *= model->terms_exponent < 0.0 ? 1.0 / sum : sum;
    }
    for (size_t i = 0; i < model->factor_count; i++) {
        result *= pow(volume_value(values, &model->factors[i].volume), model->factors[i].exponent);
    }
    return result + model->added;
}

/* Class A limits, mL: nominal volume and half width. */
static double tolerance(const double (*table)[2], size_t count, double volume_mL)
{
    for (size_t i = 0; i < count; i++) {
        if (volume_mL <= table[i][0] * 1.0001) {
            return table[i][1];
        }
    }
    return NAN;
}

double wa_flask_tolerance(double volume_mL)
{
    static const double table[][2] = {{5, 0.025},  {10, 0.025},  {25, 0.04},
                                      {50, 0.06},  {100, 0.10},  {250, 0.15},
                                      {500, 0.25}, {1000, 0.40}, {2000, 0.60}};
    return tolerance(table, sizeof table / sizeof table[0], volume_mL);
}

double wa_pipette_tolerance(double volume_mL)
{
    static const double table[][2] = {{1, 0.008}, {2, 0.010}, {5, 0.015}, {10, 0.02},
                                      {25, 0.03}, {50, 0.05}, {100, 0.08}};
    return tolerance(table, sizeof table / sizeof table[0], volume_mL);
}

static bool given(const struct wa_quantity *quantity)
{
    return quantity->value > 0.0;
}

static void say(struct wa_amount_result *result, const char *sentence)
{
    for (size_t i = 0; i < result->sentence_count; i++) {
        if (strcmp(result->sentences[i], sentence) == 0) {
            return;
        }
    }
    if (result->sentence_count < sizeof result->sentences / sizeof result->sentences[0]) {
        snprintf(result->sentences[result->sentence_count++], sizeof result->sentences[0], "%s",
                 sentence);
    }
}

static int add(struct builder *b, const char *name, const char *unit,
               const struct wa_quantity *quantity, double otherwise_u)
{
    wa_bench_add(b->budget, name, unit, quantity->value,
                 quantity->has_u ? quantity->u : otherwise_u, WA_TYPE_B);
    return (int)b->budget->input_count - 1;
}

static int add_limits(struct builder *b, const char *kind, const char *name, double half_width,
                      enum wa_distribution distribution)
{
    char words[64];
    snprintf(words, sizeof words, "%s %s", kind, name);
    wa_bench_add_limits(b->budget, words, "mL", 0.0, half_width, distribution);
    return (int)b->budget->input_count - 1;
}

static void multiply(struct builder *b, struct amount_volume volume, double exponent)
{
    b->model.factors[b->model.factor_count++] = (struct amount_factor){volume, exponent};
}

/* Temperature of a volume, when a spread is stated and the volume has no u of its own. */
static void add_temperature(struct builder *b, const char *name, const struct wa_quantity *volume,
                            struct amount_volume *at)
{
    const double spread = b->options->temperature_spread;
    if (spread > 0.0 && !volume->has_u) {
        at->temperature = add_limits(b, "temperature,", name,
                                     volume->value * WA_WATER_EXPANSION * spread, WA_RECTANGULAR);
    }
}

/* A flask or pipette: its own u when stated, else the limits of the standard. */
static struct amount_volume add_glass(struct builder *b, const char *name,
                                      const struct wa_quantity *volume, double limit)
{
    struct amount_volume at = amount_plain(add(b, name, "mL", volume, 0.0));
    if (!volume->has_u && isfinite(limit)) {
        at.calibration = add_limits(b, "calibration,", name,
                                    b->options->class_B ? 2.0 * limit : limit, WA_TRIANGULAR);
        say(b->result, "Limits of error of flasks and pipettes are those of ISO 1042 and ISO 648, "
                       "as remembered; state u where you know it.");
    }
    add_temperature(b, name, volume, &at);
    return at;
}

/* Fractions taken of the sample: each dilution's pipette over the flask it was taken from. The last
 * flask counts only for a concentration. */
static void dilute(struct builder *b, double exponent, bool concentration)
{
    const struct wa_amount_options *o = b->options;
    for (size_t i = 0; i < o->dilution_count; i++) {
        char name[32];
        const struct wa_dilution *step = &o->dilutions[i];
        if (given(&step->pipette)) {
            snprintf(name, sizeof name, "pipette %zu", i + 1);
            multiply(b,
                     add_glass(b, name, &step->pipette, wa_pipette_tolerance(step->pipette.value)),
                     exponent);
        }
        if (given(&step->flask) && (concentration || i + 1 < o->dilution_count)) {
            snprintf(name, sizeof name, "flask %zu", i + 1);
            multiply(b, add_glass(b, name, &step->flask, wa_flask_tolerance(step->flask.value)),
                     -exponent);
        }
    }
}

static void begin(struct builder *b, const char *name, const char *unit, double constant)
{
    b->budget = &b->result->budgets[b->result->count];
    b->model = (struct amount_model){.constant = constant};
    wa_bench_start(b->budget, name, unit);
    if (b->options->repeatability > 0.0) {
        const struct wa_quantity one = {1.0, b->options->repeatability, true};
        const int place = add(b, "repeatability", "", &one, 0.0);
        b->budget->inputs[place].type = WA_TYPE_A;
        multiply(b, amount_plain(place), 1.0);
    }
}

static enum wa_status finish(struct builder *b, struct wa_error *error)
{
    enum wa_status status = wa_bench_compute(b->budget, amount_model_value, &b->model, error);
    if (status == WA_OK) {
        status = wa_bench_monte_carlo(b->budget, amount_model_value, &b->model,
                                      b->options->seed > 0 ? b->options->seed : 1,
                                      &b->result->monte_carlo[b->result->count], error);
        b->result->count++;
    }
    return status;
}

static void add_mass(struct builder *b, double exponent)
{
    const struct wa_amount_options *o = b->options;
    if (given(&o->sample_mass)) {
        multiply(b, amount_plain(add(b, "sample mass", "g", &o->sample_mass, 0.0003)), exponent);
        if (!o->sample_mass.has_u) {
            say(b->result, "The uncertainty of the sample mass was not stated: 0.3 mg is assumed.");
        }
    } else {
        multiply(b,
                 add_glass(b, "sample volume", &o->sample_volume,
                           wa_pipette_tolerance(o->sample_volume.value)),
                 exponent);
        multiply(b,
                 amount_plain(add(b, "sample density", "g/mL", &o->sample_density,
                                  0.002 * o->sample_density.value)),
                 exponent);
    }
    if (given(&o->purity)) {
        multiply(b, amount_plain(add(b, "purity", "", &o->purity, 0.0)), exponent);
    }
}

/* One end point: volume, with the blank off. */
static struct amount_volume add_end_point(struct builder *b, const char *name,
                                          const struct wa_quantity *volume)
{
    struct amount_volume at = amount_plain(add(b, name, "mL", volume, WA_END_POINT_BY_EYE_U));
    if (!volume->has_u) {
        say(b->result, "The uncertainty of an end point was not stated: 0.03 mL, as judged by eye, "
                       "is assumed.");
    }
    if (b->options->blank.value != 0.0 || b->options->blank.has_u) {
        char words[64];
        snprintf(words, sizeof words, "blank, %s", name);
        at.blank = add(b, words, "mL", &b->options->blank, 0.0);
    }
    add_temperature(b, name, volume, &at);
    return at;
}

static int add_concentration(struct builder *b, const char *name,
                             const struct wa_quantity *concentration)
{
    if (!concentration->has_u) {
        say(b->result,
            "The uncertainty of a concentration was not stated: 0.5 % relative is assumed.");
    }
    return add(b, name, "mol/L", concentration, 0.005 * concentration->value);
}

static void add_term(struct builder *b, double coefficient, int concentration,
                     struct amount_volume volume)
{
    b->model.terms[b->model.term_count++] =
        (struct amount_term){coefficient, concentration, volume};
}

/* Equivalents of the sample, mmol: of the titrant, or of an excess less what was titrated back. */
static void add_equivalents(struct builder *b, double exponent)
{
    const struct wa_amount_options *o = b->options;
    const bool back = given(&o->excess);
    b->model.terms_exponent = exponent;
    const int concentration = add_concentration(b, "titrant concentration", &o->concentration);
    if (back) {
        const int other = add_concentration(b, "concentration of excess", &o->excess_concentration);
        add_term(b, 1.0, other,
                 add_glass(b, "excess added", &o->excess, wa_pipette_tolerance(o->excess.value)));
    }
    add_term(b, back ? -1.0 : 1.0, concentration, add_end_point(b, "end point", &o->end_points[0]));
}

static enum wa_status find_molar_mass(struct builder *b, struct wa_quantity *molar_mass,
                                      struct wa_error *error)
{
    const struct wa_amount_options *o = b->options;
    *molar_mass = o->molar_mass;
    if (given(molar_mass)) {
        return WA_OK;
    }
    const int form = o->substance != NULL ? wa_table_find_form(b->table, o->substance) : -1;
    if (form < 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The molar mass is missing: name the substance with --substance KEY or give "
                       "--molar-mass.");
    }
    *molar_mass = (struct wa_quantity){b->table->forms[form].molar_mass,
                                       b->table->forms[form].molar_mass_u, true};
    return WA_OK;
}

/* m P / V in mg/L, and in mol/L where a molar mass is known. */
static enum wa_status make_solution(struct builder *b, struct wa_error *error)
{
    struct wa_quantity molar_mass;
    if (b->options->dilution_count == 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The volume is missing: give the flask with --flask.");
    }
    begin(b, "mass concentration", "mg/L", 1e6);
    add_mass(b, 1.0);
    dilute(b, 1.0, true);
    enum wa_status status = finish(b, error);
    if (status != WA_OK || find_molar_mass(b, &molar_mass, NULL) != WA_OK) {
        return status;
    }
    begin(b, "concentration", "mol/L", 1e3 * (b->options->protons > 0 ? b->options->protons : 1));
    add_mass(b, 1.0);
    multiply(b, amount_plain(add(b, "molar mass", "g/mol", &molar_mass, 0.0)), -1.0);
    dilute(b, 1.0, true);
    return finish(b, error);
}

/* Equivalents a form would show: the protons that a titration in water finds. */
static int protons_of(const struct wa_table *table, const struct wa_form *form, bool base)
{
    int sum = 0;
    for (int k = 0; k < form->part_count; k++) {
        const struct wa_form_part *part = &form->parts[k];
        if (part->acid == WA_PART_WATER) {
            sum += base ? -part->lost : part->lost;
            continue;
        }
        const struct wa_acid *acid = &table->acids[part->acid];
        for (int i = 0; i < acid->step_count; i++) {
            const int beyond = part->lost - i * part->count;
            const int lost = beyond < 0 ? 0 : beyond > part->count ? part->count : beyond;
            if (base ? acid->steps[i].pKa < 10.0 : acid->steps[i].pKa > 4.0) {
                sum += base ? part->count - lost : lost;
            }
        }
    }
    return sum;
}

/* Keep the nearest, in order. */
static void insert(struct wa_amount_result *result, const struct wa_mass_candidate *candidate)
{
    size_t at = result->candidate_count;
    while (at > 0 && fabs(result->candidates[at - 1].deviation) > fabs(candidate->deviation)) {
        at--;
    }
    const bool full = result->candidate_count == WA_MASS_CANDIDATES_MAX;
    result->candidates_left_off += full;
    if (at == WA_MASS_CANDIDATES_MAX) {
        return;
    }
    result->candidate_count += !full;
    memmove(&result->candidates[at + 1], &result->candidates[at],
            (result->candidate_count - at - 1) * sizeof *candidate);
    result->candidates[at] = *candidate;
}

static void find_candidates(struct builder *b)
{
    const struct wa_bench_budget *found = &b->result->budgets[0];
    const char *words = b->options->titrant;
    const int titrant = words != NULL ? wa_table_find_titrant(b->table, words) : -1;
    const bool base = titrant < 0 || b->table->titrants[titrant].is_base;
    for (size_t f = 0; f < b->table->form_count; f++) {
        const struct wa_form *form = &b->table->forms[f];
        const int protons = protons_of(b->table, form, base);
        if (protons <= 0) {
            continue;
        }
        const double u = hypot(found->u, form->molar_mass_u / protons);
        const struct wa_mass_candidate candidate = {
            form, protons, (found->value - form->molar_mass / protons) / u};
        if (fabs(candidate.deviation) <= 2.0) {
            insert(b->result, &candidate);
        }
    }
}

static enum wa_status make_equivalent(struct builder *b, struct wa_error *error)
{
    const struct wa_amount_options *o = b->options;
    begin(b, "equivalent mass (neutralization equivalent)", "g/mol", 1e3);
    add_mass(b, 1.0);
    dilute(b, 1.0, false);
    add_equivalents(b, -1.0);
    enum wa_status status = finish(b, error);
    const int form = o->anhydrous != NULL ? wa_table_find_form(b->table, o->anhydrous) : -1;
    if (status == WA_OK && o->anhydrous != NULL && form < 0) {
        status =
            wa_fail(error, WA_ERROR_CALL, NULL, 0, "The table has no form '%.80s'.", o->anhydrous);
    }
    if (status == WA_OK && form >= 0) {
        begin(b, "water of crystallization", "", 1e3 * (o->protons > 0 ? o->protons : 1));
        b->model.constant /= water_molar_mass;
        b->model.added = -b->table->forms[form].molar_mass / water_molar_mass;
        add_mass(b, 1.0);
        dilute(b, 1.0, false);
        add_equivalents(b, -1.0);
        status = finish(b, error);
    }
    if (status == WA_OK && o->protons > 1) {
        begin(b, "molar mass", "g/mol", 1e3 * o->protons);
        add_mass(b, 1.0);
        dilute(b, 1.0, false);
        add_equivalents(b, -1.0);
        status = finish(b, error);
    }
    if (status == WA_OK) {
        find_candidates(b);
    }
    return status;
}

static enum wa_status make_content(struct builder *b, struct wa_error *error)
{
    struct wa_quantity molar_mass;
    const enum wa_status status = find_molar_mass(b, &molar_mass, error);
    if (status != WA_OK) {
        return status;
    }
    begin(b, "content (mass fraction)", "g/g",
          1e-3 / (b->options->protons > 0 ? b->options->protons : 1));
    multiply(b, amount_plain(add(b, "molar mass", "g/mol", &molar_mass, 0.0)), 1.0);
    add_mass(b, -1.0);
    dilute(b, -1.0, false);
    add_equivalents(b, 1.0);
    return finish(b, error);
}

/* One part of a mixture, mmol: its share of the volumes of both end points; then its mass
 * fraction or nothing, as the sample's mass is known or not. */
static enum wa_status make_part(struct builder *b, const char *name, double first, double second,
                                double molar_mass, struct wa_error *error)
{
    const struct wa_amount_options *o = b->options;
    const bool weighed = given(&o->sample_mass) || given(&o->sample_density);
    char words[64];
    snprintf(words, sizeof words, "%s%s", name, weighed ? " (mass fraction)" : "");
    begin(b, words, weighed ? "g/g" : "mmol", weighed ? 1e-3 * molar_mass : 1.0);
    if (weighed) {
        add_mass(b, -1.0);
    }
    dilute(b, -1.0, false);
    b->model.terms_exponent = 1.0;
    const int concentration = add_concentration(b, "titrant concentration", &o->concentration);
    add_term(b, first, concentration, add_end_point(b, "first end point", &o->end_points[0]));
    add_term(b, second, concentration, add_end_point(b, "second end point", &o->end_points[1]));
    return finish(b, error);
}

static enum wa_status make_mixture(struct builder *b, struct wa_error *error)
{
    static const struct {
        enum wa_amount_kind kind;
        struct {
            const char *name;
            double first, second, molar_mass;
        } parts[2];
    } mixtures[] = {
        {WA_AMOUNT_HYDROXIDE_CARBONATE,
         {{"sodium hydroxide", 2.0, -1.0, 39.997}, {"sodium carbonate", -1.0, 1.0, 105.988}}},
        {WA_AMOUNT_CARBONATE_BICARBONATE,
         {{"sodium carbonate", 1.0, 0.0, 105.988},
          {"sodium hydrogen carbonate", -2.0, 1.0, 84.006}}},
        {WA_AMOUNT_PHOSPHORIC_HYDROCHLORIC,
         {{"hydrochloric acid", 2.0, -1.0, 36.458}, {"phosphoric acid", -1.0, 1.0, 97.994}}},
    };
    enum wa_status status = WA_OK;
    if (!(b->options->end_points[1].value > b->options->end_points[0].value)) {
        return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                       "A mixture needs two end points, both from the start, the second the "
                       "larger.");
    }
    for (size_t m = 0; m < sizeof mixtures / sizeof mixtures[0]; m++) {
        for (size_t k = 0; mixtures[m].kind == b->options->kind && k < 2 && status == WA_OK; k++) {
            status = make_part(b, mixtures[m].parts[k].name, mixtures[m].parts[k].first,
                               mixtures[m].parts[k].second, mixtures[m].parts[k].molar_mass, error);
        }
    }
    for (size_t i = 0; i < b->result->count && status == WA_OK; i++) {
        if (b->result->budgets[i].value < -2.0 * b->result->budgets[i].u) {
            say(b->result, "One part comes out below zero: the mixture is not the one that was "
                           "declared, or the end points are exchanged.");
        }
    }
    return status;
}

static enum wa_status check(const struct wa_amount_options *o, struct wa_error *error)
{
    const bool mixture = o->kind >= WA_AMOUNT_HYDROXIDE_CARBONATE;
    const char *missing = NULL;
    if (!mixture && !given(&o->sample_mass) &&
        !(given(&o->sample_volume) && given(&o->sample_density))) {
        missing = "the sample mass (or its volume and density)";
    } else if (o->kind != WA_AMOUNT_SOLUTION && !given(&o->concentration)) {
        missing = "the titrant concentration";
    } else if (o->kind != WA_AMOUNT_SOLUTION && !given(&o->end_points[0])) {
        missing = "the end-point volume";
    } else if (given(&o->excess) != given(&o->excess_concentration)) {
        missing = "either the volume or the concentration of the excess";
    }
    return missing == NULL ? WA_OK
                           : wa_fail(error, WA_ERROR_CALL, NULL, 0, "This needs %s.", missing);
}

enum wa_status wa_amount_make(const struct wa_table *table, const struct wa_amount_options *options,
                              struct wa_amount_result *result, struct wa_error *error)
{
    struct builder builder = {.table = table, .options = options, .result = result};
    *result = (struct wa_amount_result){.count = 0};
    const enum wa_status status = check(options, error);
    if (status != WA_OK) {
        return status;
    }
    switch (options->kind) {
    case WA_AMOUNT_SOLUTION:
        return make_solution(&builder, error);
    case WA_AMOUNT_EQUIVALENT:
        return make_equivalent(&builder, error);
    case WA_AMOUNT_CONTENT:
        return make_content(&builder, error);
    default:
        return make_mixture(&builder, error);
    }
}
