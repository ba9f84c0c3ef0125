/* `identify`: from the files of a call to its answer. */
#include "command/command.h"
#include "command/identify_request.h"

#include "base/file.h"
#include "base/grow.h"
#include "base/sha256.h"
#include "whichacid/figure.h"
#include "whichacid/report.h"

#include <stdlib.h>
#include <string.h>
#include <sys/ioctl.h>
#include <unistd.h>

/* One file as it was read. */
struct input {
    const char *name;
    char sha256[65];
    size_t runs;
};

/* What all files of a call share. */
struct work {
    const struct identify_request *request;
    struct wa_table table;
    struct wa_identify_options options;
    char **among; /* single names, owned */
    size_t among_count;
    size_t among_capacity;
    struct wa_weight_list prior;
    struct wa_observation *observed;
    struct input *inputs; /* as many as files */
    struct wa_report_options report;
    enum wa_figure_kind figure_kind;
};

static bool is_in_table(const struct wa_table *table, const char *name)
{
    return wa_table_find_form(table, name) >= 0 || wa_table_find_acid(table, name) >= 0;
}

static enum wa_status fail_unknown(const char *option, const char *name, struct wa_error *error)
{
    return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                   "%s: the table has no acid or form '%.100s'; `whichacid table list` shows all.",
                   option, name);
}

static enum wa_status add_among(struct work *work, const char *name, size_t length,
                                struct wa_error *error)
{
    wa_text_trim(&name, &length);
    if (length == 0) {
        return WA_OK;
    }
    char *copy = wa_text_copy(name, length);
    if (copy == NULL ||
        !wa_grow(&work->among, &work->among_capacity, work->among_count + 1, sizeof *work->among)) {
        free(copy);
        return wa_fail_memory(error);
    }
    work->among[work->among_count++] = copy;
    return is_in_table(&work->table, copy) ? WA_OK : fail_unknown("--among", copy, error);
}

/* Names with commas in them stand when the whole text is one; else commas separate. */
static enum wa_status split_among(struct work *work, const char *text, struct wa_error *error)
{
    if (is_in_table(&work->table, text)) {
        return add_among(work, text, strlen(text), error);
    }
    enum wa_status status = WA_OK;
    while (status == WA_OK) {
        size_t length = strcspn(text, ",");
        status = add_among(work, text, length, error);
        if (text[length] == '\0') {
            break;
        }
        text += length + 1;
    }
    return status;
}

/* A name of the table, names with commas between, or a file that lists names. */
static enum wa_status take_among(struct work *work, const char *text, struct wa_error *error)
{
    struct wa_weight_list list;
    if (is_in_table(&work->table, text) || access(text, R_OK) != 0) {
        return split_among(work, text, error);
    }
    enum wa_status status = wa_weights_load(text, &work->table, &list, error);
    if (status != WA_OK) {
        return status;
    }
    for (size_t i = 0; status == WA_OK && i < list.count; i++) {
        status = add_among(work, list.weights[i].key, strlen(list.weights[i].key), error);
    }
    wa_weights_free(&list);
    return status;
}

/* The laboratory's weights, and what was observed besides. */
static enum wa_status take_evidence(struct work *work, struct wa_error *error)
{
    const struct identify_request *request = work->request;
    enum wa_status status = WA_OK;
    if (request->prior != NULL) {
        status = wa_weights_load(request->prior, &work->table, &work->prior, error);
        work->options.prior = &work->prior;
        work->options.prior_file = request->prior;
    }
    work->observed = calloc(request->observed_count + 1, sizeof *work->observed);
    if (work->observed == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; status == WA_OK && i < request->observed_count; i++) {
        status = wa_observation_parse(request->observed[i], &work->observed[i], error);
    }
    work->options.observed = work->observed;
    work->options.observed_count = request->observed_count;
    work->options.compare[0] = request->compare[0];
    work->options.compare[1] = request->compare[1];
    return status;
}

/* Names of a comparison, told before any work is done. */
static enum wa_status check_compared(const struct work *work, struct wa_error *error)
{
    for (int side = 0; side < 2; side++) {
        const char *at = work->request->compare[side];
        const bool rest = at != NULL && side == 1 && strcmp(at, WA_WEIGHT_REST) == 0;
        while (at != NULL && !rest && *at != '\0') {
            const size_t length = strcspn(at, ",");
            char *name = wa_text_copy(at, length);
            if (name == NULL) {
                return wa_fail_memory(error);
            }
            const bool known = is_in_table(&work->table, name);
            const enum wa_status status = known ? WA_OK : fail_unknown("--compare", name, error);
            free(name);
            if (!known) {
                return status;
            }
            at += length + (at[length] == ',' ? 1 : 0);
        }
    }
    return WA_OK;
}

