#include "command/command.h"
#include "command/table_trial.h"

#include "base/text.h"

#include "whichacid/quantity.h"

#include <stdlib.h>
#include <string.h>

#define DEFAULT_FOLDER "my-table"
#define ANSWER_MAX 512
#define U_SOURCED "0.03"
#define U_FROM_MEMORY "0.1"

/* What is asked for, in this order. */
enum field {
    NAME,
    KEY,
    OTHER_NAMES,
    FORMULA,
    CHARGE,
    PKA,
    TEMPERATURE,
    IONIC_STRENGTH,
    SOURCE,
    FORM_NAME,
    FORM_FORMULA,
    LOST,
    CAS,
    HAZARDS,
    CARE,
    FIELDS
};

#define OPTION_FIELD 0x300
enum { OPTION_TO = 0x200, OPTION_ACID };

static const struct {
    const char *option;
    const char *value;
    const char *question;
    bool of_system; /* not asked when a form is added to a system of the table */
    bool needed;
} fields[FIELDS] = {
    [NAME] = {"name", "NAME", "Name of the acid (or of the base, as its protonated form)", true,
              true},
    [KEY] = {"key", "KEY", "Key, lower-case letters, digits and hyphens", true, false},
    [OTHER_NAMES] = {"other-names", "NAMES", "Other names, '; ' between them", true, false},
    [FORMULA] = {"formula", "FORMULA", "Formula with every proton that can leave", true, true},
    [CHARGE] = {"charge", "Z", "Charge of that species", true, false},
    [PKA] = {"pka", "VALUES", "pKa of each step, '; ' between them, as 2.15 ± 0.02; 7.20", true,
             true},
    [TEMPERATURE] = {"temperature", "T", "Temperature of the constants, °C", true, false},
    [IONIC_STRENGTH] = {"ionic-strength", "I", "Their ionic strength, mol/L (0: thermodynamic)",
                        true, false},
    [SOURCE] = {"source", "TEXT", "Where they are published", true, false},
    [FORM_NAME] = {"form-name", "NAME", "Name of the solid or liquid that is weighed", false,
                   false},
    [FORM_FORMULA] = {"form-formula", "FORMULA", "Its formula, with its water and counter-ions",
                      false, false},
    [LOST] = {"lost", "N", "Protons already missing in it", false, false},
    [CAS] = {"cas", "NUMBER", "Its CAS registry number", false, false},
    [HAZARDS] = {"hazards", "CODES", "Its GHS hazard codes, such as H302 H319", false, false},
    [CARE] = {"care", "TEXT", "What the bench must know", false, false},
};

struct add_call {
    struct table_options common;
    const char *folder;
    const char *acid; /* key of a system of the table that gets another form, or NULL */
    const char *given[FIELDS];
    char answer[FIELDS][ANSWER_MAX];
};

static const char documentation[] =
    "Add an acid, or with --acid another form of an acid of the table, to your own folder. What "
    "the options leave open is asked for, unless name, formula and pKa are all given. Nothing is "
    "written when the check finds a mistake."
    "\vExample: whichacid table add --name 'cacodylic acid' \\\n"
    "    --formula C2H7AsO2 --pka 6.27\n"
    "Then:    whichacid identify run.csv --also " DEFAULT_FOLDER;

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct add_call *call = state->input;
    if (key >= OPTION_FIELD && key < OPTION_FIELD + FIELDS) {
        call->given[key - OPTION_FIELD] = argument;
        return 0;
    }
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &call->common;
        return 0;
    case OPTION_TO:
        call->folder = argument;
        return 0;
    case OPTION_ACID:
        call->acid = argument;
        return 0;
    case ARGP_KEY_ARG:
        argp_error(state, "'%s' is not expected here; values are given by options.", argument);
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

/* ---- answers -----------------------------------------------------------------------------------
 */

