/* One file of the table split into cells, whatever a spreadsheet program did to it: byte-order
 * marks, other encodings, semicolons or tabs, quotes round everything, trailing empty columns,
 * columns in any order. */
#include "base/file.h"
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <ctype.h>
#include <iconv.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define FILE_LIMIT ((size_t)32 << 20)
#define REQUIRED_MARK '!'

/* Header words of each kind of file in the order of the enumerations; those marked are needed. */
static const struct {
    const char *file;
    const char *words[COLUMNS_MAX];
} kinds[TABLE_KINDS] = {
    [TABLE_ACIDS] = {"acids.csv",
                     {"!key", "!name", "other names", "!formula", "!charge", "group", "modelled",
                      "note"}},
    [TABLE_CONSTANTS] = {"constants.csv",
                         {"!acid", "!step", "!pKa", "!u", "temperature", "ionic strength", "kind",
                          "enthalpy", "heat capacity", "!source", "note"}},
    [TABLE_FORMS] = {"forms.csv",
                     {"!key", "!name", "other names", "!formula", "!parts", "CAS", "molar mass",
                      "solubility", "solubility temperature", "melting point", "hazards", "care",
                      "source"}},
    [TABLE_SOURCES] = {"sources.csv", {"!key", "!reference", "!kind"}},
    [TABLE_ATOMIC_WEIGHTS] = {"atomic-weights.csv", {"!symbol", "name", "number", "!weight", "!u"}},
    [TABLE_TITRANTS] = {"titrants.csv",
                        {"!key", "!name", "!kind", "formula", "!acid or base system", "other names",
                         "note"}},
    [TABLE_INDICATORS] = {"indicators.csv",
                          {"!key", "!name", "!low pH", "!high pH", "!colour acid", "!colour base",
                           "pKa", "source", "note"}},
    [TABLE_BUFFERS] = {"buffers.csv",
                       {"!buffer", "!name", "!composition", "!temperature", "!pH", "!u",
                        "molality or concentration", "source", "note"}},
    [TABLE_STANDARDS] = {"standards.csv",
                         {"!key", "!name", "!form", "!use", "!purity", "!u", "drying",
                          "!equivalents", "source", "note"}},
    [TABLE_HAZARDS] = {"hazards.csv", {"!code", "!sentence"}},
};

const char *table_column_word(enum table_kind kind, int column)
{
    const char *word = column < COLUMNS_MAX ? kinds[kind].words[column] : NULL;
    return word != NULL && word[0] == REQUIRED_MARK ? word + 1 : word;
}

const char *table_kind_file(enum table_kind kind)
{
    return kinds[kind].file;
}

/* ---- encodings --------------------------------------------------------------------------------
 */

/* Length of a valid UTF-8 sequence, 0 when the bytes are none. */
static size_t utf8_length(const unsigned char *bytes)
{
    if (bytes[0] < 0x80) {
        return 1;
    }
    size_t length = bytes[0] >= 0xF0 && bytes[0] < 0xF5   ? 4
                    : bytes[0] >= 0xE0 && bytes[0] < 0xF0 ? 3
                    : bytes[0] >= 0xC2 && bytes[0] < 0xE0 ? 2
                                                          : 0;
    for (size_t i = 1; i < length; i++) {
        if ((bytes[i] & 0xC0) != 0x80) {
            return 0;
        }
    }
    return length;
}

static bool is_utf8(const char *bytes, size_t size)
{
    const unsigned char *at = (const unsigned char *)bytes;
    const unsigned char *end = at + size;
    while (at < end) {
        uint64_t eight = 0;
        if (end - at >= (ptrdiff_t)sizeof eight) {
            memcpy(&eight, at, sizeof eight);
            if ((eight & UINT64_C(0x8080808080808080)) == 0) {
                at += sizeof eight;
                continue;
            }
        }
        size_t length = utf8_length(at);
        if (length == 0) {
            return false;
        }
        at += length;
    }
    return true;
}