static enum wa_status parse_threshold(const char *text, double *threshold, struct wa_error *error)
{
    struct wa_quantity share;
    struct wa_error ignored;
    if (wa_quantity_parse(text, WA_DIMENSION_FRACTION, &share, &ignored) != WA_OK ||
        !(share.value >= 0.5 && share.value < 1.0)) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "--threshold: '%.40s' is no share from 0.5 to below 1, such as 0.95.", text);
    }
    *threshold = share.value;
    return WA_OK;
}

static void choose_look(struct work *work)
{
    const struct identify_request *request = work->request;
    bool to_file = request->output != NULL && strcmp(request->output, "-") != 0;
    work->report.version = WHICHACID_VERSION;
    if (to_file || !isatty(STDOUT_FILENO)) {
        return;
    }
    struct winsize size;
    if (ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) == 0) {
        work->report.columns = size.ws_col;
    }
    const char *terminal = getenv("TERM");
    const char *no_colour = getenv("NO_COLOR");
    work->report.colour = terminal != NULL && strcmp(terminal, "dumb") != 0 &&
                          (no_colour == NULL || no_colour[0] == '\0');
}

static enum wa_status prepare(struct work *work, struct wa_error *error)
{
    const struct identify_request *request = work->request;
    work->inputs = calloc(request->path_count, sizeof *work->inputs);
    if (work->inputs == NULL) {
        return wa_fail_memory(error);
    }
    enum wa_status status =
        wa_table_load(request->table, request->also, request->also_count, &work->table, error);
    if (status == WA_OK && request->threshold != NULL) {
        status = parse_threshold(request->threshold, &work->options.threshold, error);
    }
    for (size_t i = 0; i < request->among_count && status == WA_OK; i++) {
        status = take_among(work, request->among[i], error);
    }
    if (status == WA_OK) {
        status = take_evidence(work, error);
    }
    if (status == WA_OK) {
        status = check_compared(work, error);
    }
    if (status == WA_OK && request->explain != NULL &&
        !is_in_table(&work->table, request->explain)) {
        status = fail_unknown("--explain", request->explain, error);
    }
    /* A figure that cannot be written is refused before the work, not after it. */
    enum wa_figure_format format;
    if (status == WA_OK && request->figure != NULL) {
        status = wa_figure_format_of(request->figure, &format, error);
    }
    if (status == WA_OK && request->figure_kind != NULL) {
        status = wa_figure_kind_of(request->figure_kind, &work->figure_kind, error);
    }
    work->options.among = (const char *const *)work->among;
    work->options.among_count = work->among_count;
    work->options.explain = request->explain;
    choose_look(work);
    return status;
}

/* Rows that cannot be used are told, so that nobody believes them in force. */
static void tell_problems(const struct wa_table *table)
{
    for (size_t i = 0; i < table->problem_count; i++) {
        const struct wa_table_problem *problem = &table->problems[i];
        if (problem->fatal) {
            fprintf(stderr, "whichacid: %s:%ld: %s%s%s (row not used)\n", problem->file,
                    problem->line, problem->column, problem->column[0] != '\0' ? ": " : "",
                    problem->sentence);
        }
    }
}

static enum wa_status read_input(struct work *work, size_t index, struct wa_run_list *runs,
                                 struct wa_error *error)
{
    const char *path = work->request->paths[index];
    struct input *input = &work->inputs[index];
    input->name = strcmp(path, "-") == 0 ? "standard input" : path;
    char *bytes;
    size_t size;
    enum wa_status status = wa_file_read(path, WA_FILE_LIMIT, &bytes, &size, error);
    if (status != WA_OK) {
        return status;
    }
    wa_sha256(bytes, size, input->sha256);
    size_t before = runs->count;
    status = wa_read_memory(bytes, size, input->name, &work->request->notes->reader, runs, error);
    free(bytes);
    input->runs = runs->count - before;
    return status;
}

