#include "whichacid/amount.h"

#include <math.h>
#include <stdio.h>

/* Every result here is a number times powers of its inputs, save that the blank is subtracted from
 * the equivalence volume. A product is built factor by factor. */
struct product {
    struct wa_budget *budget;
    double exponents[WA_CONTRIBUTIONS_MAX];
    const char *missing; /* first input that was needed and is not there */
};

static void start(struct product *product, struct wa_budget *budget, const char *unit,
                  double constant)
{
    *budget = (struct wa_budget){.value = constant};
    snprintf(budget->unit, sizeof budget->unit, "%s", unit);
    *product = (struct product){.budget = budget};
}

static struct wa_contribution *add(struct product *product, const char *name, const char *unit,
                                   const struct wa_quantity *quantity)
{
    const size_t index = product->budget->contribution_count++;
    struct wa_contribution *contribution = &product->budget->contributions[index];
    snprintf(contribution->name, sizeof contribution->name, "%s", name);
    snprintf(contribution->unit, sizeof contribution->unit, "%s", unit);
    contribution->value = quantity->value;
    contribution->u = quantity->has_u && isfinite(quantity->u) ? fabs(quantity->u) : 0.0;
    product->exponents[index] = 0.0;
    return contribution;
}

static void multiply(struct product *product, const char *name, const char *unit,
                     const struct wa_quantity *quantity, double exponent)
{
    if (!(quantity->value > 0.0) || !isfinite(quantity->value)) {
        product->missing = product->missing == NULL ? name : product->missing;
        return;
    }
    add(product, name, unit, quantity);
    product->exponents[product->budget->contribution_count - 1] = exponent;
    product->budget->value *= pow(quantity->value, exponent);
}

static void multiply_if_given(struct product *product, const char *name, const char *unit,
                              const struct wa_quantity *quantity, double exponent)
{
    if (quantity->value > 0.0) {
        multiply(product, name, unit, quantity, exponent);
    }
}

/* The volume that the sample itself used. The sensitivities of its two parts are parked relative to
 * the result and scaled in finish(). */
static void multiply_net_volume(struct product *product, const struct wa_amount_inputs *inputs,
                                double exponent)
{
    const double net = inputs->equivalence_volume.value - inputs->blank.value;
    if (!(net > 0.0) || !isfinite(net)) {
        product->missing =
            product->missing == NULL ? "equivalence volume (less the blank)" : product->missing;
        return;
    }
    add(product, "equivalence volume", "mL", &inputs->equivalence_volume)->sensitivity =
        exponent / net;
    if (inputs->blank.value != 0.0 || inputs->blank.has_u) {
        add(product, "blank", "mL", &inputs->blank)->sensitivity = -exponent / net;
    }
    product->budget->value *= pow(net, exponent);
}

static void multiply_mass(struct product *product, const struct wa_amount_inputs *inputs,
                          double exponent)
{
    const bool liquid = !(inputs->sample_mass.value > 0.0) && inputs->sample_volume.value > 0.0;
    if (liquid) {
        multiply(product, "sample volume", "mL", &inputs->sample_volume, exponent);
        multiply(product, "sample density", "g/mL", &inputs->sample_density, exponent);
    } else {
        multiply(product, "sample mass", "g", &inputs->sample_mass, exponent);
    }
}

static void multiply_repeatability(struct product *product, const struct wa_amount_inputs *inputs)
{
    if (inputs->repeatability > 0.0) {
        const struct wa_quantity one = {1.0, inputs->repeatability, true};
        multiply(product, "repeatability", "", &one, 1.0);
    }
}

static double protons_of(const struct wa_amount_inputs *inputs)
{
    return inputs->protons > 0 ? (double)inputs->protons : 1.0;
}

static enum wa_status finish(struct product *product, struct wa_error *error)
{
    struct wa_budget *budget = product->budget;
    if (product->missing != NULL) {
        const enum wa_status status =
            wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                    "The %s is not known or not above zero; note it to have this amount computed.",
                    product->missing);
        *budget = (struct wa_budget){0};
        return status;
    }
    double square = 0.0;
    for (size_t i = 0; i < budget->contribution_count; i++) {
        struct wa_contribution *contribution = &budget->contributions[i];
        contribution->sensitivity *= budget->value;
        if (product->exponents[i] != 0.0) {
            contribution->sensitivity = budget->value * product->exponents[i] / contribution->value;
        }
        contribution->effect = fabs(contribution->sensitivity) * contribution->u;
        square += contribution->effect * contribution->effect;
    }
    budget->u = sqrt(square);
    for (size_t i = 0; i < budget->contribution_count; i++) {
        struct wa_contribution *contribution = &budget->contributions[i];
        contribution->share =
            square > 0.0 ? contribution->effect * contribution->effect / square : 0.0;
    }
    return WA_OK;
}

