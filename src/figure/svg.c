/* gnuplot's SVG made fit to stand in a page beside others, and for readers who cannot see it. */
#include "figure/figure_internal.h"

#include <stdlib.h>
#include <string.h>

static void append_escaped(struct wa_text *text, const char *words)
{
    for (const char *at = words; *at != '\0'; at++) {
        switch (*at) {
        case '&':
            wa_text_append(text, "&amp;");
            break;
        case '<':
            wa_text_append(text, "&lt;");
            break;
        case '>':
            wa_text_append(text, "&gt;");
            break;
        case '"':
            wa_text_append(text, "&quot;");
            break;
        default:
            wa_text_append_bytes(text, at, 1);
        }
    }
}

static bool starts(const char *text, const char *with)
{
    return strncmp(text, with, strlen(with)) == 0;
}

/* The svg element's opening, its words as a label; a file gets them as elements too, which viewers
 * show. Returns where its content begins. */
static const char *open_element(struct wa_text *tidy, const char *svg,
                                const struct wa_figure_words *words, bool inline_element)
{
    const char *element = strstr(svg, "<svg");
    const char *end = element != NULL ? strchr(element, '>') : NULL;
    if (end == NULL) {
        return NULL;
    }
    wa_text_append(tidy, "<svg role=\"img\" aria-label=\"");
    append_escaped(tidy, words->title);
    wa_text_append(tidy, ". ");
    append_escaped(tidy, words->alternative);
    wa_text_append(tidy, "\"");
    for (const char *at = element + 4; at < end; at++) {
        wa_text_append_bytes(tidy, *at == '\n' ? " " : at, 1);
    }
    wa_text_append(tidy, ">\n");
    if (!inline_element) {
        wa_text_append(tidy, "<title>");
        append_escaped(tidy, words->title);
        wa_text_append(tidy, "</title>\n<desc>");
        append_escaped(tidy, words->alternative);
        wa_text_append(tidy, "</desc>\n");
    }
    return end + 1;
}

/* Skip an element of gnuplot's that says nothing to the reader. Returns 0 when it is none. */
static size_t skipped(const char *at)
{
    static const char *const ends[][2] = {{"<title>", "</title>"}, {"<desc>", "</desc>"}};
    for (size_t i = 0; i < 2; i++) {
        const char *end = starts(at, ends[i][0]) ? strstr(at, ends[i][1]) : NULL;
        if (end != NULL) {
            return (size_t)(end - at) + strlen(ends[i][1]);
        }
    }
    return 0;
}

/* Copying, with what the tag under way has shown so far. */
struct copy {
    struct wa_text text;
    const char *prefix;
    bool filled; /* the tag uses one of gnuplot's filled marks: its even numbers from 4 on */
};

/* An attribute that defines or uses an id: its opening is copied and the prefix put after it. */
static size_t copied_id(struct copy *copy, const char *at)
{
    static const char *const openings[] = {" id='", " id=\"", "href='#", "href=\"#", "url(#"};
    for (size_t i = 0; i < sizeof openings / sizeof openings[0]; i++) {
        if (starts(at, openings[i])) {
            const size_t length = strlen(openings[i]);
            wa_text_append(&copy->text, "%s%s-", openings[i], copy->prefix);
            if (starts(at + length, "gpPt")) {
                const long mark = strtol(at + length + 4, NULL, 10);
                copy->filled = mark >= 4 && mark % 2 == 0;
            }
            return length;
        }
    }
    return 0;
}

/* Whether the rest of a tag gives a stroke that is not the word currentColor. */
static bool has_stroke_of_its_own(const char *rest)
{
    const char *close = strchr(rest, '>');
    const char *stroke = strstr(rest, " stroke=");
    return close != NULL && stroke != NULL && stroke < close && !starts(stroke + 9, "currentColor");
}

/* gnuplot gives colours by the property `color` and the word currentColor, which not every
 * converter follows: the colour is written out as stroke and, for filled marks, as fill. */
static size_t copied_colour(struct copy *copy, const char *at)
{
    static const char *const by_word[] = {" stroke='currentColor'", " stroke=\"currentColor\"",
                                          " fill='currentColor'", " fill=\"currentColor\""};
    for (size_t i = 0; i < sizeof by_word / sizeof by_word[0]; i++) {
        if (starts(at, by_word[i])) {
            return strlen(by_word[i]);
        }
    }
    if (!starts(at, " color='") && !starts(at, " color=\"")) {
        return 0;
    }
    const char *value = at + 8;
    const char *end = strchr(value, at[7]);
    if (end == NULL) {
        return 0;
    }
    if (has_stroke_of_its_own(end)) {
        return (size_t)(end - at) + 1;
    }
    wa_text_append(&copy->text, " stroke=\"%.*s\"", (int)(end - value), value);
    if (copy->filled) {
        wa_text_append(&copy->text, " fill=\"%.*s\"", (int)(end - value), value);
    }
    return (size_t)(end - at) + 1;
}

static void copy_content(struct copy *copy, const char *at)
{
    while (*at != '\0') {
        copy->filled = copy->filled && *at != '<';
        size_t bytes = skipped(at);
        if (bytes == 0) {
            bytes = copied_id(copy, at);
        }
        if (bytes == 0) {
            bytes = copied_colour(copy, at);
        }
        if (bytes == 0) {
            wa_text_append_bytes(&copy->text, at, 1);
            bytes = 1;
        }
        at += bytes;
    }
}

enum wa_status figure_tidy_svg(const char *svg, const char *prefix,
                               const struct wa_figure_words *words, bool inline_element,
                               char **tidy, size_t *size, struct wa_error *error)
{
    struct copy copy = {.prefix = prefix};
    if (!inline_element) {
        wa_text_append(&copy.text, "<?xml version=\"1.0\" encoding=\"utf-8\"?>\n");
    }
    const char *content = open_element(&copy.text, svg, words, inline_element);
    if (content == NULL) {
        wa_text_free(&copy.text);
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "gnuplot gave no SVG; check that the Debian package gnuplot-nox is "
                       "complete.");
    }
    copy_content(&copy, content);
    if (copy.text.failed) {
        wa_text_free(&copy.text);
        return wa_fail_memory(error);
    }
    *tidy = copy.text.bytes;
    *size = copy.text.length;
    return WA_OK;
}
