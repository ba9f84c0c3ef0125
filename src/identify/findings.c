/* What was assumed, and what the data show beside the answer. */
#include "identify/identify_internal.h"
#include "whichacid/diagnosis.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double outlier_named = 0.5;
static const size_t outliers_named = 4;

static enum wa_status add_finding(struct wa_result *result, const char *code, char *sentence,
                                  struct wa_error *error)
{
    return wa_add_sentence(&result->findings, &result->finding_count, code, sentence, error);
}

static enum wa_status add_assumption(struct wa_result *result, const char *code, char *sentence,
                                     struct wa_error *error)
{
    return wa_add_sentence(&result->assumptions, &result->assumption_count, code, sentence, error);
}

static enum wa_status assume_from_run(struct wa_result *result, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t r = 0; status == WA_OK && r < result->runs.count; r++) {
        const struct wa_run *run = &result->runs.runs[r];
        for (size_t i = 0; status == WA_OK && i < run->remark_count; i++) {
            status = add_assumption(result, "reading", wa_sentence("%s", run->remarks[i]), error);
        }
    }
    return status;
}

static enum wa_status assume_grouping(struct wa_result *result, struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    if (experiment->grouping <= 1) {
        return WA_OK;
    }
    return add_assumption(result, "grouping",
                          wa_sentence("The run has more points than a fit can use: %zu neighbours "
                                      "at a time are averaged for the fit.",
                                      experiment->grouping),
                          error);
}

static enum wa_status assume_priors(const struct wa_identification *work, struct wa_result *result,
                                    struct wa_error *error)
{
    const bool told = work->options->prior != NULL;
    enum wa_status status = add_assumption(
        result, "prior-unknown",
        wa_sentence(
            "Before the data, \"not in the table\" has a weight of %.0f %%; the rest is %s%s. "
            "An acid that is not in the table has 1 to 6 protons, constants about %.1f "
            "\u00b1 %.1f and a molar mass anywhere between %.0f and %.0f g/mol, or (%.0f %% of "
            "that weight) resembles a listed one. One row of the table in %.0f is taken to be "
            "wrong by more than it admits.",
            100.0 * work->match.not_in_table_prior,
            told ? "shared as told by "
                 : "shared evenly over the acid systems considered, "
                   "then over the forms of each, enantiomers as one",
            told && work->options->prior_file != NULL ? work->options->prior_file : "",
            WA_GENERIC_PK_MEAN, WA_GENERIC_PK_U, WA_MOLAR_MASS_LOW, WA_MOLAR_MASS_HIGH,
            100.0 * WA_RELATIVE_SHARE, 1.0 / WA_ROW_WRONG_SHARE),
        error);
    if (status == WA_OK && work->mass.known) {
        status = add_assumption(
            result, "prior-purity",
            wa_sentence("The sample is taken as reagent grade (99.7 \u00b1 0.4 %%) with a weight "
                        "of %.0f %%, else as found: below 100 %%, half-normal with a scale of "
                        "%.0f %%, so that a measured molar mass below the form's is hardly "
                        "excused.",
                        100.0 * WA_PURITY_REAGENT_SHARE, 100.0 * WA_PURITY_FOUND_LN_S),
            error);
    }
    if (status == WA_OK && work->options->among_count > 0) {
        status = add_assumption(result, "closed-set",
                                wa_sentence("The set was closed: only %zu keys were considered, "
                                            "and nothing outside it can be found.",
                                            work->options->among_count),
                                error);
    }
    return status;
}