/* Replace the bytes by their UTF-8. */
static enum wa_status convert(const char *path, const char *encoding, char **bytes, size_t *size,
                              struct wa_error *error)
{
    iconv_t converter = iconv_open("UTF-8", encoding);
    size_t room = *size * 3 + 1;
    char *converted = malloc(room);
    if (converter == (iconv_t)-1 || converted == NULL) {
        free(converted);
        if (converter != (iconv_t)-1) {
            iconv_close(converter);
        }
        return wa_fail_memory(error);
    }
    char *in = *bytes;
    char *out = converted;
    size_t in_left = *size;
    size_t out_left = room - 1;
    size_t result = iconv(converter, &in, &in_left, &out, &out_left);
    iconv_close(converter);
    if (result == (size_t)-1) {
        free(converted);
        return wa_fail(error, WA_ERROR_INPUT, path, 0,
                       "The file is neither UTF-8 nor %s text; save it as \"CSV UTF-8\".",
                       encoding);
    }
    *out = '\0';
    free(*bytes);
    *bytes = converted;
    *size = (size_t)(out - converted);
    return WA_OK;
}

enum wa_status table_text_to_utf8(const char *path, char **bytes, size_t *size,
                                  struct wa_error *error)
{
    const unsigned char *start = (const unsigned char *)*bytes;
    if (*size >= 2 &&
        ((start[0] == 0xFF && start[1] == 0xFE) || (start[0] == 0xFE && start[1] == 0xFF))) {
        return convert(path, "UTF-16", bytes, size, error);
    }
    if (memchr(*bytes, '\0', *size) != NULL) {
        return wa_fail(error, WA_ERROR_INPUT, path, 0,
                       "The file holds zero bytes and is no text; save the table as \"CSV "
                       "UTF-8\".");
    }
    if (!is_utf8(*bytes, *size)) {
        return convert(path, "WINDOWS-1252", bytes, size, error);
    }
    return WA_OK;
}

/* ---- cells ------------------------------------------------------------------------------------
 */

struct splitter {
    char *at;
    char delimiter;
    bool ends_cell[256]; /* signs that end an unquoted cell */
    long line;
    struct table_file *file;
    size_t row_capacity;
    size_t cell_capacity;
    size_t cell_count;
    long unclosed_line; /* where a quotation mark was opened and never closed, or 0 */
};

char table_guess_delimiter(const char *header)
{
    size_t commas = 0;
    size_t semicolons = 0;
    size_t tabs = 0;
    bool quoted = false;
    for (; *header != '\0' && (quoted || (*header != '\n' && *header != '\r')); header++) {
        quoted = quoted != (*header == '"');
        commas += !quoted && *header == ',';
        semicolons += !quoted && *header == ';';
        tabs += !quoted && *header == '\t';
    }
    if (semicolons > commas && semicolons >= tabs) {
        return ';';
    }
    return tabs > commas ? '\t' : ',';
}

/* Take a cell off the text, unquoted and trimmed in place. */
static const char *take_cell(struct splitter *splitter, bool *row_ends)
{
    char *read = splitter->at;
    while (*read == ' ' || (*read == '\t' && splitter->delimiter != '\t')) {
        read++;
    }
    char *start = read;
    char *write = start;
    if (*read == '"') {
        long opened = splitter->line;
        read++;
        while (*read != '\0' && (*read != '"' || read[1] == '"')) {
            read += *read == '"';
            splitter->line += *read == '\n';
            *write = *read;
            write++;
            read++;
        }
        if (*read == '\0') {
            splitter->unclosed_line = opened;
        } else {
            read++;
        }
    }
    const bool *ends_cell = splitter->ends_cell;
    if (write == read) {
        /* Nothing was unquoted: the text stays where it is. */
        while (!ends_cell[(unsigned char)*read]) {
            read++;
        }
        write = read;
    }
    while (!ends_cell[(unsigned char)*read]) {
        *write = *read;
        write++;
        read++;
    }
    *row_ends = *read != splitter->delimiter || *read == '\0';
    if (*read == '\r' && read[1] == '\n') {
        read++;
    }
    splitter->line += *read == '\n' || *read == '\r';
    splitter->at = *read == '\0' ? read : read + 1;
    while (write > start && (isspace((unsigned char)write[-1]) ||
                             (write - start > 1 && write[-1] == '\xA0' && write[-2] == '\xC2'))) {
        write -= write[-1] == '\xA0' ? 2 : 1;
    }
    *write = '\0';
    return start;
}

