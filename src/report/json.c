/* The JSON answer: the keys of the file format first, then what was added to them. */
#include "report/json_internal.h"
#include "whichacid/report.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static json_t *inputs_of(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->input_count; i++) {
        const struct wa_result_input *input = &result->inputs[i];
        struct json_maker object = json_make_object();
        json_put(&object, "file", json_text(input->file));
        json_put(&object, "sha256",
                 input->sha256[0] != '\0' ? json_text(input->sha256) : json_null());
        json_put(&object, "runs", json_integer((json_int_t)input->runs));
        json_add(&array, json_done(&object));
    }
    return json_done(&array);
}

static void put_estimate(struct json_maker *volumes, struct json_maker *uncertainties,
                         const char *name, const struct wa_volume_estimate *estimate)
{
    bool given = estimate->u_mL > 0.0;
    json_put(volumes, name, given ? json_number(estimate->volume_mL) : json_null());
    json_put(uncertainties, name, given ? json_number(estimate->u_mL) : json_null());
}

static json_t *equivalence_of(const struct wa_result_equivalence *point)
{
    struct json_maker volumes = json_make_object();
    struct json_maker uncertainties = json_make_object();
    put_estimate(&volumes, &uncertainties, "first_derivative", &point->first_derivative);
    put_estimate(&volumes, &uncertainties, "second_derivative", &point->second_derivative);
    put_estimate(&volumes, &uncertainties, "gran_before", &point->gran_before);
    put_estimate(&volumes, &uncertainties, "gran_after", &point->gran_after);
    put_estimate(&volumes, &uncertainties, "fit", &point->fit);
    struct json_maker object = json_make_object();
    json_put_pair(&object, "volume_mL", point->volume_mL, "u_mL", point->u_mL);
    json_put(&object, "pH", json_number(point->pH));
    json_put(&object, "significance", json_number(point->significance));
    json_put(&object, "methods", json_done(&volumes));
    json_put(&object, "methods_u_mL", json_done(&uncertainties));
    json_put(&object, "protons", point->protons > 0 ? json_integer(point->protons) : json_null());
    json_put(&object, "from_fit", json_boolean(point->from_fit));
    json_put(&object, "inflection_mL",
             point->inflection_seen ? json_number(point->inflection_mL) : json_null());
    return json_done(&object);
}

static json_t *equivalence_points_of(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->equivalence_count; i++) {
        json_add(&array, equivalence_of(&result->equivalence_points[i]));
    }
    return json_done(&array);
}

static json_t *protons_of(const struct wa_result *result)
{
    struct json_maker others = json_make_array();
    for (size_t i = 0; i < result->proton_alternative_count; i++) {
        struct json_maker other = json_make_object();
        json_put(&other, "count", json_integer(result->proton_alternatives[i].count));
        json_put(&other, "probability", json_number(result->proton_alternatives[i].probability));
        json_add(&others, json_done(&other));
    }
    bool known = result->proton_count > 0;
    struct json_maker object = json_make_object();
    json_put(&object, "count", known ? json_integer(result->proton_count) : json_null());
    json_put(&object, "probability", known ? json_number(result->proton_probability) : json_null());
    json_put(&object, "alternatives", json_done(&others));
    json_put(&object, "unseen", json_text(result->unseen != NULL ? result->unseen : ""));
    return json_done(&object);
}

static json_t *pKa_of(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->pKa_count; i++) {
        const struct wa_result_pKa *pKa = &result->pKa[i];
        struct json_maker object = json_make_object();
        json_put(&object, "step", json_integer(pKa->step));
        json_put_pair(&object, "half_equivalence", pKa->half_equivalence, "half_equivalence_u",
                      pKa->half_equivalence_u);
        json_put_pair(&object, "value", pKa->is_bound ? (double)NAN : pKa->value, "u", pKa->u);
        json_put(&object, "kind", json_text("thermodynamic"));
        json_put_pair(&object, "apparent", pKa->is_bound ? (double)NAN : pKa->apparent,
                      "apparent_u", pKa->apparent_u);
        json_put(&object, "ionic_strength", json_number(pKa->ionic_strength));
        json_put(&object, "temperature_C", json_number(pKa->temperature_C));
        json_put(&object, "bound", pKa->is_bound ? json_text(pKa->bound) : json_null());
        json_add(&array, json_done(&object));
    }
    return json_done(&array);
}

/* {value, u, unit}, or null when the value is not known; `assumes` may be NULL. */
static json_t *quantity_of(double value, double u, const char *unit, const char *assumes)
{
    if (!isfinite(value)) {
        return json_null();
    }
    struct json_maker object = json_make_object();
    json_put_pair(&object, "value", value, "u", u);
    json_put(&object, "unit", json_text(unit));
    if (assumes != NULL) {
        json_put(&object, "assumes", json_text(assumes));
    }
    return json_done(&object);
}

