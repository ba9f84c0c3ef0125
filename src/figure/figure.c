/* Which figures there are, and drawing one or all. */
#include "figure/figure_internal.h"

#include "base/file.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

/* A kind of figure: its word in a call, its height in CSS pixels, and what draws it. */
struct figure {
    const char *word;
    int height;
    void (*draw)(struct wa_text *script, const struct wa_result *result);
};

static const struct figure figures[WA_FIGURE_KINDS] = {
    [WA_FIGURE_CURVE] = {"curve", 380, figure_draw_curve},
    [WA_FIGURE_DERIVATIVE] = {"derivative", 260, figure_draw_derivative},
    [WA_FIGURE_GRAN] = {"gran", 270, figure_draw_gran},
    [WA_FIGURE_RESIDUALS] = {"residuals", 230, figure_draw_residuals},
    [WA_FIGURE_RUNNER_UP] = {"runner-up", 440, figure_draw_runner_up},
    [WA_FIGURE_SPECIES] = {"species", 270, figure_draw_species},
};

const char *wa_figure_word(enum wa_figure_kind kind)
{
    return (size_t)kind < WA_FIGURE_KINDS ? figures[kind].word : "";
}

enum wa_status wa_figure_kind_of(const char *word, enum wa_figure_kind *kind,
                                 struct wa_error *error)
{
    char words[128] = "";
    for (size_t i = 0; i < WA_FIGURE_KINDS; i++) {
        if (strcmp(word, figures[i].word) == 0) {
            *kind = (enum wa_figure_kind)i;
            return WA_OK;
        }
        const size_t length = strlen(words);
        snprintf(words + length, sizeof words - length, "%s%s", i > 0 ? ", " : "", figures[i].word);
    }
    return wa_fail(error, WA_ERROR_CALL, NULL, 0, "There is no figure '%.40s'; there are %s.", word,
                   words);
}

enum wa_status wa_figure_format_of(const char *path, enum wa_figure_format *format,
                                   struct wa_error *error)
{
    static const char *const endings[] = {".svg", ".pdf", ".png"};
    const size_t length = strlen(path);
    for (size_t i = 0; i < sizeof endings / sizeof endings[0]; i++) {
        if (length > 4 && strcasecmp(path + length - 4, endings[i]) == 0) {
            *format = (enum wa_figure_format)i;
            return WA_OK;
        }
    }
    return wa_fail(error, WA_ERROR_CALL, path, 0,
                   "The file's ending says how a figure is written: use .svg, .pdf or .png.");
}

static bool has_gran(const struct wa_result *result)
{
    const struct wa_curve *curve = figure_curve_of(result);
    for (size_t i = 0; curve != NULL && i < curve->inflection_count; i++) {
        if (figure_gran_is_known(&curve->inflections[i])) {
            return figure_experiment_of(result) != NULL;
        }
    }
    return false;
}

bool wa_figure_is_possible(const struct wa_result *result, enum wa_figure_kind kind)
{
    const struct wa_curve *curve = figure_curve_of(result);
    const struct wa_experiment *experiment = figure_experiment_of(result);
    const bool fitted = result->fitted && experiment != NULL && result->best.residual != NULL;
    const struct wa_trace *traces = result->candidate_traces;
    const char *name;
    switch (kind) {
    case WA_FIGURE_CURVE:
        return figure_points_of(result).count > 1;
    case WA_FIGURE_DERIVATIVE:
        return curve != NULL && curve->point_count > 1 && curve->first != NULL;
    case WA_FIGURE_GRAN:
        return has_gran(result);
    case WA_FIGURE_RESIDUALS:
        return fitted && experiment->count > 1;
    case WA_FIGURE_RUNNER_UP:
        /* Of data that support no answer, a picture of two candidates would say too much. */
        return fitted && result->verdict.kind != WA_VERDICT_UNFIT &&
               result->traced_candidates[0] < result->candidate_count &&
               result->traced_candidates[1] < result->candidate_count && traces[0].count > 1 &&
               traces[1].count > 1 && traces[0].point_count == experiment->count &&
               traces[1].point_count == experiment->count;
    case WA_FIGURE_SPECIES:
        return result->verdict.kind != WA_VERDICT_UNFIT && figure_species_of(result, &name) != NULL;
    }
    return false;
}