/* Split the rest into rows; blank rows and rows that begin with # are left out. */
static bool split_rows(struct splitter *splitter)
{
    struct table_file *file = splitter->file;
    splitter->ends_cell['\0'] = true;
    splitter->ends_cell['\n'] = true;
    splitter->ends_cell['\r'] = true;
    splitter->ends_cell[(unsigned char)splitter->delimiter] = true;
    while (*splitter->at != '\0') {
        struct table_row row = {.line = splitter->line, .first = splitter->cell_count};
        bool row_ends = false;
        bool blank = true;
        while (!row_ends) {
            const char *cell = take_cell(splitter, &row_ends);
            blank = blank && cell[0] == '\0';
            if (splitter->cell_count == splitter->cell_capacity &&
                !wa_grow(&file->cells, &splitter->cell_capacity, splitter->cell_count + 4096,
                         sizeof *file->cells)) {
                return false;
            }
            file->cells[splitter->cell_count] = cell;
            splitter->cell_count++;
        }
        row.count = splitter->cell_count - row.first;
        if (blank || file->cells[row.first][0] == '#') {
            splitter->cell_count = row.first;
            continue;
        }
        if (!wa_grow(&file->rows, &splitter->row_capacity, file->row_count + 1,
                     sizeof *file->rows)) {
            return false;
        }
        file->rows[file->row_count] = row;
        file->row_count++;
    }
    return true;
}

/* ---- header -----------------------------------------------------------------------------------
 */

static bool same_word(const char *cell, const char *word)
{
    char left[NAME_FOLD_MAX];
    char right[NAME_FOLD_MAX];
    name_fold(cell, strlen(cell), left);
    name_fold(word, strlen(word), right);
    return strcmp(left, right) == 0;
}

static int find_column(const struct table_file *file, const char *word)
{
    const struct table_row *header = &file->rows[0];
    for (size_t i = 0; i < header->count; i++) {
        if (same_word(file->cells[header->first + i], word)) {
            return (int)i;
        }
    }
    return -1;
}

/* Match the header row against one kind. @return the first needed word that is missing, or NULL */
static const char *match_header(struct table_file *file, enum table_kind kind, size_t *found)
{
    const char *missing = NULL;
    *found = 0;
    file->kind = kind;
    for (int i = 0; i < COLUMNS_MAX && kinds[kind].words[i] != NULL; i++) {
        const char *word = kinds[kind].words[i];
        file->column_of[i] = find_column(file, table_column_word(kind, i));
        *found += file->column_of[i] >= 0;
        if (missing == NULL && file->column_of[i] < 0 && word[0] == REQUIRED_MARK) {
            missing = table_column_word(kind, i);
        }
    }
    return missing;
}

static enum wa_status recognise(struct table_file *file, enum table_kind wanted,
                                struct wa_error *error)
{
    long line = file->rows[0].line;
    size_t found;
    if (wanted != TABLE_KINDS) {
        const char *missing = match_header(file, wanted, &found);
        return missing == NULL ? WA_OK
                               : wa_fail(error, WA_ERROR_INPUT, file->name, line,
                                         "The header row lacks the word '%s', which %s needs.",
                                         missing, kinds[wanted].file);
    }
    enum table_kind best = TABLE_KINDS;
    size_t best_found = 0;
    for (enum table_kind kind = 0; kind < TABLE_KINDS; kind++) {
        const char *missing = match_header(file, kind, &found);
        if (found > best_found && (missing == NULL || found > 2)) {
            best = kind;
            best_found = found;
        }
    }
    if (best == TABLE_KINDS) {
        return wa_fail(error, WA_ERROR_INPUT, file->name, line,
                       "The header row '%.40s…' is that of no table file; start from the header "
                       "words of acids.csv, constants.csv, forms.csv or sources.csv.",
                       file->cells[file->rows[0].first]);
    }
    return recognise(file, best, error);
}

/* A header word that stands twice makes it unclear which column is meant. */
static void check_header(struct loader *loader, const struct table_file *file)
{
    const struct table_row *header = &file->rows[0];
    for (size_t i = 0; i < header->count; i++) {
        const char *word = file->cells[header->first + i];
        for (size_t j = 0; j < i && word[0] != '\0'; j++) {
            if (same_word(word, file->cells[header->first + j])) {
                loader_problem(loader, file, header->line, -1, false,
                               "The header word '%.60s' stands twice; only the first column is "
                               "read.",
                               word);
            }
        }
    }
}

