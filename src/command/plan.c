/* `plan`: will a titration work, and how is it best done. */
#include "command/bench_command.h"
#include "command/command.h"

#include "whichacid/bench_report.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
    key_pKa = 0x100,
    key_molar_mass,
    key_base,
    key_titrant,
    key_concentration,
    key_carbonate,
    key_slope,
    key_offset,
    key_end_point,
    key_volume,
    key_temperature,
    key_noise_pH,
    key_noise_volume,
    key_mass_u,
    key_readings,
    key_trials,
    key_against,
    key_sheet,
    key_seed,
};

/* What the call asks for. */
struct request {
    struct bench_common common;
    struct wa_plan_options options;
    bool sheet;
};

static const char documentation[] =
    "Plan a titration before it is done: whether it can work, what to weigh, which indicator, "
    "which "
    "volumes to add, and how well the answer will be known; with a sheet for the bench.\v"
    "KEY is an acid or a form of the table. Without one the plan is for an unknown with one "
    "proton, "
    "of --pka and --molar-mass.\n\n"
    "Examples:\n"
    "  whichacid plan benzoic-acid\n"
    "  whichacid plan hydrocyanic-acid --titrant ammonia\n"
    "  whichacid plan --pka 3-5 --molar-mass 60-300 --sheet --output sheet.txt\n"
    "  whichacid plan malic-acid --against tartaric-acid\n\n"
    "Exit status: 0 a plan, also when it says that it cannot work; 2 a wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "Sample:", .group = 1},
    {"pka", key_pKa, "LOW-HIGH", 0, "pKa of an unknown, such as 3-5 (2-6)", 1},
    {"molar-mass", key_molar_mass, "LOW-HIGH", 0, "g/mol, such as 60-300, which is assumed", 1},
    {"base", key_base, NULL, 0, "the unknown is a base, to be titrated with acid", 1},
    {"against", key_against, "KEY", 0, "a second candidate: can the two be told apart", 1},
    {.doc = "Titration:", .group = 2},
    {"titrant", key_titrant, "NAME", 0, "in the burette (the strong one that suits)", 2},
    {"titrant-concentration", key_concentration, "VALUE", 0,
     "with its uncertainty, such as \"0.1 ± 0.0001 mol/L\", which is assumed", 2},
    {"titrant-carbonate", key_carbonate, "VALUE", 0,
     "what will be noted of it, such as \"0.3 ± 0.1 %\"", 2},
    {"electrode-slope", key_slope, "VALUE", 0, "what will be noted, such as \"99.2 ± 0.4 %\"", 2},
    {"electrode-offset", key_offset, "VALUE", 0, "what will be noted, such as \"0 ± 0.01\"", 2},
    {"end-point", key_end_point, "VOLUME", 0, "wanted volume of the last end point (20 mL)", 2},
    {"solution-volume", key_volume, "VOLUME", 0, "at the start (50 mL)", 2},
    {"temperature", key_temperature, "VALUE", 0, "of the solution (25 °C)", 2},
    {.doc = "Readings:", .group = 3},
    {"readings", key_readings, "N", 0, "how many to take (30)", 3},
    {"noise-ph", key_noise_pH, "PH", 0, "standard deviation of one reading (0.01)", 3},
    {"noise-volume", key_noise_volume, "VOLUME", 0, "standard deviation of one volume (0.01 mL)",
     3},
    {"mass-uncertainty", key_mass_u, "MASS", 0, "of the balance (0.3 mg)", 3},
    {"trials", key_trials, "N", 0, "simulated runs of each design (200); 0: none", 3},
    {"seed", key_seed, "N", 0, "of the random numbers (1)", 3},
    {.doc = "Result:", .group = 4},
    {"sheet", key_sheet, NULL, 0, "only the sheet for the bench", 4},
    {0},
};

/* "3-5", "3 to 5", "3..5" or one number. */
static void range(const char *option, const char *text, double *low, double *high,
                  struct argp_state *state)
{
    char *end;
    *low = strtod(text, &end);
    const char *rest = end + strspn(end, " .-to–");
    *high = *rest != '\0' ? strtod(rest, &end) : *low;
    end += strspn(end, " g/mol");
    if (end == text || *end != '\0' || !(*high >= *low)) {
        argp_error(state, "%s: '%s' is no range such as 3-5", option, text);
    }
}

