/* What was asked for besides the candidates: other observations, a comparison, an explanation. */
#include "report/report_internal.h"

void report_weighing(struct report_writer *writer, const struct wa_result *result)
{
    report_sentences(writer, "OBSERVED BESIDES THE TITRATION", result->observed,
                     result->observed_count);
    const struct wa_result_comparison *comparison = &result->comparison;
    if (comparison->given) {
        report_heading(writer, "EVIDENCE FOR ONE AGAINST THE OTHER");
        report_paragraph(writer, "  ", 2, "%s", comparison->sentence);
        report_paragraph(
            writer, "  ", 2,
            "Ratio for %s over %s as one assumption varies (purity: weight of reagent "
            "grade 50 to 95 %%, scale of as found 4 to 16 %%; electrode: half to twice "
            "its uncertainties; outliers: 0.5 to 5 %% of the rows): %s.",
            comparison->first, comparison->second, comparison->sensitivity);
    }
    if (result->explanation_count > 0) {
        report_sentences(writer, "WHY OR WHY NOT", result->explanation, result->explanation_count);
    }
}