/* "Cacodylic acid, 98 %" to "cacodylic-acid-98". */
static void key_from_name(const char *name, char *key, size_t size)
{
    char folded[ANSWER_MAX];
    size_t length = 0;
    wa_text_fold(name, strlen(name), folded, sizeof folded);
    for (const char *at = folded; *at != '\0' && length + 1 < size; at++) {
        bool plain = (*at >= 'a' && *at <= 'z') || (*at >= '0' && *at <= '9');
        if (plain) {
            key[length] = *at;
            length++;
        } else if (length > 0 && key[length - 1] != '-') {
            key[length] = '-';
            length++;
        }
    }
    while (length > 0 && key[length - 1] == '-') {
        length--;
    }
    key[length] = '\0';
}

/* What an empty answer means. */
static void set_default(const struct add_call *call, enum field field, char text[ANSWER_MAX])
{
    const char *simple = field == TEMPERATURE ? "25"
                         : field == SOURCE    ? "from memory"
                         : field == CHARGE || field == IONIC_STRENGTH || field == LOST ? "0"
                         : field == FORM_NAME ? call->answer[NAME]
                         : field == FORM_FORMULA && strcmp(call->answer[CHARGE], "0") == 0
                             ? call->answer[FORMULA]
                             : "";
    if (field == KEY) {
        key_from_name(call->answer[NAME], text, ANSWER_MAX);
        return;
    }
    snprintf(text, ANSWER_MAX, "%s", simple);
}

/* Ask on standard error and read a line. @return false at the end of the input */
static bool ask(const struct add_call *call, enum field field, char text[ANSWER_MAX])
{
    char standard[ANSWER_MAX];
    set_default(call, field, standard);
    fprintf(stderr, standard[0] != '\0' ? "%s [%s]: " : "%s%s: ", fields[field].question, standard);
    if (fgets(text, ANSWER_MAX, stdin) == NULL) {
        return false;
    }
    text[strcspn(text, "\r\n")] = '\0';
    if (text[0] == '\0') {
        memcpy(text, standard, ANSWER_MAX);
    }
    return true;
}

static bool is_asked(const struct add_call *call, enum field field)
{
    return call->acid == NULL || !fields[field].of_system;
}

static bool all_needed_given(const struct add_call *call)
{
    if (call->acid != NULL) {
        return call->given[FORM_NAME] != NULL && call->given[FORM_FORMULA] != NULL;
    }
    for (enum field field = 0; field < FIELDS; field++) {
        if (fields[field].needed && call->given[field] == NULL) {
            return false;
        }
    }
    /* What is weighed is neutral: a charged species cannot stand in for it. */
    const char *charge = call->given[CHARGE];
    return charge == NULL || strcmp(charge, "0") == 0 || call->given[FORM_FORMULA] != NULL;
}

/* Fill every answer from the options, by asking, or by what an empty answer means. @return exit
 * status */
static int collect_answers(struct add_call *call)
{
    bool asking = !all_needed_given(call);
    for (enum field field = 0; field < FIELDS; field++) {
        char *text = call->answer[field];
        if (!is_asked(call, field)) {
            continue;
        }
        if (call->given[field] != NULL) {
            snprintf(text, ANSWER_MAX, "%s", call->given[field]);
        } else if (!asking) {
            set_default(call, field, text);
        } else if (!ask(call, field, text)) {
            fprintf(stderr, "\nwhichacid: the input ended at '%s'; nothing was added.\n",
                    fields[field].question);
            return 1;
        }
        if (fields[field].needed && text[0] == '\0') {
            fprintf(stderr, "whichacid: '%s' is needed; nothing was added.\n",
                    fields[field].question);
            return 1;
        }
    }
    return 0;
}

/* ---- rows --------------------------------------------------------------------------------------
 */

static enum wa_status append(const char *folder, const char *kind,
                             const struct wa_table_cell *cells, size_t count,
                             struct wa_error *error)
{
    char path[TRIAL_PATH_MAX];
    if (!trial_path(path, folder, kind)) {
        return wa_fail(error, WA_ERROR_FILE, folder, 0, "The path is too long.");
    }
    return wa_table_append(path, kind, cells, count, error);
}

