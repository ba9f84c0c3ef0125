/* Cells with a meaning: numbers as spreadsheets write them, needed cells, rows with a key. */
#include "reference/reference_internal.h"

#include <ctype.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define NUMBER_TEXT_MAX 40

/* A plain decimal number of at most 15 digits: both the digits and the power of ten are exact in
 * double, so their quotient is the nearest double. @return false when it is not as plain as that */
static bool plain_number(const char *text, double *value)
{
    static const double powers[] = {1e0, 1e1, 1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                    1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15};
    bool negative = *text == '-';
    double digits = 0.0;
    int count = 0;
    int behind = -1;
    for (text += negative; *text != '\0'; text++) {
        if (isdigit((unsigned char)*text) && count < 15) {
            digits = digits * 10.0 + (*text - '0');
            count++;
            behind += behind >= 0;
        } else if ((*text == '.' || *text == ',') && behind < 0) {
            behind = 0;
        } else {
            return false;
        }
    }
    if (count == 0) {
        return false;
    }
    digits /= powers[behind > 0 ? behind : 0];
    *value = negative ? -digits : digits;
    return true;
}

bool table_number(const char *text, double *value)
{
    if (plain_number(text, value)) {
        return true;
    }
    char plain[NUMBER_TEXT_MAX];
    size_t length = 0;
    size_t marks = 0;
    for (; *text != '\0'; text++) {
        char sign = *text;
        if (strncmp(text, "−", strlen("−")) == 0) {
            sign = '-';
            text += strlen("−") - 1;
        }
        if (sign == ',' || sign == '.') {
            sign = '.';
            marks++;
        }
        if (length + 1 >= NUMBER_TEXT_MAX ||
            (!isdigit((unsigned char)sign) && strchr(".-+eE", sign) == NULL)) {
            return false;
        }
        plain[length] = sign;
        length++;
    }
    plain[length] = '\0';
    char *end = plain;
    double number = strtod(plain, &end);
    if (length == 0 || *end != '\0' || marks > 1 || !isfinite(number)) {
        return false;
    }
    *value = number;
    return true;
}

const char *required_cell(struct loader *loader, const struct table_file *file,
                          const struct table_row *row, int column)
{
    const char *text = table_cell(file, row, column);
    if (text[0] == '\0') {
        loader_problem(loader, file, row->line, column, true,
                       "The cell '%s' is empty; the row cannot be used without it.",
                       table_column_word(file->kind, column));
        return NULL;
    }
    return text;
}

bool numeric_cell(struct loader *loader, const struct table_file *file, const struct table_row *row,
                  int column, double low, double high, bool required, double fallback,
                  double *value)
{
    const char *text = table_cell(file, row, column);
    if (text[0] == '\0' && !required) {
        *value = fallback;
        return true;
    }
    if (text[0] == '\0') {
        return required_cell(loader, file, row, column) != NULL;
    }
    if (!table_number(text, value)) {
        loader_problem(loader, file, row->line, column, true,
                       "'%.40s' is not a number; a number such as 4.76 is expected.", text);
        return false;
    }
    if (*value < low || *value > high) {
        loader_problem(loader, file, row->line, column, true,
                       "%.40s cannot be right; a number from %g to %g is expected.", text, low,
                       high);
        return false;
    }
    return true;
}

static bool good_key(const char *key)
{
    size_t length = strlen(key);
    return length > 0 && strspn(key, "abcdefghijklmnopqrstuvwxyz0123456789-") == length &&
           key[0] != '-' && key[length - 1] != '-';
}

/* An entry of loader.keys holds the row number and, in its lowest bit, whether the row is the
 * user's. */
long keyed_place(struct loader *loader, const struct table_file *file, const struct table_row *row,
                 const char *key, size_t count)
{
    /* Keys of sources also hold dots: edition and section numbers. */
    if (file->kind != TABLE_SOURCES && !good_key(key)) {
        loader_problem(loader, file, row->line, 0, false,
                       "The key '%.60s' should be lower-case letters, digits and hyphens only, "
                       "such as acetic-acid.",
                       key);
    }
    char folded[NAME_FOLD_MAX];
    name_fold(key, strlen(key), folded);
    const char *kept = storage_copy(loader->table.storage, folded, strlen(folded));
    struct name_index *keys = &loader->keys[file->kind];
    int entry = (int)(count * 2) + (loader->user ? 1 : 0);
    int held = kept == NULL ? -2 : name_index_add(keys, kept, entry);
    if (held == -2) {
        loader->out_of_memory = true;
        return -1;
    }
    if (held >= 0 && (held & 1) == (entry & 1)) {
        loader_problem(loader, file, row->line, 0, true,
                       "The key '%.60s' stands in an earlier row already; this row is not used. "
                       "Give it another key or remove one of the two.",
                       key);
        return -1;
    }
    loader->table.overlaid_count += loader->user;
    if (held >= 0) {
        name_index_set(keys, kept, (held & ~1) | 1);
        return held / 2;
    }
    return (long)count;
}

int keyed_find(const struct loader *loader, enum table_kind kind, const char *key)
{
    int entry = name_index_find(&loader->keys[kind], key);
    return entry < 0 ? -1 : entry / 2;
}

void check_key_spelling(struct loader *loader, const struct table_file *file,
                        const struct table_row *row, int column, const char *written, size_t length,
                        const char *key)
{
    if (strlen(key) != length || strncmp(written, key, length) != 0) {
        loader_problem(loader, file, row->line, column, false,
                       "'%.*s' is taken for the key '%.60s'; write it as that.",
                       (int)(length > 60 ? 60 : length), written, key);
    }
}