static json_t *verdict_of(const struct wa_verdict *verdict)
{
    static const char *const kinds[] = {"identified", "narrowed", "not in table", "unfit"};
    struct json_maker object = json_make_object();
    json_put(&object, "kind", json_text((size_t)verdict->kind < 4 ? kinds[verdict->kind] : NULL));
    json_put(&object, "forms", json_split(verdict->forms));
    json_put(&object, "probability", json_number(verdict->probability));
    json_put(&object, "sentence", json_text(verdict->sentence != NULL ? verdict->sentence : ""));
    json_put(&object, "threshold", json_number(verdict->threshold));
    return json_done(&object);
}

json_t *json_sentences(const struct wa_result_sentence *sentences, size_t count)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < count; i++) {
        struct json_maker object = json_make_object();
        json_put(&object, "code", json_text(sentences[i].code));
        json_put(&object, "sentence", json_text(sentences[i].sentence));
        json_add(&array, json_done(&object));
    }
    return json_done(&array);
}

static json_t *next_tests_of(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->next_test_count; i++) {
        struct json_maker object = json_make_object();
        json_put(&object, "sentence", json_text(result->next_tests[i].sentence));
        json_put(&object, "separates", json_split(result->next_tests[i].separates));
        json_put(&object, "expected_bits", json_number(result->next_tests[i].expected_bits));
        json_put(&object, "expected_set_size", json_number(result->next_tests[i].expected_set));
        json_add(&array, json_done(&object));
    }
    return json_done(&array);
}

static json_t *table_of(const struct wa_result *result)
{
    struct json_maker object = json_make_object();
    json_put(&object, "version",
             result->table_version[0] != '\0' ? json_text(result->table_version) : json_null());
    json_put(&object, "folder", json_text(result->table_folder));
    json_put(&object, "overlaid_rows", json_integer((json_int_t)result->overlaid_count));
    json_put(&object, "forms_considered", json_integer((json_int_t)result->forms_considered));
    json_put(&object, "forms_fitted", json_integer((json_int_t)result->forms_fitted));
    return json_done(&object);
}

/* Stable keys, in the order of the format. */
static void put_stable(struct json_maker *answer, const struct wa_result *result,
                       const char *version)
{
    struct json_maker not_in_table = json_make_object();
    json_put(&not_in_table, "probability", json_number(result->not_in_table));
    json_put(answer, "program", json_text("whichacid"));
    json_put(answer, "version", json_text(version));
    json_put(answer, "inputs", inputs_of(result));
    json_put(answer, "notes",
             result->runs.count > 0 ? json_notes(&result->runs.runs[0]) : json_object());
    json_put(answer, "equivalence_points", equivalence_points_of(result));
    json_put(answer, "protons", protons_of(result));
    json_put(answer, "pka", pKa_of(result));
    json_put(answer, "molar_mass",
             quantity_of(result->molar_mass, result->molar_mass_u, "g/mol",
                         result->molar_mass_assumes != NULL ? result->molar_mass_assumes : ""));
    json_put(answer, "candidates", json_candidates(result));
    json_put(answer, "not_in_table", json_done(&not_in_table));
    json_put(answer, "verdict", verdict_of(&result->verdict));
    json_put(answer, "set_aside", json_set_aside(result));
    json_put(answer, "cautions", json_sentences(result->cautions, result->caution_count));
    json_put(answer, "next_tests", next_tests_of(result));
}

static void put_additions(struct json_maker *answer, const struct wa_result *result)
{
    json_put(answer, "amount", quantity_of(result->amount_mol, result->amount_u, "mol", NULL));
    json_put(answer, "equivalent_mass",
             quantity_of(result->equivalent_mass, result->equivalent_mass_u, "g/mol", NULL));
    json_put(answer, "findings", json_sentences(result->findings, result->finding_count));
    json_put(answer, "assumptions", json_sentences(result->assumptions, result->assumption_count));
    json_put(answer, "observed", json_observed(result));
    json_put(answer, "comparison", json_comparison(result));
    json_put(answer, "explanation", json_explanation(result));
    json_put(answer, "missing_bits", json_number(result->missing_bits));
    json_put(answer, "table", table_of(result));
    json_put(answer, "runs", json_runs(result));
    json_put(answer, "parameters", json_parameters(result));
    json_put(answer, "fit", json_fit(result));
}

enum wa_status wa_report_json(const struct wa_result *result,
                              const struct wa_report_options *options, char **text,
                              struct wa_error *error)
{
    struct json_maker answer = json_make_object();
    put_stable(&answer, result, options != NULL ? options->version : NULL);
    put_additions(&answer, result);
    json_t *json = json_done(&answer);
    char *bytes = json != NULL ? json_dumps(json, JSON_INDENT(2) | JSON_REAL_PRECISION(15)) : NULL;
    json_decref(json);
    if (bytes == NULL) {
        return wa_fail_memory(error);
    }
    size_t length = strlen(bytes);
    char *closed = realloc(bytes, length + 2);
    if (closed == NULL) {
        free(bytes);
        return wa_fail_memory(error);
    }
    memcpy(closed + length, "\n", 2);
    *text = closed;
    return WA_OK;
}
