/* A whole curve of a primary standard to its end-point volume. */
#include "whichacid/bench_standardize.h"

#include "whichacid/match.h"

#include <math.h>

static const double held_ln_u = 1e-5; /* the amount stands; the titrant carries what is unknown */
static const double start_ln_u = 0.3; /* of the concentration that the steepest point suggests */
static const double usual_ionic_strength = 0.05;

/* mol of standard that were titrated, before buoyancy and such small matters: they cancel between
 * this call and the volume that comes out of it. */
static enum wa_status titrated_mass(const struct wa_run *run, struct wa_quantity *mass,
                                    struct wa_error *error)
{
    const struct wa_conditions *conditions = &run->conditions;
    if (!conditions->sample_mass.known) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, 0,
                       "The mass of the standard is not noted; add '# sample mass: 0.3888 g' or "
                       "--sample-mass.");
    }
    *mass = conditions->sample_mass.quantity;
    if (conditions->aliquot.known && conditions->aliquot.quantity.value > 0.0) {
        const struct wa_quantity *part = &conditions->aliquot.quantity;
        const double mass_u = mass->has_u ? mass->u : WA_DEFAULT_MASS_U;
        mass->u =
            part->value * hypot(mass_u, mass->value * (part->has_u ? part->u / part->value : 0.0));
        mass->value *= part->value;
        mass->has_u = true;
    }
    return WA_OK;
}

/* The steepest point: where the concentration is looked for. */
static double steepest_volume(const struct wa_curve *curve)
{
    const struct wa_inflection *best = NULL;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        if (best == NULL || fabs(curve->inflections[i].slope) > fabs(best->slope)) {
            best = &curve->inflections[i];
        }
    }
    return best != NULL ? best->volume_mL : (double)NAN;
}

static const struct wa_form *form_of(const struct wa_table *table,
                                     const struct wa_standard *standard)
{
    const int form = wa_table_find_form(table, standard->key);
    const int named = form >= 0 ? form : wa_table_find_form(table, standard->name);
    return named >= 0 && table->forms[named].modelled ? &table->forms[named] : NULL;
}

/* Fit with the amount held and the titrant free, and give the volume that means the equivalents. */
static enum wa_status fit_volume(struct wa_experiment *experiment, const struct wa_table *table,
                                 const struct wa_form *form, double moles, double equivalents,
                                 double start_mL, struct wa_quantity *volume,
                                 struct wa_error *error)
{
    struct wa_sample_model sample;
    struct wa_fit fit = {.parameter_count = 0};
    const struct wa_prior amount = {.mean = log(moles), .u = held_ln_u};
    const double equivalents_mL = 1000.0 * moles * equivalents / experiment->equivalents;
    experiment->ln_titrant =
        (struct wa_prior){.mean = log(equivalents_mL / start_mL), .u = start_ln_u};
    wa_match_sample(table, form, experiment, usual_ionic_strength, &amount, &sample);
    enum wa_status status = wa_fit_run(experiment, &sample, NULL, NULL, &fit, error);
    if (status != WA_OK) {
        return status;
    }
    const int index = wa_fit_find(&fit, WA_PARAMETER_LN_TITRANT, 0, 0);
    if (fit.converged && index >= 0) {
        const struct wa_parameter *titrant = &fit.parameters[index];
        volume->value = equivalents_mL / exp(titrant->value);
        volume->u = volume->value * titrant->u;
        volume->has_u = true;
    } else {
        status = wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                         "The curve does not fit this standard; check the standard's name, its "
                         "mass and the titrant.");
    }
    wa_fit_free(&fit);
    return status;
}

static enum wa_status volume_of(const struct wa_table *table,
                                const struct wa_standardize_options *options,
                                const struct wa_standard *standard, const struct wa_run *run,
                                const struct wa_curve *curve, struct wa_replicate *replicate,
                                struct wa_error *error)
{
    const struct wa_form *form = form_of(table, standard);
    const double start_mL = steepest_volume(curve);
    if (form == NULL || !(start_mL > 0.0)) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, 0,
                       form == NULL ? "The table has no model of this standard's curve; give its "
                                      "end-point volume with --end-point."
                                    : "The curve shows no jump, so it has no end-point volume.");
    }
    const char *words = run->conditions.titrant != NULL ? run->conditions.titrant
                        : options->titrant != NULL      ? options->titrant
                        : standard->for_base            ? "sodium hydroxide"
                                                        : "hydrochloric acid";
    const int titrant = wa_table_find_titrant(table, words);
    struct wa_experiment experiment;
    enum wa_status status = wa_experiment_collect(
        run, curve, table, titrant >= 0 ? &table->titrants[titrant] : NULL, &experiment, error);
    if (status != WA_OK) {
        return status;
    }
    const double molar_mass =
        options->molar_mass.value > 0.0 ? options->molar_mass.value : standard->molar_mass;
    status = fit_volume(&experiment, table, form, replicate->mass.value / molar_mass,
                        options->equivalents > 0 ? options->equivalents : standard->equivalents,
                        start_mL, &replicate->volume, error);
    wa_experiment_free(&experiment);
    return status;
}

enum wa_status wa_standardize_run(const struct wa_table *table,
                                  const struct wa_standardize_options *options,
                                  const struct wa_run *run, struct wa_replicate *replicate,
                                  struct wa_error *error)
{
    const int index =
        options->standard != NULL ? wa_bench_find_standard(table, options->standard) : -1;
    struct wa_curve curve;
    *replicate = (struct wa_replicate){.from_curve = true, .label = run->file};
    if (index < 0) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "The table has no primary standard '%.100s'; standards.csv lists them.",
                       options->standard != NULL ? options->standard : "");
    }
    enum wa_status status = titrated_mass(run, &replicate->mass, error);
    if (status == WA_OK) {
        status = wa_curve_analyse(run, &curve, error);
    }
    if (status != WA_OK) {
        return status;
    }
    status = volume_of(table, options, &table->standards[index], run, &curve, replicate, error);
    wa_curve_free(&curve);
    /* The blank is off already; the model of the mean subtracts it from every volume. */
    replicate->volume.value += options->blank.value;
    return status;
}
