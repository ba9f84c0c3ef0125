#include "command/inspect_report.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define WIDTH 80

/* A sentence broken at spaces, each further line indented like the first. */
static void append_wrapped(struct wa_text *text, const char *lead, size_t indent,
                           const char *sentence)
{
    wa_text_append(text, "%*s%s", (int)(indent - wa_text_columns(lead)), "", lead);
    size_t column = indent;
    for (const char *word = sentence; *word != '\0';) {
        size_t length = strcspn(word, " ");
        char copy[512];
        size_t taken = length < sizeof copy - 1 ? length : sizeof copy - 1;
        memcpy(copy, word, taken);
        copy[taken] = '\0';
        size_t columns = wa_text_columns(copy);
        if (column > indent && column + 1 + columns > WIDTH) {
            wa_text_append(text, "\n%*s", (int)indent, "");
            column = indent;
        }
        wa_text_append(text, "%s%s", column > indent ? " " : "", copy);
        column += columns + (column > indent);
        word += length + (word[length] == ' ');
    }
    wa_text_append(text, "\n");
}

static const char *delimiter_word(char delimiter)
{
    switch (delimiter) {
    case ',':
        return "commas";
    case ';':
        return "semicolons";
    case '\t':
        return "tabs";
    case '|':
        return "bars";
    default:
        return "spaces";
    }
}

static const char *volume_kind_words(const struct wa_run *run)
{
    return run->volume_kind == WA_VOLUME_TOTAL       ? "running totals"
           : run->volume_kind == WA_VOLUME_INCREMENT ? "single additions, summed here"
           : run->volume_direction < 0               ? "burette readings counting down"
                                                     : "burette readings counting up";
}

static const char *origin_words(enum wa_origin origin, long line, char *buffer, size_t size)
{
    if (origin == WA_ORIGIN_NOTE && line > 0) {
        snprintf(buffer, size, "line %ld", line);
    } else {
        snprintf(buffer, size, "%s",
                 origin == WA_ORIGIN_OPTION ? "option"
                 : origin == WA_ORIGIN_NOTE ? "notes"
                                            : "assumed");
    }
    return buffer;
}

static void append_column(struct wa_text *text, const char *what, const char *header,
                          const char *rest)
{
    char line[400];
    if (header[0] != '\0') {
        snprintf(line, sizeof line, "column '%s', %s", header, rest);
    } else {
        snprintf(line, sizeof line, "column without a header, %s", rest);
    }
    append_wrapped(text, what, 12, line);
}

static void append_how(struct wa_text *text, const struct wa_run *run)
{
    char line[256];
    snprintf(line, sizeof line, "%s; cells parted by %s; decimal %s", run->encoding,
             delimiter_word(run->delimiter), run->decimal_mark == ',' ? "comma" : "point");
    append_wrapped(text, "  Text      ", 12, line);
    snprintf(line, sizeof line, "in %s, %s", run->volume_unit, volume_kind_words(run));
    append_column(text, "  Volume    ", run->volume_header, line);
    snprintf(line, sizeof line, "%s%s", strcmp(run->reading_unit, "pH") == 0 ? "pH" : "in ",
             strcmp(run->reading_unit, "pH") == 0 ? "" : run->reading_unit);
    append_column(text, "  Reading   ", run->reading_header, line);
    snprintf(line, sizeof line, "%zu used, %zu set aside", run->point_count, run->set_aside_count);
    append_wrapped(text, "  Rows      ", 12, line);
}

static void append_padded(struct wa_text *text, const char *words, size_t columns)
{
    size_t used = wa_text_columns(words);
    wa_text_append(text, "%s%*s", words, used < columns ? (int)(columns - used) : 0, "");
}

static void append_notes(struct wa_text *text, const struct wa_run *run)
{
    if (run->note_count == 0) {
        return;
    }
    wa_text_append(text, "\nNotes, as written\n");
    for (size_t i = 0; i < run->note_count; i++) {
        const struct wa_note *note = &run->notes[i];
        char origin[32];
        char line[1200];
        snprintf(line, sizeof line, "%.1000s (%s)", note->text,
                 origin_words(note->origin, note->line, origin, sizeof origin));
        char name[80];
        snprintf(name, sizeof name, "  %s", note->name);
        if (wa_text_columns(name) > 26) {
            wa_text_append(text, "%s\n", name);
            append_wrapped(text, "", 28, line);
        } else {
            append_padded(text, name, 28);
            struct wa_text wrapped = {0};
            append_wrapped(&wrapped, "", 28, line);
            wa_text_append(text, "%s", wrapped.bytes != NULL ? wrapped.bytes + 28 : "\n");
            text->failed = text->failed || wrapped.failed;
            wa_text_free(&wrapped);
        }
    }
}

/* A quantity that the computation uses. */
struct used {
    const char *name;
    const struct wa_noted *noted;
    enum wa_dimension dimension;
};

static void append_used(struct wa_text *text, const struct used *used)
{
    const struct wa_noted *noted = used->noted;
    if (!noted->known) {
        return;
    }
    bool fraction = used->dimension == WA_DIMENSION_FRACTION;
    double scale = fraction ? 100 : 1;
    char value[80];
    char line[160];
    char origin[32];
    char name[64];
    wa_quantity_format(value, sizeof value, scale * noted->quantity.value,
                       noted->quantity.has_u ? scale * noted->quantity.u : 0);
    snprintf(line, sizeof line, "%s %s", value,
             fraction ? "%" : wa_dimension_unit(used->dimension));
    snprintf(name, sizeof name, "  %s", used->name);
    append_padded(text, name, 28);
    append_padded(text, line, 36);
    wa_text_append(text, "%s\n", origin_words(noted->origin, noted->line, origin, sizeof origin));
}

