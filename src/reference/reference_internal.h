/* What the sources of this room share: the loader's state, table files split into cells, formulas,
 * name indexes. Private to src/reference/. */
#ifndef WHICHACID_REFERENCE_INTERNAL_H
#define WHICHACID_REFERENCE_INTERNAL_H

#include "whichacid/reference.h"

#include <stdint.h>

#define ELEMENTS_MAX 128
#define COMPOSITION_MAX 24 /* most different elements in one formula */
#define SPECTATOR_IONS_MAX 64
#define COLUMNS_MAX 16
#define NAME_FOLD_MAX 512 /* longest folded name, with its end */

/* ---- memory: one arena for every string that the table keeps ----------------------------------
 */

struct arena_chunk;

struct name_entry {
    uint64_t hash;
    const char *folded; /* NULL: an empty place */
    int index;
};

/* Folded names to row numbers; open addressing. */
struct name_index {
    struct name_entry *entries;
    size_t capacity; /* a power of two, or 0 */
    size_t count;
};

struct element {
    char symbol[4];
    double weight; /* g/mol */
    double u;      /* standard uncertainty */
    int number;    /* atomic number, 0 when the table does not give it */
    const char *file;
    long line;
};

struct hazard {
    const char *code;
    const char *sentence;
};

/* Atoms by element index (halves occur in hemihydrates) and charge number. An element that is not
 * listed has none. */
struct composition {
    double atoms[COMPOSITION_MAX];
    unsigned char element[COMPOSITION_MAX];
    int count; /* elements listed */
    int charge;
};

/* An ion that takes no part in the equilibria. */
struct spectator_ion {
    struct composition composition;
    int charge;
};

struct wa_table_storage {
    struct arena_chunk *chunks;
    struct element elements[ELEMENTS_MAX];
    int element_count;
    int element_of[26][27]; /* by first letter and second letter (26: none); index + 1 */
    struct spectator_ion ions[SPECTATOR_IONS_MAX];
    int ion_count;
    int hydrogen, carbon, nitrogen, oxygen; /* element indexes, -1 when not in the table */
    struct name_index acids;
    struct name_index forms;
    struct name_index indicators;
    struct name_index sources;
    struct hazard *hazards;
    size_t hazard_count;
    size_t bytes; /* taken from the system for strings */
};

/** Reserve `size` bytes that live as long as the table; NULL when memory is out. */
char *storage_reserve(struct wa_table_storage *storage, size_t size);
/** Copy a string of known length into the table's memory; NULL when memory is out. */
const char *storage_copy(struct wa_table_storage *storage, const char *text, size_t length);
/** Take over a block from malloc, to be freed with the table. @return false when memory is out */
bool storage_adopt(struct wa_table_storage *storage, char *bytes, size_t size);
void storage_free(struct wa_table_storage *storage);

/* ---- names ------------------------------------------------------------------------------------
 */

/** Fold a name for comparison: lower case (ASCII, Latin, Greek), hyphen, underscore and spaces one
 * space, subscript digits plain. Text that does not fit is cut. */
void name_fold(const char *name, size_t length, char folded[NAME_FOLD_MAX]);
/** As name_fold, and accents are dropped and ae, oe, ue written as a, o, u: for words that people
 * type with and without them. */
void name_fold_plain(const char *name, size_t length, char folded[NAME_FOLD_MAX]);
/** Add a folded string (kept by reference). The first entry for a name stays.
 * @return index already held under that name, -1 when added, -2 when memory is out */
int name_index_add(struct name_index *names, const char *folded, int index);
/** Change the row held under a folded name that is known to be there. */
void name_index_set(struct name_index *names, const char *folded, int index);
/** Row held under a name (folded here), or -1. */
int name_index_find(const struct name_index *names, const char *name);
void name_index_free(struct name_index *names);
/** Step through "a; b; c". @return the next name, its length in *length, NULL at the end */
const char *next_other_name(const char **cursor, size_t *length);

/* ---- formulas ---------------------------------------------------------------------------------
 */

/** Parse a formula. On failure `reason` says what and where. */
bool formula_parse(const struct wa_table_storage *storage, const char *formula,
                   struct composition *composition, char *reason, size_t reason_size);
/** Molar mass in g/mol and its standard uncertainty (may be NULL). */
double composition_mass(const struct wa_table_storage *storage,
                        const struct composition *composition, double *u);
/** Index of an element by symbol, -1 when the table of atomic weights lacks it. */
int element_find(const struct wa_table_storage *storage, const char *symbol);
/** Whether a formula of main-group elements has, with its charge, an odd number of electrons, as
 * hardly any compound in a bottle has. */
