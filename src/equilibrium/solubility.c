#include "whichacid/equilibrium.h"

#include <math.h>

enum wa_status wa_species_solubility(const struct wa_system *system, const struct wa_medium *medium,
                                     double total, int species, double *solubility,
                                     struct wa_error *error)
{
    const struct wa_mixture water = {
        .medium = medium,
        .davies_coefficient = WA_DAVIES_COEFFICIENT,
        .components = {{.system = system, .concentration = total, .solubility = INFINITY}},
        .component_count = 1,
    };
    struct wa_solution solution;
    const enum wa_status status = wa_mixture_solve(&water, 7.0, &solution, NULL, error);
    if (status == WA_OK) {
        double fraction[WA_PROTONS_MAX + 1];
        const double log10_gamma = wa_davies_log10_gamma(
            solution.ionic_strength, medium->debye_huckel_A, WA_DAVIES_COEFFICIENT);
        wa_system_fractions(system, pow(10.0, -solution.pH), pow(10.0, log10_gamma), fraction);
        *solubility = total * fraction[species];
    }
    return status;
}