struct wa_amount_inputs wa_amount_inputs_of(const struct wa_conditions *conditions)
{
    const struct {
        const struct wa_noted *noted;
        size_t offset;
    } pairs[] = {
        {&conditions->titrant_concentration,
         offsetof(struct wa_amount_inputs, titrant_concentration)},
        {&conditions->blank, offsetof(struct wa_amount_inputs, blank)},
        {&conditions->aliquot, offsetof(struct wa_amount_inputs, aliquot)},
        {&conditions->sample_mass, offsetof(struct wa_amount_inputs, sample_mass)},
        {&conditions->sample_volume, offsetof(struct wa_amount_inputs, sample_volume)},
        {&conditions->sample_density, offsetof(struct wa_amount_inputs, sample_density)},
    };
    struct wa_amount_inputs inputs = {0};
    for (size_t i = 0; i < sizeof pairs / sizeof pairs[0]; i++) {
        if (pairs[i].noted->known) {
            *(struct wa_quantity *)(void *)((char *)&inputs + pairs[i].offset) =
                pairs[i].noted->quantity;
        }
    }
    return inputs;
}

/* Equivalents to the power `exponent` as factors of a product. */
static void multiply_equivalents(struct product *product, const struct wa_amount_inputs *inputs,
                                 double exponent)
{
    multiply_net_volume(product, inputs, exponent);
    multiply(product, "titrant concentration", "mol/L", &inputs->titrant_concentration, exponent);
    multiply_if_given(product, "aliquot", "", &inputs->aliquot, -exponent);
    multiply_repeatability(product, inputs);
    product->budget->value *= pow(1000.0, -exponent);
}

enum wa_status wa_amount_equivalents(const struct wa_amount_inputs *inputs,
                                     struct wa_budget *result, struct wa_error *error)
{
    struct product product;
    start(&product, result, "mol", 1.0);
    multiply_equivalents(&product, inputs, 1.0);
    return finish(&product, error);
}

enum wa_status wa_amount_moles(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                               struct wa_error *error)
{
    struct product product;
    start(&product, result, "mol", 1.0 / protons_of(inputs));
    multiply_equivalents(&product, inputs, 1.0);
    return finish(&product, error);
}

static enum wa_status mass_per_mole(const struct wa_amount_inputs *inputs, double protons,
                                    struct wa_budget *result, struct wa_error *error)
{
    struct product product;
    start(&product, result, "g/mol", protons);
    multiply_mass(&product, inputs, 1.0);
    multiply_if_given(&product, "purity", "", &inputs->purity, 1.0);
    multiply_equivalents(&product, inputs, -1.0);
    return finish(&product, error);
}

enum wa_status wa_amount_equivalent_mass(const struct wa_amount_inputs *inputs,
                                         struct wa_budget *result, struct wa_error *error)
{
    return mass_per_mole(inputs, 1.0, result, error);
}

enum wa_status wa_amount_molar_mass(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                                    struct wa_error *error)
{
    return mass_per_mole(inputs, protons_of(inputs), result, error);
}

enum wa_status wa_amount_content(const struct wa_amount_inputs *inputs, struct wa_budget *result,
                                 struct wa_error *error)
{
    struct product product;
    start(&product, result, "", 1.0 / protons_of(inputs));
    multiply_equivalents(&product, inputs, 1.0);
    multiply(&product, "molar mass", "g/mol", &inputs->molar_mass, 1.0);
    multiply_mass(&product, inputs, -1.0);
    return finish(&product, error);
}

enum wa_status wa_amount_titrant_concentration(const struct wa_amount_inputs *inputs,
                                               struct wa_budget *result, struct wa_error *error)
{
    struct product product;
    start(&product, result, "mol/L", 1000.0 * protons_of(inputs));
    multiply_mass(&product, inputs, 1.0);
    multiply_if_given(&product, "purity", "", &inputs->purity, 1.0);
    multiply_if_given(&product, "aliquot", "", &inputs->aliquot, 1.0);
    multiply(&product, "molar mass", "g/mol", &inputs->molar_mass, -1.0);
    multiply_net_volume(&product, inputs, -1.0);
    multiply_repeatability(&product, inputs);
    return finish(&product, error);
}
