/* What the words of `whichacid table` share: the common options, loading, and where output goes. */
#ifndef WHICHACID_COMMAND_TABLE_INTERNAL_H
#define WHICHACID_COMMAND_TABLE_INTERNAL_H

#include "whichacid/equilibrium.h"
#include "whichacid/reference.h"

#include <argp.h>
#include <jansson.h>
#include <stdio.h>

#define PAGE_COLUMNS 80
#define TABLE_ALSO_MAX 32

/** The options that every word takes. Zero-initialise; `folder` NULL means the shipped table. */
struct table_options {
    const char *folder;
    const char *also[TABLE_ALSO_MAX];
    size_t also_count;
    const char *output;
    bool json;
};

/** Put these children into an argp and hand a struct table_options as child input 0. */
extern const struct argp_child table_common_children[];

/** Load the table the options name; says on standard error how many rows of the user's are laid
 * over. @return exit status, 0 when loaded */
int table_open(const struct table_options *options, struct wa_table *table);

/** Where a word writes: a stream into memory, written out at once by page_close. */
struct page {
    FILE *stream;
    char *text;
    size_t size;
};

/** @return exit status, 0 when open */
int page_open(struct page *page);
/** Write the page to standard output or the file of the options. @return exit status */
int page_close(struct page *page, const struct table_options *options);
/** Write JSON as the whole output; takes over the reference. @return exit status */
int table_write_json(json_t *value, const struct table_options *options);

/** Text from `column` on, wrapped at PAGE_COLUMNS, the following lines indented by `indent`; a line
 * end at the close. */
void print_wrapped(FILE *stream, int column, int indent, const char *text);
/** Text padded with spaces to a width in terminal columns. */
void print_padded(FILE *stream, const char *text, int width);
/** A JSON number, null when it is not finite. */
json_t *json_number_or_null(double value);

/** Join the remaining arguments by spaces into a name ("table show acetic acid"). */
void join_words(char *text, size_t size, char **words, int count);

int table_list(int argument_count, char **arguments);
int table_show(int argument_count, char **arguments);
int table_check(int argument_count, char **arguments);
int table_near(int argument_count, char **arguments);
int table_add(int argument_count, char **arguments);

/* ---- landmarks of a titration (table_landmarks.c) ----------------------------------------------
 */

#define LANDMARKS_MAX 6

/** pH at the start, half-way to and at each equivalence of a form titrated with a strong titrant of
 * the same concentration. */
struct landmarks {
    bool with_base;
    int count; /**< equivalence points */
    double start_pH;
    double half_pH[LANDMARKS_MAX];
    double equivalence_pH[LANDMARKS_MAX];
    double jump_low[LANDMARKS_MAX];  /**< pH 0.5 % of the titrant before the point */
    double jump_high[LANDMARKS_MAX]; /**< and behind it, the lower of the two first */
};

/**
 * @param[in] concentration  mol/L of the form and of the titrant
 * @return false when the form gives (or takes) no proton in water, or cannot be modelled
 */
bool landmarks_compute(const struct wa_table *table, const struct wa_form *form, bool with_base,
                       double concentration, double temperature_C, struct landmarks *landmarks);

/** The forms whose landmarks a page shows: for each state of the system the first form that brings
 * nothing else. @return how many were found */
int landmark_forms(const struct wa_table *table, int acid, int forms[LANDMARKS_MAX]);

#endif
