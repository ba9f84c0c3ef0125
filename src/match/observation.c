/* Likelihoods of observations that are no titration. */
#include "whichacid/observation.h"

#include "base/text.h"

#include <gsl/gsl_sf_erf.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double ln_sqrt_2pi = 0.91893853320467274;
static const double sqrt_half = 0.70710678118654752;

/* Melting points, degree Celsius. Of the substances that laboratories keep, common practice. */
static const double melting_outlier_share = 0.05;
static const double melting_depression = 2.0; /* mean, by impurity and slow heating */
static const double melting_table_u = 1.5;    /* handbooks differ by this much */
static const double melting_decomposing_u = 8.0;
static const double melting_any_mean = 140.0;
static const double melting_any_u = 90.0;
static const double melting_default_u = 1.0;

/* Loss on drying, mass fraction. */
static const double drying_moisture = 0.003;     /* mean of what clings */
static const double drying_partial_share = 0.10; /* of hydrates: weathered, or dried in part */
static const double drying_outlier_share = 0.05;
static const double drying_hydrate_share = 0.25; /* of substances that nobody named */
static const double drying_any_most = 0.6;
static const double drying_default_u = 0.002;

/* Spot tests. */
static const double spot_error = 0.04;
static const double spot_any_share = 0.15; /* of substances that nobody named */

/* Names and what is said of the likelihood, by kind. */
static const struct {
    const char *name;
    const char *assumption;
} kinds[WA_OBSERVED_KINDS] = {
    {"melting point", "A melting point may lie below the table's by impurity (2 °C on average) and "
                      "differ by 1.5 °C between handbooks, 8 °C where the substance decomposes; "
                      "one in twenty says nothing."},
    {"loss on drying", "Loss on drying is the formula's water of crystallization and some moisture "
                       "(0.3 % on average); one hydrate in ten has lost part of its water before, "
                       "and one result in twenty says nothing."},
    {"sodium", "A test for sodium is wrong once in 25 times."},
    {"potassium", "A test for potassium is wrong once in 25 times."},
    {"ammonium", "A test for ammonium is wrong once in 25 times."},
    {"chloride", "A test for chloride is wrong once in 25 times."},
    {"bromide", "A test for bromide is wrong once in 25 times."},
    {"sulfate", "A test for sulfate is wrong once in 25 times."},
};

const char *wa_observation_name(enum wa_observation_kind kind)
{
    return kinds[kind].name;
}

const char *wa_observation_assumption(enum wa_observation_kind kind)
{
    return kinds[kind].assumption;
}

static double log_sum(double a, double b)
{
    const double high = fmax(a, b);
    return isfinite(high) ? high + log1p(exp(fmin(a, b) - high)) : high;
}

static double log_normal_density(double x, double u)
{
    return -0.5 * (x / u) * (x / u) - log(u) - ln_sqrt_2pi;
}

/* ln of the density of a normal deviate of width u plus an exponential one of the given mean. */
static double log_normal_exponential_density(double x, double u, double mean)
{
    return -log(2.0 * mean) + u * u / (2.0 * mean * mean) - x / mean +
           gsl_sf_log_erfc((u / mean - x / u) * sqrt_half);
}

static double molar_mass_of_water(const struct wa_table *table)
{
    double molar_mass = 0.0;
    struct wa_error error;
    return wa_table_molar_mass(table, "H2O", &molar_mass, NULL, &error) == WA_OK ? molar_mass
                                                                                 : 18.015;
}

/* Waters behind a raised dot or an asterisk: "·2H2O", "·0.5H2O", "·H2O". */
static double waters_in(const char *formula)
{
    double sum = 0.0;
    for (const char *at = formula; (at = strstr(at, "H2O")) != NULL; at += 3) {
        const bool ends = at[3] == '\0' || strchr(" )*\xC2", at[3]) != NULL;
        const char *from = at;
        while (from > formula && ((from[-1] >= '0' && from[-1] <= '9') || from[-1] == '.')) {
            from--;
        }
        const bool behind_dot = (from - formula >= 2 && memcmp(from - 2, "\xC2\xB7", 2) == 0) ||
                                (from > formula && from[-1] == '*');
        if (ends && behind_dot) {
            sum += from < at ? strtod(from, NULL) : 1.0;
        }
    }
    return sum;
}

double wa_form_water(const struct wa_table *table, const struct wa_form *form)
{
    return waters_in(form->formula) * molar_mass_of_water(table) / form->molar_mass;
}

static bool decomposes(const struct wa_form *form)
{
    return form->melting_point != NULL && strchr(form->melting_point, 'd') != NULL;
}

