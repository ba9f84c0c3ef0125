/* `simulate`: a synthetic run from the model. */
#include "command/command.h"

#include "whichacid/simulate.h"

#include "base/file.h"

#include <argp.h>
#include <errno.h>
#include <stdlib.h>
#include <string.h>

enum {
    key_mass = 0x100,
    key_volume,
    key_titrant,
    key_concentration,
    key_noise_pH,
    key_noise_volume,
    key_carbonate,
    key_carbon_dioxide,
    key_slope,
    key_offset,
    key_points,
    key_step,
    key_end,
    key_temperature,
    key_dissolved,
    key_seed,
    key_table,
    key_also,
    key_output,
};

#define ALSO_MAX 32

/* What the call asks for. */
struct request {
    struct wa_simulation_options options;
    int mass_count;
    const char *folder;
    const char *also[ALSO_MAX];
    size_t also_count;
    const char *output;
};

static const char documentation[] =
    "Write a synthetic run: the forms named by KEY, dissolved together and titrated.\v"
    "A value written with an uncertainty is what the analyst notes; the value that acts is drawn "
    "from it. Slope, offset and carbonate without one are faults that the notes do not tell, and "
    "stand only on the lines that say what was simulated.\n\n"
    "Example:\n"
    "  whichacid simulate citric-acid \\\n"
    "    --titrant-concentration \"0.1 ± 0.0002 mol/L\" --seed 7 --output run.csv\n"
    "  whichacid identify run.csv\n\n"
    "Exit status: 0 written, 1 a file that cannot be used, 2 wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "Sample and titrant:", .group = 1},
    {"mass", key_mass, "0.3 g", 0,
     "mass of each KEY, in their order (enough for about 20 mL of titrant)", 1},
    {"volume", key_volume, "50 mL", 0, "solution volume at the start", 1},
    {"titrant", key_titrant, "NAME", 0, "what is in the burette (the strong one that suits)", 1},
    {"titrant-concentration", key_concentration, "0.1 mol/L", 0, "its concentration", 1},
    {"carbonate", key_carbonate, "0 %", 0, "part of a strong base's alkalinity", 1},
    {"carbon-dioxide", key_carbon_dioxide, "0 mol/L", 0, "dissolved in the sample's water", 1},
    {"temperature", key_temperature, "25 °C", 0, "of the solution", 1},
    {"dissolved", key_dissolved, NULL, 0, "all of the sample dissolves, whatever its solubility",
     1},
    {.doc = "Readings:", .group = 2},
    {"noise-ph", key_noise_pH, "0.01", 0, "standard deviation of one reading", 2},
    {"noise-volume", key_noise_volume, "0.005 mL", 0, "standard deviation of one volume", 2},
    {"slope", key_slope, "100 %", 0, "electrode slope", 2},
    {"offset", key_offset, "0 pH", 0, "electrode offset at pH 7", 2},
    {"points", key_points, "60", 0, "so many points, denser where the pH moves", 2},
    {"step", key_step, "0.5 mL", 0, "even steps instead", 2},
    {"end", key_end, "26 mL", 0, "last volume (1.3 times the equivalence volume)", 2},
    {"seed", key_seed, "1", 0, "of the random numbers; the same seed gives the same run", 2},
    {.doc = "Files:", .group = 3},
    {"table", key_table, "DIR", 0, "folder of the reference table", 3},
    {"also", key_also, "FILE", 0, "your own file or folder laid over the table (repeatable)", 3},
    {"output", key_output, "FILE", 0, "write to FILE instead of standard output", 3},
    {0},
};

static struct wa_quantity quantity(const char *text, enum wa_dimension dimension,
                                   struct argp_state *state)
{
    struct wa_quantity parsed = {.value = 0.0};
    struct wa_error error;
    if (wa_quantity_parse(text, dimension, &parsed, &error) != WA_OK) {
        argp_error(state, "%s", error.message);
    }
    return parsed;
}

static struct wa_quantity slope(const char *text, struct argp_state *state)
{
    struct wa_quantity parsed = quantity(text, WA_DIMENSION_FRACTION, state);
    if (parsed.value > 2.0) { /* a bare 99.2 means per cent */
        parsed.value *= 0.01;
        parsed.u *= 0.01;
    }
    return parsed;
}

static long whole_number(const char *text, struct argp_state *state)
{
    char *end;
    errno = 0;
    const long value = strtol(text, &end, 10);
    if (end == text || *end != '\0' || errno != 0 || value < 0 || value > UINT32_MAX) {
        argp_error(state, "'%s' is no whole number that can be used", text);
    }
    return value;
}

static void add_key(struct request *request, const char *argument, struct argp_state *state)
{
    struct wa_simulation_options *options = &request->options;
    if (options->form_count == WA_SIMULATED_FORMS_MAX) {
        argp_error(state, "a sample is at most %d forms", WA_SIMULATED_FORMS_MAX);
    }
    options->forms[options->form_count] = argument;
    options->form_count++;
}

