/* Figures of a result, drawn by gnuplot: another view of the same numbers. */
#ifndef WHICHACID_FIGURE_H
#define WHICHACID_FIGURE_H

#include "whichacid/result.h"

/** What a figure shows. All are of the first run. */
enum wa_figure_kind {
    WA_FIGURE_CURVE,      /**< points, fit, equivalence and half-equivalence points */
    WA_FIGURE_DERIVATIVE, /**< first derivative of the reading by the volume */
    WA_FIGURE_GRAN,       /**< Gran's lines before and after each jump */
    WA_FIGURE_RESIDUALS,  /**< measured less model, in standard uncertainties */
    WA_FIGURE_RUNNER_UP,  /**< the first two candidates where they differ most */
    WA_FIGURE_SPECIES,    /**< fractions of the species over the run's pH */
};
#define WA_FIGURE_KINDS 6

/** How a figure is written. */
enum wa_figure_format { WA_FIGURE_SVG, WA_FIGURE_PDF, WA_FIGURE_PNG };

/** A figure in words. Plain text, malloc'd. */
struct wa_figure_words {
    const char *title; /**< static */
    char *caption;     /**< what the marks mean */
    char *alternative; /**< what a reader who cannot see it needs to know */
};

/** A figure drawn for a page. */
struct wa_drawn_figure {
    enum wa_figure_kind kind;
    char *svg; /**< an svg element alone, its ids not shared with other figures */
    struct wa_figure_words words;
};

/** All figures that a result allows, in the order of the kinds. */
struct wa_figure_set {
    struct wa_drawn_figure figures[WA_FIGURE_KINDS];
    size_t count;
    char missing[256]; /**< a sentence when figures could not be drawn, else "" */
};

/** The word that names a kind in a call: "curve", "runner-up". */
const char *wa_figure_word(enum wa_figure_kind kind);

/** The kind that a word names. @return WA_ERROR_CALL with the words there are */
enum wa_status wa_figure_kind_of(const char *word, enum wa_figure_kind *kind,
                                 struct wa_error *error) WA_MUST_USE;

/** The format by a file's ending, .svg, .pdf or .png. @return WA_ERROR_CALL when it is another */
enum wa_status wa_figure_format_of(const char *path, enum wa_figure_format *format,
                                   struct wa_error *error) WA_MUST_USE;

/** Whether the result holds what the figure needs. */
bool wa_figure_is_possible(const struct wa_result *result, enum wa_figure_kind kind);

/** Put a figure into words. Free with wa_figure_words_free. */
enum wa_status wa_figure_describe(const struct wa_result *result, enum wa_figure_kind kind,
                                  struct wa_figure_words *words,
                                  struct wa_error *error) WA_MUST_USE;

/** Free what the words own. NULL is allowed. */
void wa_figure_words_free(struct wa_figure_words *words);

/**
 * Draw a figure.
 * @param[out] bytes  the finished file, malloc'd
 * @return WA_ERROR_CALL when the result does not hold it; WA_ERROR_FILE when gnuplot is missing
 *         (the sentence names the Debian package) or fails
 */
enum wa_status wa_figure_draw(const struct wa_result *result, enum wa_figure_kind kind,
                              enum wa_figure_format format, char **bytes, size_t *size,
                              struct wa_error *error) WA_MUST_USE;

/** Draw a figure into a file, in the format of its ending. Errors as above and of writing. */
enum wa_status wa_figure_write(const struct wa_result *result, enum wa_figure_kind kind,
                               const char *path, struct wa_error *error) WA_MUST_USE;

/**
 * Draw all that are possible, for a page. A missing or failing gnuplot is no error here: the page
 * is worth having without figures, and `missing` says why there are none.
 * @param[out] set  to be freed with wa_figure_set_free
 */
enum wa_status wa_figure_set_draw(const struct wa_result *result, struct wa_figure_set *set,
                                  struct wa_error *error) WA_MUST_USE;

/** Free what a set owns. NULL is allowed. */
void wa_figure_set_free(struct wa_figure_set *set);

#endif