static void append_values(struct wa_text *text, const struct wa_run *run)
{
    const struct wa_conditions *c = &run->conditions;
    enum wa_dimension reading =
        run->reading_kind == WA_READING_PH ? WA_DIMENSION_PH : WA_DIMENSION_VOLTAGE;
    const struct used all[] = {
        {"sample mass", &c->sample_mass, WA_DIMENSION_MASS},
        {"sample volume", &c->sample_volume, WA_DIMENSION_VOLUME},
        {"sample density", &c->sample_density, WA_DIMENSION_DENSITY},
        {"aliquot", &c->aliquot, WA_DIMENSION_FRACTION},
        {"solution volume", &c->solution_volume, WA_DIMENSION_VOLUME},
        {"titrant concentration", &c->titrant_concentration, WA_DIMENSION_CONCENTRATION},
        {"titrant carbonate", &c->titrant_carbonate, WA_DIMENSION_FRACTION},
        {"temperature", &c->temperature, WA_DIMENSION_TEMPERATURE},
        {"background electrolyte", &c->background, WA_DIMENSION_CONCENTRATION},
        {"blank", &c->blank, WA_DIMENSION_VOLUME},
        {"electrode slope", &c->electrode_slope, WA_DIMENSION_FRACTION},
        {"electrode offset", &c->electrode_offset, WA_DIMENSION_PH},
        {"reading uncertainty", &c->reading_uncertainty, reading},
        {"volume uncertainty", &c->volume_uncertainty, WA_DIMENSION_VOLUME},
    };
    wa_text_append(text, "\nValues that the computation uses (± one standard uncertainty)\n");
    for (size_t i = 0; i < sizeof all / sizeof all[0]; i++) {
        append_used(text, &all[i]);
    }
}

static void append_remarks(struct wa_text *text, const struct wa_run *run)
{
    if (run->remark_count > 0) {
        wa_text_append(text, "\nAssumed and noticed\n");
    }
    for (size_t i = 0; i < run->remark_count; i++) {
        append_wrapped(text, "- ", 4, run->remarks[i]);
    }
}

static void append_set_aside(struct wa_text *text, const struct wa_set_aside *row)
{
    char lead[40];
    snprintf(lead, sizeof lead, "%8ld  ", row->line);
    char flat[160];
    snprintf(flat, sizeof flat, "%s", row->text);
    for (char *at = flat; *at != '\0'; at++) {
        *at = *at == '\t' || *at == '\n' ? ' ' : *at;
    }
    append_wrapped(text, lead, 10, flat);
    append_wrapped(text, "set aside: ", 21, row->reason);
}

static void append_point(struct wa_text *text, const struct wa_run *run,
                         const struct wa_point *point)
{
    int total_decimals = run->volume_decimals;
    if (strcmp(run->volume_unit, "µL") == 0) {
        total_decimals += 3;
    }
    wa_text_append(text, "%8ld  %17.*f  %10.*f  ", point->line, run->volume_decimals,
                   point->written_volume, total_decimals, point->volume_mL);
    if (run->reading_from_mV) {
        wa_text_append(text, "%10.3f  used (%.*f %s)\n", point->reading, run->reading_decimals,
                       point->written_reading, run->reading_unit);
    } else {
        wa_text_append(text, "%10.*f  used\n", run->reading_decimals,
                       strcmp(run->reading_unit, "V") == 0 ? point->written_reading
                                                           : point->reading);
    }
}

static void append_rows(struct wa_text *text, const struct wa_run *run)
{
    const char *reading = run->reading_kind == WA_READING_PH    ? "pH"
                          : strcmp(run->reading_unit, "V") == 0 ? "V"
                                                                : "mV";
    char written[40];
    snprintf(written, sizeof written, "as written (%s)", run->volume_unit);
    wa_text_append(text, "\nRow by row\n    line  %*s  total (mL)  %10s\n",
                   (int)(17 + strlen(written) - wa_text_columns(written)), written, reading);
    size_t aside = 0;
    for (size_t i = 0; i <= run->point_count; i++) {
        long line = i < run->point_count ? run->points[i].line : 0;
        while (aside < run->set_aside_count &&
               (i == run->point_count || run->set_aside[aside].line < line)) {
            append_set_aside(text, &run->set_aside[aside++]);
        }
        if (i < run->point_count) {
            append_point(text, run, &run->points[i]);
        }
    }
}

enum wa_status inspect_report_text(const struct wa_run_list *list, struct wa_text *text,
                                   struct wa_error *error)
{
    for (size_t i = 0; i < list->count; i++) {
        const struct wa_run *run = &list->runs[i];
        wa_text_append(text, "%s%s", i > 0 ? "\n" : "", run->file);
        if (list->count > 1) {
            wa_text_append(text, ": run %zu of %zu (%s)", i + 1, list->count,
                           run->heading != NULL ? run->heading : "no heading");
        }
        wa_text_append(text, "\n");
        append_how(text, run);
        append_notes(text, run);
        append_values(text, run);
        append_remarks(text, run);
        append_rows(text, run);
    }
    return text->failed ? wa_fail_memory(error) : WA_OK;
}
