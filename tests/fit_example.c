/* Prints a fit as JSON: data, priors, frozen weights and results, for a check of the same problem
 * by another program. Usage: fit_example CASE POINTS SEED [OUTLIER_ROW] */
#include "fit_cases.h"

#include <jansson.h>

#include <stdio.h>

static const char *kind_name(enum wa_parameter_kind kind)
{
    static const char *const names[] = {
        [WA_PARAMETER_PK] = "pK",
        [WA_PARAMETER_LN_AMOUNT] = "ln_amount",
        [WA_PARAMETER_LN_TITRANT] = "ln_titrant",
        [WA_PARAMETER_OFFSET] = "offset",
        [WA_PARAMETER_SLOPE] = "slope",
        [WA_PARAMETER_LN_CARBONATE] = "ln_carbonate",
        [WA_PARAMETER_LN_CARBON_DIOXIDE] = "ln_carbon_dioxide",
        [WA_PARAMETER_DAVIES] = "davies",
        [WA_PARAMETER_LN_VOLUME] = "ln_volume",
        [WA_PARAMETER_TEMPERATURE] = "temperature",
        [WA_PARAMETER_EXCESS] = "excess",
    };
    return names[kind];
}

static json_t *numbers(const double *values, size_t count)
{
    json_t *array = json_array();
    for (size_t i = 0; i < count; i++) {
        json_array_append_new(array, json_real(values[i]));
    }
    return array;
}

static json_t *parameters_json(const struct wa_fit *fit, const double *start)
{
    json_t *array = json_array();
    for (int i = 0; i < fit->parameter_count; i++) {
        const struct wa_parameter *p = &fit->parameters[i];
        json_array_append_new(array, json_pack("{s:s, s:i, s:f, s:f, s:f, s:f, s:f}", "kind",
                                               kind_name(p->kind), "step", p->step, "prior_mean",
                                               p->prior.mean, "prior_u", p->prior.u, "start",
                                               start[i], "value", p->value, "u", p->u));
    }
    return array;
}

static int print_fit(const struct fit_case *c, const struct wa_experiment *experiment,
                     const struct wa_sample_model *sample, const double *start,
                     const struct wa_fit *fit)
{
    const size_t count = (size_t)fit->parameter_count;
    struct wa_point_model *work = calloc(experiment->count, sizeof *work);
    double *precision = calloc(experiment->count, sizeof *precision);
    double *value = calloc(count, sizeof *value);
    const struct wa_noise noise = {.reading = fit->noise_reading, .volume = fit->noise_volume};
    bool made = work != NULL && precision != NULL && value != NULL;
    for (size_t i = 0; made && i < count; i++) {
        value[i] = fit->parameters[i].value;
    }
    made = made && case_precisions(experiment, sample, fit->parameters, value, (int)count, &noise,
                                   true, work, NULL, precision);
    json_t *root =
        json_pack("{s:s, s:b, s:i, s:i, s:i, s:f, s:f, s:f, s:f, s:f, s:f, s:f}", "case", c->name,
                  "converged", fit->converged, "charge", c->charge, "steps", c->steps, "lost",
                  c->lost, "temperature_C", experiment->temperature_C, "titrant_charge",
                  experiment->titrant_charge, "solution_volume_L", exp(experiment->ln_volume.mean),
                  "background", experiment->background, "noise_reading", fit->noise_reading,
                  "noise_volume", fit->noise_volume, "log_evidence", fit->log_evidence);
    if (made) {
        json_object_set_new(root, "volume_mL", numbers(experiment->volume_mL, experiment->count));
        json_object_set_new(root, "reading", numbers(experiment->reading, experiment->count));
        json_object_set_new(root, "precision", numbers(precision, experiment->count));
        json_object_set_new(root, "outlier", numbers(fit->outlier, experiment->count));
        json_object_set_new(root, "parameters", parameters_json(fit, start));
        json_object_set_new(root, "covariance", numbers(fit->covariance, count * count));
        made = json_dumpf(root, stdout, JSON_INDENT(1) | JSON_REAL_PRECISION(17)) == 0;
        printf("\n");
    }
    json_decref(root);
    free(work);
    free(precision);
    free(value);
    return made ? 0 : 1;
}

int main(int argument_count, char **arguments)
{
    const struct fit_case *c = NULL;
    for (size_t i = 0; argument_count >= 4 && i < FIT_CASE_COUNT; i++) {
        c = strcmp(fit_cases[i].name, arguments[1]) == 0 ? &fit_cases[i] : c;
    }
    if (c == NULL) {
        fprintf(stderr, "Usage: fit_example CASE POINTS SEED [OUTLIER_ROW]\n");
        return 2;
    }
    struct wa_experiment experiment;
    struct wa_sample_model sample;
    double start[WA_PARAMETERS_MAX];
    struct wa_fit fit = {.parameter_count = 0};
    struct wa_error error;
    bool made = case_example(c, strtoul(arguments[2], NULL, 10), strtoul(arguments[3], NULL, 10),
                             &experiment, &sample, start);
    if (made && argument_count > 4) {
        experiment.reading[strtoul(arguments[4], NULL, 10)] += 0.7;
    }
    const struct wa_fit_options options = {
        .most_iterations = 500, .settled = 1e-10, .from_afar = true};
    made = made && wa_fit_run(&experiment, &sample, &options, start, &fit, &error) == WA_OK;
    const int status = made ? print_fit(c, &experiment, &sample, start, &fit) : 1;
    wa_fit_free(&fit);
    wa_experiment_free(&experiment);
    return status;
}
