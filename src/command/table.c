#include "command/command.h"
#include "command/table_internal.h"

#include "base/file.h"
#include "base/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const struct command words[] = {
    {"list", "the acids of the table, with their pKa", table_list},
    {"show", "a page about one acid", table_show},
    {"near", "acids near given pKa values or a molar mass", table_near},
    {"check", "look for mistakes in the table or in your own file", table_check},
    {"add", "add an acid or a form to your own file", table_add},
};

static void print_words(FILE *stream)
{
    fprintf(stream, "Usage: whichacid table WORD [OPTION...]\n\nWords:\n");
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++) {
        fprintf(stream, "  %-8s %s\n", words[i].word, words[i].summary);
    }
    fprintf(stream, "\nExample: whichacid table show citric acid\n"
                    "'whichacid table WORD --help' tells more.\n");
}

int command_table(int argument_count, char **arguments)
{
    if (argument_count < 2) {
        print_words(stderr);
        return 2;
    }
    if (strcmp(arguments[1], "--help") == 0) {
        print_words(stdout);
        return 0;
    }
    argp_err_exit_status = 2;
    for (size_t i = 0; i < sizeof words / sizeof words[0]; i++) {
        if (strcmp(arguments[1], words[i].word) == 0) {
            char name[48];
            snprintf(name, sizeof name, "whichacid table %s", words[i].word);
            /* argp prints the first argument as the program's name. */
            arguments[1] = name;
            return words[i].run(argument_count - 1, arguments + 1);
        }
    }
    fprintf(stderr, "whichacid: table has no word '%s'.\n\n", arguments[1]);
    print_words(stderr);
    return 2;
}

/* ---- options that every word takes ------------------------------------------------------------
 */

enum { OPTION_TABLE = 0x100, OPTION_ALSO, OPTION_JSON };

static const struct argp_option common_options[] = {
    {"table", OPTION_TABLE, "DIR", 0, "folder of the reference table", 10},
    {"also", OPTION_ALSO, "FILE", 0, "your own file or folder laid over the table (repeatable)",
     10},
    {"json", OPTION_JSON, NULL, 0, "the result as JSON", 10},
    {"output", 'o', "FILE", 0, "write to FILE instead of standard output", 10},
    {0},
};

static error_t parse_common(int key, char *argument, struct argp_state *state)
{
    struct table_options *options = state->input;
    switch (key) {
    case OPTION_TABLE:
        options->folder = argument;
        return 0;
    case OPTION_ALSO:
        if (options->also_count == TABLE_ALSO_MAX) {
            argp_error(state, "--also can be given %d times at most; put the files into a folder.",
                       TABLE_ALSO_MAX);
        }
        options->also[options->also_count] = argument;
        options->also_count++;
        return 0;
    case OPTION_JSON:
        options->json = true;
        return 0;
    case 'o':
        options->output = argument;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static const struct argp common_argp = {.options = common_options, .parser = parse_common};

const struct argp_child table_common_children[] = {{&common_argp, 0, NULL, 0}, {0}};

int table_open(const struct table_options *options, struct wa_table *table)
{
    struct wa_error error;
    const char *folder = options->folder != NULL ? options->folder : WHICHACID_REFERENCE_DIR;
    if (wa_table_load(folder, options->also, options->also_count, table, &error) != WA_OK) {
        return command_report_error(&error);
    }
    if (table->overlaid_count > 0) {
        fprintf(stderr, "whichacid: %zu %s of yours %s laid over the table.\n",
                table->overlaid_count, table->overlaid_count == 1 ? "row" : "rows",
                table->overlaid_count == 1 ? "is" : "are");
    }
    return 0;
}

/* ---- output -----------------------------------------------------------------------------------
 */

int page_open(struct page *page)
{
    *page = (struct page){0};
    page->stream = open_memstream(&page->text, &page->size);
    if (page->stream == NULL) {
        struct wa_error error;
        (void)wa_fail_memory(&error);
        return command_report_error(&error);
    }
    return 0;
}

static int write_text(const char *text, size_t size, const struct table_options *options)
{
    struct wa_error error;
    if (options->output != NULL) {
        return wa_file_write(options->output, text, size, &error) == WA_OK
                   ? 0
                   : command_report_error(&error);
    }
    if (fwrite(text, 1, size, stdout) != size || fflush(stdout) != 0) {
        (void)wa_fail(&error, WA_ERROR_FILE, "standard output", 0, "The output cannot be written.");
        return command_report_error(&error);
    }
    return 0;
}

int page_close(struct page *page, const struct table_options *options)
{
    struct wa_error error;
    int status;
    if (fclose(page->stream) != 0) {
        (void)wa_fail_memory(&error);
        status = command_report_error(&error);
    } else {
        status = write_text(page->text, page->size, options);
    }
    free(page->text);
    return status;
}

int table_write_json(json_t *value, const struct table_options *options)
{
    struct wa_error error;
    char *text =
        value != NULL
            ? json_dumps(value, JSON_INDENT(2) | JSON_PRESERVE_ORDER | JSON_REAL_PRECISION(10))
            : NULL;
    json_decref(value);
    if (text == NULL) {
        (void)wa_fail_memory(&error);
        return command_report_error(&error);
    }
    struct page page;
    int status = page_open(&page);
    if (status == 0) {
        fprintf(page.stream, "%s\n", text);
        status = page_close(&page, options);
    }
    free(text);
    return status;
}

json_t *json_number_or_null(double value)
{
    return isfinite(value) ? json_real(value) : json_null();
}

/* ---- text -------------------------------------------------------------------------------------
 */

void print_padded(FILE *stream, const char *text, int width)
{
    int columns = (int)wa_text_columns(text);
    fprintf(stream, "%s%*s", text, columns < width ? width - columns : 0, "");
}

void print_wrapped(FILE *stream, int column, int indent, const char *text)
{
    bool first = true;
    while (*text != '\0') {
        size_t length = strcspn(text, " ");
        char word[256];
        snprintf(word, sizeof word, "%.*s", (int)(length < 255 ? length : 255), text);
        int columns = (int)wa_text_columns(word);
        if (!first && column + 1 + columns > PAGE_COLUMNS) {
            fprintf(stream, "\n%*s", indent, "");
            column = indent;
            first = true;
        }
        fprintf(stream, "%s%s", first ? "" : " ", word);
        column += columns + (first ? 0 : 1);
        first = false;
        text += length;
        text += strspn(text, " ");
    }
    fputc('\n', stream);
}

void join_words(char *text, size_t size, char **parts, int count)
{
    size_t used = 0;
    text[0] = '\0';
    for (int i = 0; i < count && used < size; i++) {
        int written = snprintf(text + used, size - used, "%s%s", i > 0 ? " " : "", parts[i]);
        used += written > 0 ? (size_t)written : 0;
    }
}
