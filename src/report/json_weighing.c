/* JSON of what was asked for besides the candidates. */
#include "report/json_internal.h"

json_t *json_observed(const struct wa_result *result)
{
    return json_sentences(result->observed, result->observed_count);
}

json_t *json_comparison(const struct wa_result *result)
{
    const struct wa_result_comparison *comparison = &result->comparison;
    if (!comparison->given) {
        return json_null();
    }
    struct json_maker object = json_make_object();
    json_put(&object, "first", json_text(comparison->first));
    json_put(&object, "second", json_text(comparison->second));
    json_put(&object, "log10_ratio", json_number(comparison->log10_ratio));
    json_put(&object, "log10_low", json_number(comparison->log10_low));
    json_put(&object, "log10_high", json_number(comparison->log10_high));
    json_put(&object, "support", json_text(comparison->support));
    json_put(&object, "scale",
             json_text("ENFSI Guideline for Evaluative Reporting in Forensic Science (2015)"));
    json_put(&object, "sentence", json_text(comparison->sentence));
    json_put(&object, "sensitivity", json_text(comparison->sensitivity));
    return json_done(&object);
}

json_t *json_explanation(const struct wa_result *result)
{
    if (result->explained == NULL) {
        return json_null();
    }
    struct json_maker object = json_make_object();
    json_put(&object, "key", json_text(result->explained));
    json_put(&object, "sentences", json_sentences(result->explanation, result->explanation_count));
    return json_done(&object);
}
