/* Making JSON values without losing a failure on the way. */
#include "report/json_internal.h"

#include "report/report_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

struct json_maker json_make_object(void)
{
    json_t *json = json_object();
    return (struct json_maker){.json = json, .failed = json == NULL};
}

struct json_maker json_make_array(void)
{
    json_t *json = json_array();
    return (struct json_maker){.json = json, .failed = json == NULL};
}

void json_put(struct json_maker *object, const char *key, json_t *value)
{
    if (json_object_set_new(object->json, key, value) != 0) {
        object->failed = true;
    }
}

void json_add(struct json_maker *array, json_t *value)
{
    if (json_array_append_new(array->json, value) != 0) {
        array->failed = true;
    }
}

json_t *json_done(struct json_maker *maker)
{
    if (maker->failed) {
        json_decref(maker->json);
        maker->json = NULL;
    }
    return maker->json;
}

json_t *json_number(double value)
{
    return isfinite(value) ? json_real(value) : json_null();
}

json_t *json_text(const char *text)
{
    if (text == NULL) {
        return json_null();
    }
    struct wa_text clean = {0};
    report_clean(&clean, text, false);
    json_t *json = clean.failed ? NULL : json_stringn(clean.bytes, clean.length);
    wa_text_free(&clean);
    return json;
}

json_t *json_split(const char *text)
{
    struct json_maker array = json_make_array();
    while (text != NULL && *text != '\0') {
        const char *end = strstr(text, "; ");
        size_t length = end != NULL ? (size_t)(end - text) : strlen(text);
        char *piece = wa_text_copy(text, length);
        json_add(&array, piece != NULL ? json_text(piece) : NULL);
        free(piece);
        text = end != NULL ? end + 2 : NULL;
    }
    return json_done(&array);
}

void json_put_pair(struct json_maker *object, const char *key, double value, const char *key_u,
                   double u)
{
    bool known = isfinite(value);
    json_put(object, key, json_number(value));
    json_put(object, key_u, known && u > 0.0 ? json_number(u) : json_null());
}
