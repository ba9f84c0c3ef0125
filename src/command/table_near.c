#include "command/table_internal.h"

#include "whichacid/quantity.h"

#include <math.h>
#include <string.h>

#define NEAR_ROOM 40
#define APART_DEFAULT 0.3

struct near_call {
    struct table_options common;
    double pKa[WA_PROTONS_MAX];
    size_t count;
    double molar_mass;
    double apart;
};

enum { OPTION_MOLAR_MASS = 0x200, OPTION_WITHIN };

static const struct argp_option options[] = {
    {"molar-mass", OPTION_MOLAR_MASS, "M", 0, "g/mol of the solid or liquid as weighed", 0},
    {"within", OPTION_WITHIN, "PK", 0, "how far off the pKa may be (0.3)", 0},
    {0},
};

static const char documentation[] =
    "Acids whose pKa values come near the given ones, nearest first."
    "\vExample: whichacid table near 3.1 4.8 6.4 --molar-mass 210";

static double number_of(const char *text, struct argp_state *state)
{
    struct wa_quantity quantity;
    struct wa_error error;
    if (wa_quantity_parse(text, WA_DIMENSION_NUMBER, &quantity, &error) != WA_OK) {
        argp_error(state, "'%s' is not a number.", text);
    }
    return quantity.value;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct near_call *call = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &call->common;
        return 0;
    case OPTION_MOLAR_MASS:
        call->molar_mass = number_of(argument, state);
        return 0;
    case OPTION_WITHIN:
        call->apart = number_of(argument, state);
        return 0;
    case ARGP_KEY_ARG:
        if (call->count == WA_PROTONS_MAX) {
            argp_error(state, "at most %d pKa values can be given.", WA_PROTONS_MAX);
        }
        call->pKa[call->count] = number_of(argument, state);
        call->count++;
        return 0;
    case ARGP_KEY_END:
        if (call->count == 0 && !isfinite(call->molar_mass)) {
            argp_error(state, "give at least one pKa value or --molar-mass.");
        }
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static json_t *near_json(const struct wa_table *table, const struct wa_near *near)
{
    const struct wa_acid *acid = &table->acids[near->acid];
    json_t *steps = json_array();
    for (int i = 0; i < acid->step_count; i++) {
        json_array_append_new(steps, json_real(acid->steps[i].pKa));
    }
    json_t *value = json_pack("{s:s,s:s,s:o,s:f,s:i}", "key", acid->key, "name", acid->name, "pKa",
                              steps, "distance", near->distance, "unasked_steps", near->unmatched);
    if (near->form >= 0) {
        const struct wa_form *form = &table->forms[near->form];
        json_object_set_new(value, "form", json_string(form->key));
        json_object_set_new(value, "molar_mass", json_real(form->molar_mass));
    }
    return value;
}

static void print_near(FILE *stream, const struct wa_table *table, const struct wa_near *near)
{
    const struct wa_acid *acid = &table->acids[near->acid];
    char pKa[80];
    size_t used = 0;
    pKa[0] = '\0';
    for (int i = 0; i < acid->step_count && used + 8 < sizeof pKa; i++) {
        used += (size_t)snprintf(pKa + used, sizeof pKa - used, "%s%.2f", i > 0 ? " " : "",
                                 acid->steps[i].pKa);
    }
    fprintf(stream, "%6.2f  ", near->distance);
    print_padded(stream, acid->key, 30);
    fprintf(stream, " %s\n", pKa);
    if (near->form >= 0) {
        const struct wa_form *form = &table->forms[near->form];
        fprintf(stream, "        as %s, %.2f g/mol (%+.2f)\n", form->name, form->molar_mass,
                near->mass_off);
    }
}

int table_near(int argument_count, char **arguments)
{
    const struct argp argp = {.options = options,
                              .parser = parse,
                              .args_doc = "[PKA...]",
                              .doc = documentation,
                              .children = table_common_children};
    struct near_call call = {.molar_mass = NAN, .apart = APART_DEFAULT};
    struct wa_table table;
    struct wa_near near[NEAR_ROOM];
    argp_parse(&argp, argument_count, arguments, 0, NULL, &call);
    int status = table_open(&call.common, &table);
    if (status != 0) {
        return status;
    }
    size_t found =
        wa_table_near(&table, call.pKa, call.count, call.molar_mass, call.apart, near, NEAR_ROOM);
    if (call.common.json) {
        json_t *list = json_array();
        for (size_t i = 0; i < found; i++) {
            json_array_append_new(list, near_json(&table, &near[i]));
        }
        status = table_write_json(list, &call.common);
    } else {
        struct page page;
        status = page_open(&page);
        if (status == 0) {
            fprintf(page.stream, "%s",
                    found > 0 ? "   off  acid                           pKa\n"
                              : "No acid of the table comes that near; try a larger --within.\n");
            for (size_t i = 0; i < found; i++) {
                print_near(page.stream, &table, &near[i]);
            }
            status = page_close(&page, &call.common);
        }
    }
    wa_table_free(&table);
    return status;
}
