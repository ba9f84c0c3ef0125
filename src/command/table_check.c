#include "command/command.h"
#include "command/table_internal.h"

#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

struct check_call {
    struct table_options common;
    const char *path;
};

static const char documentation[] =
    "Look for mistakes in a table folder, or in a file or folder of your own that is laid over the "
    "shipped table. Exit status 1 when there are any."
    "\vExample: whichacid table check my-acids.csv";

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct check_call *call = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &call->common;
        return 0;
    case ARGP_KEY_ARG:
        if (call->path != NULL) {
            argp_error(state, "one file or folder at a time.");
        }
        call->path = argument;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

/* A folder with an acids.csv and an atomic-weights.csv is a whole table; everything else is laid
 * over one. */
static bool is_whole_table(const char *path)
{
    char file[4096];
    snprintf(file, sizeof file, "%s/atomic-weights.csv", path);
    bool weights = access(file, R_OK) == 0;
    snprintf(file, sizeof file, "%s/acids.csv", path);
    return weights && access(file, R_OK) == 0;
}

/* Does a problem belong to what was asked about? */
static bool concerns(const struct check_call *call, const struct wa_table_problem *problem)
{
    return call->common.also_count == 0 || call->path == NULL ||
           strncmp(problem->file, call->path, strlen(call->path)) == 0;
}

static json_t *statistics_json(const struct wa_table_statistics *s)
{
    return json_pack("{s:I,s:I,s:I,s:I,s:I,s:I,s:I,s:I,s:I,s:I,s:I,s:I}", "acids",
                     (json_int_t)s->acids, "acids_modelled", (json_int_t)s->acids_modelled,
                     "acids_sourced", (json_int_t)s->acids_sourced, "acids_with_enthalpy",
                     (json_int_t)s->acids_enthalpy, "constants", (json_int_t)s->constants,
                     "constants_sourced", (json_int_t)s->constants_sourced, "forms",
                     (json_int_t)s->forms, "forms_with_cas", (json_int_t)s->forms_with_cas,
                     "forms_with_hazards", (json_int_t)s->forms_with_hazards,
                     "forms_with_solubility", (json_int_t)s->forms_with_solubility,
                     "forms_with_melting_point", (json_int_t)s->forms_with_melting_point,
                     "forms_of_several_parts", (json_int_t)s->forms_of_several_parts);
}

static void print_statistics(FILE *stream, const struct wa_table *table,
                             const struct wa_table_statistics *s)
{
    double share = s->acids > 0 ? 100.0 * (double)s->acids_sourced / (double)s->acids : 0.0;
    fprintf(stream,
            "%zu acids, %zu of them modelled, %zu (%.0f %%) with a source for\n"
            "  every step, ",
            s->acids, s->acids_modelled, s->acids_sourced, share);
    fprintf(stream, "%zu with an enthalpy\n", s->acids_enthalpy);
    fprintf(stream, "%zu constants, %zu from a source, %zu from memory; %zu sources\n",
            s->constants, s->constants_sourced, s->constants - s->constants_sourced,
            table->source_count);
    fprintf(stream,
            "%zu forms, %zu of several parts; %zu with a CAS number, %zu with hazards,\n"
            "  %zu with a solubility, %zu with a melting point\n",
            s->forms, s->forms_of_several_parts, s->forms_with_cas, s->forms_with_hazards,
            s->forms_with_solubility, s->forms_with_melting_point);
    fprintf(stream, "%zu indicators, %zu titrants, %zu standards, %zu buffer values\n",
            table->indicator_count, table->titrant_count, table->standard_count,
            table->buffer_count);
    if (s->acids_from_user + s->forms_from_user > 0) {
        fprintf(stream, "yours: %zu acids, %zu forms\n", s->acids_from_user, s->forms_from_user);
    }
}

static json_t *problem_json(const struct wa_table_problem *problem)
{
    return json_pack("{s:s,s:I,s:s,s:b,s:s}", "file", problem->file, "line",
                     (json_int_t)problem->line, "column", problem->column, "row_used",
                     (int)!problem->fatal, "sentence", problem->sentence);
}

static void print_problem(FILE *stream, const struct wa_table_problem *problem)
{
    fprintf(stream, "%s:%ld: %s%s%s%s\n", problem->file, problem->line, problem->column,
            problem->column[0] != '\0' ? ": " : "", problem->sentence,
            problem->fatal ? " (row not used)" : "");
}

/* Write the findings. @return exit status */
static int write_findings(const struct check_call *call, const struct wa_table *table)
{
    struct wa_table_statistics statistics;
    struct page page;
    json_t *problems = json_array();
    size_t count = 0;
    wa_table_count(table, &statistics);
    int status = page_open(&page);
    for (size_t i = 0; i < table->problem_count && status == 0; i++) {
        if (concerns(call, &table->problems[i])) {
            print_problem(page.stream, &table->problems[i]);
            json_array_append_new(problems, problem_json(&table->problems[i]));
            count++;
        }
    }
    if (status == 0 && call->common.json) {
        fclose(page.stream);
        free(page.text);
        status = table_write_json(json_pack("{s:s,s:O,s:o}", "version", table->version, "problems",
                                            problems, "statistics", statistics_json(&statistics)),
                                  &call->common);
    } else if (status == 0) {
        print_statistics(page.stream, table, &statistics);
        fprintf(page.stream, "version %s\n", table->version);
        if (count == 0) {
            fprintf(page.stream, "no problem found\n");
        } else {
            fprintf(page.stream, "%zu %s found\n", count, count == 1 ? "problem" : "problems");
        }
        status = page_close(&page, &call->common);
    }
    json_decref(problems);
    return status != 0 ? status : count > 0 ? 1 : 0;
}

int table_check(int argument_count, char **arguments)
{
    const struct argp argp = {.parser = parse,
                              .args_doc = "[FILE|FOLDER]",
                              .doc = documentation,
                              .children = table_common_children};
    struct check_call call = {0};
    struct wa_table table;
    struct wa_error error;
    argp_parse(&argp, argument_count, arguments, 0, NULL, &call);
    if (call.path != NULL && is_whole_table(call.path)) {
        call.common.folder = call.path;
        call.path = NULL;
    } else if (call.path != NULL) {
        if (call.common.also_count == TABLE_ALSO_MAX) {
            fprintf(stderr, "whichacid: too many files are laid over the table.\n");
            return 2;
        }
        call.common.also[call.common.also_count] = call.path;
        call.common.also_count++;
    }
    int status = table_open(&call.common, &table);
    if (status != 0) {
        return status;
    }
    if (wa_table_check(&table, &error) != WA_OK) {
        wa_table_free(&table);
        return command_report_error(&error);
    }
    status = write_findings(&call, &table);
    wa_table_free(&table);
    return status;
}
