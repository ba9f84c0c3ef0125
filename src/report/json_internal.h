/* What the JSON sources share. Every function that returns json_t gives a new reference, or NULL
 * when memory is out; putting a NULL into an object or array is remembered as a failure. */
#ifndef WHICHACID_REPORT_JSON_INTERNAL_H
#define WHICHACID_REPORT_JSON_INTERNAL_H

#include "whichacid/result.h"

#include <jansson.h>

/** An object or array under construction. */
struct json_maker {
    json_t *json;
    bool failed;
};

struct json_maker json_make_object(void);
struct json_maker json_make_array(void);

/** Set a key; takes over the reference. */
void json_put(struct json_maker *object, const char *key, json_t *value);

/** Append to an array; takes over the reference. */
void json_add(struct json_maker *array, json_t *value);

/** The finished value, or NULL when anything failed. */
json_t *json_done(struct json_maker *maker);

/** A number, or null when it is not finite: JSON knows neither NaN nor infinity. */
json_t *json_number(double value);

/** Text as valid UTF-8, or null for NULL. */
json_t *json_text(const char *text);

/** Text split at "; " into an array of strings. */
json_t *json_split(const char *text);

/** Put `value` and `u` with that key, null for what is not known. */
void json_put_pair(struct json_maker *object, const char *key, double value, const char *key_u,
                   double u);

/* The parts of the answer that stand in their own source. */
json_t *json_notes(const struct wa_run *run);
json_t *json_runs(const struct wa_result *result);
json_t *json_set_aside(const struct wa_result *result);
json_t *json_candidates(const struct wa_result *result);
json_t *json_parameters(const struct wa_result *result);
json_t *json_observed(const struct wa_result *result);
json_t *json_comparison(const struct wa_result *result);
json_t *json_explanation(const struct wa_result *result);
json_t *json_sentences(const struct wa_result_sentence *sentences, size_t count);
json_t *json_fit(const struct wa_result *result);

#endif
