/* Where the points of a run are: at even steps, or denser where the pH moves. */
#include "simulate/simulate_internal.h"

#include <math.h>
#include <stdlib.h>

#define FINE_STEPS 3000

static const double movement_share = 0.5; /* of the points that follow the pH, not the volume */
static const double least_spacing = 5e-4; /* of the end volume */
static const int decimals_least = 3;
static const int decimals_most = 7;

static double rounded(double value, int decimals)
{
    const double scale = pow(10.0, decimals);
    return round(value * scale) / scale;
}

static enum wa_status allocate(size_t count, struct wa_simulation *simulation,
                               struct wa_error *error)
{
    simulation->volume_mL = calloc(count, sizeof *simulation->volume_mL);
    simulation->reading = calloc(count, sizeof *simulation->reading);
    simulation->count = count;
    return simulation->volume_mL != NULL && simulation->reading != NULL ? WA_OK
                                                                        : wa_fail_memory(error);
}

static enum wa_status place_evenly(struct wa_simulation *simulation, struct wa_error *error)
{
    const double step = simulation->options.step_mL;
    const double steps = floor(simulation->options.end_mL / step + 1e-9);
    if (!(steps < WA_SIMULATED_POINTS_MAX)) {
        return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                       "Steps of %g mL up to %g mL are more than %d points; take a larger step.",
                       step, simulation->options.end_mL, WA_SIMULATED_POINTS_MAX);
    }
    const enum wa_status status = allocate((size_t)steps + 1, simulation, error);
    for (size_t p = 0; status == WA_OK && p < simulation->count; p++) {
        simulation->volume_mL[p] = rounded((double)p * step, simulation->volume_decimals);
    }
    return status;
}

/* pH at even fine steps from 0 to the end. */
static enum wa_status fine_curve(const struct wa_simulation *simulation, double *pH,
                                 struct wa_error *error)
{
    enum wa_status status = WA_OK;
    double guess = 7.0;
    for (int i = 0; status == WA_OK && i <= FINE_STEPS; i++) {
        struct wa_solution solution;
        status =
            wa_titration_pH(&simulation->titration, simulation->options.end_mL * i / FINE_STEPS,
                            guess, &solution, NULL, error);
        if (status == WA_OK) {
            pH[i] = guess = solution.pH;
        }
    }
    return status;
}

/* Points at equal shares of a measure that grows with the volume and with the movement of the
 * pH, where the latter's density is limited so that no two points come closer than a burette. */
static void place_by_movement(const double *pH, struct wa_simulation *simulation)
{
    const double intervals = (double)(simulation->count - 1);
    double total = 0.0;
    for (int i = 0; i < FINE_STEPS; i++) {
        total += fabs(pH[i + 1] - pH[i]);
    }
    const double most = 1.0 / (least_spacing * intervals * FINE_STEPS);
    double measure[FINE_STEPS + 1] = {0.0};
    for (int i = 0; i < FINE_STEPS; i++) {
        const double moved = total > 0.0 ? movement_share * fabs(pH[i + 1] - pH[i]) / total : 0.0;
        measure[i + 1] =
            measure[i] + fmin(moved + (1.0 - movement_share) / FINE_STEPS, fmax(most, 1e-9));
    }
    int at = 0;
    for (size_t p = 0; p < simulation->count; p++) {
        const double wanted = measure[FINE_STEPS] * (double)p / intervals;
        while (at < FINE_STEPS - 1 && measure[at + 1] < wanted) {
            at++;
        }
        const double within = fmin((wanted - measure[at]) / (measure[at + 1] - measure[at]), 1.0);
        simulation->volume_mL[p] = rounded(simulation->options.end_mL * (at + within) / FINE_STEPS,
                                           simulation->volume_decimals);
    }
}

enum wa_status wa_simulation_place(struct wa_simulation *simulation, struct wa_error *error)
{
    const double finest = least_spacing * simulation->options.end_mL;
    const double decimals = ceil(-log10(0.1 * finest));
    simulation->volume_decimals = (int)fmin(fmax(decimals, decimals_least), decimals_most);
    if (simulation->options.step_mL > 0.0) {
        return place_evenly(simulation, error);
    }
    double pH[FINE_STEPS + 1];
    enum wa_status status = allocate((size_t)simulation->options.point_count, simulation, error);
    if (status == WA_OK) {
        status = fine_curve(simulation, pH, error);
    }
    if (status == WA_OK) {
        place_by_movement(pH, simulation);
    }
    return status;
}
