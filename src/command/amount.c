/* `amount`: amounts without a curve. */
#include "command/bench_command.h"
#include "command/command.h"

#include "whichacid/bench_report.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

enum {
    key_mass = 0x100,
    key_volume,
    key_density,
    key_purity,
    key_titrant,
    key_concentration,
    key_end_point,
    key_blank,
    key_excess,
    key_excess_concentration,
    key_molar_mass,
    key_substance,
    key_anhydrous,
    key_protons,
    key_flask,
    key_pipette,
    key_class_B,
    key_spread,
    key_repeatability,
    key_seed,
};

/* What the call asks for. */
struct request {
    struct bench_common common;
    struct wa_amount_options options;
    int end_point_count;
    bool asked;
};

static const struct {
    const char *word;
    enum wa_amount_kind kind;
} kinds[] = {
    {"solution", WA_AMOUNT_SOLUTION},
    {"equivalent-mass", WA_AMOUNT_EQUIVALENT},
    {"content", WA_AMOUNT_CONTENT},
    {"hydroxide-carbonate", WA_AMOUNT_HYDROXIDE_CARBONATE},
    {"carbonate-bicarbonate", WA_AMOUNT_CARBONATE_BICARBONATE},
    {"phosphoric-hydrochloric", WA_AMOUNT_PHOSPHORIC_HYDROCHLORIC},
};

static const char documentation[] =
    "Amounts from weighings, flasks and end points, without a curve, each with its uncertainty "
    "budget.\v"
    "WHAT is one of\n"
    "  solution                 of a solution made by weighing and diluting\n"
    "  equivalent-mass          of an unknown, by an end point; forms that agree\n"
    "  content                  part of a sample that is a named substance; with\n"
    "                           --excess by back titration\n"
    "  hydroxide-carbonate      hydroxide with carbonate, acid to two end points\n"
    "  carbonate-bicarbonate    sodium carbonate with hydrogen carbonate, likewise\n"
    "  phosphoric-hydrochloric  both acids, base to two end points\n\n"
    "Dilutions are given in their order: --flask of the stock, --pipette taken from it, and so "
    "on.\n\n"
    "Examples:\n"
    "  whichacid amount equivalent-mass --sample-mass \"0.2500 g\" \\\n"
    "    --end-point \"20.47 mL\" --titrant-concentration \"0.1000 ± 0.0002 mol/L\"\n"
    "  whichacid amount content --substance acetylsalicylic-acid --protons 2 \\\n"
    "    --sample-mass \"1.5 g\" --excess \"50 mL\" \\\n"
    "    --excess-concentration \"0.5 mol/L\" \\\n"
    "    --end-point \"17.2 mL\" --titrant-concentration \"0.5 mol/L\"\n"
    "  whichacid amount solution --sample-mass \"1.0012 g\" --flask \"250 mL\" \\\n"
    "    --pipette \"25 mL\" --flask \"100 mL\"\n\n"
    "Exit status: 0 an answer, 1 values that cannot be, 2 a wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "Sample:", .group = 1},
    {"sample-mass", key_mass, "MASS", 0, "what was weighed, such as \"0.3127 g\"", 1},
    {"sample-volume", key_volume, "VOLUME", 0, "of a liquid sample", 1},
    {"sample-density", key_density, "DENSITY", 0, "of a liquid sample", 1},
    {"purity", key_purity, "SHARE", 0, "of what was weighed", 1},
    {"flask", key_flask, "VOLUME", 0, "made up to; may be repeated", 1},
    {"pipette", key_pipette, "VOLUME", 0, "taken from the last flask; may be repeated", 1},
    {.doc = "Titration:", .group = 2},
    {"titrant", key_titrant, "NAME", 0, "a base (assumed) or an acid", 2},
    {"titrant-concentration", key_concentration, "VALUE", 0, "such as \"0.1023 ± 0.0002 mol/L\"",
     2},
    {"end-point", key_end_point, "VOLUME", 0, "from the start; twice for a mixture", 2},
    {"blank", key_blank, "VOLUME", 0, "that a blank uses", 2},
    {"excess", key_excess, "VOLUME", 0, "of a solution that was added and titrated back", 2},
    {"excess-concentration", key_excess_concentration, "VALUE", 0, "of that solution", 2},
    {.doc = "Substance:", .group = 3},
    {"substance", key_substance, "KEY", 0, "a form of the table, for its molar mass", 3},
    {"molar-mass", key_molar_mass, "VALUE", 0, "instead of the table's", 3},
    {"protons", key_protons, "N", 0, "equivalents of one mole (1)", 3},
    {"anhydrous", key_anhydrous, "KEY", 0, "tell the water that the sample holds beside this form",
     3},
    {.doc = "Equipment:", .group = 4},
    {"class-b", key_class_B, NULL, 0, "flasks and pipettes are of class B", 4},
    {"temperature-spread", key_spread, "K", 0, "limits around the temperature of calibration", 4},
    {"repeatability", key_repeatability, "SHARE", 0, "relative standard deviation of the procedure",
     4},
    {"seed", key_seed, "N", 0, "of the random numbers (1)", 4},
    {0},
};