bool formula_has_odd_electrons(const struct wa_table_storage *storage, const char *formula,
                               int charge);
/** Atoms of one element. */
double composition_atoms(const struct composition *composition, int element);
/** Add atoms of one element. @return false when the formula has too many elements */
bool composition_change(struct composition *composition, int element, double atoms);
bool composition_add(struct composition *sum, double factor, const struct composition *other);

/* ---- table files ------------------------------------------------------------------------------
 */

enum table_kind {
    TABLE_ACIDS,
    TABLE_CONSTANTS,
    TABLE_FORMS,
    TABLE_SOURCES,
    TABLE_ATOMIC_WEIGHTS,
    TABLE_TITRANTS,
    TABLE_INDICATORS,
    TABLE_BUFFERS,
    TABLE_STANDARDS,
    TABLE_HAZARDS,
    TABLE_KINDS
};

/* Columns in the order of the format; the numbers index table_file.column_of. */
enum {
    ACID_KEY,
    ACID_NAME,
    ACID_OTHER,
    ACID_FORMULA,
    ACID_CHARGE,
    ACID_GROUP,
    ACID_MODELLED,
    ACID_NOTE
};
enum {
    CONSTANT_ACID,
    CONSTANT_STEP,
    CONSTANT_PKA,
    CONSTANT_U,
    CONSTANT_TEMPERATURE,
    CONSTANT_IONIC_STRENGTH,
    CONSTANT_KIND,
    CONSTANT_ENTHALPY,
    CONSTANT_HEAT_CAPACITY,
    CONSTANT_SOURCE,
    CONSTANT_NOTE
};
enum {
    FORM_KEY,
    FORM_NAME,
    FORM_OTHER,
    FORM_FORMULA,
    FORM_PARTS,
    FORM_CAS,
    FORM_MOLAR_MASS,
    FORM_SOLUBILITY,
    FORM_SOLUBILITY_TEMPERATURE,
    FORM_MELTING_POINT,
    FORM_HAZARDS,
    FORM_CARE,
    FORM_SOURCE
};
enum { SOURCE_KEY, SOURCE_REFERENCE, SOURCE_KIND };
enum { WEIGHT_SYMBOL, WEIGHT_NAME, WEIGHT_NUMBER, WEIGHT_WEIGHT, WEIGHT_U };
enum {
    TITRANT_KEY,
    TITRANT_NAME,
    TITRANT_KIND,
    TITRANT_FORMULA,
    TITRANT_SYSTEM,
    TITRANT_OTHER,
    TITRANT_NOTE
};
enum {
    INDICATOR_KEY,
    INDICATOR_NAME,
    INDICATOR_LOW,
    INDICATOR_HIGH,
    INDICATOR_ACID_COLOUR,
    INDICATOR_BASE_COLOUR,
    INDICATOR_PKA,
    INDICATOR_SOURCE,
    INDICATOR_NOTE
};
enum {
    BUFFER_KEY,
    BUFFER_NAME,
    BUFFER_COMPOSITION,
    BUFFER_TEMPERATURE,
    BUFFER_PH,
    BUFFER_U,
    BUFFER_AMOUNT,
    BUFFER_SOURCE,
    BUFFER_NOTE
};
enum {
    STANDARD_KEY,
    STANDARD_NAME,
    STANDARD_FORM,
    STANDARD_USE,
    STANDARD_PURITY,
    STANDARD_U,
    STANDARD_DRYING,
    STANDARD_EQUIVALENTS,
    STANDARD_SOURCE,
    STANDARD_NOTE
};
enum { HAZARD_CODE, HAZARD_SENTENCE };

struct table_row {
    long line;
    size_t first; /* index of its first cell */
    size_t count;
};

/* One CSV file, split. Cells point into the table's memory. */
struct table_file {
    const char *name;
    enum table_kind kind;
    int column_of[COLUMNS_MAX];
    struct table_row *rows;
    size_t row_count;
    const char **cells;
};

/* State while a table is being built. */
struct loader {
    struct wa_table table;
    size_t acid_capacity, constant_capacity, form_capacity, titrant_capacity, indicator_capacity,
        source_capacity, problem_capacity, buffer_capacity, standard_capacity, hazard_capacity;
    bool out_of_memory; /* set once; checked at the end of each stage */
    bool user;          /* the file being taken in is the user's */
    uint64_t hash;
    struct name_index keys[TABLE_KINDS];
};

/** Read and split one file. `wanted` is the kind its place demands, or TABLE_KINDS to recognise it
 * by its header words. Problems of single rows go to the loader. */
