/* Faces of the result: text for a terminal, JSON, a page to print and sign, Markdown. They read the
 * result and compute nothing. */
#ifndef WHICHACID_REPORT_H
#define WHICHACID_REPORT_H

#include "whichacid/figure.h"
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

/** The paper that a page is laid out for. */
enum wa_paper {
    WA_PAPER_OF_READER, /**< whatever the printing reader has; A4 when the program makes the PDF */
    WA_PAPER_A4,
    WA_PAPER_LETTER,
};

/** How to write a page. */
struct wa_page_options {
    const char *version;                 /**< of the program */
    const struct wa_figure_set *figures; /**< borrowed; NULL: the page has none */
    enum wa_paper paper;
};

/**
 * The report as one self-contained HTML file: verdict first, figures inline, every number with its
 * uncertainty and origin, lines to sign. It has no scripts and loads nothing, and its policy
 * forbids both. Text that came from files is escaped.
 * @param[out] text  malloc'd, terminated UTF-8
 */
enum wa_status wa_report_html(const struct wa_result *result, const struct wa_page_options *options,
                              char **text, struct wa_error *error) WA_MUST_USE;

/**
 * The same page as PDF, converted by WeasyPrint.
 * @param[out] bytes  malloc'd
 * @return WA_ERROR_FILE when WeasyPrint is missing (the sentence names the Debian package) or fails
 */
enum wa_status wa_report_pdf(const struct wa_result *result, const struct wa_page_options *options,
                             char **bytes, size_t *size, struct wa_error *error) WA_MUST_USE;

/**
 * A short form in Markdown (CommonMark with tables): verdict, figures of merit, candidates, what to
 * do next, cautions, provenance. Text that came from files is escaped.
 * @param[in]  version  of the program, or NULL
 * @param[out] text     malloc'd, terminated UTF-8
 */
enum wa_status wa_report_markdown(const struct wa_result *result, const char *version, char **text,
                                  struct wa_error *error) WA_MUST_USE;

#endif
