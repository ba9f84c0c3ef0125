/* Figures drawn by gnuplot. Kinds of check are stated at each test. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "figure/figure_internal.h"
#include "figure_sample.h"
#include "report_sample.h"

#include <sys/stat.h>
#include <unistd.h>

static struct wa_result demo;

static char *drawn(const struct wa_result *result, enum wa_figure_kind kind,
                   enum wa_figure_format format, size_t *size)
{
    char *bytes = NULL;
    struct wa_error error;
    if (wa_figure_draw(result, kind, format, &bytes, size, &error) != WA_OK) {
        fail_msg("%s: %s", wa_figure_word(kind), error.message);
    }
    return bytes;
}

static void assert_says(const char *text, const char *words)
{
    if (strstr(text, words) == NULL) {
        fail_msg("'%s' is missing", words);
    }
}

/* What each figure must say in words. */
static const char *const said[WA_FIGURE_KINDS][6] = {
    [WA_FIGURE_CURVE] = {"titrant volume / mL", "pH", "measured", "fit", "half-equivalence", "E1:"},
    [WA_FIGURE_DERIVATIVE] = {"titrant volume / mL", "(dpH/dV) / mL", "steepest slope",
                              "standard uncertainty", "E1"},
    [WA_FIGURE_GRAN] = {"titrant volume / mL", "Gran", "before the jump", "after the jump",
                        "intercept"},
    [WA_FIGURE_RESIDUALS] = {"titrant volume / mL", "(measured", "/ u", "residual"},
    [WA_FIGURE_RUNNER_UP] = {"titrant volume / mL", "residual / u", "citric acid", "(rank 1)",
                             "measured"},
    [WA_FIGURE_SPECIES] = {"pH", "fraction of the acid system", "H₃A", "H₂A⁻", "HA²⁻", "A³⁻"},
};

/* Own contract: every figure of a good curve is drawn, is well-formed, and names its axes with
 * units and its marks. */
static void svg_holds_the_words(void **state)
{
    (void)state;
    static const char *const xmllint[] = {"xmllint", "--noout", "--nonet", "-", NULL};
    for (int kind = 0; kind < WA_FIGURE_KINDS; kind++) {
        assert_true(wa_figure_is_possible(&demo, (enum wa_figure_kind)kind));
        size_t size;
        char *svg = drawn(&demo, (enum wa_figure_kind)kind, WA_FIGURE_SVG, &size);
        for (size_t i = 0; i < 6 && said[kind][i] != NULL; i++) {
            assert_says(svg, said[kind][i]);
        }
        assert_says(svg, "role=\"img\"");
        assert_null(strstr(svg, "<script"));
        assert_null(strstr(svg, "gnuplot_plot"));
        free(checked_by(xmllint, svg, size));
        free(svg);
    }
}

/* Own contract: the PDF is one page as wide as asked for, with text that can be searched. */
static void pdf_holds_the_words(void **state)
{
    (void)state;
    static const char *const pdftotext[] = {"pdftotext", "-layout", "-", "-", NULL};
    static const char *const pdfinfo[] = {"pdfinfo", "-", NULL};
    for (int kind = 0; kind < WA_FIGURE_KINDS; kind++) {
        size_t size;
        char *pdf = drawn(&demo, (enum wa_figure_kind)kind, WA_FIGURE_PDF, &size);
        char *text = checked_by(pdftotext, pdf, size);
        char *about = checked_by(pdfinfo, pdf, size);
        assert_says(text, said[kind][0]);
        assert_says(text, said[kind][1]);
        assert_says(about, "Pages:           1\n");
        assert_says(about, "Page size:       450 x");
        free(about);
        free(text);
        free(pdf);
    }
}

static unsigned big_endian(const char *bytes)
{
    const unsigned char *at = (const unsigned char *)bytes;
    return (unsigned)at[0] << 24 | (unsigned)at[1] << 16 | (unsigned)at[2] << 8 | at[3];
}

/* Outside check (PNG specification, ISO/IEC 15948: signature and header): size in pixels. */
static void png_has_its_size(void **state)
{
    (void)state;
    size_t size;
    char *png = drawn(&demo, WA_FIGURE_CURVE, WA_FIGURE_PNG, &size);
    assert_true(size > 1000);
    assert_memory_equal(png, "\x89PNG\r\n\x1A\n", 8);
    assert_int_equal(big_endian(png + 16), 2 * FIGURE_WIDTH);
    assert_int_equal(big_endian(png + 20), 760);
    free(png);
}

