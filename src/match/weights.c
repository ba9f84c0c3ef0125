#include "whichacid/weights.h"

#include "base/file.h"
#include "base/grow.h"
#include "base/number.h"
#include "base/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const size_t file_limit = 1 << 20;
static const char byte_order_mark[] = "\xEF\xBB\xBF";

/* Where a load stands. */
struct loading {
    const char *path;
    const struct wa_table *table;
    struct wa_weight_list *list;
    size_t capacity;
    long line;
};

/* Cut one cell off the front of a line; `separator` tells whether another follows. */
static void next_cell(const char **at, const char *end, const char **cell, size_t *length,
                      bool *separator)
{
    const char *from = *at;
    while (from < end && (*from == ' ' || *from == '\t')) {
        from++;
    }
    const char *to = from;
    if (from < end && *from == '"') {
        from++;
        to = memchr(from, '"', (size_t)(end - from));
        to = to != NULL ? to : end;
        *at = to < end ? to + 1 : end;
        while (*at < end && strchr(",;\t", **at) == NULL) {
            (*at)++;
        }
    } else {
        while (to < end && strchr(",;\t", *to) == NULL) {
            to++;
        }
        *at = to;
    }
    *separator = *at < end;
    *at += *separator ? 1 : 0;
    *cell = from;
    *length = (size_t)(to - from);
    wa_text_trim(cell, length);
}

static enum wa_status read_weight(const struct loading *load, const char *cell, size_t length,
                                  double *weight, struct wa_error *error)
{
    struct wa_number number;
    if (length == 0) {
        return WA_OK;
    }
    if (wa_number_parse(cell, length, &number) != length || !(number.value >= 0.0) ||
        number.grouped || !isfinite(number.value)) {
        return wa_fail(error, WA_ERROR_CALL, load->path, load->line,
                       "'%.*s' is no weight: write a number from 0.", (int)length, cell);
    }
    *weight = number.value;
    return WA_OK;
}

static enum wa_status set_once(const struct loading *load, double *place, double weight,
                               const char *key, struct wa_error *error)
{
    if (!isnan(*place)) {
        return wa_fail(error, WA_ERROR_CALL, load->path, load->line, "'%s' is given twice.", key);
    }
    *place = weight;
    return WA_OK;
}

/* A key that an acid and a form share means the acid in all its forms. */
static enum wa_status add_row(struct loading *load, char *key, double weight,
                              struct wa_error *error)
{
    struct wa_weight_list *list = load->list;
    const int acid = wa_table_find_acid(load->table, key);
    const int form = acid < 0 ? wa_table_find_form(load->table, key) : -1;
    if (acid < 0 && form < 0) {
        return wa_fail(error, WA_ERROR_CALL, load->path, load->line,
                       "The table has no acid or form '%.100s'; `whichacid table list` shows all.",
                       key);
    }
    for (size_t i = 0; i < list->count; i++) {
        if (list->weights[i].acid == acid && list->weights[i].form == form) {
            return wa_fail(error, WA_ERROR_CALL, load->path, load->line,
                           "'%.100s' is given twice, first on line %ld.", key,
                           list->weights[i].line);
        }
    }
    if (!wa_grow(&list->weights, &load->capacity, list->count + 1, sizeof *list->weights)) {
        return wa_fail_memory(error);
    }
    list->weights[list->count++] = (struct wa_weight){
        .key = key, .acid = acid, .form = form, .weight = weight, .line = load->line};
    return WA_OK;
}

static enum wa_status read_line(struct loading *load, const char *line, size_t length,
                                struct wa_error *error)
{
    const char *at = line, *end = line + length, *cell, *second = "";
    size_t cell_length, second_length = 0;
    bool more;
    next_cell(&at, end, &cell, &cell_length, &more);
    if (more) {
        next_cell(&at, end, &second, &second_length, &more);
    }
    if (cell_length == 0 || *cell == '#' ||
        (load->list->count == 0 && cell_length == 3 && strncmp(cell, "key", 3) == 0)) {
        return WA_OK;
    }
    double weight = 1.0;
    enum wa_status status = read_weight(load, second, second_length, &weight, error);
    if (status != WA_OK) {
        return status;
    }
    char *key = wa_text_copy(cell, cell_length);
    if (key == NULL) {
        return wa_fail_memory(error);
    }
    if (strcmp(key, WA_WEIGHT_REST) == 0 || strcmp(key, WA_WEIGHT_NOT_IN_TABLE) == 0) {
        double *place =
            strcmp(key, WA_WEIGHT_REST) == 0 ? &load->list->rest : &load->list->not_in_table;
        status = set_once(load, place, weight, key, error);
        free(key);
        return status;
    }
    status = add_row(load, key, weight, error);
    if (status != WA_OK) {
        free(key);
    }
    return status;
}

static enum wa_status check_sum(const struct loading *load, struct wa_error *error)
{
    double sum = isnan(load->list->rest) ? 0.0 : load->list->rest;
    for (size_t i = 0; i < load->list->count; i++) {
        sum += load->list->weights[i].weight;
    }
    return sum > 0.0 && isfinite(sum) ? WA_OK
                                      : wa_fail(error, WA_ERROR_INPUT, load->path, 0,
                                                "No row gives an acid or form a weight above 0.");
}

enum wa_status wa_weights_load(const char *path, const struct wa_table *table,
                               struct wa_weight_list *list, struct wa_error *error)
{
    struct wa_weight_list read = {.rest = NAN, .not_in_table = NAN};
    struct loading load = {.path = path, .table = table, .list = &read};
    char *bytes;
    size_t size;
    enum wa_status status = wa_file_read(path, file_limit, &bytes, &size, error);
    if (status != WA_OK) {
        return status;
    }
    const char *at = bytes, *end = bytes + size;
    at += strncmp(at, byte_order_mark, 3) == 0 ? 3 : 0;
    while (status == WA_OK && at < end) {
        const char *stop = memchr(at, '\n', (size_t)(end - at));
        stop = stop != NULL ? stop : end;
        load.line++;
        const size_t length = (size_t)(stop - at);
        status =
            read_line(&load, at, length > 0 && at[length - 1] == '\r' ? length - 1 : length, error);
        at = stop < end ? stop + 1 : end;
    }
    free(bytes);
    if (status == WA_OK) {
        status = check_sum(&load, error);
    }
    if (status != WA_OK) {
        wa_weights_free(&read);
        return status;
    }
    *list = read;
    return WA_OK;
}

void wa_weights_free(struct wa_weight_list *list)
{
    if (list != NULL) {
        for (size_t i = 0; i < list->count; i++) {
            free(list->weights[i].key);
        }
        free(list->weights);
        *list = (struct wa_weight_list){.count = 0};
    }
}
