/* Steps of the pipeline, in the order in which a result is filled. */
#ifndef WHICHACID_IDENTIFY_INTERNAL_H
#define WHICHACID_IDENTIFY_INTERNAL_H

#include "whichacid/explanations.h"
#include "whichacid/identify.h"
#include "whichacid/match.h"
#include "whichacid/protons.h"

/** Charges that an acid's species may have at the start, from -4 to +4. */
#define WA_START_CHARGES 9

/** What the steps hand to one another. */
struct wa_identification {
    const struct wa_table *table;
    const struct wa_identify_options *options;
    double threshold;
    double amount_limit;
    double pKa_limit;
    struct wa_titrated_mass mass;
    struct wa_proton_study study; /**< of the first run */
    struct wa_explanations explanations;
    struct wa_match match;
    char *compared[2]; /**< names of a comparison, cut at their commas */
    bool matched;
    bool replicates_disagree; /**< two, and nothing tells which is wrong */
    bool replicate_left_out;
    double charge_weight[WA_START_CHARGES]; /**< share of the candidates by start charge */
};

/** A malloc'd sentence; NULL when memory is out. */
char *wa_sentence(const char *format, ...) WA_PRINTF(1, 2);

/** Append to one of the result's sentence lists. The sentence is taken over, also on failure. */
enum wa_status wa_add_sentence(struct wa_result_sentence **list, size_t *count, const char *code,
                               char *sentence, struct wa_error *error) WA_MUST_USE;

/** The mass that was titrated, from the notes. */
struct wa_titrated_mass wa_titrated_mass_of(const struct wa_conditions *conditions);

/** Volume at which so many protons a molecule are titrated, by the fit. */
struct wa_volume_estimate wa_equivalence_by_fit(const struct wa_experiment *experiment,
                                                const struct wa_fit *fit, int protons);

/** Equivalence points: by the curve, by the fit, and which of them an inflection shows. */
enum wa_status wa_fill_equivalence(const struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error) WA_MUST_USE;

/** Proton counts, constants, amount and molar mass. */
enum wa_status wa_fill_protons(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error) WA_MUST_USE;

/** The end of a hydrogen carbonate titration in an open vessel. */
enum wa_status wa_fill_hydrogen_carbonate(const struct wa_identification *work,
                                          struct wa_result *result,
                                          struct wa_error *error) WA_MUST_USE;

/** The candidates listed, each with its reasons. */
enum wa_status wa_fill_candidates(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error) WA_MUST_USE;

/** Parameters of the best fit, for the report. */
enum wa_status wa_fill_parameters(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error) WA_MUST_USE;

/** Whether the readings go the other way than the titrant named can take them. */
bool wa_runs_against_titrant(const struct wa_curve *curve, const struct wa_experiment *experiment);

/** More than one pure acid, when the data prefer it. */
enum wa_status wa_fill_mixture(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error) WA_MUST_USE;

/** A titrant that was stronger or weaker than noted, when the mass shows it. */
enum wa_status wa_find_titrant_doubt(const struct wa_identification *work, struct wa_result *result,
                                     struct wa_error *error) WA_MUST_USE;

/** Link the experiments into one series; WA_ERROR_INPUT for runs that cannot be replicates. */
enum wa_status wa_link_replicates(struct wa_result *result, struct wa_error *error) WA_MUST_USE;

/**
 * Whether the replicates agree. One of three or more that does not is left out of the series, and
 * the study must be made again; two that do not agree support no answer.
 */
enum wa_status wa_check_replicates(struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error) WA_MUST_USE;

/** The verdict, and why data are unfit when they are. */
enum wa_status wa_fill_verdict(const struct wa_identification *work, struct wa_result *result,
                               struct wa_error *error) WA_MUST_USE;

/** What to do next. */
enum wa_status wa_fill_next_tests(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error) WA_MUST_USE;

/** Observations besides the titration, the comparison and the explanation asked for. */
enum wa_status wa_fill_observed(const struct wa_identification *work, struct wa_result *result,
                                struct wa_error *error) WA_MUST_USE;
enum wa_status wa_fill_comparison(const struct wa_identification *work, struct wa_result *result,
                                  struct wa_error *error) WA_MUST_USE;
enum wa_status wa_fill_explanation(const struct wa_identification *work, struct wa_result *result,
                                   struct wa_error *error) WA_MUST_USE;

/** What the curve alone says of a constant, less the table's value, in the uncertainty of both; NaN
 * when it says next to nothing. `alone` and `alone_u` may be NULL. */
double wa_constant_deviation(const struct wa_parameter *parameter, double table_u, double *alone,
                             double *alone_u);

/** Assumptions and findings beside the answer. */
enum wa_status wa_fill_findings(const struct wa_identification *work, struct wa_result *result,
                                struct wa_error *error) WA_MUST_USE;

/** Curves of the best fit and of two candidates, for figures. After wa_fill_candidates. */
enum wa_status wa_fill_traces(const struct wa_identification *work, struct wa_result *result,
                              struct wa_error *error) WA_MUST_USE;

#endif
