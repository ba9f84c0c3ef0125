/* The page: its order, the verdict, and what is said in sentences. */
#include "report/html_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

const char *html_sample_name(const struct wa_result *result)
{
    const struct wa_run *run = result->runs.count > 0 ? &result->runs.runs[0] : NULL;
    if (run != NULL && run->conditions.sample != NULL && run->conditions.sample[0] != '\0') {
        return run->conditions.sample;
    }
    return run != NULL && run->file != NULL ? run->file : "unnamed sample";
}

/* Words and class of a verdict. */
struct look {
    const char *words;
    const char *class;
};

static struct look look_of(enum wa_verdict_kind kind)
{
    static const struct look looks[] = {{"identified", "identified"},
                                        {"narrowed to a set", "narrowed"},
                                        {"not in the table", "absent"},
                                        {"unfit for an answer", "unfit"}};
    return (size_t)kind < sizeof looks / sizeof looks[0] ? looks[kind] : looks[3];
}

static void write_fact(struct wa_text *page, const char *name, double value, double u,
                       const char *unit)
{
    if (isfinite(value)) {
        char text[64];
        report_quantity(text, sizeof text, value, u);
        html_raw(page, "<tr><th scope=\"row\">%s</th><td>", name);
        html_format(page, "%s%s%s", text, unit[0] != '\0' ? " " : "", unit);
        html_raw(page, "</td></tr>\n");
    }
}

static void write_facts(struct wa_text *rows, const struct wa_result *result)
{
    if (isfinite(result->verdict.probability) && result->verdict.kind != WA_VERDICT_UNFIT) {
        char share[32], against[80];
        report_probability(share, sizeof share, result->verdict.probability);
        report_threshold(against, sizeof against, &result->verdict);
        html_raw(rows, "<tr><th scope=\"row\">Probability</th><td>");
        html_format(rows, "%s (%s)", share, against);
        html_raw(rows, "</td></tr>\n");
    }
    write_fact(rows, "Molar mass", result->molar_mass, result->molar_mass_u, "g/mol");
    write_fact(rows, "Amount", 1e3 * result->amount_mol, 1e3 * result->amount_u, "mmol");
    for (size_t i = 0; i < result->pKa_count && i < 4; i++) {
        char name[48];
        snprintf(name, sizeof name, "p<i>K</i><sub>a</sub> %d", result->pKa[i].step);
        if (!result->pKa[i].is_bound) {
            write_fact(rows, name, result->pKa[i].value, result->pKa[i].u, "");
        }
    }
    if (result->proton_count > 0) {
        char share[32];
        report_probability(share, sizeof share, result->proton_probability);
        html_raw(rows, "<tr><th scope=\"row\">Protons shown</th><td>");
        html_format(rows, "%d (probability %s)", result->proton_count, share);
        html_raw(rows, "</td></tr>\n");
    }
}

void html_verdict(struct wa_text *page, const struct wa_result *result)
{
    const struct wa_verdict *verdict = &result->verdict;
    const struct look look = look_of(verdict->kind);
    const bool said = verdict->sentence != NULL && verdict->sentence[0] != '\0';
    html_raw(page,
             "<section class=\"verdict %s\" aria-labelledby=\"verdict\">\n"
             "<h2 id=\"verdict\">Verdict: %s</h2>\n<p class=\"answer\">",
             look.class, look.words);
    html_text(page, said ? verdict->sentence : "No verdict could be reached.");
    html_raw(page, "</p>\n");
    struct wa_text rows = {0};
    write_facts(&rows, result);
    if (rows.length > 0 && !rows.failed) {
        html_raw(page, "<table class=\"facts\">\n<tbody>\n%s</tbody>\n</table>\n", rows.bytes);
    }
    page->failed = page->failed || rows.failed;
    wa_text_free(&rows);
    if (result->forms_considered > 0) {
        html_raw(page, "<p class=\"small\">");
        html_format(page, "Compared: %zu forms of the table, %zu of them with every point.",
                    result->forms_considered, result->forms_fitted);
        html_raw(page, "</p>\n");
    }
    html_section_end(page);
}

static bool said_before(const struct wa_result_sentence *sentences, size_t index)
{
    return report_has_sentence(sentences, index, sentences[index].sentence);
}

static void write_item(struct wa_text *page, const char *sentence)
{
    html_raw(page, "<li>");
    html_text(page, sentence);
    html_raw(page, "</li>\n");
}

static void write_sentences(struct wa_text *page, const struct wa_result_sentence *sentences,
                            size_t count)
{
    for (size_t i = 0; i < count; i++) {
        if (sentences[i].sentence != NULL && !said_before(sentences, i)) {
            write_item(page, sentences[i].sentence);
        }
    }
}

void html_findings(struct wa_text *page, const struct wa_result *result)
{
    size_t remarks = 0;
    for (size_t i = 0; i < result->runs.count && result->curves != NULL; i++) {
        remarks += result->curves[i].remark_count;
    }
    if (result->finding_count + remarks == 0) {
        return;
    }
    html_section(page, "findings", "Findings");
    html_raw(page, "<ul>\n");
    write_sentences(page, result->findings, result->finding_count);
    for (size_t i = 0; i < result->runs.count && result->curves != NULL; i++) {
        for (size_t k = 0; k < result->curves[i].remark_count; k++) {
            const char *remark = result->curves[i].remarks[k];
            if (!report_has_sentence(result->findings, result->finding_count, remark)) {
                html_raw(page, "<li>");
                html_format(page, "%s%s", result->runs.count > 1 ? "In a run: " : "", remark);
                html_raw(page, "</li>\n");
            }
        }
    }
    html_raw(page, "</ul>\n");
    html_section_end(page);
}

