/* The best fit's parameters with their priors, in the units a reader knows. */
#include "identify/identify_internal.h"

#include <math.h>
#include <stdlib.h>

/* How a parameter is shown: logarithms as the quantity itself. */
struct shown {
    enum wa_parameter_kind kind;
    const char *name;
    const char *unit;
    double scale;
    bool logarithm;
};

static const struct shown shown_parameters[] = {
    {WA_PARAMETER_PK, "pKa", "", 1.0, false},
    {WA_PARAMETER_LN_AMOUNT, "amount of acid", "mmol", 1e3, true},
    {WA_PARAMETER_LN_TITRANT, "titrant concentration", "mol/L", 1.0, true},
    {WA_PARAMETER_OFFSET, "electrode offset at pH 7", "pH", 1.0, false},
    {WA_PARAMETER_SLOPE, "electrode slope", "%", 100.0, false},
    {WA_PARAMETER_LN_CARBONATE, "carbonate in the titrant", "%", 100.0, true},
    {WA_PARAMETER_LN_CARBON_DIOXIDE, "dissolved carbon dioxide", "mmol/L", 1e3, true},
    {WA_PARAMETER_DAVIES, "Davies coefficient", "", 1.0, false},
    {WA_PARAMETER_LN_VOLUME, "solution volume at the start", "mL", 1e3, true},
    {WA_PARAMETER_TEMPERATURE, "temperature", "\u00b0C", 1.0, false},
    {WA_PARAMETER_LN_SOLUBILITY, "solubility", "mmol/L", 1e3, true},
    {WA_PARAMETER_EXCESS, "strong acid in excess", "mmol", 1e3, false},
};

static const struct shown *shown_of(enum wa_parameter_kind kind)
{
    for (size_t i = 0; i < sizeof shown_parameters / sizeof shown_parameters[0]; i++) {
        if (shown_parameters[i].kind == kind) {
            return &shown_parameters[i];
        }
    }
    return &shown_parameters[0];
}

static char *name_of(const struct wa_parameter *parameter, const struct shown *shown, double pivot)
{
    if (parameter->kind == WA_PARAMETER_OFFSET && pivot != 0.0) {
        return wa_sentence("electrode offset at pH %.1f", 7.0 + pivot);
    }
    return parameter->kind == WA_PARAMETER_PK
               ? wa_sentence("pKa %d of the generic acid", parameter->step + 1)
               : wa_sentence("%s", shown->name);
}

enum wa_status wa_fill_parameters(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error)
{
    if (work->study.count == 0) {
        return WA_OK;
    }
    const struct wa_fit *fit = &work->study.generic[0].fit;
    result->parameters = calloc((size_t)fit->parameter_count, sizeof *result->parameters);
    if (result->parameters == NULL) {
        return wa_fail_memory(error);
    }
    for (int i = 0; i < fit->parameter_count; i++) {
        const struct wa_parameter *from = &fit->parameters[i];
        const struct shown *shown = shown_of(from->kind);
        struct wa_result_parameter *to = &result->parameters[result->parameter_count];
        to->name = name_of(from, shown, result->experiments[0].pivot);
        if (to->name == NULL) {
            return wa_fail_memory(error);
        }
        result->parameter_count++;
        to->unit = shown->unit;
        to->origin = from->prior.origin;
        to->line = from->prior.line;
        to->prior = shown->scale * (shown->logarithm ? exp(from->prior.mean) : from->prior.mean);
        to->value = shown->scale * (shown->logarithm ? exp(from->value) : from->value);
        to->prior_u = shown->logarithm ? to->prior * from->prior.u : shown->scale * from->prior.u;
        to->u = shown->logarithm ? to->value * from->u : shown->scale * from->u;
    }
    return WA_OK;
}
