#include "command/table_internal.h"

#include "base/text.h"

#include <string.h>

#define KEY_COLUMNS 30
#define NAME_COLUMNS 28

struct list_call {
    struct table_options common;
    char words[256];
};

static const char documentation[] =
    "List the acids of the table, or those whose key, name, other name or formula holds the words."
    "\vExample: whichacid table list phosphoric";

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct list_call *call = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &call->common;
        return 0;
    case ARGP_KEY_ARGS:
        join_words(call->words, sizeof call->words, state->argv + state->next,
                   state->argc - state->next);
        return 0;
    default:
        (void)argument;
        return ARGP_ERR_UNKNOWN;
    }
}

static bool holds(const char *text, const char *folded_words)
{
    char folded[2048];
    wa_text_fold(text, strlen(text), folded, sizeof folded);
    return strstr(folded, folded_words) != NULL;
}

static bool wanted(const struct wa_acid *acid, const char *words)
{
    char folded[256];
    wa_text_fold(words, strlen(words), folded, sizeof folded);
    return folded[0] == '\0' || holds(acid->key, folded) || holds(acid->name, folded) ||
           holds(acid->other_names, folded) || holds(acid->formula, folded);
}

static json_t *acid_json(const struct wa_acid *acid)
{
    json_t *steps = json_array();
    for (int i = 0; i < acid->step_count; i++) {
        json_array_append_new(
            steps, json_pack("{s:f,s:f}", "pKa", acid->steps[i].pKa, "u", acid->steps[i].u));
    }
    return json_pack("{s:s,s:s,s:s,s:i,s:b,s:b,s:o}", "key", acid->key, "name", acid->name,
                     "formula", acid->formula, "charge", acid->charge, "modelled",
                     (int)acid->modelled, "yours", (int)acid->from_user, "steps", steps);
}

static void print_acid(FILE *stream, const struct wa_acid *acid)
{
    print_padded(stream, acid->key, KEY_COLUMNS - 2);
    fputs("  ", stream);
    print_padded(stream, acid->name, NAME_COLUMNS - 2);
    fputc(' ', stream);
    for (int i = 0; i < acid->step_count; i++) {
        fprintf(stream, " %.2f", acid->steps[i].pKa);
    }
    fprintf(stream, "%s\n", acid->from_user ? "  (yours)" : "");
}

int table_list(int argument_count, char **arguments)
{
    const struct argp argp = {.parser = parse,
                              .args_doc = "[WORDS]",
                              .doc = documentation,
                              .children = table_common_children};
    struct list_call call = {0};
    struct wa_table table;
    struct page page;
    argp_parse(&argp, argument_count, arguments, 0, NULL, &call);
    int status = table_open(&call.common, &table);
    if (status != 0) {
        return status;
    }
    json_t *list = json_array();
    status = page_open(&page);
    size_t count = 0;
    for (size_t i = 0; i < table.acid_count && status == 0; i++) {
        if (wanted(&table.acids[i], call.words)) {
            print_acid(page.stream, &table.acids[i]);
            json_array_append_new(list, acid_json(&table.acids[i]));
            count++;
        }
    }
    if (status == 0 && call.common.json) {
        fclose(page.stream);
        free(page.text);
        status = table_write_json(json_incref(list), &call.common);
    } else if (status == 0) {
        fprintf(page.stream, "%zu of %zu acids\n", count, table.acid_count);
        status = page_close(&page, &call.common);
    }
    json_decref(list);
    wa_table_free(&table);
    return status;
}
