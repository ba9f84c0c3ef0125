/* The JSON of `inspect`. */
#include "command/inspect_report.h"

#include <jansson.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Texts come from files: what is not UTF-8 after all must not lose the whole result. */
static json_t *text_or_empty(const char *text)
{
    json_t *value = json_string(text != NULL ? text : "");
    return value != NULL ? value : json_string("");
}

static json_t *number_or_null(double value)
{
    return isfinite(value) ? json_real(value) : json_null();
}

static const char *origin_word(enum wa_origin origin)
{
    return origin == WA_ORIGIN_OPTION ? "option" : origin == WA_ORIGIN_NOTE ? "note" : "default";
}

static json_t *json_points(const struct wa_run *run)
{
    json_t *points = json_array();
    for (size_t i = 0; i < run->point_count; i++) {
        const struct wa_point *point = &run->points[i];
        json_array_append_new(points, json_pack("{s:I,s:o,s:o,s:o,s:o,s:o,s:o}", "line",
                                                (json_int_t)point->line, "volume_written",
                                                number_or_null(point->written_volume), "volume_mL",
                                                number_or_null(point->volume_mL), "reading_written",
                                                number_or_null(point->written_reading), "reading",
                                                number_or_null(point->reading), "time_s",
                                                number_or_null(point->time_s), "temperature_C",
                                                number_or_null(point->temperature_C)));
    }
    return points;
}

static json_t *json_notes(const struct wa_run *run)
{
    json_t *notes = json_array();
    for (size_t i = 0; i < run->note_count; i++) {
        const struct wa_note *note = &run->notes[i];
        json_array_append_new(notes,
                              json_pack("{s:o,s:o,s:s,s:I}", "name", text_or_empty(note->name),
                                        "text", text_or_empty(note->text), "from",
                                        origin_word(note->origin), "line", (json_int_t)note->line));
    }
    return notes;
}

static json_t *json_set_aside(const struct wa_run *run)
{
    json_t *rows = json_array();
    for (size_t i = 0; i < run->set_aside_count; i++) {
        const struct wa_set_aside *row = &run->set_aside[i];
        json_array_append_new(rows, json_pack("{s:o,s:I,s:o,s:o}", "file", text_or_empty(run->file),
                                              "line", (json_int_t)row->line, "text",
                                              text_or_empty(row->text), "reason",
                                              text_or_empty(row->reason)));
    }
    return rows;
}

static json_t *json_remarks(const struct wa_run *run)
{
    json_t *remarks = json_array();
    for (size_t i = 0; i < run->remark_count; i++) {
        json_array_append_new(remarks, text_or_empty(run->remarks[i]));
    }
    return remarks;
}

static void add_value(json_t *values, const char *name, const struct wa_noted *noted,
                      enum wa_dimension dimension)
{
    if (noted->known) {
        json_object_set_new(
            values, name,
            json_pack("{s:f,s:o,s:s,s:s,s:I}", "value", noted->quantity.value, "u",
                      noted->quantity.has_u ? json_real(noted->quantity.u) : json_null(), "unit",
                      wa_dimension_unit(dimension), "from", origin_word(noted->origin), "line",
                      (json_int_t)noted->line));
    }
}

static json_t *json_values(const struct wa_run *run)
{
    const struct wa_conditions *c = &run->conditions;
    json_t *values = json_object();
    add_value(values, "sample mass", &c->sample_mass, WA_DIMENSION_MASS);
    add_value(values, "sample volume", &c->sample_volume, WA_DIMENSION_VOLUME);
    add_value(values, "sample density", &c->sample_density, WA_DIMENSION_DENSITY);
    add_value(values, "aliquot", &c->aliquot, WA_DIMENSION_FRACTION);
    add_value(values, "solution volume", &c->solution_volume, WA_DIMENSION_VOLUME);
    add_value(values, "titrant concentration", &c->titrant_concentration,
              WA_DIMENSION_CONCENTRATION);
    add_value(values, "titrant carbonate", &c->titrant_carbonate, WA_DIMENSION_FRACTION);
    add_value(values, "temperature", &c->temperature, WA_DIMENSION_TEMPERATURE);
    add_value(values, "background electrolyte", &c->background, WA_DIMENSION_CONCENTRATION);
    add_value(values, "blank", &c->blank, WA_DIMENSION_VOLUME);
    add_value(values, "electrode slope", &c->electrode_slope, WA_DIMENSION_FRACTION);
    add_value(values, "electrode offset", &c->electrode_offset, WA_DIMENSION_PH);
    add_value(values, "reading uncertainty", &c->reading_uncertainty,
              run->reading_kind == WA_READING_PH ? WA_DIMENSION_PH : WA_DIMENSION_VOLTAGE);
    add_value(values, "volume uncertainty", &c->volume_uncertainty, WA_DIMENSION_VOLUME);
    return values;
}

static json_t *json_run(const struct wa_run *run)
{
    static const char *const kinds[] = {"total", "burette", "increment"};
    char delimiter[2] = {run->delimiter, '\0'};
    char mark[2] = {run->decimal_mark, '\0'};
    json_t *object = json_object();
    json_object_set_new(object, "file", text_or_empty(run->file));
    json_object_set_new(object, "heading",
                        run->heading != NULL ? text_or_empty(run->heading) : json_null());
    json_object_set_new(object, "encoding", text_or_empty(run->encoding));
    json_object_set_new(object, "delimiter", text_or_empty(delimiter));
    json_object_set_new(object, "decimal_mark", text_or_empty(mark));
    json_object_set_new(object, "volume_header", text_or_empty(run->volume_header));
    json_object_set_new(object, "volume_unit", text_or_empty(run->volume_unit));
    json_object_set_new(object, "volume_reading", text_or_empty(kinds[run->volume_kind]));
    json_object_set_new(object, "volume_direction", json_integer(run->volume_direction));
    json_object_set_new(object, "reading_header", text_or_empty(run->reading_header));
    json_object_set_new(object, "reading_unit", text_or_empty(run->reading_unit));
    json_object_set_new(object, "reading",
                        json_string(run->reading_kind == WA_READING_PH ? "pH" : "mV"));
    json_object_set_new(object, "reading_from_mV", json_boolean(run->reading_from_mV));
    json_object_set_new(object, "notes", json_notes(run));
    json_object_set_new(object, "values", json_values(run));
    json_object_set_new(object, "remarks", json_remarks(run));
    json_object_set_new(object, "points", json_points(run));
    json_object_set_new(object, "set_aside", json_set_aside(run));
    return object;
}

enum wa_status inspect_report_json(const struct wa_run_list *list, struct wa_text *text,
                                   struct wa_error *error)
{
    json_t *runs = json_array();
    for (size_t i = 0; i < list->count; i++) {
        json_array_append_new(runs, json_run(&list->runs[i]));
    }
    json_t *root = json_pack("{s:s,s:s,s:o}", "program", "whichacid", "version", WHICHACID_VERSION,
                             "runs", runs);
    char *dump = root != NULL ? json_dumps(root, JSON_INDENT(2) | JSON_REAL_PRECISION(15)) : NULL;
    if (dump != NULL) {
        wa_text_append_bytes(text, dump, strlen(dump));
        wa_text_append_bytes(text, "\n", 1);
    }
    bool failed = dump == NULL || text->failed;
    free(dump);
    json_decref(root);
    return failed ? wa_fail_memory(error) : WA_OK;
}