/* The picture as gnuplot gives it. */
static enum wa_status draw_raw(const struct wa_result *result, enum wa_figure_kind kind,
                               enum wa_figure_format format, char **bytes, size_t *size,
                               struct wa_error *error)
{
    struct wa_text script = {0};
    figure_begin(&script, format, figures[kind].height);
    figures[kind].draw(&script, result);
    const enum wa_status status = figure_run(&script, bytes, size, error);
    wa_text_free(&script);
    return status;
}

static enum wa_status draw_svg(const struct wa_result *result, enum wa_figure_kind kind,
                               const struct wa_figure_words *words, bool inline_element,
                               char **bytes, size_t *size, struct wa_error *error)
{
    char *raw = NULL;
    size_t raw_size = 0;
    enum wa_status status = draw_raw(result, kind, WA_FIGURE_SVG, &raw, &raw_size, error);
    if (status == WA_OK) {
        status =
            figure_tidy_svg(raw, figures[kind].word, words, inline_element, bytes, size, error);
    }
    free(raw);
    return status;
}

enum wa_status wa_figure_draw(const struct wa_result *result, enum wa_figure_kind kind,
                              enum wa_figure_format format, char **bytes, size_t *size,
                              struct wa_error *error)
{
    struct wa_figure_words words;
    enum wa_status status = wa_figure_describe(result, kind, &words, error);
    if (status != WA_OK) {
        return status;
    }
    status = format == WA_FIGURE_SVG ? draw_svg(result, kind, &words, false, bytes, size, error)
                                     : draw_raw(result, kind, format, bytes, size, error);
    wa_figure_words_free(&words);
    return status;
}

enum wa_status wa_figure_write(const struct wa_result *result, enum wa_figure_kind kind,
                               const char *path, struct wa_error *error)
{
    enum wa_figure_format format = WA_FIGURE_SVG;
    char *bytes = NULL;
    size_t size = 0;
    enum wa_status status = wa_figure_format_of(path, &format, error);
    if (status == WA_OK) {
        status = wa_figure_draw(result, kind, format, &bytes, &size, error);
    }
    if (status == WA_OK) {
        status = wa_file_write(path, bytes, size, error);
    }
    free(bytes);
    return status;
}

static enum wa_status add_figure(const struct wa_result *result, enum wa_figure_kind kind,
                                 struct wa_figure_set *set, struct wa_error *error)
{
    struct wa_drawn_figure *figure = &set->figures[set->count];
    size_t size;
    *figure = (struct wa_drawn_figure){.kind = kind};
    enum wa_status status = wa_figure_describe(result, kind, &figure->words, error);
    if (status == WA_OK) {
        status = draw_svg(result, kind, &figure->words, true, &figure->svg, &size, error);
        if (status == WA_OK) {
            set->count++;
        } else {
            wa_figure_words_free(&figure->words);
        }
    }
    return status;
}

enum wa_status wa_figure_set_draw(const struct wa_result *result, struct wa_figure_set *set,
                                  struct wa_error *error)
{
    struct wa_error why = {.status = WA_OK};
    enum wa_status status = WA_OK;
    *set = (struct wa_figure_set){.count = 0};
    for (int kind = 0; status == WA_OK && kind < WA_FIGURE_KINDS; kind++) {
        if (wa_figure_is_possible(result, (enum wa_figure_kind)kind)) {
            status = add_figure(result, (enum wa_figure_kind)kind, set, &why);
        }
    }
    if (status == WA_ERROR_FILE) {
        snprintf(set->missing, sizeof set->missing, "%.250s", why.message);
        return WA_OK;
    }
    if (status != WA_OK) {
        wa_figure_set_free(set);
        if (error != NULL) {
            *error = why;
        }
    }
    return status;
}

void wa_figure_set_free(struct wa_figure_set *set)
{
    if (set == NULL) {
        return;
    }
    for (size_t i = 0; i < set->count; i++) {
        free(set->figures[i].svg);
        wa_figure_words_free(&set->figures[i].words);
    }
    *set = (struct wa_figure_set){.count = 0};
}
