/* What the sources of the reader share: the sheet of cells, what a cell holds, what a column is,
 * and the steps from bytes to runs. */
#ifndef WHICHACID_READER_INTERNAL_H
#define WHICHACID_READER_INTERNAL_H

#include "base/text.h"
#include "whichacid/reader.h"

#include <stdint.h>

#define WA_COLUMNS_MAX 64  /* columns beyond are not looked at */
#define WA_POINTS_NEEDED 5 /* fewer points cannot show a curve */

/* --- text ----------------------------------------------------------------------------------- */

/** A file as UTF-8 with LF line ends. */
struct wa_decoded {
    char *text; /**< malloc'd, terminated */
    size_t length;
    char encoding[16];
};

/** Bytes to UTF-8 text; refuses what is no text, with a sentence that names what it is. */
enum wa_status wa_reader_decode(const char *bytes, size_t size, const char *name,
                                struct wa_decoded *decoded, struct wa_error *error);

/* --- cells ---------------------------------------------------------------------------------- */

enum wa_unit {
    WA_UNIT_NONE,
    WA_UNIT_ML,
    WA_UNIT_UL,
    WA_UNIT_CL,
    WA_UNIT_DL,
    WA_UNIT_L,
    WA_UNIT_DROP,
    WA_UNIT_PH,
    WA_UNIT_MV,
    WA_UNIT_VOLT,
    WA_UNIT_SECOND,
    WA_UNIT_MINUTE,
    WA_UNIT_HOUR,
    WA_UNIT_CELSIUS,
    WA_UNIT_KELVIN,
    WA_UNIT_GRAM, /* titrant by weight: known, not usable */
};

/** The unit that folded text names, WA_UNIT_NONE when it is none. */
enum wa_unit wa_unit_find(const char *folded, size_t length);

/** Multiplies a number in that unit into mL, mV, s; 1 for others. */
double wa_unit_factor(enum wa_unit unit);

/** The unit as printed. */
const char *wa_unit_name(enum wa_unit unit);

bool wa_unit_is_volume(enum wa_unit unit);
bool wa_unit_is_voltage(enum wa_unit unit);
bool wa_unit_is_time(enum wa_unit unit);
bool wa_unit_is_temperature(enum wa_unit unit);

enum wa_cell_kind {
    WA_CELL_EMPTY,
    WA_CELL_NUMBER,
    WA_CELL_LIMIT,   /**< "< 5" */
    WA_CELL_GROUPED, /**< a number with a thousands separator */
    WA_CELL_WORDS,
};

/** What one cell holds. */
struct wa_cell_value {
    enum wa_cell_kind kind;
    double value;
    enum wa_unit unit;
    int decimals;
    char mark;        /**< '.', ',' or 0 */
    bool plus;        /**< written with a plus sign */
    bool starred;     /**< followed by a star */
    bool three_after; /**< a mark followed by exactly three digits, none else: could be 1,234 */
};

/** Whether a cell is a number, even one that cannot be used for its thousands separator. */
bool wa_cell_is_numeric(const struct wa_cell_value *value);

struct wa_cell_value wa_cell_parse(const char *text, size_t length);

/* --- sheet ---------------------------------------------------------------------------------- */

struct wa_cell {
    uint32_t start; /**< into sheet.cell_text */
    uint32_t length;
};

enum wa_row_kind { WA_ROW_BLANK, WA_ROW_COMMENT, WA_ROW_WORDS, WA_ROW_NUMBERS };

struct wa_row {
    uint32_t text_start; /**< the line as written, into sheet.text */
    uint32_t text_length;
    uint32_t first_cell;
    uint16_t cell_count;
    uint16_t number_count; /**< cells that are numbers */
    uint32_t line;
    uint8_t kind; /**< enum wa_row_kind */
    bool used;    /**< as a note, a header or a heading */
};

struct wa_sheet {
    const char *name;
    const char *text; /**< decoded file, owned elsewhere */
    char delimiter;   /**< 0 before it is known */
    char *cell_text;
    size_t cell_text_length, cell_text_capacity;
    struct wa_cell *cells;
    size_t cell_count, cell_capacity;
    struct wa_row *rows;
    size_t row_count, row_capacity;
    size_t word_lines; /**< rows without two numbers so far */
};

