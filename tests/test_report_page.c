/* The page to print and sign, as HTML and PDF, and the short form. Kinds of check are stated at
 * each test. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "figure_sample.h"
#include "report_sample.h"
#include "whichacid/report.h"

static const char plain_words[] = "The sample is acetic acid.";

/* What would be markup, script, style, policy or a closing element if it were not escaped. */
static const char hostile_words[] =
    "\"><script>alert(1)</script><img src=x onerror=alert(1)>' onmouseover='alert(1) "
    "</style></title></table></svg></main> <!-- --> ]]> &amp; &#60;b&#62; "
    "<a href=\"https://example.org\">x</a> [x](https://example.org) | a | `b` **c** <d> \n# e\n- f "
    "\xFF\xC0\x80 \x1B[2J \xE2\x80\xAE right";

static struct wa_result demo;
static struct wa_figure_set figures;

static char *page_of(const struct wa_result *result, const struct wa_figure_set *set,
                     enum wa_paper paper)
{
    const struct wa_page_options options = {.version = "0.0.0", .figures = set, .paper = paper};
    char *page = NULL;
    assert_int_equal(wa_report_html(result, &options, &page, NULL), WA_OK);
    return page;
}

static char *sample_page(const char *words)
{
    struct wa_result result;
    sample_result(&result, words);
    assert_int_equal(wa_result_add_input(&result, words, "0123456789abcdef", 1, NULL), WA_OK);
    char *page = page_of(&result, NULL, WA_PAPER_OF_READER);
    wa_result_free(&result);
    return page;
}

static void assert_says(const char *text, const char *words)
{
    if (strstr(text, words) == NULL) {
        fail_msg("'%s' is missing", words);
    }
}

static size_t count_of(const char *text, const char *words)
{
    size_t count = 0;
    for (const char *at = text; (at = strstr(at, words)) != NULL; at += strlen(words)) {
        count++;
    }
    return count;
}

static void assert_valid(const char *page)
{
    static const char *const tidy[] = {"tidy", "-quiet", "-errors", NULL};
    free(checked_by(tidy, page, strlen(page)));
}

/* Outside check (tidy, Debian's HTML checker): the pages of a good curve, of hostile words and of
 * nothing at all are valid without a warning. */
static void html_is_valid(void **state)
{
    (void)state;
    char *page = page_of(&demo, &figures, WA_PAPER_A4);
    assert_valid(page);
    free(page);
    page = sample_page(hostile_words);
    assert_valid(page);
    free(page);
    struct wa_result nothing;
    sample_nothing(&nothing);
    page = page_of(&nothing, NULL, WA_PAPER_LETTER);
    assert_valid(page);
    assert_null(strstr(page, ">nan"));
    assert_null(strstr(page, " nan"));
    free(page);
}

/* Own contract: words from files never become markup. The page of hostile words has exactly the
 * tags and quotes of the page of plain words. */
static void words_are_never_markup(void **state)
{
    (void)state;
    char *plain = sample_page(plain_words);
    char *hostile = sample_page(hostile_words);
    static const char *const marks[] = {"<", ">", "\"", "<th", "<a", "<!--", "'"};
    for (size_t i = 0; i < sizeof marks / sizeof marks[0]; i++) {
        assert_int_equal(count_of(hostile, marks[i]), count_of(plain, marks[i]));
    }
    assert_null(strstr(hostile, "<script"));
    assert_null(strstr(hostile, "<img"));
    assert_null(strchr(hostile, 0x1B));
    assert_says(hostile, "&lt;script&gt;alert(1)&lt;/script&gt;");
    assert_says(hostile, "&amp;amp; &amp;#60;b&amp;#62;");
    free(hostile);
    free(plain);
}

/* Own contract: one file, nothing loaded, nothing run. The only addresses are the two names of SVG.
 */
static void page_stands_alone(void **state)
{
    (void)state;
    char *page = page_of(&demo, &figures, WA_PAPER_OF_READER);
    assert_null(strstr(page, "<script"));
    assert_null(strstr(page, " src="));
    assert_null(strstr(page, "<link"));
    assert_null(strstr(page, "@import"));
    assert_int_equal(count_of(page, "http"),
                     count_of(page, "http://www.w3.org/") + count_of(page, "http-equiv"));
    assert_int_equal(count_of(page, "url("), count_of(page, "url(#"));
    assert_says(page, "default-src 'none'");
    free(page);
}