enum wa_status table_file_read(struct loader *loader, const char *path, enum table_kind wanted,
                               struct table_file *file, struct wa_error *error) WA_MUST_USE;
void table_file_free(struct table_file *file);
/** Turn UTF-16 and Windows-1252 into UTF-8 in place of the bytes, which are from malloc. */
enum wa_status table_text_to_utf8(const char *path, char **bytes, size_t *size,
                                  struct wa_error *error) WA_MUST_USE;
/** The separator of a header line: comma, semicolon or tab. */
char table_guess_delimiter(const char *header);
/** Cell of a row by column number, "" when the file has no such column. Never NULL. */
const char *table_cell(const struct table_file *file, const struct table_row *row, int column);
/** Header word of a column, NULL behind the last. */
const char *table_column_word(enum table_kind kind, int column);
/** File name of a kind inside a table folder. */
const char *table_kind_file(enum table_kind kind);
/** Parse a number as spreadsheets write it: decimal point or comma, any minus sign. */
bool table_number(const char *text, double *value);

/** Note a problem in a cell; `column` < 0 means the whole row. */
void loader_problem(struct loader *loader, const struct table_file *file, long line, int column,
                    bool fatal, const char *format, ...) WA_PRINTF(6, 7);
/** Note a problem of a table that is already loaded. */
enum wa_status table_problem(struct wa_table *table, const char *file, long line,
                             const char *column, bool fatal, struct wa_error *error,
                             const char *format, ...) WA_MUST_USE WA_PRINTF(7, 8);
/** Required cell: its text, or NULL with a fatal problem noted. */
const char *required_cell(struct loader *loader, const struct table_file *file,
                          const struct table_row *row, int column);
/** Numeric cell: false with a fatal problem noted when it is no number within the limits; an empty
 * cell gives `fallback`, or a problem when that is NaN and `required`. */
bool numeric_cell(struct loader *loader, const struct table_file *file, const struct table_row *row,
                  int column, double low, double high, bool required, double fallback,
                  double *value);
/** Place for a row with that key: the place of the row it replaces (a user's row over the table's),
 * or `count` for a new one; -1 with a fatal problem for a key that stands twice in one layer. */
long keyed_place(struct loader *loader, const struct table_file *file, const struct table_row *row,
                 const char *key, size_t count);
/** Note a key that was found although it is not written as it stands in its own row. */
void check_key_spelling(struct loader *loader, const struct table_file *file,
                        const struct table_row *row, int column, const char *written, size_t length,
                        const char *key);
/** Row index of a key of the given kind, or -1. */
int keyed_find(const struct loader *loader, enum table_kind kind, const char *key);

/* ---- stages of loading ------------------------------------------------------------------------
 */

void take_acids(struct loader *loader, const struct table_file *file);
void take_constants(struct loader *loader, const struct table_file *file);
void take_forms(struct loader *loader, const struct table_file *file);
void take_sources(struct loader *loader, const struct table_file *file);
void take_atomic_weights(struct loader *loader, const struct table_file *file);
void take_titrants(struct loader *loader, const struct table_file *file);
void take_indicators(struct loader *loader, const struct table_file *file);
void take_buffers(struct loader *loader, const struct table_file *file);
void take_standards(struct loader *loader, const struct table_file *file);
void take_hazards(struct loader *loader, const struct table_file *file);
/** Sort the constants, combine the rows of each step, drop the systems that cannot be used. */
void settle_acids(struct loader *loader);
/** Build the indexes of names. */
void settle_names(struct loader *loader);

/** Parse `KEY [×N] [lost M]; …`. @return false with the reason as a sentence */
bool parts_parse(const struct loader *loader, const char *text,
                 struct wa_form_part parts[WA_PARTS_MAX], int *part_count, char *reason,
                 size_t reason_size);

/** Note part keys that are not written as they stand in acids.csv. */
void check_part_spelling(struct loader *loader, const struct table_file *file,
                         const struct table_row *row, int column, const char *text,
                         const struct wa_form_part *parts);

/* What is left of a form when its parts are taken away. */
struct spectators {
    int charge;
    double z2;     /* sum of z^2 of the ions */
    bool split;    /* the remainder is known ions and whole waters, and the charges add up */
    bool balanced; /* split, or the remainder may hold an ion that is not known here */
    double waters; /* whole waters beside the ions; negative in anhydrides */
    char remainder[96];
};

/** Parse the known spectator ions once the atomic weights are there. */
void settle_ions(struct wa_table_storage *storage);
void spectators_find(const struct wa_table_storage *storage, const struct composition *form,
                     const struct composition *parts, struct spectators *spectators);

#endif
