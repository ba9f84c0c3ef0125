/* The parts that the page is made of. */
#include "report/html_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void html_text(struct wa_text *page, const char *text)
{
    struct wa_text clean = {0};
    report_clean(&clean, text != NULL ? text : "", true);
    if (clean.failed) {
        page->failed = true;
        wa_text_free(&clean);
        return;
    }
    for (const char *at = clean.bytes; *at != '\0'; at++) {
        switch (*at) {
        case '&':
            html_raw(page, "&amp;");
            break;
        case '<':
            html_raw(page, "&lt;");
            break;
        case '>':
            html_raw(page, "&gt;");
            break;
        case '"':
            html_raw(page, "&quot;");
            break;
        case '\'':
            html_raw(page, "&#39;");
            break;
        default:
            wa_text_append_bytes(page, at, 1);
        }
    }
    wa_text_free(&clean);
}

void html_format(struct wa_text *page, const char *format, ...)
{
    char *words = NULL;
    va_list arguments;
    va_start(arguments, format);
    if (vasprintf(&words, format, arguments) < 0) {
        words = NULL;
        page->failed = true;
    }
    va_end(arguments);
    html_text(page, words);
    free(words);
}

void html_section(struct wa_text *page, const char *id, const char *heading)
{
    html_raw(page, "<section aria-labelledby=\"%s\">\n<h2 id=\"%s\">%s</h2>\n", id, id, heading);
}

void html_section_end(struct wa_text *page)
{
    html_raw(page, "</section>\n");
}

void html_table(struct wa_text *page, const char *caption, const char *const *headings)
{
    html_raw(page,
             "<div class=\"scroll\" tabindex=\"0\" role=\"region\" aria-label=\"%s\">\n<table>\n"
             "<caption>%s</caption>\n<thead><tr>",
             caption, caption);
    for (size_t i = 0; headings[i] != NULL; i++) {
        html_raw(page, "<th scope=\"col\">%s</th>", headings[i]);
    }
    html_raw(page, "</tr></thead>\n<tbody>\n");
}

void html_table_end(struct wa_text *page)
{
    html_raw(page, "</tbody>\n</table>\n</div>\n");
}

void html_row(struct wa_text *page, const char *heading)
{
    html_raw(page, "<tr><th scope=\"row\">");
    html_text(page, heading);
    html_raw(page, "</th>");
}

void html_cell(struct wa_text *page, const char *text)
{
    html_raw(page, "<td>");
    html_text(page, text);
    html_raw(page, "</td>");
}

void html_number(struct wa_text *page, const char *text)
{
    html_raw(page, "<td class=\"number\">");
    html_text(page, text);
    html_raw(page, "</td>");
}

void html_quantity(struct wa_text *page, double value, double u)
{
    char text[64] = "–";
    if (isfinite(value)) {
        report_quantity(text, sizeof text, value, u);
    }
    html_number(page, text);
}

void html_origin(struct wa_text *page, enum wa_origin origin, long line)
{
    char text[64];
    report_origin(text, sizeof text, origin, line);
    html_cell(page, text);
}

void html_figure(struct wa_text *page, const struct wa_page_options *options,
                 enum wa_figure_kind kind)
{
    const struct wa_figure_set *set = options != NULL ? options->figures : NULL;
    for (size_t i = 0; set != NULL && i < set->count; i++) {
        const struct wa_drawn_figure *figure = &set->figures[i];
        if (figure->kind != kind) {
            continue;
        }
        html_raw(page, "<figure>\n<div class=\"scroll\" tabindex=\"0\" role=\"group\" "
                       "aria-label=\"");
        html_text(page, figure->words.title);
        html_raw(page, "\">\n");
        wa_text_append_bytes(page, figure->svg, strlen(figure->svg));
        html_raw(page, "</div>\n<figcaption><strong>");
        html_text(page, figure->words.title);
        html_raw(page, ".</strong> ");
        html_text(page, figure->words.caption);
        html_raw(page, "</figcaption>\n</figure>\n");
    }
}
