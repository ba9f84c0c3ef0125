/* A list of buffer readings to their pH at temperature. */
#include "whichacid/bench_calibrate.h"

#include "base/file.h"
#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define FILE_LIMIT (1u << 20)
#define CELLS_MAX 6

enum column { column_buffer, column_temperature, column_reading, column_count };

/* The list under way. */
struct list {
    const char *path;
    const struct wa_table *table;
    struct wa_electrode *electrode;
    char delimiter;
    int places[column_count]; /* cell of each column, -1: none */
    bool headed;
};

static bool same_word(const char *a, const char *b)
{
    char x[96], y[96];
    wa_text_fold(a, strlen(a), x, sizeof x);
    wa_text_fold(b, strlen(b), y, sizeof y);
    return strcmp(x, y) == 0;
}

bool wa_buffer_pH(const struct wa_table *table, const char *name, double temperature_C, double *pH,
                  double *u)
{
    const struct wa_buffer *below = NULL, *above = NULL;
    for (size_t i = 0; i < table->buffer_count; i++) {
        const struct wa_buffer *row = &table->buffers[i];
        if (!same_word(row->key, name) && !same_word(row->name, name)) {
            continue;
        }
        const double t = row->temperature_C;
        if (t <= temperature_C && (below == NULL || t > below->temperature_C)) {
            below = row;
        }
        if (t >= temperature_C && (above == NULL || t < above->temperature_C)) {
            above = row;
        }
    }
    if (below == NULL || above == NULL) {
        return false;
    }
    const double gap = above->temperature_C - below->temperature_C;
    const double share = gap > 0.0 ? (temperature_C - below->temperature_C) / gap : 0.0;
    *pH = below->pH + share * (above->pH - below->pH);
    *u = fmax(below->u, above->u);
    return true;
}

static bool in_table(const struct wa_table *table, const char *name)
{
    for (size_t i = 0; i < table->buffer_count; i++) {
        if (same_word(table->buffers[i].key, name) || same_word(table->buffers[i].name, name)) {
            return true;
        }
    }
    return false;
}

/* Split a line in place; cells are trimmed, their quotes taken off. */
static int split(char *line, char delimiter, char *cells[CELLS_MAX])
{
    int count = 0;
    for (char *at = line; at != NULL && count < CELLS_MAX; count++) {
        char *end = strchr(at, delimiter);
        if (end != NULL) {
            *end = '\0';
        }
        const char *start = at;
        size_t length = strlen(at);
        wa_text_trim(&start, &length);
        if (length > 1 && start[0] == '"' && start[length - 1] == '"') {
            start++;
            length -= 2;
        }
        cells[count] = at + (start - at);
        cells[count][length] = '\0';
        at = end != NULL ? end + 1 : NULL;
    }
    return count;
}

static char delimiter_of(const char *line)
{
    return strchr(line, ';') != NULL ? ';' : strchr(line, '\t') != NULL ? '\t' : ',';
}

static enum wa_status take_header(struct list *list, char *line, long number,
                                  struct wa_error *error)
{
    char *cells[CELLS_MAX];
    list->delimiter = delimiter_of(line);
    const int count = split(line, list->delimiter, cells);
    for (int c = 0; c < column_count; c++) {
        list->places[c] = -1;
    }
    for (int i = 0; i < count; i++) {
        char word[96];
        wa_text_fold(cells[i], strlen(cells[i]), word, sizeof word);
        if (strncmp(word, "buffer", 6) == 0) {
            list->places[column_buffer] = i;
        } else if (strncmp(word, "temp", 4) == 0 || strcmp(word, "t") == 0) {
            list->places[column_temperature] = i;
        } else if (strstr(word, "mv") != NULL || strstr(word, "ph") != NULL) {
            list->places[column_reading] = i;
            list->electrode->in_mV = strstr(word, "mv") != NULL;
        }
    }
    list->headed = list->places[column_buffer] >= 0 && list->places[column_reading] >= 0;
    return list->headed ? WA_OK
                        : wa_fail(error, WA_ERROR_INPUT, list->path, number,
                                  "The first line must name the columns, such as "
                                  "'buffer,temperature,mV' or 'buffer,temperature,pH'.");
}

