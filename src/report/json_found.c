/* JSON of what was found: candidates, the fit and its parameters. */
#include "report/json_internal.h"

#include <math.h>

static json_t *steps_of(const struct wa_result_candidate *candidate)
{
    struct json_maker array = json_make_array();
    for (int i = 0; i < candidate->step_count && i < WA_PROTONS_MAX; i++) {
        struct json_maker step = json_make_object();
        json_put(&step, "step", json_integer(i + 1));
        json_put_pair(&step, "value", candidate->pKa[i], "u", candidate->pKa_u[i]);
        json_put(&step, "deviation",
                 candidate->seen[i] ? json_number(candidate->pKa_deviation[i]) : json_null());
        json_put(&step, "seen", json_boolean(candidate->seen[i]));
        json_add(&array, json_done(&step));
    }
    return json_done(&array);
}

static json_t *candidate_of(const struct wa_result_candidate *candidate)
{
    struct json_maker object = json_make_object();
    json_put(&object, "rank", json_integer(candidate->rank));
    json_put(&object, "acid", json_text(candidate->acid_name));
    json_put(&object, "form", json_text(candidate->form_name));
    json_put(&object, "key", json_text(candidate->key));
    json_put(&object, "probability", json_number(candidate->probability));
    json_put(&object, "misfit", json_number(candidate->misfit));
    json_put(&object, "molar_mass", json_number(candidate->molar_mass));
    json_put(&object, "molar_mass_deviation", json_number(candidate->molar_mass_deviation));
    json_put(&object, "pka", steps_of(candidate));
    json_put(&object, "why", json_text(candidate->why));
    json_put(&object, "cannot_be_told_from", json_split(candidate->others));
    json_put(&object, "hazards", json_text(candidate->hazards));
    json_put(&object, "care", json_text(candidate->care));
    json_put(&object, "sources", json_text(candidate->sources));
    return json_done(&object);
}

json_t *json_candidates(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->candidate_count; i++) {
        json_add(&array, candidate_of(&result->candidates[i]));
    }
    return json_done(&array);
}

static const char *origin_word(enum wa_origin origin)
{
    return origin == WA_ORIGIN_NOTE ? "note" : origin == WA_ORIGIN_OPTION ? "option" : "default";
}

json_t *json_parameters(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->parameter_count; i++) {
        const struct wa_result_parameter *parameter = &result->parameters[i];
        struct json_maker object = json_make_object();
        json_put(&object, "name", json_text(parameter->name));
        json_put(&object, "unit", json_text(parameter->unit));
        json_put_pair(&object, "prior", parameter->prior, "prior_u", parameter->prior_u);
        json_put_pair(&object, "value", parameter->value, "u", parameter->u);
        json_put(&object, "moved",
                 parameter->prior_u > 0.0
                     ? json_number((parameter->value - parameter->prior) / parameter->prior_u)
                     : json_null());
        json_put(&object, "from", json_text(origin_word(parameter->origin)));
        json_put(&object, "line",
                 parameter->line > 0 ? json_integer(parameter->line) : json_null());
        json_add(&array, json_done(&object));
    }
    return json_done(&array);
}

static json_t *numbers_of(const double *values, size_t count)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < count && values != NULL; i++) {
        json_add(&array, json_number(values[i]));
    }
    return json_done(&array);
}

static json_t *lines_of(const long *lines, size_t count)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < count && lines != NULL; i++) {
        json_add(&array, json_integer(lines[i]));
    }
    return json_done(&array);
}

json_t *json_fit(const struct wa_result *result)
{
    if (!result->fitted) {
        return json_null();
    }
    const struct wa_fit *fit = &result->best;
    struct json_maker object = json_make_object();
    json_put(&object, "converged", json_boolean(fit->converged));
    json_put(&object, "misfit", json_number(fit->misfit));
    json_put(&object, "noise_pH", json_number(fit->noise_reading));
    json_put(&object, "noise_volume_mL", json_number(fit->noise_volume));
    json_put(&object, "ionic_strength", json_number(fit->ionic_strength));
    if (result->experiments != NULL && result->runs.count > 0) {
        const struct wa_experiment *experiment = &result->experiments[0];
        size_t count = experiment->count;
        json_put(&object, "line", lines_of(experiment->line, count));
        json_put(&object, "volume_mL", numbers_of(experiment->volume_mL, count));
        json_put(&object, "reading", numbers_of(experiment->reading, count));
        json_put(&object, "model", numbers_of(fit->model, count));
        json_put(&object, "residual", numbers_of(fit->residual, count));
        json_put(&object, "outlier_probability", numbers_of(fit->outlier, count));
    }
    return json_done(&object);
}
