/* The text report: the verdict first, then what stands behind it. */
#include "report/report_internal.h"

#include <stdlib.h>
#include <string.h>

#define COLUMNS_DEFAULT 80
#define COLUMNS_LEAST 40
#define COLUMNS_MOST 100 /* longer lines tire the reader */

static const char *verdict_word(enum wa_verdict_kind kind)
{
    static const char *const words[] = {"identified", "narrowed", "not in the table", "unfit"};
    return (size_t)kind < sizeof words / sizeof words[0] ? words[kind] : "unknown";
}

static void write_set(struct report_writer *writer, const struct wa_verdict *verdict)
{
    if (verdict->form_count > 1 && verdict->forms != NULL) {
        struct wa_text keys = {.bytes = NULL};
        report_keys(&keys, verdict->forms);
        writer->text.failed = writer->text.failed || keys.failed;
        report_paragraph(writer, "The set: ", 2, "%s", keys.failed ? "" : keys.bytes);
        wa_text_free(&keys);
    }
}

static void write_verdict(struct report_writer *writer, const struct wa_result *result)
{
    const struct wa_verdict *verdict = &result->verdict;
    const char *sentence = verdict->sentence;
    report_paragraph(writer, "", 0, "%s",
                     sentence != NULL && sentence[0] != '\0' ? sentence
                                                             : "No verdict could be reached.");
    char share[32];
    report_probability(share, sizeof share, verdict->probability);
    if (verdict->kind == WA_VERDICT_UNFIT) {
        report_paragraph(writer, "", 0, "Verdict: unfit.");
    } else {
        char against[80];
        report_threshold(against, sizeof against, verdict);
        report_paragraph(writer, "", 0, "Verdict: %s, probability %s (%s).",
                         verdict_word(verdict->kind), share, against);
    }
    write_set(writer, verdict);
    if (result->forms_considered > 0) {
        report_paragraph(
            writer, "", 0, "Compared: %zu forms of the table, %zu of them with every point%s%s%s.",
            result->forms_considered, result->forms_fitted,
            result->table_version[0] != '\0' ? "; table version " : "", result->table_version,
            result->overlaid_count > 0 ? "; rows of your own are laid over it" : "");
    }
}

static size_t chosen_width(const struct wa_report_options *options)
{
    int columns = options != NULL && options->columns > 0 ? options->columns : COLUMNS_DEFAULT;
    columns = columns < COLUMNS_LEAST ? COLUMNS_LEAST : columns;
    return (size_t)(columns > COLUMNS_MOST ? COLUMNS_MOST : columns);
}

enum wa_status wa_report_text(const struct wa_result *result,
                              const struct wa_report_options *options, char **text,
                              struct wa_error *error)
{
    struct report_writer writer = {
        .columns = chosen_width(options),
        .colour = options != NULL && options->colour,
    };
    if (options != NULL && options->title != NULL) {
        report_paragraph(&writer, "", 0, "%s", options->title);
    }
    write_verdict(&writer, result);
    report_measured(&writer, result);
    report_plot(&writer, result);
    report_equivalence(&writer, result);
    report_pKa(&writer, result);
    report_amount(&writer, result);
    report_candidates(&writer, result);
    report_weighing(&writer, result);
    report_set_aside(&writer, result);
    report_assumed(&writer, result);
    report_fit(&writer, result);
    report_closing(&writer, result);
    if (options != NULL && options->version != NULL) {
        report_paragraph(&writer, "\n", 0, "whichacid %s", options->version);
    }
    if (writer.text.failed) {
        wa_text_free(&writer.text);
        return wa_fail_memory(error);
    }
    *text = writer.text.bytes;
    return WA_OK;
}