/** Find the delimiter and split the text with libcsv. */
enum wa_status wa_sheet_fill(struct wa_sheet *sheet, const struct wa_decoded *decoded,
                             struct wa_error *error);

void wa_sheet_free(struct wa_sheet *sheet);

/** Delimiter of a text by how many numbers each gives; 0 when none gives two in a row. */
char wa_sheet_delimiter(const char *text, size_t length);

/**
 * Rewrite a line that is delimited by runs of spaces so that one unit separator (0x1F) stands
 * between its cells; "(mL)" and "mL" stay with what they follow.
 * @param[in]  careful  look at the words of a line to find where headers part
 * @param[out] spaced   at least length + 1 bytes
 * @return length of the rewritten line
 */
size_t wa_sheet_join_spaces(const char *line, size_t length, bool careful, char *spaced);

/** Text of a cell, or an empty one where the row is shorter. */
const char *wa_sheet_cell(const struct wa_sheet *sheet, const struct wa_row *row, size_t column,
                          size_t *length);

/** What a cell holds; empty where the row is shorter. */
struct wa_cell_value wa_sheet_value(const struct wa_sheet *sheet, const struct wa_row *row,
                                    size_t column);

/* --- tables that are not rows ---------------------------------------------------------------- */

/**
 * Replace the tags of a page by tabs and line ends, in place.
 * @return whether the text was a table in markup
 */
bool wa_reader_strip_markup(struct wa_decoded *decoded);

/**
 * Write a table on its side, or one number a line, out again as rows, and read those into the
 * sheet; rows keep the line of the file they came from.
 * @param[out] remark  sentence on what was done, NULL when nothing was
 */
enum wa_status wa_reader_rebuild(struct wa_sheet *sheet, struct wa_decoded *decoded,
                                 const char **remark, struct wa_error *error);

/* --- columns -------------------------------------------------------------------------------- */

enum wa_role {
    WA_ROLE_UNKNOWN,
    WA_ROLE_VOLUME,
    WA_ROLE_PH,
    WA_ROLE_MV,
    WA_ROLE_TIME,
    WA_ROLE_TEMPERATURE,
    WA_ROLE_OTHER, /**< derivative, index, drift, comment: known and not used */
};

/** What header words say of a column. */
struct wa_header {
    enum wa_role role;
    enum wa_unit unit;
    bool increment, total, burette; /**< words on how the volume counts */
    bool added;                     /**< says what was added, as totals do */
    bool second;                    /**< a second electrode */
    bool computed;                  /**< calculated or smoothed, not measured */
    bool weak;                      /**< the role is a guess from a single letter */
    bool equivalents;               /**< equivalents of titrant, not a volume */
};

struct wa_header wa_header_parse(const char *text, size_t length);

/** One column of a table: header, and what its numbers look like. */
struct wa_column {
    struct wa_header header;
    char text[64];                                        /**< header words */
    size_t numbers, plus_signs, rising, falling, counted; /**< counted: steps of exactly one */
    size_t in_pH_range;
    double first, last, lowest, highest;
    enum wa_unit cell_unit;
};

/** A table inside a sheet: rows [first_row, end_row) under an optional header. */
struct wa_table_part {
    size_t first_row, end_row;
    size_t header_row; /**< SIZE_MAX when there is none */
    size_t header_end; /**< one past the last header row */
    struct wa_column columns[WA_COLUMNS_MAX];
    size_t column_count;
    size_t row_count; /**< rows that hold numbers */
    int label_column; /**< tells runs apart, such as "sample"; -1 when there is none */
};

/** Which columns make one run. */
struct wa_column_choice {
    int volume, reading, time, temperature; /**< -1 when absent */
    enum wa_role kind;                      /**< WA_ROLE_PH or WA_ROLE_MV */
};

/** Most runs that stand side by side. */
#define WA_CHOICES_MAX 32

/** Find the header rows and the tables under them. */
enum wa_status wa_tables_find(struct wa_sheet *sheet, struct wa_table_part **tables, size_t *count,
                              struct wa_error *error);

/**
 * Choose the columns of each run of a table.
 * @param[out] remark  words on what was guessed or left out, "" when nothing
 */
enum wa_status wa_columns_choose(const struct wa_sheet *sheet, struct wa_table_part *table,
                                 struct wa_column_choice choices[WA_CHOICES_MAX], size_t *count,
                                 struct wa_text *remark, struct wa_error *error);