/* Own contract: names from files are drawn as text, whatever they hold; gnuplot runs none of it. */
static void names_are_never_commands(void **state)
{
    (void)state;
    static const char *const xmllint[] = {"xmllint", "--noout", "--nonet", "-", NULL};
    static const char *const hostile[] = {
        "`touch ran-by-name`",
        "a\" ; system \"touch ran-by-name\" ; print \"",
        "a' ; !touch ran-by-name",
        "\nsystem 'touch ran-by-name'\n",
        "\\140touch ran-by-name\\140 @macro $value %s 12\\061",
        "<script>&amp;</script> \xFF\xC0 \x1B[2J \xE2\x80\xAE 30.0",
    };
    for (size_t i = 0; i < sizeof hostile / sizeof hostile[0]; i++) {
        char *kept = demo.candidates[0].form_name;
        demo.candidates[0].form_name = strdup(hostile[i]);
        size_t size;
        char *svg = drawn(&demo, WA_FIGURE_RUNNER_UP, WA_FIGURE_SVG, &size);
        free(demo.candidates[0].form_name);
        demo.candidates[0].form_name = kept;
        assert_null(strstr(svg, "<script"));
        assert_true(access("ran-by-name", F_OK) != 0);
        free(checked_by(xmllint, svg, size));
        free(svg);
    }
}

/* Own contract: a name comes out as it went in, so that escapes are undone in the right place. */
static void names_come_out_whole(void **state)
{
    (void)state;
    char *kept = demo.candidates[0].form_name;
    demo.candidates[0].form_name = strdup("2'-acid `x` \"y\" \\101 30.07 % $z @w ±");
    size_t size;
    char *svg = drawn(&demo, WA_FIGURE_RUNNER_UP, WA_FIGURE_SVG, &size);
    free(demo.candidates[0].form_name);
    demo.candidates[0].form_name = kept;
    assert_says(svg, "2'-acid `x` \"y\" \\101 30.07 % $z @w ± (rank 1)");
    free(svg);
}

/* Own contract: figures of a page share no id. */
static void set_has_no_id_twice(void **state)
{
    (void)state;
    struct wa_figure_set set;
    assert_int_equal(wa_figure_set_draw(&demo, &set, NULL), WA_OK);
    assert_int_equal(set.count, WA_FIGURE_KINDS);
    assert_string_equal(set.missing, "");
    for (size_t i = 0; i < set.count; i++) {
        const char *word = wa_figure_word(set.figures[i].kind);
        for (const char *at = set.figures[i].svg; (at = strstr(at, " id=")) != NULL; at += 5) {
            assert_memory_equal(at + 5, word, strlen(word));
        }
        assert_memory_equal(set.figures[i].svg, "<svg", 4);
        assert_true(strlen(set.figures[i].words.alternative) > 20);
    }
    wa_figure_set_free(&set);
}

/* Own contract: without gnuplot one sentence names the package, and a page loses nothing else. */
static void missing_gnuplot_is_one_sentence(void **state)
{
    (void)state;
    char *path = strdup(getenv("PATH"));
    struct wa_error error;
    struct wa_figure_set set;
    char *bytes;
    size_t size;
    setenv("PATH", "/nonexistent", 1);
    const enum wa_status status =
        wa_figure_draw(&demo, WA_FIGURE_CURVE, WA_FIGURE_SVG, &bytes, &size, &error);
    const enum wa_status of_set = wa_figure_set_draw(&demo, &set, NULL);
    setenv("PATH", path, 1);
    free(path);
    assert_int_equal(status, WA_ERROR_FILE);
    assert_says(error.message, "install the Debian package gnuplot-nox.");
    assert_int_equal(of_set, WA_OK);
    assert_int_equal(set.count, 0);
    assert_says(set.missing, "gnuplot-nox");
    wa_figure_set_free(&set);
}

/* Own contract: the ending decides, and a file appears whole or not at all. */
static void files_by_their_ending(void **state)
{
    (void)state;
    struct wa_error error;
    assert_int_equal(wa_figure_write(&demo, WA_FIGURE_CURVE, "figure-of-test.PNG", &error), WA_OK);
    struct stat about;
    assert_int_equal(stat("figure-of-test.PNG", &about), 0);
    assert_true(about.st_size > 1000);
    unlink("figure-of-test.PNG");
    assert_int_equal(wa_figure_write(&demo, WA_FIGURE_CURVE, "figure-of-test.gif", &error),
                     WA_ERROR_CALL);
    assert_says(error.message, ".svg, .pdf or .png");
    assert_int_equal(wa_figure_write(&demo, WA_FIGURE_CURVE, "no-such-folder/a.svg", &error),
                     WA_ERROR_FILE);
    enum wa_figure_kind kind;
    assert_int_equal(wa_figure_kind_of("runner-up", &kind, NULL), WA_OK);
    assert_int_equal(kind, WA_FIGURE_RUNNER_UP);
    assert_int_equal(wa_figure_kind_of("pie", &kind, &error), WA_ERROR_CALL);
    assert_says(error.message, "curve, derivative, gran, residuals, runner-up, species");
}

