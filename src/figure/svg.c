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

/* The svg element's opening with its title and description. Returns where its content begins. */
static const char *open_element(struct wa_text *tidy, const char *svg, const char *prefix,
                                const struct wa_figure_words *words)
{
    const char *element = strstr(svg, "<svg");
    const char *end = element != NULL ? strchr(element, '>') : NULL;
    if (end == NULL) {
        return NULL;
    }
    wa_text_append(tidy, "<svg role=\"img\" aria-labelledby=\"%s-title %s-description\"", prefix,
                   prefix);
    for (const char *at = element + 4; at < end; at++) {
        wa_text_append_bytes(tidy, *at == '\n' ? " " : at, 1);
    }
    wa_text_append(tidy, ">\n<title id=\"%s-title\">", prefix);
    append_escaped(tidy, words->title);
    wa_text_append(tidy, "</title>\n<desc id=\"%s-description\">", prefix);
    append_escaped(tidy, words->alternative);
    wa_text_append(tidy, "</desc>\n");
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

/* An attribute that defines or uses an id: its opening is copied and the prefix put after it. */
static size_t copied_id(struct wa_text *tidy, const char *at, const char *prefix)
{
    static const char *const openings[] = {" id='", " id=\"", "href='#", "href=\"#", "url(#"};
    for (size_t i = 0; i < sizeof openings / sizeof openings[0]; i++) {
        if (starts(at, openings[i])) {
            wa_text_append(tidy, "%s%s-", openings[i], prefix);
            return strlen(openings[i]);
        }
    }
    return 0;
}

enum wa_status figure_tidy_svg(const char *svg, const char *prefix,
                               const struct wa_figure_words *words, bool inline_element,
                               char **tidy, size_t *size, struct wa_error *error)
{
    struct wa_text text = {0};
    if (!inline_element) {
        wa_text_append(&text, "<?xml version=\"1.0\" encoding=\"utf-8\"?>\n");
    }
    const char *at = open_element(&text, svg, prefix, words);
    if (at == NULL) {
        wa_text_free(&text);
        return wa_fail(error, WA_ERROR_FILE, NULL, 0,
                       "gnuplot gave no SVG; check that the Debian package gnuplot-nox is "
                       "complete.");
    }
    while (*at != '\0') {
        size_t bytes = skipped(at);
        if (bytes == 0) {
            bytes = copied_id(&text, at, prefix);
        }
        if (bytes == 0) {
            wa_text_append_bytes(&text, at, 1);
            bytes = 1;
        }
        at += bytes;
    }
    if (text.failed) {
        wa_text_free(&text);
        return wa_fail_memory(error);
    }
    *tidy = text.bytes;
    *size = text.length;
    return WA_OK;
}