static double log_melting(const struct wa_form *form, const struct wa_quantity *observed)
{
    const double any =
        log_normal_density(observed->value - melting_any_mean, hypot(melting_any_u, observed->u));
    if (form == NULL || isnan(form->melting_point_C)) {
        return any;
    }
    const double u = hypot(observed->u, decomposes(form) ? melting_decomposing_u : melting_table_u);
    const double below = form->melting_point_C - observed->value;
    return log_sum(log(1.0 - melting_outlier_share) +
                       log_normal_exponential_density(below, u, melting_depression),
                   log(melting_outlier_share) + any);
}

static double log_drying(const struct wa_table *table, const struct wa_form *form,
                         const struct wa_quantity *observed)
{
    const double water = form != NULL ? wa_form_water(table, form) : 0.0;
    const double any = observed->value > -3.0 * observed->u && observed->value < drying_any_most
                           ? -log(drying_any_most)
                           : log(1e-6);
    const double full =
        log_normal_exponential_density(observed->value - water, observed->u, drying_moisture);
    if (form == NULL) {
        return log_sum(log(1.0 - drying_hydrate_share) + full, log(drying_hydrate_share) + any);
    }
    double partial = -INFINITY;
    if (water > 0.0) {
        /* Anything between none and all, seen through the uncertainty of the result. */
        const double share = 0.5 * (erf(observed->value / observed->u * sqrt_half) -
                                    erf((observed->value - water) / observed->u * sqrt_half));
        partial = log(drying_partial_share) + log(fmax(share, 1e-300) / water);
    }
    const double whole = 1.0 - drying_outlier_share - (water > 0.0 ? drying_partial_share : 0.0);
    return log_sum(log_sum(log(whole) + full, partial), log(drying_outlier_share) + any);
}

/* Whether a formula holds an element, "Na" but not the N of "Nb". */
static bool has_element(const char *formula, const char *symbol)
{
    const size_t length = strlen(symbol);
    for (const char *at = formula; (at = strstr(at, symbol)) != NULL; at += length) {
        if (!(at[length] >= 'a' && at[length] <= 'z')) {
            return true;
        }
    }
    return false;
}

/* Whether a halogen stands as an ion: as a hydrohalide, or at the end of a salt's formula. A
 * halogen bound to carbon stands inside the formula of the molecule. */
static bool has_halide(const char *formula, const char *symbol)
{
    const size_t length = strlen(symbol);
    for (const char *at = formula; (at = strstr(at, symbol)) != NULL; at += length) {
        const char *end = at + length;
        end += strspn(end, "0123456789");
        const bool hydrohalide = at > formula && at[-1] == 'H';
        const bool closes = *end == '\0' || (unsigned char)*end == 0xC2u || *end == '*';
        if (hydrohalide || (closes && formula[0] != 'C')) {
            return true;
        }
    }
    return false;
}

static bool holds(const struct wa_form *form, enum wa_observation_kind kind)
{
    switch (kind) {
    case WA_OBSERVED_SODIUM:
        return has_element(form->formula, "Na");
    case WA_OBSERVED_POTASSIUM:
        return has_element(form->formula, "K");
    case WA_OBSERVED_AMMONIUM:
        return strstr(form->formula, "NH4") != NULL;
    case WA_OBSERVED_CHLORIDE:
        return has_halide(form->formula, "Cl");
    case WA_OBSERVED_BROMIDE:
        return has_halide(form->formula, "Br");
    case WA_OBSERVED_SULFATE:
        return strstr(form->formula, "SO4") != NULL;
    default:
        return false;
    }
}

static double spot_share(const struct wa_form *form, enum wa_observation_kind kind)
{
    if (form == NULL) {
        return spot_any_share;
    }
    return holds(form, kind) ? 1.0 - spot_error : spot_error;
}

double wa_observation_log_likelihood(const struct wa_table *table, const struct wa_form *form,
                                     const struct wa_observation *observation)
{
    if (observation->kind == WA_OBSERVED_MELTING_POINT) {
        return log_melting(form, &observation->quantity);
    }
    if (observation->kind == WA_OBSERVED_LOSS_ON_DRYING) {
        return log_drying(table, form, &observation->quantity);
    }
    const double share = spot_share(form, observation->kind);
    return log(observation->positive ? share : 1.0 - share);
}

double wa_draw_uniform(uint64_t *state)
{
    *state ^= *state << 13;
    *state ^= *state >> 7;
    *state ^= *state << 17;
    return ((double)(*state >> 11) + 0.5) * 0x1p-53;
}

