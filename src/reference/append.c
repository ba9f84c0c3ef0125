/* Appending a row to a file of the user's, as the user keeps it. */
#include "base/file.h"
#include "base/text.h"
#include "reference/reference_internal.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#define FILE_LIMIT ((size_t)32 << 20)

/* A cell as CSV: quoted when it must be, with a decimal comma where semicolons separate. */
static void append_cell(struct wa_text *row, const char *text, char delimiter)
{
    double value;
    if (delimiter == ';' && table_number(text, &value) && strchr(text, '.') != NULL) {
        for (; *text != '\0'; text++) {
            wa_text_append(row, "%c", *text == '.' ? ',' : *text);
        }
        return;
    }
    char special[] = {delimiter, '"', '\n', '\r', '\0'};
    if (strpbrk(text, special) == NULL) {
        wa_text_append(row, "%s", text);
        return;
    }
    wa_text_append(row, "\"");
    for (; *text != '\0'; text++) {
        wa_text_append(row, *text == '"' ? "\"\"" : "%c", *text);
    }
    wa_text_append(row, "\"");
}

static const char *cell_for(const struct wa_table_cell *cells, size_t count, const char *word,
                            bool *placed)
{
    char wanted[NAME_FOLD_MAX];
    char folded[NAME_FOLD_MAX];
    name_fold(word, strlen(word), wanted);
    for (size_t i = 0; i < count; i++) {
        name_fold(cells[i].column, strlen(cells[i].column), folded);
        if (strcmp(wanted, folded) == 0 && !placed[i]) {
            placed[i] = true;
            return cells[i].text != NULL ? cells[i].text : "";
        }
    }
    return "";
}

/* Compose the row for a header line. */
static void compose_row(struct wa_text *row, const char *header, char delimiter,
                        const struct wa_table_cell *cells, size_t count, bool *placed)
{
    bool first = true;
    while (*header != '\0' && *header != '\n' && *header != '\r') {
        const char *end = header;
        bool quoted = false;
        while (*end != '\0' && (quoted || (*end != delimiter && *end != '\n' && *end != '\r'))) {
            quoted = quoted != (*end == '"');
            end++;
        }
        char word[128];
        size_t length = 0;
        for (const char *at = header; at < end && length + 1 < sizeof word; at++) {
            if (*at != '"') {
                word[length] = *at;
                length++;
            }
        }
        word[length] = '\0';
        if (!first) {
            wa_text_append(row, "%c", delimiter);
        }
        first = false;
        append_cell(row, cell_for(cells, count, word, placed), delimiter);
        header = *end == delimiter ? end + 1 : end;
    }
}

/* The header line of a file's text, behind a byte-order mark, comments and "sep=". */
static const char *find_header(const char *text, char *delimiter)
{
    *delimiter = '\0';
    if (strncmp(text, "\xEF\xBB\xBF", 3) == 0) {
        text += 3;
    }
    if (strncasecmp(text, "sep=", 4) == 0 && text[4] != '\0') {
        *delimiter = text[4];
        text += strcspn(text, "\n");
        text += *text == '\n';
    }
    while (*text == '#' || *text == '\n' || *text == '\r') {
        text += strcspn(text, "\n");
        text += *text == '\n';
    }
    if (*delimiter == '\0') {
        *delimiter = table_guess_delimiter(text);
    }
    return text;
}

static bool begin_file(const char *kind, char **bytes, size_t *size)
{
    struct wa_text header = {0};
    for (enum table_kind i = 0; i < TABLE_KINDS; i++) {
        for (int column = 0;
             strcmp(table_kind_file(i), kind) == 0 && table_column_word(i, column) != NULL;
             column++) {
            wa_text_append(&header, "%s%s", column > 0 ? "," : "", table_column_word(i, column));
        }
    }
    wa_text_append(&header, "\n");
    if (header.failed) {
        wa_text_free(&header);
        return false;
    }
    *bytes = header.bytes;
    *size = header.length;
    return true;
}

static enum wa_status write_row(const char *path, const char *text, size_t size,
                                const struct wa_table_cell *cells, size_t cell_count,
                                struct wa_error *error)
{
    char delimiter;
    bool placed[COLUMNS_MAX] = {false};
    const char *header = find_header(text, &delimiter);
    struct wa_text whole = {0};
    wa_text_append_bytes(&whole, text, size);
    if (size > 0 && text[size - 1] != '\n' && text[size - 1] != '\r') {
        wa_text_append(&whole, "\n");
    }
    compose_row(&whole, header, delimiter, cells, cell_count, placed);
    wa_text_append(&whole, strstr(text, "\r\n") != NULL ? "\r\n" : "\n");
    enum wa_status status = whole.failed ? wa_fail_memory(error) : WA_OK;
    for (size_t i = 0; i < cell_count && status == WA_OK; i++) {
        if (!placed[i] && cells[i].text != NULL && cells[i].text[0] != '\0') {
            status = wa_fail(error, WA_ERROR_INPUT, path, 1,
                             "The file has no column '%s' to put '%.40s' into; add that header "
                             "word.",
                             cells[i].column, cells[i].text);
        }
    }
    if (status == WA_OK) {
        status = wa_file_write(path, whole.bytes, whole.length, error);
    }
    wa_text_free(&whole);
    return status;
}

enum wa_status wa_table_append(const char *path, const char *kind,
                               const struct wa_table_cell *cells, size_t cell_count,
                               struct wa_error *error)
{
    char *bytes = NULL;
    size_t size = 0;
    enum wa_status status = WA_OK;
    if (cell_count > COLUMNS_MAX) {
        return wa_fail(error, WA_ERROR_CALL, path, 0, "A row has %d cells at most.", COLUMNS_MAX);
    }
    if (access(path, F_OK) == 0) {
        status = wa_file_read(path, FILE_LIMIT, &bytes, &size, error);
        if (status == WA_OK) {
            status = table_text_to_utf8(path, &bytes, &size, error);
        }
    } else if (!begin_file(kind, &bytes, &size)) {
        status = wa_fail_memory(error);
    }
    if (status == WA_OK) {
        status = write_row(path, bytes, size, cells, cell_count, error);
    }
    free(bytes);
    return status;
}
