/* `standardize`: the concentration of a titrant against a weighed primary standard. */
#include "command/bench_command.h"
#include "command/command.h"

#include "whichacid/bench_report.h"
#include "whichacid/reader.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

enum {
    key_standard = 0x100,
    key_mass,
    key_end_point,
    key_titrant,
    key_purity,
    key_molar_mass,
    key_blank,
    key_repeatability,
    key_balance,
    key_burette,
    key_spread,
    key_buoyancy,
    key_leave_out,
    key_second_volume,
    key_second_end_point,
    key_second_titrant,
    key_pipette,
    key_seed,
};

/* What the call asks for. */
struct request {
    struct bench_common common;
    struct wa_standardize_options options;
    struct wa_quantity masses[WA_REPLICATES_MAX];
    struct wa_quantity end_points[WA_REPLICATES_MAX];
    const char *paths[WA_REPLICATES_MAX];
    size_t mass_count, end_point_count, path_count;
    bool left_out[WA_REPLICATES_MAX];
};

static const char documentation[] =
    "Concentration of a titrant from titrations of a weighed primary standard, with its "
    "uncertainty budget: by the volumes at the end points, or by the whole curves RUN, whose notes "
    "hold the masses.\v"
    "Masses and end points are taken in their order; a value may be written with its standard "
    "uncertainty, which counts as an error of calibration common to all titrations. What scatters "
    "is seen from replicates.\n\n"
    "Examples:\n"
    "  whichacid standardize --standard potassium-hydrogen-phthalate \\\n"
    "    --sample-mass \"0.3888 g\" --end-point \"18.64 mL\" \\\n"
    "    --sample-mass \"0.4012 g\" --end-point \"19.25 mL\" \\\n"
    "    --json --output naoh.json\n"
    "  whichacid identify vial17.csv --titrant naoh.json\n\n"
    "Exit status: 0 an answer, 1 input that cannot be used, 2 a wrong call.";

static const struct argp_option own_options[] = {
    {.doc = "Titrations:", .group = 1},
    {"standard", key_standard, "KEY", 0, "primary standard, as in standards.csv", 1},
    {"sample-mass", key_mass, "MASS", 0,
     "mass of the standard, such as \"0.3888 g\"; once a titration", 1},
    {"end-point", key_end_point, "VOLUME", 0,
     "titrant used, such as \"18.64 mL\"; once a titration", 1},
    {"titrant", key_titrant, "NAME", 0, "what is in the burette (the usual one that suits)", 1},
    {"blank", key_blank, "VOLUME", 0, "titrant that a blank uses; may be 0 ± u", 1},
    {"leave-out", key_leave_out, "N", 0, "do not count titration N; may be repeated", 1},
    {.doc = "What is known of the standard:", .group = 2},
    {"purity", key_purity, "SHARE", 0, "such as \"0.9999 ± 0.0003\" (the table's)", 2},
    {"molar-mass", key_molar_mass, "VALUE", 0, "(from the formula)", 2},
    {"buoyancy", key_buoyancy, "DENSITY", 0,
     "correct masses for the buoyancy of air, by the density of the standard, such as \"1.636 "
     "g/mL\"",
     2},
    {.doc = "What is known of the equipment:", .group = 3},
    {"repeatability", key_repeatability, "SHARE", 0,
     "relative standard deviation of one titration, from experience", 3},
    {"balance-linearity", key_balance, "MASS", 0,
     "limits of error of one weighing, such as \"0.15 mg\"", 3},
    {"burette-tolerance", key_burette, "VOLUME", 0,
     "limits of error of the burette, such as \"0.03 mL\"", 3},
    {"temperature-spread", key_spread, "K", 0, "limits in K around the temperature of calibration",
     3},
    {.doc = "A second solution, titrated with the first titrant:", .group = 4},
    {"second-volume", key_second_volume, "VOLUME", 0, "volume of it that was taken", 4},
    {"second-end-point", key_second_end_point, "VOLUME", 0, "titrant that it used", 4},
    {"second-titrant", key_second_titrant, "NAME", 0, "what it is", 4},
    {"pipette-tolerance", key_pipette, "VOLUME", 0, "limits of error of its volume", 4},
    {.doc = "Monte Carlo:", .group = 5},
    {"seed", key_seed, "N", 0, "of the random numbers (1); the same seed gives the same figures",
     5},
    {0},
};

