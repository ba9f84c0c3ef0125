/* What a call of `identify` asks for, and the two steps that answer it. */
#ifndef WHICHACID_COMMAND_IDENTIFY_REQUEST_H
#define WHICHACID_COMMAND_IDENTIFY_REQUEST_H

#include "command/note_options.h"

#include "base/text.h"
#include "whichacid/identify.h"
#include "whichacid/report.h"

/** The call. Texts belong to the argument vector. */
struct identify_request {
    struct note_options *notes;
    const char **paths;
    size_t path_count;
    const char *table; /**< folder */
    const char **also; /**< files or folders laid over it */
    size_t also_count;
    const char **among; /**< as given: names, or several with commas between */
    size_t among_count;
    const char *prior;     /**< file, or NULL */
    const char **observed; /**< as given */
    size_t observed_count;
    const char *compare[2]; /**< names with commas between, or NULL */
    const char *explain;
    const char *threshold;
    const char *output;
    enum wa_paper paper;
    const char *figure;      /**< file, or NULL */
    const char *figure_kind; /**< word, or NULL */
    bool json;
    bool each;
};

/** The form of an answer. */
enum identify_page {
    IDENTIFY_TEXT, /**< or JSON */
    IDENTIFY_HTML,
    IDENTIFY_PDF,
    IDENTIFY_MARKDOWN,
};

/** The form that the output's ending asks for; JSON goes before any ending. */
enum identify_page identify_page_of(const struct identify_request *request);

/**
 * Append the answer in its form.
 * @param[in] options  of the text form
 */
enum wa_status identify_write(const struct identify_request *request,
                              const struct wa_result *result,
                              const struct wa_report_options *options, struct wa_text *answer,
                              struct wa_error *error) WA_MUST_USE;

/**
 * Answer the call. The answers of files that could be used are in `answer` even when another file
 * failed; failures are told on standard error.
 * @param[out] answer  what goes to standard output or the file
 * @return the exit status
 */
int identify_answer(const struct identify_request *request, struct wa_text *answer);

#endif