static void add_mass(struct request *request, const char *argument, struct argp_state *state)
{
    if (request->mass_count == WA_SIMULATED_FORMS_MAX) {
        argp_error(state, "a sample is at most %d forms", WA_SIMULATED_FORMS_MAX);
    }
    const struct wa_quantity mass = quantity(argument, WA_DIMENSION_MASS, state);
    if (!(mass.value > 0.0)) {
        argp_error(state, "a mass of '%s' is not possible", argument);
    }
    request->options.mass[request->mass_count] = mass;
    request->mass_count++;
}

static void add_file(struct request *request, const char *argument, struct argp_state *state)
{
    if (request->also_count == ALSO_MAX) {
        argp_error(state, "--also can be given %d times at most; put the files into a folder",
                   ALSO_MAX);
    }
    request->also[request->also_count] = argument;
    request->also_count++;
}

static void check_whole(const struct request *request, struct argp_state *state)
{
    if (request->options.form_count == 0) {
        argp_error(state, "name what to simulate, such as citric-acid");
    }
    if (request->mass_count > request->options.form_count) {
        argp_error(state, "there are more masses than keys");
    }
}

/* The options that are quantities; false when the key is another one. */
static bool parse_quantity(int key, const char *argument, struct wa_simulation_options *options,
                           struct argp_state *state)
{
    switch (key) {
    case key_volume:
        options->solution_volume = quantity(argument, WA_DIMENSION_VOLUME, state);
        return true;
    case key_concentration:
        options->titrant_concentration = quantity(argument, WA_DIMENSION_CONCENTRATION, state);
        return true;
    case key_carbonate:
        options->titrant_carbonate = quantity(argument, WA_DIMENSION_FRACTION, state);
        return true;
    case key_carbon_dioxide:
        options->carbon_dioxide = quantity(argument, WA_DIMENSION_CONCENTRATION, state).value;
        return true;
    case key_temperature:
        options->temperature_C = quantity(argument, WA_DIMENSION_TEMPERATURE, state).value;
        return true;
    case key_noise_pH:
        options->noise_reading = quantity(argument, WA_DIMENSION_PH, state).value;
        return true;
    case key_noise_volume:
        options->noise_volume = quantity(argument, WA_DIMENSION_VOLUME, state).value;
        return true;
    case key_slope:
        options->electrode_slope = slope(argument, state);
        return true;
    case key_offset:
        options->electrode_offset = quantity(argument, WA_DIMENSION_PH, state);
        return true;
    case key_step:
        options->step_mL = quantity(argument, WA_DIMENSION_VOLUME, state).value;
        if (!(options->step_mL > 0.0)) {
            argp_error(state, "a step of '%s' is not possible", argument);
        }
        return true;
    case key_end:
        options->end_mL = quantity(argument, WA_DIMENSION_VOLUME, state).value;
        return true;
    default:
        return false;
    }
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    if (parse_quantity(key, argument, &request->options, state)) {
        return 0;
    }
    switch (key) {
    case key_mass:
        add_mass(request, argument, state);
        return 0;
    case key_titrant:
        request->options.titrant = argument;
        return 0;
    case key_points:
        request->options.point_count = (int)whole_number(argument, state);
        return 0;
    case key_seed:
        request->options.seed = (uint32_t)whole_number(argument, state);
        return 0;
    case key_dissolved:
        request->options.dissolved = true;
        return 0;
    case key_table:
        request->folder = argument;
        return 0;
    case key_also:
        add_file(request, argument, state);
        return 0;
    case key_output:
        request->output = argument;
        return 0;
    case ARGP_KEY_ARG:
        add_key(request, argument, state);
        return 0;
    case ARGP_KEY_END:
        check_whole(request, state);
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static enum wa_status hand_over(const struct request *request, const char *text, size_t length,
                                struct wa_error *error)
{
    if (request->output != NULL && strcmp(request->output, "-") != 0) {
        return wa_file_write(request->output, text, length, error);
    }
    if (fwrite(text, 1, length, stdout) != length || fflush(stdout) != 0) {
        return wa_fail(error, WA_ERROR_FILE, NULL, 0, "The run cannot be written.");
    }
    return WA_OK;
}

static enum wa_status simulate(const struct request *request, struct wa_error *error)
{
    const char *folder = request->folder != NULL ? request->folder : WHICHACID_REFERENCE_DIR;
    struct wa_table table;
    struct wa_simulation simulation;
    enum wa_status status =
        wa_table_load(folder, request->also, request->also_count, &table, error);
    if (status != WA_OK) {
        return status;
    }
    status = wa_simulate(&table, &request->options, &simulation, error);
    if (status == WA_OK) {
        char *text = NULL;
        size_t length = 0;
        status = wa_simulation_write(&simulation, &text, &length, error);
        if (status == WA_OK) {
            status = hand_over(request, text, length, error);
        }
        free(text);
        wa_simulation_free(&simulation);
    }
    wa_table_free(&table);
    return status;
}

int command_simulate(int argument_count, char **arguments)
{
    const struct argp argp = {
        .options = own_options, .parser = parse, .args_doc = "KEY [KEY...]", .doc = documentation};
    struct request request = {.folder = NULL};
    struct wa_error error;
    wa_simulation_defaults(&request.options);
    char name[] = "whichacid simulate";
    arguments[0] = name;
    argp_err_exit_status = 2;
    if (argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0) {
        return 2;
    }
    return simulate(&request, &error) == WA_OK ? 0 : command_report_error(&error);
}