/* A row longer than the header has lost or gained a delimiter: its cells cannot be trusted. */
static void drop_long_rows(struct loader *loader, struct table_file *file)
{
    size_t kept = 0;
    for (size_t i = 0; i < file->row_count; i++) {
        const struct table_row *row = &file->rows[i];
        const char *beyond = NULL;
        for (size_t j = file->rows[0].count; j < row->count && beyond == NULL; j++) {
            const char *cell = file->cells[row->first + j];
            beyond = cell[0] != '\0' ? cell : NULL;
        }
        if (beyond != NULL) {
            loader_problem(loader, file, row->line, -1, true,
                           "The row has more cells than the header has words ('%.60s' stands "
                           "beyond the last): put quotation marks round a cell that holds the "
                           "separator.",
                           beyond);
            continue;
        }
        file->rows[kept] = file->rows[i];
        kept++;
    }
    file->row_count = kept;
}

/* ---- the file ---------------------------------------------------------------------------------
 */

static enum wa_status split_file(struct loader *loader, char *text, enum table_kind wanted,
                                 struct table_file *file, struct wa_error *error)
{
    struct splitter splitter = {.at = text, .line = 1, .file = file};
    if (strncmp(splitter.at, "\xEF\xBB\xBF", 3) == 0) {
        splitter.at += 3;
    }
    if (strncasecmp(splitter.at, "sep=", 4) == 0 && splitter.at[4] != '\0') {
        splitter.delimiter = splitter.at[4];
        splitter.at += strcspn(splitter.at, "\n");
        splitter.at += *splitter.at == '\n';
        splitter.line = 2;
    } else {
        const char *header = splitter.at;
        while (*header == '#' || *header == '\n' || *header == '\r') {
            header += strcspn(header, "\n");
            header += *header == '\n';
        }
        splitter.delimiter = table_guess_delimiter(header);
    }
    if (!split_rows(&splitter)) {
        return wa_fail_memory(error);
    }
    if (file->row_count == 0) {
        return wa_fail(error, WA_ERROR_INPUT, file->name, 1,
                       "The file is empty; a table file begins with a row of header words.");
    }
    enum wa_status status = recognise(file, wanted, error);
    if (status != WA_OK) {
        return status;
    }
    if (splitter.unclosed_line > 0) {
        loader_problem(loader, file, splitter.unclosed_line, -1, true,
                       "A quotation mark is opened here and never closed: everything behind it "
                       "was taken for one cell.");
    }
    check_header(loader, file);
    drop_long_rows(loader, file);
    /* The header has done its work: what stays are rows of data. */
    file->row_count--;
    memmove(file->rows, file->rows + 1, file->row_count * sizeof *file->rows);
    return WA_OK;
}

/* FNV-1a (Fowler, Noll, Vo) over words of eight bytes instead of single ones, for speed. */
static void hash_bytes(struct loader *loader, const char *bytes, size_t size)
{
    uint64_t hash = loader->hash ^ size;
    for (size_t i = 0; i < size; i += sizeof hash) {
        uint64_t word = 0;
        memcpy(&word, bytes + i, size - i < sizeof word ? size - i : sizeof word);
        hash = (hash ^ word) * UINT64_C(1099511628211);
        hash ^= hash >> 32;
    }
    loader->hash = hash;
}

enum wa_status table_file_read(struct loader *loader, const char *path, enum table_kind wanted,
                               struct table_file *file, struct wa_error *error)
{
    char *bytes = NULL;
    size_t size = 0;
    *file = (struct table_file){0};
    enum wa_status status = wa_file_read(path, FILE_LIMIT, &bytes, &size, error);
    if (status != WA_OK) {
        return status;
    }
    hash_bytes(loader, bytes, size);
    status = table_text_to_utf8(path, &bytes, &size, error);
    if (status == WA_OK) {
        file->name = storage_copy(loader->table.storage, path, strlen(path));
        status = file->name == NULL ? wa_fail_memory(error) : WA_OK;
    }
    /* The cells are cut out of the file's own bytes, which the table keeps. */
    if (status == WA_OK && !storage_adopt(loader->table.storage, bytes, size)) {
        status = wa_fail_memory(error);
    }
    if (status != WA_OK) {
        free(bytes);
        return status;
    }
    status = split_file(loader, bytes, wanted, file, error);
    if (status != WA_OK) {
        table_file_free(file);
    }
    return status;
}

void table_file_free(struct table_file *file)
{
    free(file->rows);
    free(file->cells);
    *file = (struct table_file){0};
}

const char *table_cell(const struct table_file *file, const struct table_row *row, int column)
{
    int place = file->column_of[column];
    if (place < 0 || (size_t)place >= row->count) {
        return "";
    }
    return file->cells[row->first + (size_t)place];
}
