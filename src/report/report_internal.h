/* What the sources of the room share: clean text, a writer that never exceeds its width, tables,
 * and the sections of the text report. */
#ifndef WHICHACID_REPORT_INTERNAL_H
#define WHICHACID_REPORT_INTERNAL_H

#include "base/text.h"
#include "whichacid/report.h"

/** Most columns and bytes of a cell of a table. */
#define REPORT_CELLS_MAX 10
#define REPORT_CELL_SIZE 72

/** Where the report grows. */
struct report_writer {
    struct wa_text text;
    size_t columns;
    bool colour;
};

/** A table whose widths follow its cells; the first row holds the headings. */
struct report_table {
    char (*rows)[REPORT_CELLS_MAX][REPORT_CELL_SIZE];
    size_t row_count;
    size_t capacity;
    size_t column_count;
    bool failed; /**< memory ran out */
};

/**
 * Append text as valid UTF-8. What is no UTF-8 becomes U+FFFD.
 * @param[in] for_terminal  control characters and those that turn the direction of writing become
 *                          U+FFFD too (line ends and tabs a space), so that a file's text can
 *                          neither move the cursor nor reorder a line
 */
void report_clean(struct wa_text *clean, const char *text, bool for_terminal);

/** Columns that the code point at `text` takes in a terminal, and its bytes. */
size_t report_point_columns(const char *text, size_t *bytes);

/** Columns of clean text. */
size_t report_columns(const char *text);

/** A heading, with an empty line before it. */
void report_heading(struct report_writer *writer, const char *heading);

/**
 * A paragraph folded to the width.
 * @param[in] first  text before the first line ("  - "); clean
 * @param[in] hang   columns before the others
 */
void report_paragraph(struct report_writer *writer, const char *first, size_t hang,
                      const char *format, ...) WA_PRINTF(4, 5);

/** "  label     text", folded under the text. */
void report_item(struct report_writer *writer, const char *label, const char *format, ...)
    WA_PRINTF(3, 4);

/** A list of sentences under a heading; one that replicates bring again is said once. */
void report_sentences(struct report_writer *writer, const char *heading,
                      const struct wa_result_sentence *sentences, size_t count);

/** Whether the list says that already. */
bool report_has_sentence(const struct wa_result_sentence *sentences, size_t count,
                         const char *sentence);

/** Begin the next row of a table; returns its cells to be filled with report_cell. */
void report_row(struct report_table *table);

/** Fill a cell of the last row. */
void report_cell(struct report_table *table, size_t column, const char *format, ...)
    WA_PRINTF(3, 4);

/** Draw the table indented by two, its first cells folded where it would be too wide, or row by row
 * as a list where that does not help; then free it. */
void report_table_draw(struct report_writer *writer, struct report_table *table);

/** "4.756 ± 0.012", the value alone when u is not known, "not known" when the value is not. */
void report_quantity(char *text, size_t size, double value, double u);

/** The first dozen of a list of keys parted by "; ", and how many more there are. JSON has them
 * all. */
void report_keys(struct wa_text *text, const char *keys);

/** "98.7 %", "> 99.9 %", "< 0.1 %", "not known". */
void report_probability(char *text, size_t size, double probability);

/** "at least 95.0 % is asked for", or "below the 95.0 % that is asked for". */
void report_threshold(char *text, size_t size, const struct wa_verdict *verdict);

/** "+0.4 u", or "" when it is not known. */
void report_deviation(char *text, size_t size, double deviation);

/** One quantity among the conditions of a run, with its name in files. */
struct report_condition {
    const char *name;
    enum wa_dimension dimension;
    const struct wa_noted *noted;
};

/** The quantities of a run's conditions in reading order. @return how many */
size_t report_conditions(const struct wa_conditions *conditions, struct report_condition list[16]);

/** The name that a note is known by, or its own. */
const char *report_note_name(const struct wa_note *note);

/** Whether a note's name is one of report_conditions, or of the texts the conditions hold. */
bool report_is_condition(const char *name);

/** "line 5", "option" or "assumed". */
void report_origin(char *text, size_t size, enum wa_origin origin, long line);

/* The sections of the text report, in order; each writes nothing when there is nothing to say. */
void report_measured(struct report_writer *writer, const struct wa_result *result);
void report_plot(struct report_writer *writer, const struct wa_result *result);
void report_equivalence(struct report_writer *writer, const struct wa_result *result);
void report_pKa(struct report_writer *writer, const struct wa_result *result);
void report_amount(struct report_writer *writer, const struct wa_result *result);
void report_candidates(struct report_writer *writer, const struct wa_result *result);
void report_weighing(struct report_writer *writer, const struct wa_result *result);
void report_set_aside(struct report_writer *writer, const struct wa_result *result);
void report_assumed(struct report_writer *writer, const struct wa_result *result);
void report_fit(struct report_writer *writer, const struct wa_result *result);
void report_closing(struct report_writer *writer, const struct wa_result *result);

#endif