/* Own contract: verdict first, then everything a reviewer asks for. */
static void page_holds_the_record(void **state)
{
    (void)state;
    char *page = page_of(&demo, &figures, WA_PAPER_OF_READER);
    const char *verdict = strstr(page, "Verdict: identified");
    assert_non_null(verdict);
    assert_true(verdict < strstr(page, "<svg"));
    assert_true(verdict < strstr(page, "Candidates"));
    assert_int_equal(count_of(page, "<svg"), WA_FIGURE_KINDS);
    free(page);
    page = sample_page(plain_words);
    static const char *const record[] = {
        "0.18010 ± 0.00020", "line 3",           "option",          "assumed",
        "0123456789abcdef",  "98.1 %",           "4.761 ± 0.012",   "above 11",
        "30.000 ± 0",        "taken for a slip", "whichacid 0.0.0", ">33<",
        "Analyst",           "Reviewer",         "Signature",       "Date"};
    for (size_t i = 0; i < sizeof record / sizeof record[0]; i++) {
        assert_says(page, record[i]);
    }
    free(page);
}

/* Own contract (WCAG 2.1, 1.1.1 and 1.3.1): headings in order, every heading cell says what it
 * heads, every figure has words. */
static void page_is_accessible(void **state)
{
    (void)state;
    char *page = page_of(&demo, &figures, WA_PAPER_OF_READER);
    assert_int_equal(count_of(page, "<h1"), 1);
    assert_true(strstr(page, "<h1") < strstr(page, "<h2"));
    assert_null(strstr(page, "<h3"));
    assert_int_equal(count_of(page, "<th ") + count_of(page, "<thead"), count_of(page, "<th"));
    assert_int_equal(count_of(page, "<th scope="), count_of(page, "<th "));
    assert_int_equal(count_of(page, "<svg role=\"img\" aria-label=\""), count_of(page, "<svg"));
    assert_says(page, "<html lang=\"en\">");
    free(page);
}

static double luminance(const char *digits)
{
    double channels[3];
    for (int i = 0; i < 3; i++) {
        char pair[3] = {digits[2 * i], digits[2 * i + 1], '\0'};
        const double part = (double)strtol(pair, NULL, 16) / 255.0;
        channels[i] = part <= 0.03928 ? part / 12.92 : pow((part + 0.055) / 1.055, 2.4);
    }
    return 0.2126 * channels[0] + 0.7152 * channels[1] + 0.0722 * channels[2];
}

/* Outside check (WCAG 2.1, contrast ratio by relative luminance): all words at least 4.5 to 1 on
 * white and on the one shade. */
static void contrast_is_enough(void **state)
{
    (void)state;
    char *page = page_of(&demo, NULL, WA_PAPER_OF_READER);
    const double darkest_ground = luminance("f0f0ec");
    size_t colours = 0;
    for (const char *at = page; (at = strstr(at, "color:#")) != NULL; at += 7) {
        assert_true((darkest_ground + 0.05) / (luminance(at + 7) + 0.05) >= 4.5);
        colours++;
    }
    assert_true(colours > 5);
    free(page);
}

/* Own contract: without gnuplot the page says so and has everything else. */
static void page_without_figures(void **state)
{
    (void)state;
    struct wa_figure_set none = {.missing = "Install <gnuplot-nox>."};
    char *page = page_of(&demo, &none, WA_PAPER_OF_READER);
    assert_says(page, "Figures are missing.</strong> Install &lt;gnuplot-nox&gt;.");
    assert_says(page, "citric acid");
    free(page);
}

/* Own contract: the PDF has the paper asked for, its text can be searched, and pages are numbered
 * and named. */