/* The source as the constants name it: a key of the table, "from memory", or a key of the user's
 * own for whatever else was written, which then goes into sources.csv. */
static enum wa_status append_source(const struct add_call *call, const struct wa_table *table,
                                    const char *folder, char key[ANSWER_MAX],
                                    struct wa_error *error)
{
    const char *text = call->answer[SOURCE];
    if (strcmp(text, "from memory") == 0 || wa_table_find_source(table, text) >= 0) {
        snprintf(key, ANSWER_MAX, "%s", text);
        return WA_OK;
    }
    snprintf(key, ANSWER_MAX, "own-%.400s", call->answer[KEY]);
    const struct wa_table_cell cells[] = {{"key", key}, {"reference", text}, {"kind", "own"}};
    return append(folder, "sources.csv", cells, sizeof cells / sizeof cells[0], error);
}

static enum wa_status append_constant(const struct add_call *call, const char *folder, int step,
                                      const struct wa_quantity *pKa, const char *source,
                                      struct wa_error *error)
{
    char number[16];
    char value[32];
    char u[32];
    snprintf(number, sizeof number, "%d", step);
    snprintf(value, sizeof value, "%.10g", pKa->value);
    if (pKa->has_u) {
        snprintf(u, sizeof u, "%.3g", pKa->u);
    } else {
        snprintf(u, sizeof u, "%s", strcmp(source, "from memory") == 0 ? U_FROM_MEMORY : U_SOURCED);
    }
    bool thermodynamic = strtod(call->answer[IONIC_STRENGTH], NULL) <= 0.0;
    const struct wa_table_cell cells[] = {
        {"acid", call->answer[KEY]},
        {"step", number},
        {"pKa", value},
        {"u", u},
        {"temperature", call->answer[TEMPERATURE]},
        {"ionic strength", call->answer[IONIC_STRENGTH]},
        {"kind", thermodynamic ? "thermodynamic" : "concentration"},
        {"source", source},
    };
    return append(folder, "constants.csv", cells, sizeof cells / sizeof cells[0], error);
}

/* One row for each pKa between semicolons. */
static enum wa_status append_constants(const struct add_call *call, const char *folder,
                                       const char *source, struct wa_error *error)
{
    const char *at = call->answer[PKA];
    int step = 0;
    while (*at != '\0') {
        char text[ANSWER_MAX];
        size_t length = strcspn(at, ";");
        snprintf(text, sizeof text, "%.*s", (int)length, at);
        at += length + (at[length] == ';');
        if (text[strspn(text, " \t")] == '\0') {
            continue;
        }
        struct wa_quantity pKa;
        enum wa_status status = wa_quantity_parse(text, WA_DIMENSION_NUMBER, &pKa, error);
        if (status != WA_OK) {
            return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                           "The pKa '%.60s' cannot be read; write values like 2.15 ± 0.02; 7.20.",
                           text);
        }
        step++;
        status = append_constant(call, folder, step, &pKa, source, error);
        if (status != WA_OK) {
            return status;
        }
    }
    return WA_OK;
}

static enum wa_status append_form(const struct add_call *call, const char *folder,
                                  struct wa_error *error)
{
    char key[ANSWER_MAX];
    char parts[ANSWER_MAX + 32];
    key_from_name(call->answer[FORM_NAME], key, sizeof key);
    snprintf(parts, sizeof parts, "%s", call->acid != NULL ? call->acid : call->answer[KEY]);
    if (strcmp(call->answer[LOST], "0") != 0) {
        size_t length = strlen(parts);
        snprintf(parts + length, sizeof parts - length, " lost %.16s", call->answer[LOST]);
    }
    const struct wa_table_cell cells[] = {
        {"key", key},
        {"name", call->answer[FORM_NAME]},
        {"formula", call->answer[FORM_FORMULA]},
        {"parts", parts},
        {"CAS", call->answer[CAS]},
        {"hazards", call->answer[HAZARDS]},
        {"care", call->answer[CARE]},
        {"source", "from memory"},
    };
    return append(folder, "forms.csv", cells, sizeof cells / sizeof cells[0], error);
}

