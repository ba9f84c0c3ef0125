/* What the figures share: the script that gnuplot reads, and the numbers to be drawn. */
#ifndef WHICHACID_FIGURE_INTERNAL_H
#define WHICHACID_FIGURE_INTERNAL_H

#include "base/text.h"
#include "whichacid/figure.h"

/** Size of a figure in CSS pixels (1/96 inch): fits the text of a printed page. */
#define FIGURE_WIDTH 600

/** The points of the first run as they are drawn. Borrowed from the result. */
struct figure_points {
    size_t count;
    const double *volume_mL;
    const double *reading;
    bool fitted;      /**< they are the points of the fit, in pH */
    bool in_mV;       /**< the readings are mV */
    bool nominal_pH;  /**< pH by the theoretical slope from an electrode that nobody calibrated */
    double u_reading; /**< scatter of a reading, 0 when not known */
    double u_volume;  /**< mL, 0 when not known */
    const double *outlier; /**< probabilities, NULL when there was no fit */
};

/** The points, from the fit when there was one, else from the curve. */
struct figure_points figure_points_of(const struct wa_result *result);

/** The curve of the first run, or NULL. */
const struct wa_curve *figure_curve_of(const struct wa_result *result);

/** The experiment of the first run, or NULL when it has no points. */
const struct wa_experiment *figure_experiment_of(const struct wa_result *result);

/** Reading at a volume by interpolation between neighbouring points, NaN outside. */
double figure_reading_at(const struct figure_points *points, double volume_mL);

/** Whether the fit takes this point for a slip. */
bool figure_is_slip(const struct figure_points *points, size_t index);

/** The trace whose species are drawn, and the name of its substance; NULL when there is none. */
const struct wa_trace *figure_species_of(const struct wa_result *result, const char **name);

/** Label of the reading's axis, quantity over unit. */
const char *figure_reading_label(const struct figure_points *points);

/** Name of a candidate for a legend. */
const char *figure_candidate_name(const struct wa_result_candidate *candidate);

/** "H2A-" in Unicode sub- and superscripts, for a species that has lost so many protons. */
void figure_species_label(char *label, size_t size, int step_count, int charge, int lost);

/**
 * Append text as a string of gnuplot. Every byte that is no letter is written as an octal escape
 * (digits too: gnuplot takes any that follow an escape for part of it), so that nothing in it can
 * be read as a command, a back-quoted call or the string's end.
 */
void figure_quote(struct wa_text *script, const char *text);

/** Begin a script: terminal, fonts, border, grid. */
void figure_begin(struct wa_text *script, enum wa_figure_format format, int height);

/** Axis labels. */
void figure_axes(struct wa_text *script, const char *x, const char *y);

/** The range of the volume axis, a little wider than the points. */
void figure_volume_range(struct wa_text *script, const struct figure_points *points);

/** Data block $equivalence (volume, u, reading) and dotted lines with their names at the top. */
void figure_equivalence(struct wa_text *script, const struct wa_result *result,
                        const struct figure_points *points);

/** One of the figures: append what begins after figure_begin. */
void figure_draw_curve(struct wa_text *script, const struct wa_result *result);
void figure_draw_derivative(struct wa_text *script, const struct wa_result *result);
void figure_draw_gran(struct wa_text *script, const struct wa_result *result);
void figure_draw_residuals(struct wa_text *script, const struct wa_result *result);
void figure_draw_runner_up(struct wa_text *script, const struct wa_result *result);
void figure_draw_species(struct wa_text *script, const struct wa_result *result);

/** Whether Gran's lines can be drawn for this jump on any side. */
bool figure_gran_is_known(const struct wa_inflection *inflection);

/** The candidate that a trace is of, 0 the winner and 1 the runner-up. */
const struct wa_result_candidate *figure_traced(const struct wa_result *result, int which);

/** Index of the point where the first two candidates differ most, in standard uncertainties. */
size_t figure_widest_difference(const struct wa_result *result);

/** Run gnuplot on a script. */
enum wa_status figure_run(const struct wa_text *script, char **bytes, size_t *size,
                          struct wa_error *error) WA_MUST_USE;

/**
 * Make gnuplot's SVG fit for a page or a file: own ids, no tool tips of its own, title and
 * description from the words.
 * @param[in]  inline_element  leave off the XML declaration
 * @param[out] tidy            malloc'd
 */
enum wa_status figure_tidy_svg(const char *svg, const char *prefix,
                               const struct wa_figure_words *words, bool inline_element,
                               char **tidy, size_t *size, struct wa_error *error) WA_MUST_USE;

#endif
