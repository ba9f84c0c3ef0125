/* The short form in Markdown (CommonMark, with the tables of GitHub's dialect). */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Whether a character could be markup where it stands. At the start of a line a list's marks count
 * too: "-", or digits with a point and a space. */
static bool is_markup(const char *start, const char *at)
{
    const size_t digits = strspn(start, "0123456789");
    if (at == start && strchr("-+=", *at) != NULL) {
        return true;
    }
    if (digits > 0 && at == start + digits && (*at == '.' || *at == ')')) {
        return at[1] == ' ' || at[1] == '\0';
    }
    return strchr("\\`*_{}[]<>#|&~@$", *at) != NULL || (*at == ':' && at[1] == '/');
}

/* Text as text: what could be markup gets a backslash, which CommonMark takes off again. */
static void put_text(struct wa_text *out, const char *text)
{
    struct wa_text clean = {0};
    report_clean(&clean, text != NULL ? text : "", true);
    if (clean.failed) {
        out->failed = true;
        wa_text_free(&clean);
        return;
    }
    const char *start = clean.bytes;
    while (*start == ' ') {
        start++;
    }
    for (const char *at = start; *at != '\0'; at++) {
        if (is_markup(start, at)) {
            wa_text_append_bytes(out, "\\", 1);
        }
        wa_text_append_bytes(out, at, 1);
    }
    wa_text_free(&clean);
}

static void put_fact(struct wa_text *out, const char *name, double value, double u,
                     const char *unit)
{
    if (isfinite(value)) {
        char figure[64];
        report_quantity(figure, sizeof figure, value, u);
        wa_text_append(out, "| %s | %s%s%s |\n", name, figure, unit[0] != '\0' ? " " : "", unit);
    }
}

static void put_facts(struct wa_text *out, const struct wa_result *result)
{
    char share[32];
    report_probability(share, sizeof share, result->verdict.probability);
    wa_text_append(out, "\n| Quantity | Value |\n|---|---|\n");
    if (result->verdict.kind != WA_VERDICT_UNFIT) {
        wa_text_append(out, "| probability | %s |\n", share);
    }
    for (size_t i = 0; i < result->equivalence_count; i++) {
        char name[48];
        snprintf(name, sizeof name, "equivalence point %zu", i + 1);
        put_fact(out, name, result->equivalence_points[i].volume_mL,
                 result->equivalence_points[i].u_mL, "mL");
    }
    for (size_t i = 0; i < result->pKa_count; i++) {
        char name[32];
        snprintf(name, sizeof name, "pKa %d", result->pKa[i].step);
        if (result->pKa[i].is_bound) {
            wa_text_append(out, "| %s | ", name);
            put_text(out, result->pKa[i].bound);
            wa_text_append(out, " |\n");
        } else {
            put_fact(out, name, result->pKa[i].value, result->pKa[i].u, "");
        }
    }
    put_fact(out, "amount", 1e3 * result->amount_mol, 1e3 * result->amount_u, "mmol");
    put_fact(out, "molar mass", result->molar_mass, result->molar_mass_u, "g/mol");
}

static void put_candidates(struct wa_text *out, const struct wa_result *result)
{
    char share[32];
    wa_text_append(out, "\n## Candidates\n\n| Rank | Substance | Probability | Why |\n"
                        "|---:|---|---:|---|\n");
    for (size_t i = 0; i < result->candidate_count; i++) {
        const struct wa_result_candidate *candidate = &result->candidates[i];
        report_probability(share, sizeof share, candidate->probability);
        wa_text_append(out, "| %d | ", candidate->rank);
        put_text(out, candidate->form_name != NULL && candidate->form_name[0] != '\0'
                          ? candidate->form_name
                          : candidate->acid_name);
        wa_text_append(out, " | ");
        put_text(out, share);
        wa_text_append(out, " | ");
        put_text(out, candidate->why);
        wa_text_append(out, " |\n");
    }
    report_probability(share, sizeof share, result->not_in_table);
    wa_text_append(out, "| – | something that is not in the table | ");
    put_text(out, share);
    wa_text_append(out, " | |\n");
}

/* A list under a heading; one sentence is said once. */
static void put_sentences(struct wa_text *out, const char *heading,
                          const struct wa_result_sentence *sentences, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        if (i == 0) {
            wa_text_append(out, "\n## %s\n\n", heading);
        }
        if (!report_has_sentence(sentences, i, sentences[i].sentence)) {
            wa_text_append(out, "- ");
            put_text(out, sentences[i].sentence);
            wa_text_append(out, "\n");
        }
    }
}

static void put_next(struct wa_text *out, const struct wa_result *result)
{
    for (size_t i = 0; i < result->next_test_count; i++) {
        wa_text_append(out, "%s- ", i == 0 ? "\n## What to do next\n\n" : "");
        put_text(out, result->next_tests[i].sentence);
        wa_text_append(out, "\n");
    }
}

static void put_provenance(struct wa_text *out, const struct wa_result *result, const char *version)
{
    wa_text_append(out, "\n## Provenance\n\n");
    for (size_t i = 0; i < result->input_count; i++) {
        wa_text_append(out, "- ");
        put_text(out, result->inputs[i].file);
        wa_text_append(out, ", SHA-256 %s\n", result->inputs[i].sha256);
    }
    wa_text_append(out, "- whichacid %s, reference table version %s\n",
                   version != NULL ? version : "",
                   result->table_version[0] != '\0' ? result->table_version : "not known");
}

enum wa_status wa_report_markdown(const struct wa_result *result, const char *version, char **text,
                                  struct wa_error *error)
{
    const struct wa_run *run = result->runs.count > 0 ? &result->runs.runs[0] : NULL;
    const bool named = run != NULL && run->conditions.sample != NULL;
    struct wa_text out = {0};
    wa_text_append(&out, "# Identification by titration\n\n");
    if (run != NULL) {
        wa_text_append(&out, "Sample: ");
        put_text(&out, named ? run->conditions.sample : run->file);
        wa_text_append(&out, "\n\n");
    }
    wa_text_append(&out, "**Verdict:** ");
    put_text(&out, result->verdict.sentence != NULL ? result->verdict.sentence
                                                    : "No verdict could be reached.");
    wa_text_append(&out, "\n");
    put_facts(&out, result);
    put_candidates(&out, result);
    put_sentences(&out, "Findings", result->findings, result->finding_count);
    put_next(&out, result);
    put_sentences(&out, "Assumed", result->assumptions, result->assumption_count);
    put_sentences(&out, "Cautions", result->cautions, result->caution_count);
    put_provenance(&out, result, version);
    if (out.failed) {
        wa_text_free(&out);
        return wa_fail_memory(error);
    }
    *text = out.bytes;
    return WA_OK;
}