static enum wa_status find_outliers(const struct wa_identification *work, struct wa_result *result,
                                    struct wa_error *error)
{
    const struct wa_experiment *experiment = &result->experiments[0];
    const struct wa_fit *fit = &work->study.generic[0].fit;
    enum wa_status status = WA_OK;
    size_t count = 0;
    for (size_t p = 0; p < experiment->count; p++) {
        count += fit->outlier[p] > outlier_named ? 1 : 0;
    }
    /* One more than the most is named too: it takes no more room than saying so. */
    size_t left = count > outliers_named + 1 ? outliers_named : count;
    for (size_t p = 0; status == WA_OK && left > 0 && p < experiment->count; p++) {
        if (fit->outlier[p] > outlier_named) {
            left--;
            status = add_finding(
                result, "outlier",
                wa_sentence("Line %ld (%.2f mL, pH %.2f) does not follow the curve, which expects "
                            "%.2f there; it counts for next to nothing in the fit.",
                            experiment->line[p], experiment->volume_mL[p], experiment->reading[p],
                            fit->model[p]),
                error);
        }
    }
    if (status == WA_OK && count > outliers_named + 1) {
        status = add_finding(
            result, "outlier",
            wa_sentence("So it is with %zu more points: %zu of the %zu do not follow the curve. "
                        "One curve through the rest may not be the right one; look at the plot.",
                        count - outliers_named, count, experiment->count),
            error);
    }
    return status;
}

static enum wa_status find_range(const struct wa_identification *work, struct wa_result *result,
                                 struct wa_error *error)
{
    const struct wa_fit *fit = &work->study.generic[0].fit;
    if (fit->ionic_strength <= WA_DAVIES_LIMIT) {
        return WA_OK;
    }
    return add_finding(result, "ionic-strength",
                       wa_sentence("The ionic strength is about %.2f mol/L: beyond %.1f mol/L the "
                                   "activity model is out of its range, and the constants with it.",
                                   fit->ionic_strength, WA_DAVIES_LIMIT),
                       error);
}

static enum wa_status find_from_curve(struct wa_result *result, struct wa_error *error)
{
    const struct wa_curve *curve = &result->curves[0];
    enum wa_status status = WA_OK;
    if (curve->spacing[0] != '\0' && !curve->spacing_explained) {
        status = add_finding(result, "spacing", wa_sentence("%s", curve->spacing), error);
    }
    if (status == WA_OK && curve->in_mV) {
        status = add_finding(result, "uncalibrated",
                             wa_sentence("The readings are mV without a calibration: the jumps "
                                         "stand, but no pKa can be given. Note the electrode's "
                                         "slope and offset, or two buffer readings."),
                             error);
    }
    for (size_t i = 0; status == WA_OK && i < curve->remark_count; i++) {
        status = add_finding(result, "curve", wa_sentence("%s", curve->remarks[i]), error);
    }
    return status;
}

/* What went wrong at the bench. */
static enum wa_status find_faults(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error)
{
    struct wa_diagnosis diagnosis;
    enum wa_status status =
        wa_diagnose(&result->runs.runs[0], &result->experiments[0], &work->study,
                    work->explanations.log_two_acids, &diagnosis, error);
    if (status != WA_OK) {
        return status;
    }
    for (int k = 0; status == WA_OK && k < WA_FAULT_KINDS; k++) {
        struct wa_suspicion *suspicion = &diagnosis.suspicions[k];
        if (suspicion->said) {
            status = add_finding(result, suspicion->code, suspicion->sentence, error);
            suspicion->sentence = NULL;
        }
    }
    wa_diagnosis_free(&diagnosis);
    return status;
}

enum wa_status wa_fill_findings(const struct wa_identification *work, struct wa_result *result,
                                struct wa_error *error)
{
    enum wa_status status = assume_from_run(result, error);
    if (status == WA_OK) {
        status = assume_grouping(result, error);
    }
    if (status == WA_OK) {
        status = assume_priors(work, result, error);
    }
    if (status == WA_OK) {
        status = find_from_curve(result, error);
    }
    if (status == WA_OK && work->study.count > 0) {
        status = find_outliers(work, result, error);
    }
    if (status == WA_OK && work->study.count > 0) {
        status = find_range(work, result, error);
    }
    if (status == WA_OK && work->study.count > 0) {
        status = find_faults(work, result, error);
    }
    if (status == WA_OK) {
        status = wa_find_titrant_doubt(work, result, error);
    }
    return status;
}
