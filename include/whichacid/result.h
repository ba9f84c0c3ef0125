/* The one result structure: what `identify` found, ready to be shown. The text, JSON and page faces
 * read it and compute nothing. Every string is owned by the result. */
#ifndef WHICHACID_RESULT_H
#define WHICHACID_RESULT_H

#include "whichacid/trace.h"

/** Most candidates that are listed. */
#define WA_CANDIDATES_MAX 40

/** An input file. */
struct wa_result_input {
    char *file;
    char sha256[65];
    size_t runs;
};

/** An equivalence point, in order of volume. */
struct wa_result_equivalence {
    double volume_mL; /**< stoichiometric volume on total alkalinity */
    double u_mL;
    double pH; /**< NaN in mV runs */
    double significance;
    int protons;          /**< protons removed or added up to here, 0 when unknown */
    bool from_fit;        /**< refined by the whole-curve fit; else by the curve alone */
    bool inflection_seen; /**< the curve shows an inflection here */
    double inflection_mL; /**< NaN when none is seen */
    struct wa_volume_estimate first_derivative, second_derivative, gran_before, gran_after;
    struct wa_volume_estimate fit;
};

/** Probability of one proton count. */
struct wa_proton_count {
    int count;
    double probability;
};

/** A dissociation constant. */
struct wa_result_pKa {
    int step;                /**< counted over the protons that this run shows, from 1 */
    double half_equivalence; /**< apparent constant read at half-equivalence, NaN when not read */
    double half_equivalence_u;
    double value; /**< refined, thermodynamic; NaN when there was no fit */
    double u;
    double apparent; /**< refined, at the run's ionic strength, activity scale of pH */
    double apparent_u;
    double ionic_strength; /**< of the apparent constant, mol/L */
    double temperature_C;
    bool is_bound; /**< only "below" or "above" can be said; `bound` says it */
    char bound[64];
};

/** A listed candidate: one acid system in one supplied form. */
struct wa_result_candidate {
    int rank;
    int acid; /**< index into the table; first part of the form */
    int form; /**< index into the table, -1 for the acid system when no mass separates its forms */
    char *acid_name;
    char *form_name;
    char *key;
    char *others; /**< forms that cannot be told from this one here, "; " between, or "" */
    double probability;
    double misfit;               /**< root mean square residual in standard uncertainties */
    double molar_mass;           /**< of the form, g/mol */
    double molar_mass_deviation; /**< measured minus table in combined u, NaN without a mass */
    int step_count;
    double pKa[WA_PROTONS_MAX]; /**< reference, thermodynamic, 25 degree Celsius */
    double pKa_u[WA_PROTONS_MAX];
    double pKa_deviation[WA_PROTONS_MAX]; /**< fitted minus reference in u, NaN when unseen */
    bool seen[WA_PROTONS_MAX];            /**< the run shows this step */
    char *why;                            /**< one line that a chemist can check */
    char *hazards;                        /**< GHS codes with their sentences, or "" */
    char *care;
    char *sources; /**< source keys of the constants */
};

/** A parameter of the best fit with its prior, for the report. */
struct wa_result_parameter {
    char *name;
    const char *unit;
    double prior, prior_u;
    double value, u;
    enum wa_origin origin;
    long line;
};

/** A sentence with a stable code. */
struct wa_result_sentence {
    const char *code;
    char *sentence;
};

/** A next observation and what it would separate. */
struct wa_result_next {
    char *sentence;
    char *separates;      /**< keys, "; " between */
    double expected_bits; /**< expected drop of the entropy over the forms; NaN: not computed */
    double expected_set;  /**< expected number of forms in the 95 % set after it; NaN likewise */
};

/** Evidence for one proposition against another (--compare). */
struct wa_result_comparison {
    bool given;
    char *first, *second; /**< as asked for */
    double log10_ratio;   /**< evidence for the first over the second */
    double log10_low, log10_high;
    const char *support; /**< the verbal scale's words, for the end of the range nearer to 1 */
    char *sentence;
    char *sensitivity; /**< what each assumption does to it */
};

enum wa_verdict_kind {
    WA_VERDICT_IDENTIFIED, /**< one candidate holds at least the stated share */
    WA_VERDICT_NARROWED,   /**< the smallest set that holds it */
    WA_VERDICT_NOT_IN_TABLE,
    WA_VERDICT_UNFIT, /**< the data cannot support an answer */
};

/** The verdict. */
struct wa_verdict {
    enum wa_verdict_kind kind;
    double threshold;   /**< share demanded, printed with the verdict */
    double probability; /**< of the form or set named */
    char *forms;        /**< keys in the set, "; " between */
    size_t form_count;
    char *sentence;
};

/** Everything that is shown. */
struct wa_result {
    struct wa_result_input *inputs;
    size_t input_count;
    struct wa_run_list runs;           /**< owned: points, notes, rows set aside, remarks */
    struct wa_curve *curves;           /**< one a run */
    struct wa_experiment *experiments; /**< one a run; count 0 where none could be made */
    struct wa_fit best; /**< best generic fit of the first run; parameter_count 0: none */
    bool fitted;
    struct wa_trace best_trace; /**< of `best`; count 0: none */
    /** The winner's curve and the runner-up's, from their own fits of the first run; count 0:
     * none. The runner-up is the next candidate of another acid system, else the next one. */
    struct wa_trace candidate_traces[2];
    size_t traced_candidates[2];                      /**< which of `candidates` they are of */
    struct wa_result_equivalence *equivalence_points; /**< of the first run */
    size_t equivalence_count;
    int proton_count;
    double proton_probability;
    struct wa_proton_count proton_alternatives[6];
    size_t proton_alternative_count;
    char *unseen; /**< what this titration cannot see, in words */
    struct wa_result_pKa pKa[WA_PROTONS_MAX];
    size_t pKa_count;
    double amount_mol, amount_u;     /**< NaN when unknown */
    double molar_mass, molar_mass_u; /**< NaN without a mass */
    double equivalent_mass, equivalent_mass_u;
    char *molar_mass_assumes;
    struct wa_result_candidate candidates[WA_CANDIDATES_MAX];
    size_t candidate_count;
    size_t forms_considered; /**< forms of the table that were compared */
    size_t forms_fitted;     /**< of these, fitted fully after screening */
    double not_in_table;
    struct wa_verdict verdict;
    struct wa_result_parameter *parameters;
    size_t parameter_count;
    struct wa_result_sentence *findings; /**< diagnosis: what the data show beside the answer */
    size_t finding_count;
    struct wa_result_sentence *assumptions;
    size_t assumption_count;
    struct wa_result_sentence *cautions;
    size_t caution_count;
    struct wa_result_sentence *observed; /**< observations besides the titration */
    size_t observed_count;
    struct wa_result_comparison comparison;
    char *explained; /**< key asked for with --explain, or NULL */
    struct wa_result_sentence *explanation;
    size_t explanation_count;
    double missing_bits; /**< entropy over the forms; NaN when nothing was matched */
    struct wa_result_next *next_tests;
    size_t next_test_count;
    char table_version[17];
    char *table_folder;
    size_t overlaid_count;
};

/**
 * Say which bytes the result was made from. An input of that name without a fingerprint gets it,
 * else an input is added.
 * @param[in] sha256  64 hexadecimal digits
 * @param[in] runs    runs that the file held
 */
enum wa_status wa_result_add_input(struct wa_result *result, const char *file, const char *sha256,
                                   size_t runs, struct wa_error *error) WA_MUST_USE;

/** Free everything the result owns. NULL is allowed. */
void wa_result_free(struct wa_result *result);

#endif
