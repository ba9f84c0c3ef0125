/* Results made by hand for the tests of the report: one with everything, one with hostile text. */
#ifndef WHICHACID_TESTS_REPORT_SAMPLE_H
#define WHICHACID_TESTS_REPORT_SAMPLE_H

#include "whichacid/result.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define SAMPLE_POINTS 61

static inline char *sample_text(const char *text)
{
    return strdup(text);
}

static inline void sample_note(struct wa_run *run, const char *name, const char *text, long line)
{
    run->notes = realloc(run->notes, (run->note_count + 1) * sizeof *run->notes);
    run->notes[run->note_count++] = (struct wa_note){.name = sample_text(name),
                                                     .text = sample_text(text),
                                                     .origin = WA_ORIGIN_NOTE,
                                                     .line = line};
}

static inline struct wa_noted sample_noted(double value, double u, enum wa_origin origin, long line)
{
    return (struct wa_noted){.quantity = {.value = value, .u = u, .has_u = u > 0.0},
                             .known = true,
                             .origin = origin,
                             .line = line};
}

/* A weak acid of pKa 4.756, 3 mmol in 50 mL, with 0.1 mol/L of base: good enough to draw. */
static inline double sample_pH(double volume_mL)
{
    double share = volume_mL / 30.0;
    if (share < 0.01) {
        return 2.9;
    }
    if (share < 0.999) {
        return 4.756 + log10(share / (1.0 - share));
    }
    return share < 1.001 ? 8.7 : 14.0 + log10((share - 1.0) * 3e-3 / 0.08);
}

static inline void sample_run(struct wa_run *run, const char *words)
{
    *run = (struct wa_run){.file = sample_text(words), .point_count = SAMPLE_POINTS};
    run->points = calloc(SAMPLE_POINTS, sizeof *run->points);
    for (size_t i = 0; i < SAMPLE_POINTS; i++) {
        double volume = 0.6 * (double)i;
        run->points[i] = (struct wa_point){.volume_mL = volume,
                                           .reading = sample_pH(volume),
                                           .time_s = NAN,
                                           .temperature_C = NAN,
                                           .line = (long)i + 8};
    }
    sample_note(run, "sample", words, 1);
    sample_note(run, "analyst", words, 2);
    run->conditions.sample = run->notes[0].text;
    run->conditions.sample_mass = sample_noted(0.1801, 0.0002, WA_ORIGIN_NOTE, 3);
    run->conditions.titrant_concentration = sample_noted(0.1023, 0.0002, WA_ORIGIN_OPTION, 0);
    run->conditions.electrode_offset = sample_noted(0.0, 0.06, WA_ORIGIN_DEFAULT, 0);
    run->conditions.titrant_carbonate = sample_noted(0.005, 0.002, WA_ORIGIN_NOTE, 5);
    run->set_aside = calloc(1, sizeof *run->set_aside);
    run->set_aside[0] =
        (struct wa_set_aside){.line = 33, .text = sample_text(words), .reason = sample_text(words)};
    run->set_aside_count = 1;
    run->remarks = calloc(1, sizeof *run->remarks);
    run->remarks[0] = sample_text(words);
    run->remark_count = 1;
}

static inline void sample_experiment(struct wa_result *result)
{
    const struct wa_run *run = &result->runs.runs[0];
    struct wa_experiment *experiment = calloc(1, sizeof *experiment);
    experiment->count = run->point_count;
    experiment->volume_mL = calloc(run->point_count, sizeof(double));
    experiment->reading = calloc(run->point_count, sizeof(double));
    experiment->line = calloc(run->point_count, sizeof(long));
    experiment->titrant_is_base = true;
    result->best = (struct wa_fit){.converged = true,
                                   .misfit = 1.04,
                                   .noise_reading = 0.012,
                                   .noise_volume = 0.006,
                                   .ionic_strength = 0.031};
    result->best.model = calloc(run->point_count, sizeof(double));
    result->best.residual = calloc(run->point_count, sizeof(double));
    result->best.outlier = calloc(run->point_count, sizeof(double));
    for (size_t i = 0; i < run->point_count; i++) {
        experiment->volume_mL[i] = run->points[i].volume_mL;
        experiment->reading[i] = run->points[i].reading;
        experiment->line[i] = run->points[i].line;
        result->best.model[i] = run->points[i].reading;
    }
    result->best.outlier[6] = 0.97;
    result->best.residual[6] = NAN;
    result->experiments = experiment;
    result->fitted = true;
}

static inline void sample_candidate(struct wa_result *result, double probability, const char *words)
{
    size_t index = result->candidate_count++;
    struct wa_result_candidate *candidate = &result->candidates[index];
    *candidate = (struct wa_result_candidate){.rank = (int)index + 1,
                                              .acid = -1,
                                              .form = -1,
                                              .acid_name = sample_text(words),
                                              .form_name = sample_text(words),
                                              .key = sample_text("acetic-acid"),
                                              .others = sample_text(words),
                                              .probability = probability,
                                              .misfit = 1.04,
                                              .molar_mass = 60.052,
                                              .molar_mass_deviation = -0.42,
                                              .step_count = 2,
                                              .pKa = {4.756, 13.1},
                                              .pKa_u = {0.01, 0.3},
                                              .pKa_deviation = {0.52, NAN},
                                              .seen = {true, false},
                                              .why = sample_text(words),
                                              .hazards = sample_text(words),
                                              .care = sample_text(""),
                                              .sources = sample_text(words)};
}