static error_t add_quantity(struct wa_quantity *list, size_t *count, const char *option,
                            const char *text, enum wa_dimension dimension, struct argp_state *state)
{
    if (*count == WA_REPLICATES_MAX) {
        argp_error(state, "%s: at most %d titrations", option, WA_REPLICATES_MAX);
        return EINVAL;
    }
    list[*count] = bench_quantity(option, text, dimension, state);
    (*count)++;
    return 0;
}

static error_t parse_equipment(int key, char *argument, struct argp_state *state)
{
    struct wa_standardize_options *options = &((struct request *)state->input)->options;
    switch (key) {
    case key_repeatability:
        options->repeatability =
            bench_quantity("--repeatability", argument, WA_DIMENSION_FRACTION, state).value;
        return 0;
    case key_balance:
        options->balance_linearity =
            bench_quantity("--balance-linearity", argument, WA_DIMENSION_MASS, state).value;
        return 0;
    case key_burette:
        options->burette_tolerance =
            bench_quantity("--burette-tolerance", argument, WA_DIMENSION_VOLUME, state).value;
        return 0;
    case key_pipette:
        options->pipette_tolerance =
            bench_quantity("--pipette-tolerance", argument, WA_DIMENSION_VOLUME, state).value;
        return 0;
    case key_spread:
        options->temperature_spread =
            bench_quantity("--temperature-spread", argument, WA_DIMENSION_NUMBER, state).value;
        return 0;
    case key_second_volume:
        options->second_volume =
            bench_quantity("--second-volume", argument, WA_DIMENSION_VOLUME, state);
        return 0;
    case key_second_end_point:
        options->second_end_point =
            bench_quantity("--second-end-point", argument, WA_DIMENSION_VOLUME, state);
        return 0;
    case key_second_titrant:
        options->second_titrant = argument;
        return 0;
    case key_seed:
        options->seed = (uint32_t)bench_whole("--seed", argument, 1, UINT32_MAX, state);
        return 0;
    default:
        return ARGP_ERR_UNKNOWN;
    }
}

static error_t parse_standard(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    struct wa_standardize_options *options = &request->options;
    switch (key) {
    case key_standard:
        options->standard = argument;
        return 0;
    case key_mass:
        return add_quantity(request->masses, &request->mass_count, "--sample-mass", argument,
                            WA_DIMENSION_MASS, state);
    case key_end_point:
        return add_quantity(request->end_points, &request->end_point_count, "--end-point", argument,
                            WA_DIMENSION_VOLUME, state);
    case key_titrant:
        options->titrant = argument;
        return 0;
    case key_purity:
        options->purity = bench_share("--purity", argument, state);
        return 0;
    case key_molar_mass:
        options->molar_mass =
            bench_quantity("--molar-mass", argument, WA_DIMENSION_MOLAR_MASS, state);
        return 0;
    case key_blank:
        options->blank = bench_quantity("--blank", argument, WA_DIMENSION_VOLUME, state);
        return 0;
    case key_buoyancy:
        options->density = bench_quantity("--buoyancy", argument, WA_DIMENSION_DENSITY, state);
        return 0;
    case key_leave_out:
        request->left_out[bench_whole("--leave-out", argument, 1, WA_REPLICATES_MAX, state) - 1] =
            true;
        return 0;
    default:
        return parse_equipment(key, argument, state);
    }
}

