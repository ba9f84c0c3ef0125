/* JSON of what was read: notes, runs, rows set aside. */
#include "report/json_internal.h"

#include "report/report_internal.h"

#include <math.h>
#include <string.h>

static const char *origin_word(enum wa_origin origin)
{
    static const char *const words[] = {"default", "note", "option"};
    return (size_t)origin < sizeof words / sizeof words[0] ? words[origin] : "default";
}

static json_t *note_of(json_t *value, double u, const char *unit, enum wa_origin origin, long line)
{
    struct json_maker note = json_make_object();
    json_put(&note, "value", value);
    json_put(&note, "u", json_number(u));
    json_put(&note, "unit", json_text(unit));
    json_put(&note, "from", json_text(origin_word(origin)));
    json_put(&note, "line", line > 0 ? json_integer(line) : json_null());
    return json_done(&note);
}

/* The texts as given, by known name; of several for one name the one that is in force. */
static void put_texts(struct json_maker *notes, const struct wa_run *run)
{
    for (size_t i = 0; i < run->note_count; i++) {
        const struct wa_note *note = &run->notes[i];
        const char *known = report_note_name(note);
        if (wa_run_find_note(run, known) != note) {
            continue;
        }
        struct wa_text name = {0};
        report_clean(&name, known, false);
        if (name.failed) {
            notes->failed = true;
        } else {
            json_put(notes, name.bytes,
                     note_of(json_text(note->text), NAN, NULL, note->origin, note->line));
        }
        wa_text_free(&name);
    }
}

json_t *json_notes(const struct wa_run *run)
{
    struct json_maker notes = json_make_object();
    put_texts(&notes, run);
    struct report_condition list[16];
    size_t count = report_conditions(&run->conditions, list);
    for (size_t i = 0; i < count; i++) {
        const struct wa_noted *noted = list[i].noted;
        if (noted->known) {
            const char *unit = list[i].dimension == WA_DIMENSION_FRACTION
                                   ? "1"
                                   : wa_dimension_unit(list[i].dimension);
            json_put(&notes, list[i].name,
                     note_of(json_number(noted->quantity.value),
                             noted->quantity.has_u ? noted->quantity.u : NAN,
                             unit[0] != '\0' ? unit : "1", noted->origin, noted->line));
        }
    }
    return json_done(&notes);
}

static json_t *remarks_of(char *const *remarks, size_t count)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < count; i++) {
        json_add(&array, json_text(remarks[i]));
    }
    return json_done(&array);
}

static json_t *run_of(const struct wa_run *run, const struct wa_curve *curve)
{
    static const char *const kinds[] = {"total", "burette", "increment"};
    struct json_maker object = json_make_object();
    json_put(&object, "file", json_text(run->file));
    json_put(&object, "heading", json_text(run->heading));
    json_put(&object, "points", json_integer((json_int_t)run->point_count));
    json_put(&object, "reading", json_text(run->reading_kind == WA_READING_MV ? "mV" : "pH"));
    json_put(&object, "volume_reading",
             json_text((size_t)run->volume_kind < 3 ? kinds[run->volume_kind] : NULL));
    json_put(&object, "notes", json_notes(run));
    json_put(&object, "remarks", remarks_of(run->remarks, run->remark_count));
    json_put(&object, "curve_remarks",
             curve != NULL ? remarks_of(curve->remarks, curve->remark_count) : json_array());
    return json_done(&object);
}

json_t *json_runs(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->runs.count; i++) {
        json_add(&array,
                 run_of(&result->runs.runs[i], result->curves != NULL ? &result->curves[i] : NULL));
    }
    return json_done(&array);
}

json_t *json_set_aside(const struct wa_result *result)
{
    struct json_maker array = json_make_array();
    for (size_t i = 0; i < result->runs.count; i++) {
        const struct wa_run *run = &result->runs.runs[i];
        for (size_t k = 0; k < run->set_aside_count; k++) {
            struct json_maker row = json_make_object();
            json_put(&row, "file", json_text(run->file));
            json_put(&row, "line", json_integer(run->set_aside[k].line));
            json_put(&row, "text", json_text(run->set_aside[k].text));
            json_put(&row, "reason", json_text(run->set_aside[k].reason));
            json_add(&array, json_done(&row));
        }
    }
    return json_done(&array);
}