static error_t parse_readings(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    struct wa_plan_options *options = &request->options;
    switch (key) {
    case key_noise_pH:
        options->noise_reading =
            bench_quantity("--noise-ph", argument, WA_DIMENSION_PH, state).value;
        return 0;
    case key_noise_volume:
        options->noise_volume =
            bench_quantity("--noise-volume", argument, WA_DIMENSION_VOLUME, state).value;
        return 0;
    case key_mass_u:
        options->mass_u =
            bench_quantity("--mass-uncertainty", argument, WA_DIMENSION_MASS, state).value;
        return 0;
    case key_readings:
        options->additions =
            (int)bench_whole("--readings", argument, 8, WA_PLAN_ADDITIONS_MAX, state);
        return 0;
    case key_trials:
        options->trials = (int)bench_whole("--trials", argument, 0, 1000, state);
        return 0;
    case key_seed:
        options->seed = (uint32_t)bench_whole("--seed", argument, 1, UINT32_MAX, state);
        return 0;
    case key_sheet:
        request->sheet = true;
        options->trials = 0;
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static error_t parse_titration(int key, char *argument, struct argp_state *state)
{
    struct wa_plan_options *options = &((struct request *)state->input)->options;
    switch (key) {
    case key_titrant:
        options->titrant = argument;
        return 0;
    case key_concentration:
        options->titrant_concentration =
            bench_quantity("--titrant-concentration", argument, WA_DIMENSION_CONCENTRATION, state);
        return 0;
    case key_carbonate:
        options->titrant_carbonate =
            bench_quantity("--titrant-carbonate", argument, WA_DIMENSION_FRACTION, state);
        return 0;
    case key_slope:
        options->electrode_slope = bench_share("--electrode-slope", argument, state);
        return 0;
    case key_offset:
        options->electrode_offset =
            bench_quantity("--electrode-offset", argument, WA_DIMENSION_PH, state);
        return 0;
    case key_end_point:
        options->end_point_mL =
            bench_quantity("--end-point", argument, WA_DIMENSION_VOLUME, state).value;
        return 0;
    case key_volume:
        options->solution_mL =
            bench_quantity("--solution-volume", argument, WA_DIMENSION_VOLUME, state).value;
        return 0;
    case key_temperature:
        options->temperature_C =
            bench_quantity("--temperature", argument, WA_DIMENSION_TEMPERATURE, state).value;
        return 0;
    default:
        return parse_readings(key, argument, state);
    }
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    struct wa_plan_options *options = &request->options;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &request->common;
        return 0;
    case ARGP_KEY_ARG:
        if (options->form != NULL) {
            argp_error(state, "one sample at a time; a second candidate goes with --against");
            return EINVAL;
        }
        options->form = argument;
        return 0;
    case key_pKa:
        range("--pka", argument, &options->pKa_low, &options->pKa_high, state);
        return 0;
    case key_molar_mass:
        range("--molar-mass", argument, &options->mass_low, &options->mass_high, state);
        return 0;
    case key_base:
        options->unknown_is_base = true;
        return 0;
    case key_against:
        options->rival = argument;
        return 0;
    default:
        return parse_titration(key, argument, state);
    }
}

static enum wa_status plan(const struct request *request, struct wa_error *error)
{
    struct wa_table table;
    struct wa_plan *made = malloc(sizeof *made);
    char *text = NULL;
    if (made == NULL) {
        return wa_fail_memory(error);
    }
    enum wa_status status = bench_table(&request->common, &table, error);
    if (status != WA_OK) {
        free(made);
        return status;
    }
    status = wa_plan_make(&table, &request->options, made, error);
    if (status == WA_OK) {
        status = (request->common.json ? wa_plan_json
                  : request->sheet     ? wa_plan_sheet
                                       : wa_plan_text)(made, &request->options, &text, error);
    }
    if (status == WA_OK) {
        status = bench_write(&request->common, text, error);
    }
    free(text);
    free(made);
    wa_table_free(&table);
    return status;
}

int command_plan(int argument_count, char **arguments)
{
    const struct argp_child children[] = {{.argp = &bench_common_argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "[KEY]",
                              .doc = documentation,
                              .children = children};
    struct request request = {.sheet = false};
    struct wa_error error;
    char name[] = "whichacid plan";
    wa_plan_defaults(&request.options);
    arguments[0] = name;
    argp_err_exit_status = 2;
    if (argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0) {
        return 2;
    }
    return plan(&request, &error) == WA_OK ? 0 : command_report_error(&error);
}