static error_t finish(const struct request *request, struct argp_state *state)
{
    const char *complaint = NULL;
    if (request->options.standard == NULL) {
        complaint = "name the primary standard with --standard KEY";
    } else if (request->path_count == 0 && request->mass_count == 0) {
        complaint = "give --sample-mass and --end-point of each titration, or name its run";
    } else if (request->path_count == 0 && request->mass_count != request->end_point_count) {
        complaint = "each titration needs one --sample-mass and one --end-point";
    } else if (request->path_count > 0 && request->mass_count + request->end_point_count > 0) {
        complaint = "give either runs, which note their masses, or masses and end points";
    }
    if (complaint != NULL) {
        argp_error(state, "%s", complaint);
        return EINVAL;
    }
    return 0;
}

static error_t parse(int key, char *argument, struct argp_state *state)
{
    struct request *request = state->input;
    switch (key) {
    case ARGP_KEY_INIT:
        state->child_inputs[0] = &request->common;
        return 0;
    case ARGP_KEY_ARG:
        if (request->path_count == WA_REPLICATES_MAX) {
            argp_error(state, "at most %d runs", WA_REPLICATES_MAX);
            return EINVAL;
        }
        request->paths[request->path_count++] = argument;
        return 0;
    case ARGP_KEY_END:
        return finish(request, state);
    default:
        return parse_standard(key, argument, state);
    }
}

/* The titrations of the call: from its runs, or from its masses and end points. */
static enum wa_status collect(const struct request *request, const struct wa_table *table,
                              struct wa_run_list *runs, struct wa_standardization *work,
                              struct wa_error *error)
{
    const struct wa_reader_options reader = {.given = NULL};
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < request->path_count && status == WA_OK; i++) {
        status = wa_read_file(request->paths[i], &reader, runs, error);
    }
    if (status == WA_OK && runs->count > WA_REPLICATES_MAX) {
        status = wa_fail(error, WA_ERROR_INPUT, NULL, 0, "The files hold more than %d runs.",
                         WA_REPLICATES_MAX);
    }
    for (size_t i = 0; i < runs->count && status == WA_OK; i++) {
        status = wa_standardize_run(table, &request->options, &runs->runs[i],
                                    &work->replicates[work->replicate_count++], error);
    }
    for (size_t i = 0; i < request->mass_count; i++) {
        work->replicates[work->replicate_count++] =
            (struct wa_replicate){.mass = request->masses[i], .volume = request->end_points[i]};
    }
    for (size_t i = 0; i < work->replicate_count; i++) {
        work->replicates[i].left_out = request->left_out[i];
    }
    return status;
}

static enum wa_status standardize(const struct request *request, struct wa_error *error)
{
    struct wa_table table;
    struct wa_run_list runs = {.count = 0};
    struct wa_standardization work = {.replicate_count = 0};
    char *text = NULL;
    enum wa_status status = bench_table(&request->common, &table, error);
    if (status != WA_OK) {
        return status;
    }
    status = collect(request, &table, &runs, &work, error);
    if (status == WA_OK) {
        status = wa_standardize(&table, &request->options, &work, error);
    }
    if (status == WA_OK) {
        status = request->common.json ? wa_standardization_json(&work, &text, error)
                                      : wa_standardization_text(&work, &text, error);
    }
    if (status == WA_OK) {
        status = bench_write(&request->common, text, error);
    }
    free(text);
    wa_run_list_free(&runs);
    wa_table_free(&table);
    return status;
}

int command_standardize(int argument_count, char **arguments)
{
    const struct argp_child children[] = {{.argp = &bench_common_argp}, {0}};
    const struct argp argp = {.options = own_options,
                              .parser = parse,
                              .args_doc = "[RUN...]",
                              .doc = documentation,
                              .children = children};
    struct request request = {.options = {.standard = NULL}};
    struct wa_error error;
    char name[] = "whichacid standardize";
    arguments[0] = name;
    argp_err_exit_status = 2;
    if (argp_parse(&argp, argument_count, arguments, 0, NULL, &request) != 0) {
        return 2;
    }
    return standardize(&request, &error) == WA_OK ? 0 : command_report_error(&error);
}