double wa_draw_normal(uint64_t *state)
{
    const double radius = sqrt(-2.0 * log(wa_draw_uniform(state)));
    return radius * cos(6.283185307179586 * wa_draw_uniform(state));
}

static double draw_melting(const struct wa_form *form, double u, uint64_t *state)
{
    const bool any = form == NULL || isnan(form->melting_point_C) ||
                     wa_draw_uniform(state) < melting_outlier_share;
    if (any) {
        return melting_any_mean + melting_any_u * wa_draw_normal(state);
    }
    const double width = hypot(u, decomposes(form) ? melting_decomposing_u : melting_table_u);
    return form->melting_point_C + width * wa_draw_normal(state) +
           melting_depression * log(wa_draw_uniform(state));
}

static double draw_drying(const struct wa_table *table, const struct wa_form *form, double u,
                          uint64_t *state)
{
    double water = form != NULL ? wa_form_water(table, form) : 0.0;
    const double odd = wa_draw_uniform(state);
    if (odd < (form != NULL ? drying_outlier_share : drying_hydrate_share)) {
        return drying_any_most * wa_draw_uniform(state);
    }
    if (odd < drying_outlier_share + drying_partial_share) {
        return water * wa_draw_uniform(state) + u * wa_draw_normal(state);
    }
    return water - drying_moisture * log(wa_draw_uniform(state)) + u * wa_draw_normal(state);
}

void wa_observation_draw(const struct wa_table *table, const struct wa_form *form,
                         enum wa_observation_kind kind, uint64_t *state,
                         struct wa_observation *observation)
{
    *observation = (struct wa_observation){.kind = kind};
    if (kind == WA_OBSERVED_MELTING_POINT) {
        observation->quantity = (struct wa_quantity){draw_melting(form, melting_default_u, state),
                                                     melting_default_u, true};
    } else if (kind == WA_OBSERVED_LOSS_ON_DRYING) {
        observation->quantity = (struct wa_quantity){
            draw_drying(table, form, drying_default_u, state), drying_default_u, true};
    } else {
        observation->positive = wa_draw_uniform(state) < spot_share(form, kind);
    }
}

static enum wa_status fail_parse(const char *text, struct wa_error *error)
{
    return wa_fail(
        error, WA_ERROR_CALL, NULL, 0,
        "--observed: '%.100s' is not understood; write \"melting point: 122 ± 1 °C\", "
        "\"loss on drying: 8.5 ± 0.2 %%\", or yes or no for sodium, potassium, ammonium, "
        "chloride, bromide or sulfate, as \"chloride: yes\".",
        text);
}

static enum wa_status parse_value(const char *text, const char *value,
                                  struct wa_observation *observation, struct wa_error *error)
{
    const bool melting = observation->kind == WA_OBSERVED_MELTING_POINT;
    struct wa_error ignored;
    if (wa_quantity_parse(value, melting ? WA_DIMENSION_TEMPERATURE : WA_DIMENSION_FRACTION,
                          &observation->quantity, &ignored) != WA_OK) {
        return fail_parse(text, error);
    }
    struct wa_quantity *quantity = &observation->quantity;
    if (!quantity->has_u || !(quantity->u > 0.0)) {
        quantity->u = melting ? melting_default_u : drying_default_u;
        quantity->has_u = true;
    }
    if (!melting && !(quantity->value >= -0.05 && quantity->value < drying_any_most)) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "--observed: a loss on drying of %.3g %% is not possible; write it in per "
                       "cent of the mass, as \"loss on drying: 8.5 ± 0.2 %%\".",
                       100.0 * quantity->value);
    }
    return WA_OK;
}

enum wa_status wa_observation_parse(const char *text, struct wa_observation *observation,
                                    struct wa_error *error)
{
    char name[64], answer[16];
    const char *colon = strchr(text, ':');
    if (colon == NULL) {
        return fail_parse(text, error);
    }
    wa_text_fold(text, (size_t)(colon - text), name, sizeof name);
    wa_text_fold(colon + 1, strlen(colon + 1), answer, sizeof answer);
    for (int kind = 0; kind < WA_OBSERVED_KINDS; kind++) {
        if (strcmp(name, kinds[kind].name) != 0) {
            continue;
        }
        *observation = (struct wa_observation){.kind = (enum wa_observation_kind)kind};
        if (kind < WA_OBSERVED_SODIUM) {
            return parse_value(text, colon + 1, observation, error);
        }
        observation->positive = strcmp(answer, "yes") == 0;
        return observation->positive || strcmp(answer, "no") == 0 ? WA_OK : fail_parse(text, error);
    }
    return fail_parse(text, error);
}