void html_next_tests(struct wa_text *page, const struct wa_result *result)
{
    if (result->next_test_count == 0) {
        return;
    }
    html_section(page, "next", "What to do next");
    html_raw(page, "<ul>\n");
    for (size_t i = 0; i < result->next_test_count; i++) {
        const struct wa_result_next *next = &result->next_tests[i];
        html_raw(page, "<li>");
        html_text(page, next->sentence);
        if (next->separates != NULL && next->separates[0] != '\0') {
            html_raw(page, "<span class=\"small\">");
            struct wa_text keys = {.bytes = NULL};
            report_keys(&keys, next->separates);
            page->failed = page->failed || keys.failed;
            html_format(page, "separates: %s", keys.failed ? "" : keys.bytes);
            wa_text_free(&keys);
            html_raw(page, "</span>");
        }
        html_raw(page, "</li>\n");
    }
    html_raw(page, "</ul>\n");
    html_section_end(page);
}

static bool is_new_remark(const struct wa_result *result, size_t run, size_t remark)
{
    const char *sentence = result->runs.runs[run].remarks[remark];
    bool said = report_has_sentence(result->assumptions, result->assumption_count, sentence);
    for (size_t i = 0; i <= run; i++) {
        const struct wa_run *other = &result->runs.runs[i];
        const size_t count = i < run ? other->remark_count : remark;
        for (size_t k = 0; k < count; k++) {
            said = said || strcmp(other->remarks[k], sentence) == 0;
        }
    }
    return !said;
}

void html_assumed(struct wa_text *page, const struct wa_result *result)
{
    size_t remarks = 0;
    for (size_t i = 0; i < result->runs.count; i++) {
        remarks += result->runs.runs[i].remark_count;
    }
    if (result->assumption_count + remarks == 0) {
        return;
    }
    html_section(page, "assumed", "Assumed");
    html_raw(page, "<ul>\n");
    write_sentences(page, result->assumptions, result->assumption_count);
    for (size_t i = 0; i < result->runs.count; i++) {
        for (size_t k = 0; k < result->runs.runs[i].remark_count; k++) {
            if (is_new_remark(result, i, k)) {
                write_item(page, result->runs.runs[i].remarks[k]);
            }
        }
    }
    html_raw(page, "</ul>\n");
    html_section_end(page);
}

/* Hazards of candidates stand apart: which of them holds depends on the answer. */
static void write_cautions(struct wa_text *page, const struct wa_result *result, const char *id,
                           const char *heading, bool of_candidates)
{
    bool headed = false;
    for (size_t i = 0; i < result->caution_count; i++) {
        const struct wa_result_sentence *caution = &result->cautions[i];
        const bool of_one = caution->code != NULL && strncmp(caution->code, "candidate-", 10) == 0;
        if (of_one != of_candidates || caution->sentence == NULL ||
            said_before(result->cautions, i)) {
            continue;
        }
        if (!headed) {
            html_section(page, id, heading);
            html_raw(page, "<ul>\n");
            headed = true;
        }
        write_item(page, caution->sentence);
    }
    if (headed) {
        html_raw(page, "</ul>\n");
        html_section_end(page);
    }
}

void html_cautions(struct wa_text *page, const struct wa_result *result)
{
    write_cautions(page, result, "cautions", "Cautions", false);
    write_cautions(page, result, "hazards", "Hazards, if it is one of the candidates", true);
}

static void write_header(struct wa_text *page, const struct wa_result *result,
                         const struct wa_page_options *options)
{
    html_raw(page, "<body>\n<main>\n<header>\n<p class=\"kind\">Identification by titration</p>\n"
                   "<h1>");
    html_text(page, html_sample_name(result));
    html_raw(page, "</h1>\n<p class=\"kind\">");
    for (size_t i = 0; i < result->runs.count && i < 3; i++) {
        const char *file = result->runs.runs[i].file;
        html_format(page, "%s%s", i > 0 ? ", " : "", file != NULL ? file : "(no file)");
    }
    html_format(page, "%s, %zu %s", result->runs.count > 3 ? " …" : "", result->runs.count,
                result->runs.count == 1 ? "run" : "runs");
    html_raw(page, "</p>\n</header>\n");
    html_verdict(page, result);
    const struct wa_figure_set *figures = options != NULL ? options->figures : NULL;
    if (figures != NULL && figures->missing[0] != '\0') {
        html_raw(page, "<p><strong>Figures are missing.</strong> ");
        html_text(page, figures->missing);
        html_raw(page, "</p>\n");
    }
}

enum wa_status wa_report_html(const struct wa_result *result, const struct wa_page_options *options,
                              char **text, struct wa_error *error)
{
    struct wa_text page = {0};
    html_head(&page, result, options != NULL ? options->paper : WA_PAPER_OF_READER);
    write_header(&page, result, options);
    html_figure(&page, options, WA_FIGURE_CURVE);
    html_findings(&page, result);
    html_next_tests(&page, result);
    html_candidates(&page, result, options);
    html_equivalence(&page, result, options);
    html_constants(&page, result, options);
    html_amounts(&page, result);
    html_measured(&page, result);
    html_set_aside(&page, result);
    html_assumed(&page, result);
    html_fit(&page, result, options);
    html_cautions(&page, result);
    html_provenance(&page, result, options);
    html_signatures(&page);
    html_points(&page, result);
    html_raw(&page, "</main>\n</body>\n</html>\n");
    if (page.failed) {
        wa_text_free(&page);
        return wa_fail_memory(error);
    }
    *text = page.bytes;
    return WA_OK;
}