/* Own contract: a result without points has no figures, and unfit data no picture of candidates. */
static void nothing_to_draw(void **state)
{
    (void)state;
    struct wa_result empty;
    sample_nothing(&empty);
    for (int kind = 0; kind < WA_FIGURE_KINDS; kind++) {
        assert_false(wa_figure_is_possible(&empty, (enum wa_figure_kind)kind));
    }
    char *bytes;
    size_t size;
    assert_int_equal(wa_figure_draw(&empty, WA_FIGURE_CURVE, WA_FIGURE_SVG, &bytes, &size, NULL),
                     WA_ERROR_CALL);
    const enum wa_verdict_kind kept = demo.verdict.kind;
    demo.verdict.kind = WA_VERDICT_UNFIT;
    assert_true(wa_figure_is_possible(&demo, WA_FIGURE_CURVE));
    assert_false(wa_figure_is_possible(&demo, WA_FIGURE_RUNNER_UP));
    assert_false(wa_figure_is_possible(&demo, WA_FIGURE_SPECIES));
    demo.verdict.kind = kept;
}

/* Common practice (charges follow from protons): labels of species. */
static void species_are_labelled(void **state)
{
    (void)state;
    char label[48];
    figure_species_label(label, sizeof label, 3, 0, 1);
    assert_string_equal(label, "H₂A⁻");
    figure_species_label(label, sizeof label, 1, 1, 0);
    assert_string_equal(label, "HA⁺");
    figure_species_label(label, sizeof label, 2, 1, 1);
    assert_string_equal(label, "HA");
    figure_species_label(label, sizeof label, 4, 0, 4);
    assert_string_equal(label, "A⁴⁻");
}

/* Self-consistency: the smooth curve passes through the model at the points it was fitted to, and
 * fractions add up to one. */
static void trace_follows_the_fit(void **state)
{
    (void)state;
    const struct wa_trace *trace = &demo.best_trace;
    const struct wa_experiment *experiment = &demo.experiments[0];
    assert_true(trace->count > 200);
    for (size_t p = 0; p < experiment->count; p++) {
        size_t i = 1;
        while (i + 1 < trace->count && trace->volume_mL[i] < experiment->volume_mL[p]) {
            i++;
        }
        const double low = fmin(trace->reading[i - 1], trace->reading[i]) - 1e-6;
        const double high = fmax(trace->reading[i - 1], trace->reading[i]) + 1e-6;
        assert_true(demo.best.model[p] >= low && demo.best.model[p] <= high);
    }
    for (size_t i = 0; i < trace->count; i++) {
        double sum = 0.0;
        for (int k = 0; k <= trace->step_count; k++) {
            sum += trace->fraction[i * (size_t)(trace->step_count + 1) + (size_t)k];
        }
        assert_true(fabs(sum - 1.0) < 1e-9);
        assert_true(i == 0 || trace->volume_mL[i] > trace->volume_mL[i - 1]);
        assert_true(i == 0 || fabs(trace->pH[i] - trace->pH[i - 1]) < 0.2);
    }
}

static int set_up(void **state)
{
    (void)state;
    demo_result(&demo);
    return 0;
}

static int tear_down(void **state)
{
    (void)state;
    wa_result_free(&demo);
    return 0;
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(svg_holds_the_words),
        cmocka_unit_test(pdf_holds_the_words),
        cmocka_unit_test(png_has_its_size),
        cmocka_unit_test(names_are_never_commands),
        cmocka_unit_test(names_come_out_whole),
        cmocka_unit_test(set_has_no_id_twice),
        cmocka_unit_test(missing_gnuplot_is_one_sentence),
        cmocka_unit_test(files_by_their_ending),
        cmocka_unit_test(nothing_to_draw),
        cmocka_unit_test(species_are_labelled),
        cmocka_unit_test(trace_follows_the_fit),
    };
    return cmocka_run_group_tests(tests, set_up, tear_down);
}