static error_t add_dilution(struct wa_amount_options *options, bool flask, const char *argument,
                            struct argp_state *state)
{
    const struct wa_quantity volume =
        bench_quantity(flask ? "--flask" : "--pipette", argument, WA_DIMENSION_VOLUME, state);
    struct wa_dilution *last =
        options->dilution_count > 0 ? &options->dilutions[options->dilution_count - 1] : NULL;
    if (flask && last != NULL && !(last->flask.value > 0.0)) {
        last->flask = volume;
        return 0;
    }
    if (options->dilution_count == WA_DILUTIONS_MAX || (!flask && last == NULL) ||
        (flask && last != NULL) || (!flask && !(last->flask.value > 0.0))) {
        argp_error(state, "flasks and pipettes take turns, a flask first, at most %d of each",
                   WA_DILUTIONS_MAX);
        return EINVAL;
    }
    struct wa_dilution *next = &options->dilutions[options->dilution_count++];
    *(flask ? &next->flask : &next->pipette) = volume;
    return 0;
}

static error_t parse_equipment(int key, char *argument, struct argp_state *state)
{
    struct wa_amount_options *options = &((struct request *)state->input)->options;
    switch (key) {
    case key_flask:
    case key_pipette:
        return add_dilution(options, key == key_flask, argument, state);
    case key_class_B:
        options->class_B = true;
        return 0;
    case key_spread:
        options->temperature_spread =
            bench_quantity("--temperature-spread", argument, WA_DIMENSION_NUMBER, state).value;
        return 0;
    case key_repeatability:
        options->repeatability =
            bench_quantity("--repeatability", argument, WA_DIMENSION_FRACTION, state).value;
        return 0;
    case key_seed:
        options->seed = (uint32_t)bench_whole("--seed", argument, 1, UINT32_MAX, state);
        return 0;
    case key_protons:
        options->protons = (int)bench_whole("--protons", argument, 1, 12, state);
        return 0;
    case key_substance:
        options->substance = argument;
        return 0;
    case key_anhydrous:
        options->anhydrous = argument;
        return 0;
    case key_titrant:
        options->titrant = argument;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

/* Options that are one quantity each. */
static error_t parse_quantity(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    struct wa_amount_options *o = &request->options;
    const struct {
        int key;
        const char *option;
        enum wa_dimension dimension;
        struct wa_quantity *target;
    } plain[] = {
        {key_mass, "--sample-mass", WA_DIMENSION_MASS, &o->sample_mass},
        {key_volume, "--sample-volume", WA_DIMENSION_VOLUME, &o->sample_volume},
        {key_density, "--sample-density", WA_DIMENSION_DENSITY, &o->sample_density},
        {key_concentration, "--titrant-concentration", WA_DIMENSION_CONCENTRATION,
         &o->concentration},
        {key_blank, "--blank", WA_DIMENSION_VOLUME, &o->blank},
        {key_excess, "--excess", WA_DIMENSION_VOLUME, &o->excess},
        {key_excess_concentration, "--excess-concentration", WA_DIMENSION_CONCENTRATION,
         &o->excess_concentration},
        {key_molar_mass, "--molar-mass", WA_DIMENSION_MOLAR_MASS, &o->molar_mass},
    };
    for (size_t i = 0; i < sizeof plain / sizeof plain[0]; i++) {
        if (plain[i].key == key) {
            *plain[i].target = bench_quantity(plain[i].option, argument, plain[i].dimension, state);
            return 0;
        }
    }
    if (key == key_purity) {
        o->purity = bench_share("--purity", argument, state);
        return 0;
    }
    if (key == key_end_point && request->end_point_count < 2) {
        o->end_points[request->end_point_count++] =
            bench_quantity("--end-point", argument, WA_DIMENSION_VOLUME, state);
        return 0;
    }
    return parse_equipment(key, argument, state);
}

static error_t take_kind(struct request *request, const char *argument, struct argp_state *state)
{
    for (size_t i = 0; i < sizeof kinds / sizeof kinds[0]; i++) {
        if (!request->asked && strcmp(argument, kinds[i].word) == 0) {
            request->options.kind = kinds[i].kind;
            request->asked = true;
            return 0;
        }
    }
    argp_error(state, "'%s' is no amount that can be asked for; --help lists them", argument);
    return EINVAL;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &request->common;
        return 0;
    case ARGP_KEY_ARG:
        return take_kind(request, argument, state);
    case ARGP_KEY_END:
        if (!request->asked) {
            argp_error(state, "say what is asked for, such as equivalent-mass");
            return EINVAL;
        }
        return 0;
    default:
        return parse_quantity(key, argument, state);
    }
}

static enum wa_status amount(const struct request *request, struct wa_error *error)
{
    struct wa_table table;
    struct wa_amount_result result;
    char *text = NULL;
    enum wa_status status = bench_table(&request->common, &table, error);
    if (status != WA_OK) {
        return status;
    }
    status = wa_amount_make(&table, &request->options, &result, error);
    if (status == WA_OK) {
        const bool candidates = request->options.kind == WA_AMOUNT_EQUIVALENT;
        status = request->common.json ? wa_amount_json(&result, &text, error)
                                      : wa_amount_text(&result, candidates, &text, error);
    }
    if (status == WA_OK) {
        status = bench_write(&request->common, text, error);
    }
    free(text);
    wa_table_free(&table);
    return status;
}

int command_amount(int argument_count, char **arguments)
{
    const struct argp_child children[] = {{.argp = &bench_common_argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "WHAT",
                              .doc = documentation,
                              .children = children};
    struct request request = {.asked = false};
    struct wa_error error;
    char name[] = "whichacid amount";
    arguments[0] = name;
    argp_err_exit_status = 2;
    if (argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0) {
        return 2;
    }
    return amount(&request, &error) == WA_OK ? 0 : command_report_error(&error);
}