/* --- notes ---------------------------------------------------------------------------------- */

/** A note found in the file. */
struct wa_found_note {
    char name[64];
    char *text;
    uint32_t row;
    bool loose; /**< written without a comment mark */
};

/** Notes of a sheet, in the order of its rows. */
struct wa_found_notes {
    struct wa_found_note *notes;
    size_t count, capacity;
};

/** Find the notes outside the tables' numbers, and mark their rows as used. */
enum wa_status wa_notes_find(struct wa_sheet *sheet, const struct wa_table_part *tables,
                             size_t table_count, struct wa_found_notes *notes,
                             struct wa_error *error);

void wa_notes_free(struct wa_found_notes *notes);

/* --- points --------------------------------------------------------------------------------- */

/** A row on its way to a point. */
struct wa_raw {
    struct wa_point point; /**< volume_mL holds the volume as written, in mL, before totals */
    uint32_t row;          /**< index into sheet.rows */
    bool plus;             /**< the volume was written with a plus sign */
    bool new_label;        /**< the column that tells runs apart has another text here */
    bool after_words;      /**< rows of words or blanks stand above it */
    const char *wrong;     /**< why it is not used, NULL when it is */
    bool impossible;       /**< it cannot be right, as against merely incomplete */
};

/** What the volume column counts, and how certain that is. */
struct wa_volume_rule {
    enum wa_volume_kind kind;
    int direction;
    const char *remark; /**< sentence to add, NULL when the file or caller said so */
};

/** Decide how volumes count, from header words and from the numbers. */
struct wa_volume_rule wa_volume_decide(const struct wa_raw *raw, size_t count,
                                       const struct wa_column *column);

/** Set volumes that run against the rest aside, and turn the others into totals. */
enum wa_status wa_volume_totals(struct wa_raw *raw, size_t count, struct wa_volume_rule rule,
                                struct wa_error *error);

/** Mark readings that cannot be right: out of range, or a clear slip against their neighbours. */
enum wa_status wa_screen_readings(struct wa_raw *raw, size_t count, enum wa_reading_kind kind,
                                  struct wa_error *error);

/* --- runs ----------------------------------------------------------------------------------- */

#define WA_TABLES_MAX 1000
#define WA_RUNS_MAX 200 /* more runs in one file are not a titration's table */

/** Where in the sheet a run came from. */
struct wa_span {
    uint32_t first_row, last_row; /**< rows of its points, both included */
    size_t table;
    struct wa_column_choice choice;
    size_t beside; /**< 0, or which of several runs side by side */
};

/** Everything of one file while it is read. */
struct wa_reading {
    struct wa_decoded decoded;
    struct wa_sheet sheet;
    struct wa_table_part *tables;
    size_t table_count;
    struct wa_found_notes notes;
    const struct wa_reader_options *options;
    struct wa_run_list list; /**< grown to WA_RUNS_MAX at once */
    struct wa_span spans[WA_RUNS_MAX];
    const char *remark;      /**< on a table that had to be written out again, or NULL */
    bool markup;             /**< the file was a page's markup */
    struct wa_error refusal; /**< why the first table that is no titration is none */
};

/** Give each run its heading, notes and rows of words, and work its conditions out. */
enum wa_status wa_runs_finish(struct wa_reading *reading, struct wa_error *error);

/** Make the runs of table t and append them to reading->list. */
enum wa_status wa_runs_of_table(struct wa_reading *reading, size_t t, struct wa_error *error);

/** Rows of one column choice as raw points, in file order; volumes in mL, readings in pH or mV. */
struct wa_raw_list {
    struct wa_raw *raw;
    size_t count, capacity;
    size_t dots, commas;             /* cells with either decimal mark */
    size_t dots_three, commas_three; /* those that could be thousands separators */
    size_t starred;
    int volume_decimals, reading_decimals;
    enum wa_unit volume_unit, reading_unit;
    bool volume_unit_assumed, reading_unit_assumed;
};

enum wa_status wa_raw_collect(const struct wa_sheet *sheet, const struct wa_table_part *table,
                              const struct wa_column_choice *choice, bool among_several,
                              struct wa_raw_list *list, struct wa_error *error);

#endif
