/* What the sources of the page share: escaped text, tables, lists, and the page's sections. */
#ifndef WHICHACID_REPORT_HTML_INTERNAL_H
#define WHICHACID_REPORT_HTML_INTERNAL_H

#include "report/report_internal.h"

/** Markup of our own, printf-style; no text from files. */
#define html_raw wa_text_append

/** Text as text: valid, harmless, with the five characters of markup escaped. */
void html_text(struct wa_text *page, const char *text);

/** Formatted text as text. */
void html_format(struct wa_text *page, const char *format, ...) WA_PRINTF(2, 3);

/** A heading of the second level with an id that its section is labelled by; opens the section. */
void html_section(struct wa_text *page, const char *id, const char *heading);

/** Close a section. */
void html_section_end(struct wa_text *page);

/** Open a table with a caption and its column headings; NULL ends the headings. */
void html_table(struct wa_text *page, const char *caption, const char *const *headings);

/** Close a table. */
void html_table_end(struct wa_text *page);

/** A row's heading: the first cell. */
void html_row(struct wa_text *page, const char *heading);

/** A cell of words. */
void html_cell(struct wa_text *page, const char *text);

/** A cell of a number, set so that columns line up. */
void html_number(struct wa_text *page, const char *text);

/** A cell of a value with its uncertainty, a dash when the value is not known. */
void html_quantity(struct wa_text *page, double value, double u);

/** A cell of where a value came from. */
void html_origin(struct wa_text *page, enum wa_origin origin, long line);

/** A figure of the set, when it is there. */
void html_figure(struct wa_text *page, const struct wa_page_options *options,
                 enum wa_figure_kind kind);

/** The head with its style. */
void html_head(struct wa_text *page, const struct wa_result *result, enum wa_paper paper);

/** The name of the sample, or of its file. */
const char *html_sample_name(const struct wa_result *result);

/* The sections, in order; each writes nothing when there is nothing to say. */
void html_verdict(struct wa_text *page, const struct wa_result *result);
void html_findings(struct wa_text *page, const struct wa_result *result);
void html_next_tests(struct wa_text *page, const struct wa_result *result);
void html_candidates(struct wa_text *page, const struct wa_result *result,
                     const struct wa_page_options *options);
void html_equivalence(struct wa_text *page, const struct wa_result *result,
                      const struct wa_page_options *options);
void html_constants(struct wa_text *page, const struct wa_result *result,
                    const struct wa_page_options *options);
void html_amounts(struct wa_text *page, const struct wa_result *result);
void html_measured(struct wa_text *page, const struct wa_result *result);
void html_set_aside(struct wa_text *page, const struct wa_result *result);
void html_assumed(struct wa_text *page, const struct wa_result *result);
void html_fit(struct wa_text *page, const struct wa_result *result,
              const struct wa_page_options *options);
void html_cautions(struct wa_text *page, const struct wa_result *result);
void html_provenance(struct wa_text *page, const struct wa_result *result,
                     const struct wa_page_options *options);
void html_signatures(struct wa_text *page);
void html_points(struct wa_text *page, const struct wa_result *result);

#endif