static enum wa_status look_up(const struct list *list, struct wa_buffer_reading *reading,
                              struct wa_error *error)
{
    struct wa_quantity value;
    if (in_table(list->table, reading->buffer)) {
        return wa_buffer_pH(list->table, reading->buffer, reading->temperature_C, &reading->pH,
                            &reading->pH_u)
                   ? WA_OK
                   : wa_fail(error, WA_ERROR_INPUT, list->path, reading->line,
                             "The table has no pH of the buffer '%s' at %g °C.", reading->buffer,
                             reading->temperature_C);
    }
    if (wa_quantity_parse(reading->buffer, WA_DIMENSION_PH, &value, NULL) != WA_OK ||
        !(value.value > 0.0 && value.value < 14.0)) {
        return wa_fail(error, WA_ERROR_INPUT, list->path, reading->line,
                       "'%s' is neither a buffer of the table nor a pH; buffers.csv lists them, "
                       "such as phthalate, phosphate or borax.",
                       reading->buffer);
    }
    reading->pH = value.value;
    reading->pH_u = value.has_u ? value.u : WA_DEFAULT_BUFFER_U;
    return WA_OK;
}

static enum wa_status take_row(struct list *list, char *line, long number, struct wa_error *error)
{
    char *cells[CELLS_MAX];
    const int count = split(line, list->delimiter, cells);
    const int *at = list->places;
    struct wa_quantity value = {.value = NAN}, temperature = {.value = 25.0};
    const enum wa_dimension dimension =
        list->electrode->in_mV ? WA_DIMENSION_VOLTAGE : WA_DIMENSION_PH;
    if (at[column_buffer] >= count || at[column_reading] >= count ||
        wa_quantity_parse(cells[at[column_reading]], dimension, &value, NULL) != WA_OK ||
        (at[column_temperature] >= 0 && at[column_temperature] < count &&
         wa_quantity_parse(cells[at[column_temperature]], WA_DIMENSION_TEMPERATURE, &temperature,
                           NULL) != WA_OK)) {
        return wa_fail(error, WA_ERROR_INPUT, list->path, number,
                       "This line is no buffer reading; write it like 'phthalate,25.0,172.3'.");
    }
    if (list->electrode->count == WA_BUFFER_READINGS_MAX) {
        return wa_fail(error, WA_ERROR_INPUT, list->path, number,
                       "More than %d buffer readings; keep those of one calibration.",
                       WA_BUFFER_READINGS_MAX);
    }
    struct wa_buffer_reading *reading = &list->electrode->readings[list->electrode->count++];
    *reading = (struct wa_buffer_reading){
        .temperature_C = temperature.value, .reading = value.value, .line = number};
    snprintf(reading->buffer, sizeof reading->buffer, "%s", cells[at[column_buffer]]);
    return look_up(list, reading, error);
}

enum wa_status wa_electrode_read(const char *path, const struct wa_table *table,
                                 struct wa_electrode *electrode, struct wa_error *error)
{
    char *bytes = NULL;
    size_t size = 0;
    *electrode = (struct wa_electrode){.count = 0};
    struct list list = {.path = path, .table = table, .electrode = electrode};
    enum wa_status status = wa_file_read(path, FILE_LIMIT, &bytes, &size, error);
    long number = 0;
    char *next = status == WA_OK ? bytes : NULL;
    if (next != NULL && strncmp(next, "\xEF\xBB\xBF", 3) == 0) {
        next += 3;
    }
    while (next != NULL && status == WA_OK) {
        char *line = next;
        next = strchr(line, '\n');
        if (next != NULL) {
            *next++ = '\0';
        }
        number++;
        const char first = line[strspn(line, " \t\r,;")];
        if (first != '\0' && first != '#') {
            status = list.headed ? take_row(&list, line, number, error)
                                 : take_header(&list, line, number, error);
        }
    }
    free(bytes);
    if (status == WA_OK && electrode->count == 0) {
        status = wa_fail(error, WA_ERROR_INPUT, path, 0, "The file holds no buffer reading.");
    }
    return status;
}
