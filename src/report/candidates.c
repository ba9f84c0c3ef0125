/* The candidates, each with what a chemist can check. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* A candidate below this share and rank takes one line. */
#define SHARE_IN_FULL 0.01
#define RANK_IN_FULL 3

#define INDENT "       " /* of what is said about a candidate */
#define HANG 9

static bool is_given(const char *text)
{
    return text != NULL && text[0] != '\0';
}

static void append_steps(struct wa_text *words, const struct wa_result_candidate *candidate)
{
    for (int i = 0; i < candidate->step_count && i < WA_PROTONS_MAX; i++) {
        char figure[64];
        char off[32];
        report_quantity(figure, sizeof figure, candidate->pKa[i], candidate->pKa_u[i]);
        report_deviation(off, sizeof off, candidate->seen[i] ? candidate->pKa_deviation[i] : NAN);
        wa_text_append(words, "%s%s (%s)", i == 0 ? "pKa " : ", ", figure,
                       !candidate->seen[i] ? "not seen"
                       : off[0] != '\0'    ? off
                                           : "not compared");
    }
}

/* The molar mass of a form is known far better than any titration tells: two decimals. */
static void write_figures(struct report_writer *writer, const struct wa_result_candidate *candidate)
{
    struct wa_text words = {0};
    append_steps(&words, candidate);
    if (isfinite(candidate->molar_mass) && candidate->molar_mass > 0.0) {
        char off[32];
        report_deviation(off, sizeof off, candidate->molar_mass_deviation);
        wa_text_append(&words, "%smolar mass %.2f g/mol (%s)", words.length > 0 ? "; " : "",
                       candidate->molar_mass, off[0] != '\0' ? off : "none measured");
    }
    if (isfinite(candidate->misfit) && candidate->misfit > 0.0) {
        wa_text_append(&words, "%smisfit %.2f", words.length > 0 ? "; " : "", candidate->misfit);
    }
    if (words.failed) {
        writer->text.failed = true;
    } else if (words.length > 0) {
        report_paragraph(writer, INDENT, HANG, "%s", words.bytes);
    }
    wa_text_free(&words);
}

static void write_name(struct report_writer *writer, const struct wa_result_candidate *candidate,
                       bool in_full)
{
    char share[32];
    char first[64];
    report_probability(share, sizeof share, candidate->probability);
    snprintf(first, sizeof first, "  %2d. %8s  ", candidate->rank, share);
    const char *name = is_given(candidate->form_name)   ? candidate->form_name
                       : is_given(candidate->acid_name) ? candidate->acid_name
                                                        : "(no name)";
    char mass[48] = "";
    if (!in_full && isfinite(candidate->molar_mass) && candidate->molar_mass > 0.0) {
        snprintf(mass, sizeof mass, ", %.2f g/mol", candidate->molar_mass);
    }
    report_paragraph(writer, first, HANG, "%s [%s]%s", name,
                     candidate->key != NULL ? candidate->key : "", mass);
}

static void write_candidate(struct report_writer *writer,
                            const struct wa_result_candidate *candidate)
{
    bool in_full = candidate->rank <= RANK_IN_FULL || !(candidate->probability < SHARE_IN_FULL);
    write_name(writer, candidate, in_full);
    if (!in_full) {
        return;
    }
    write_figures(writer, candidate);
    if (is_given(candidate->why) || is_given(candidate->sources)) {
        const char *why = is_given(candidate->why) ? candidate->why : "";
        const char *sources = is_given(candidate->sources) ? candidate->sources : "";
        report_paragraph(writer, INDENT, HANG, "%s%s%s%s", why,
                         why[0] != '\0' && sources[0] != '\0' ? "; " : "",
                         sources[0] != '\0' ? "sources: " : "", sources);
    }
    if (is_given(candidate->others)) {
        report_paragraph(writer, INDENT, HANG, "cannot be told here from: %s", candidate->others);
    }
}

void report_candidates(struct report_writer *writer, const struct wa_result *result)
{
    report_heading(writer, "CANDIDATES");
    if (result->verdict.kind == WA_VERDICT_UNFIT && result->candidate_count > 0) {
        report_paragraph(writer, "  ", 2,
                         "The data are unfit for an answer: this list is a hint and no more.");
    }
    for (size_t i = 0; i < result->candidate_count; i++) {
        write_candidate(writer, &result->candidates[i]);
    }
    char share[32];
    char first[64];
    report_probability(share, sizeof share, result->not_in_table);
    snprintf(first, sizeof first, "   -  %8s  ", share);
    report_paragraph(writer, first, HANG, "something that is not in the table");
    if (result->candidate_count == 0) {
        report_paragraph(writer, "  ", 2, "No form of the table is listed.");
        return;
    }
    report_paragraph(writer, "  ", 2,
                     "In brackets: measured less table, in standard uncertainties u of both; "
                     "beyond 2 u is doubtful, beyond 3 u hardly the same substance. The table's "
                     "pKa hold at 25 °C and I = 0. Misfit: how far a point is off, in its own u; 1 "
                     "is expected.");
}
