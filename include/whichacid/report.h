/* Faces of the result: text for a terminal, JSON. They read the result and compute nothing. */
#ifndef WHICHACID_REPORT_H
#define WHICHACID_REPORT_H

#include "whichacid/result.h"

/** How to write a report. */
struct wa_report_options {
    int columns;         /**< width of the text, 0: 80; held within 40..100; a plot needs 72 */
    bool colour;         /**< escape sequences for emphasis, never the only carrier of meaning */
    const char *version; /**< of the program */
    const char *title;   /**< a line before the verdict, or NULL; JSON has none */
};

/**
 * The text report.
 * @param[out] text  malloc'd, terminated UTF-8
 */
enum wa_status wa_report_text(const struct wa_result *result,
                              const struct wa_report_options *options, char **text,
                              struct wa_error *error) WA_MUST_USE;

/** The JSON answer with the keys of the design; malloc'd, ends in a newline. */
enum wa_status wa_report_json(const struct wa_result *result,
                              const struct wa_report_options *options, char **text,
                              struct wa_error *error) WA_MUST_USE;

#endif