static void pdf_on_both_papers(void **state)
{
    (void)state;
    static const char *const pdfinfo[] = {"pdfinfo", "-", NULL};
    static const char *const pdftotext[] = {"pdftotext", "-layout", "-", "-", NULL};
    const struct {
        enum wa_paper paper;
        const char *size;
    } papers[] = {{WA_PAPER_OF_READER, "(A4)"}, {WA_PAPER_LETTER, "(letter)"}};
    for (size_t i = 0; i < 2; i++) {
        const struct wa_page_options options = {
            .version = "0.0.0", .figures = &figures, .paper = papers[i].paper};
        char *pdf = NULL;
        size_t size = 0;
        struct wa_error error;
        if (wa_report_pdf(&demo, &options, &pdf, &size, &error) != WA_OK) {
            fail_msg("%s", error.message);
        }
        char *about = checked_by(pdfinfo, pdf, size);
        char *text = checked_by(pdftotext, pdf, size);
        assert_says(about, papers[i].size);
        assert_says(text, "Verdict: identified");
        assert_says(text, "page 1 of");
        assert_says(text, "titrant volume / mL");
        assert_says(text, "Reviewer");
        free(text);
        free(about);
        free(pdf);
    }
}

/* Own contract: a missing converter is one sentence that names the package. */
static void missing_converter_is_one_sentence(void **state)
{
    (void)state;
    char *path = strdup(getenv("PATH"));
    const struct wa_page_options options = {.version = "0.0.0"};
    struct wa_error error;
    char *pdf;
    size_t size;
    setenv("PATH", "/nonexistent", 1);
    const enum wa_status status = wa_report_pdf(&demo, &options, &pdf, &size, &error);
    setenv("PATH", path, 1);
    free(path);
    assert_int_equal(status, WA_ERROR_FILE);
    assert_says(error.message, "install the Debian package weasyprint");
}

static char *short_form(const char *words)
{
    struct wa_result result;
    sample_result(&result, words);
    assert_int_equal(wa_result_add_input(&result, words, "0123456789abcdef", 1, NULL), WA_OK);
    char *text = NULL;
    assert_int_equal(wa_report_markdown(&result, "0.0.0", &text, NULL), WA_OK);
    wa_result_free(&result);
    return text;
}

/* Characters of that kind which no backslash takes the meaning from. */
static size_t bare_marks(const char *text, char mark)
{
    size_t count = 0;
    for (const char *at = text; *at != '\0'; at++) {
        if (*at == '\\') {
            at += at[1] != '\0';
        } else {
            count += *at == mark;
        }
    }
    return count;
}

/* Own contract: words from files are no markup in the short form either, nor do they make lines. */
static void short_form_is_escaped(void **state)
{
    (void)state;
    char *plain = short_form(plain_words);
    char *hostile = short_form(hostile_words);
    for (const char *mark = "<>|`*_[]#&\n"; *mark != '\0'; mark++) {
        assert_int_equal(bare_marks(hostile, *mark), bare_marks(plain, *mark));
    }
    assert_int_equal(count_of(hostile, "://"), count_of(hostile, "\\://"));
    assert_says(plain, "**Verdict:** The sample is acetic acid.\n");
    assert_says(plain, "| amount | 3.0012 ± 0.0070 mmol |");
    assert_says(plain, "SHA-256 0123456789abcdef");
    free(hostile);
    free(plain);
}

static int set_up(void **state)
{
    (void)state;
    demo_result(&demo);
    return wa_figure_set_draw(&demo, &figures, NULL) == WA_OK ? 0 : -1;
}

static int tear_down(void **state)
{
    (void)state;
    wa_figure_set_free(&figures);
    wa_result_free(&demo);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(html_is_valid),
        cmocka_unit_test(words_are_never_markup),
        cmocka_unit_test(page_stands_alone),
        cmocka_unit_test(page_holds_the_record),
        cmocka_unit_test(page_is_accessible),
        cmocka_unit_test(contrast_is_enough),
        cmocka_unit_test(page_without_figures),
        cmocka_unit_test(pdf_on_both_papers),
        cmocka_unit_test(missing_converter_is_one_sentence),
        cmocka_unit_test(short_form_is_escaped),
    };
    return cmocka_run_group_tests(tests, set_up, tear_down);
}