/* The same bytes twice would pass for two measurements that agree wonderfully. */
static enum wa_status refuse_copies(const struct work *work, size_t first, size_t count,
                                    struct wa_error *error)
{
    for (size_t i = first; i < first + count; i++) {
        for (size_t k = first; k < i; k++) {
            if (strcmp(work->inputs[i].sha256, work->inputs[k].sha256) == 0) {
                return wa_fail(error, WA_ERROR_INPUT, work->inputs[i].name, 0,
                               "The file holds the same bytes as %.200s, so it is no replicate; "
                               "name it once.",
                               work->inputs[k].name);
            }
        }
    }
    return WA_OK;
}

static enum wa_status add_inputs(const struct work *work, size_t first, size_t count,
                                 struct wa_result *result, struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t i = first; i < first + count && status == WA_OK; i++) {
        const struct input *input = &work->inputs[i];
        status = wa_result_add_input(result, input->name, input->sha256, input->runs, error);
    }
    if (status == WA_OK && result->table_folder == NULL) {
        result->table_folder = strdup(work->request->table);
        status = result->table_folder != NULL ? WA_OK : wa_fail_memory(error);
    }
    return status;
}

static enum wa_status write_result(const struct work *work, const struct wa_result *result,
                                   const char *title, struct wa_text *answer,
                                   struct wa_error *error)
{
    struct wa_report_options options = work->report;
    options.title = title;
    enum wa_status status = identify_write(work->request, result, &options, answer, error);
    if (status == WA_OK && work->request->figure != NULL) {
        status = wa_figure_write(result, work->figure_kind, work->request->figure, error);
    }
    return status;
}

/* Files `first` to `first + count` as replicates of one sample. */
static enum wa_status answer_sample(struct work *work, size_t first, size_t count,
                                    const char *title, struct wa_text *answer,
                                    struct wa_error *error)
{
    struct wa_run_list runs = {0};
    struct wa_result result = {0};
    enum wa_status status = WA_OK;
    for (size_t i = first; i < first + count && status == WA_OK; i++) {
        status = read_input(work, i, &runs, error);
    }
    if (status == WA_OK) {
        status = refuse_copies(work, first, count, error);
    }
    if (status == WA_OK) {
        status = wa_identify(&runs, &work->table, &work->options, &result, error);
    }
    if (status == WA_OK) {
        status = add_inputs(work, first, count, &result, error);
        if (status == WA_OK) {
            status = write_result(work, &result, title, answer, error);
        }
        wa_result_free(&result);
    }
    wa_run_list_free(&runs);
    return status;
}

static void show_progress(size_t index, size_t count)
{
    if (count > 1 && isatty(STDERR_FILENO)) {
        fprintf(stderr, "\rwhichacid: file %zu of %zu%s", index + 1, count,
                index + 1 == count ? "\n" : "");
    }
}

/* Each file for itself: one that cannot be used does not keep the others from their answers. */
static int answer_each(struct work *work, struct wa_text *answer)
{
    const struct identify_request *request = work->request;
    int result = 0;
    size_t answered = 0;
    for (size_t i = 0; i < request->path_count; i++) {
        struct wa_error error;
        size_t before = answer->length;
        show_progress(i, request->path_count);
        wa_text_append(answer, "%s",
                       request->json   ? answered == 0 ? "[\n" : ",\n"
                       : answered == 0 ? ""
                                       : "\n\n");
        if (answer_sample(work, i, 1, request->paths[i], answer, &error) == WA_OK) {
            answered++;
        } else {
            answer->length = before;
            int failed = command_report_error(&error);
            result = failed > result ? failed : result;
        }
    }
    if (request->json) {
        wa_text_append(answer, "%s", answered == 0 ? "[]\n" : "]\n");
    }
    return result;
}

int identify_answer(const struct identify_request *request, struct wa_text *answer)
{
    struct work work = {.request = request};
    struct wa_error error;
    int result = 0;
    if (prepare(&work, &error) != WA_OK) {
        result = command_report_error(&error);
    } else {
        tell_problems(&work.table);
        if (request->each) {
            result = answer_each(&work, answer);
        } else if (answer_sample(&work, 0, request->path_count, NULL, answer, &error) != WA_OK) {
            result = command_report_error(&error);
        }
    }
    for (size_t i = 0; i < work.among_count; i++) {
        free(work.among[i]);
    }
    free(work.among);
    free(work.inputs);
    free(work.observed);
    wa_weights_free(&work.prior);
    wa_table_free(&work.table);
    return result;
}