static enum wa_status append_rows(const struct add_call *call, const struct wa_table *table,
                                  const char *folder, struct wa_error *error)
{
    if (call->acid == NULL) {
        char source[ANSWER_MAX];
        const struct wa_table_cell cells[] = {
            {"key", call->answer[KEY]},
            {"name", call->answer[NAME]},
            {"other names", call->answer[OTHER_NAMES]},
            {"formula", call->answer[FORMULA]},
            {"charge", call->answer[CHARGE]},
            {"modelled", "yes"},
        };
        enum wa_status status =
            append(folder, "acids.csv", cells, sizeof cells / sizeof cells[0], error);
        if (status == WA_OK) {
            status = append_source(call, table, folder, source, error);
        }
        if (status == WA_OK) {
            status = append_constants(call, folder, source, error);
        }
        if (status != WA_OK) {
            return status;
        }
    }
    return append_form(call, folder, error);
}

/* ---- the word ----------------------------------------------------------------------------------
 */

static int add_rows(const struct add_call *call, const struct wa_table *table)
{
    char trial[TRIAL_PATH_MAX];
    struct wa_error error;
    enum wa_status status = trial_begin(call->folder, trial, &error);
    if (status != WA_OK) {
        return command_report_error(&error);
    }
    status = append_rows(call, table, trial, &error);
    int problems = status == WA_OK ? trial_check(&call->common, trial) : 0;
    if (status == WA_OK && problems == 0) {
        status = trial_keep(trial, call->folder, &error);
    }
    trial_remove(trial);
    if (status != WA_OK) {
        return command_report_error(&error);
    }
    if (problems != 0) {
        fprintf(stderr, "whichacid: nothing was added.\n");
        return 1;
    }
    return 0;
}

static int report_added(const struct add_call *call)
{
    const char *name = call->acid != NULL ? call->answer[FORM_NAME] : call->answer[NAME];
    if (call->common.json) {
        return table_write_json(json_pack("{s:s,s:s,s:s}", "added", name, "key",
                                          call->acid != NULL ? call->acid : call->answer[KEY],
                                          "folder", call->folder),
                                &call->common);
    }
    struct page page;
    int status = page_open(&page);
    if (status != 0) {
        return status;
    }
    fprintf(page.stream, "Added %s to %s; give --also %s to use it.\n", name, call->folder,
            call->folder);
    return page_close(&page, &call->common);
}

int table_add(int argument_count, char **arguments)
{
    struct argp_option options[FIELDS + 3] = {
        {"to", OPTION_TO, "FOLDER", 0, "your own folder (" DEFAULT_FOLDER ")", 0},
        {"acid", OPTION_ACID, "KEY", 0, "only add a form of this acid of the table", 0},
    };
    for (int i = 0; i < FIELDS; i++) {
        options[i + 2] = (struct argp_option){
            fields[i].option, OPTION_FIELD + i, fields[i].value, 0, fields[i].question, 1};
    }
    const struct argp argp = {.options = options,
                              .parser = parse,
                              .doc = documentation,
                              .children = table_common_children};
    struct wa_table table;
    struct add_call *call = calloc(1, sizeof *call);
    if (call == NULL) {
        fprintf(stderr, "whichacid: there is not enough memory for this.\n");
        return 1;
    }
    call->folder = DEFAULT_FOLDER;
    argp_parse(&argp, argument_count, arguments, 0, NULL, call);
    int status = table_open(&call->common, &table);
    if (status == 0) {
        status = collect_answers(call);
        if (status == 0 && call->acid == NULL &&
            wa_table_find_acid(&table, call->answer[KEY]) >= 0) {
            fprintf(stderr,
                    "whichacid: the table has an acid '%s' already; yours stands in its place "
                    "wherever your folder is laid over it.\n",
                    call->answer[KEY]);
        }
        if (status == 0) {
            status = add_rows(call, &table);
        }
        wa_table_free(&table);
    }
    if (status == 0) {
        status = report_added(call);
    }
    free(call);
    return status;
}