static inline struct wa_result_sentence *sample_sentence(const char *code, const char *words)
{
    struct wa_result_sentence *sentence = calloc(1, sizeof *sentence);
    *sentence = (struct wa_result_sentence){.code = code, .sentence = sample_text(words)};
    return sentence;
}

static inline void sample_lists(struct wa_result *result, const char *words)
{
    result->parameters = calloc(2, sizeof *result->parameters);
    result->parameters[0] = (struct wa_result_parameter){.name = sample_text(words),
                                                         .unit = "pH",
                                                         .prior = 0.0,
                                                         .prior_u = 0.06,
                                                         .value = 0.03,
                                                         .u = 0.008,
                                                         .origin = WA_ORIGIN_DEFAULT};
    result->parameters[1] = (struct wa_result_parameter){
        .name = sample_text("pKa 1"), .prior = NAN, .prior_u = NAN, .value = 4.761, .u = 0.0123};
    result->parameter_count = 2;
    result->findings = sample_sentence("carbonate-in-titrant", words);
    result->finding_count = 1;
    result->assumptions = sample_sentence("electrode-offset", words);
    result->assumption_count = 1;
    result->cautions = sample_sentence("screening-aid", words);
    result->caution_count = 1;
    result->next_tests = calloc(1, sizeof *result->next_tests);
    result->next_tests[0] = (struct wa_result_next){
        .sentence = sample_text(words), .separates = sample_text("acetic-acid; propionic-acid")};
    result->next_test_count = 1;
}

/* Everything filled; free text is `words` throughout. */
static inline void sample_result(struct wa_result *result, const char *words)
{
    *result = (struct wa_result){.proton_count = 1,
                                 .proton_probability = 0.993,
                                 .proton_alternatives = {{1, 0.993}, {2, 0.007}},
                                 .proton_alternative_count = 2,
                                 .unseen = sample_text(words),
                                 .amount_mol = 3.0012e-3,
                                 .amount_u = 7e-6,
                                 .molar_mass = 60.01,
                                 .molar_mass_u = 0.155,
                                 .equivalent_mass = 60.01,
                                 .equivalent_mass_u = 0.155,
                                 .molar_mass_assumes = sample_text(words),
                                 .forms_considered = 214,
                                 .forms_fitted = 17,
                                 .not_in_table = 0.004,
                                 .table_version = "0123456789abcdef",
                                 .table_folder = sample_text("reference"),
                                 .overlaid_count = 1};
    result->runs.runs = calloc(1, sizeof *result->runs.runs);
    result->runs.count = 1;
    sample_run(&result->runs.runs[0], words);
    sample_experiment(result);
    result->equivalence_points = calloc(1, sizeof *result->equivalence_points);
    result->equivalence_points[0] =
        (struct wa_result_equivalence){.volume_mL = 30.0,
                                       .u_mL = 0.0234,
                                       .pH = 8.7,
                                       .significance = 41.3,
                                       .protons = 1,
                                       .from_fit = true,
                                       .inflection_seen = true,
                                       .inflection_mL = 29.98,
                                       .first_derivative = {29.98, 0.05},
                                       .gran_before = {30.02, 0.04},
                                       .fit = {30.0, 0.0234}};
    result->equivalence_count = 1;
    result->pKa[0] = (struct wa_result_pKa){.step = 1,
                                            .half_equivalence = 4.71,
                                            .half_equivalence_u = 0.062,
                                            .value = 4.761,
                                            .u = 0.0123,
                                            .apparent = 4.68,
                                            .apparent_u = 0.0145,
                                            .ionic_strength = 0.031,
                                            .temperature_C = 25.0};
    result->pKa[1] = result->pKa[0];
    result->pKa[1].step = 2;
    result->pKa[1].is_bound = true;
    strcpy(result->pKa[1].bound, "above 11.2");
    result->pKa_count = 2;
    sample_candidate(result, 0.981, words);
    sample_candidate(result, 0.014, words);
    sample_candidate(result, 0.0004, words);
    sample_candidate(result, 0.0003, words);
    result->verdict = (struct wa_verdict){.kind = WA_VERDICT_IDENTIFIED,
                                          .threshold = 0.95,
                                          .probability = 0.981,
                                          .forms = sample_text("acetic-acid; propionic-acid"),
                                          .form_count = 1,
                                          .sentence = sample_text(words)};
    sample_lists(result, words);
}

/* Nothing known at all, as the numbers of an unfit run are. */
static inline void sample_nothing(struct wa_result *result)
{
    *result = (struct wa_result){.amount_mol = NAN,
                                 .amount_u = NAN,
                                 .molar_mass = NAN,
                                 .molar_mass_u = NAN,
                                 .equivalent_mass = NAN,
                                 .equivalent_mass_u = NAN,
                                 .not_in_table = NAN,
                                 .verdict = {.kind = WA_VERDICT_UNFIT, .probability = NAN}};
}

#endif
