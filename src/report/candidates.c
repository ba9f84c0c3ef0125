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

/* The molar mass of a form is known far better than any titration tells: two decimals. */
static void write_molar_mass(struct report_writer *writer,
                             const struct wa_result_candidate *candidate)
{
    if (!isfinite(candidate->molar_mass) || candidate->molar_mass <= 0.0) {
        return;
    }
    char off[32];
    report_deviation(off, sizeof off, candidate->molar_mass_deviation);
    report_paragraph(writer, INDENT, HANG, "molar mass %.2f g/mol%s%s", candidate->molar_mass,
                     off[0] != '\0' ? "; measured is off by " : "; none was measured", off);
}

static void write_steps(struct report_writer *writer, const struct wa_result_candidate *candidate)
{
    struct wa_text words = {0};
    for (int i = 0; i < candidate->step_count && i < WA_PROTONS_MAX; i++) {
        char figure[64];
        char off[32];
        report_quantity(figure, sizeof figure, candidate->pKa[i], candidate->pKa_u[i]);
        report_deviation(off, sizeof off, candidate->seen[i] ? candidate->pKa_deviation[i] : NAN);
        wa_text_append(&words, "%s%s (%s)", i == 0 ? "" : "; ", figure,
                       !candidate->seen[i] ? "not seen here"
                       : off[0] != '\0'    ? off
                                           : "not compared");
    }
    if (words.failed) {
        writer->text.failed = true;
    } else if (words.length > 0) {
        report_paragraph(writer, INDENT, HANG, "pKa %s", words.bytes);
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
    write_molar_mass(writer, candidate);
    write_steps(writer, candidate);
    if (isfinite(candidate->misfit) && candidate->misfit > 0.0) {
        report_paragraph(writer, INDENT, HANG, "misfit %.2f u a point (1 is expected)",
                         candidate->misfit);
    }
    if (is_given(candidate->why)) {
        report_paragraph(writer, INDENT, HANG, "why: %s", candidate->why);
    }
    if (is_given(candidate->others)) {
        report_paragraph(writer, INDENT, HANG, "cannot be told here from: %s", candidate->others);
    }
    if (is_given(candidate->sources)) {
        report_paragraph(writer, INDENT, HANG, "constants from: %s", candidate->sources);
    }
}

void report_candidates(struct report_writer *writer, const struct wa_result *result)
{
    report_heading(writer, "CANDIDATES");
    for (size_t i = 0; i < result->candidate_count; i++) {
        write_candidate(writer, &result->candidates[i]);
    }
    char share[32];
    report_probability(share, sizeof share, result->not_in_table);
    char first[64];
    snprintf(first, sizeof first, "   -  %8s  ", share);
    report_paragraph(writer, first, HANG, "something that is not in the table");
    if (result->candidate_count == 0) {
        report_paragraph(writer, "  ", 2, "No form of the table is listed.");
        return;
    }
    report_paragraph(writer, "  ", 2,
                     "u: one standard uncertainty, of measurement and table together; beyond 2 u "
                     "is doubtful, beyond 3 u hardly the same substance. The table's pKa hold at "
                     "25 °C and I = 0.");
}
