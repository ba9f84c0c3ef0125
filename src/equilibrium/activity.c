#include "whichacid/activity.h"

#include <math.h>

static const double kelvin_offset = 273.15;
static const double reference_K = 298.15;
static const double gas_constant = 8.314462618; /* J/(K mol), CODATA 2018 */

static double water_density(double t)
{
    const double numerator =
        999.83952 +
        t * (16.945176 +
             t * (-7.9870401e-3 + t * (-46.170461e-6 + t * (105.56302e-9 - t * 280.54253e-12))));
    return numerator / (1.0 + 16.879850e-3 * t) / 1000.0;
}

static double water_pKw(double temperature_K, double density)
{
    const double inverse = 1.0 / temperature_K;
    const double constant = -4.098 + inverse * (-3245.2 + inverse * (2.2362e5 - inverse * 3.984e7));
    const double slope = 13.957 + inverse * (-1262.3 + inverse * 8.5641e5);
    return -(constant + slope * log10(density));
}

struct wa_medium wa_medium_at(double temperature_C)
{
    const double t = fmin(fmax(temperature_C, 0.0), 100.0);
    const double temperature_K = t + kelvin_offset;
    struct wa_medium medium = {.temperature_C = t};
    medium.density = water_density(t);
    medium.permittivity = 87.740 + t * (-0.40008 + t * (9.398e-4 - t * 1.410e-6));
    /* Debye-Hueckel limiting slope, with e^3 N^(1/2) and the rest gathered into one constant. */
    medium.debye_huckel_A =
        1.82481e6 * sqrt(medium.density) / pow(medium.permittivity * temperature_K, 1.5);
    medium.pKw = water_pKw(temperature_K, medium.density);
    return medium;
}

double wa_davies_log10_gamma(double ionic_strength, double debye_huckel_A,
                             double linear_coefficient)
{
    const double strength = fmin(fmax(ionic_strength, 0.0), WA_DAVIES_HOLD);
    const double root = sqrt(strength);
    return -debye_huckel_A * (root / (1.0 + root) - linear_coefficient * strength);
}

double wa_pK_at_temperature(double pK, double enthalpy, double heat_capacity, double temperature_C)
{
    const double temperature_K = temperature_C + kelvin_offset;
    const double ln_K_change =
        1000.0 * enthalpy / gas_constant * (1.0 / reference_K - 1.0 / temperature_K) +
        heat_capacity / gas_constant *
            (reference_K / temperature_K - 1.0 + log(temperature_K / reference_K));
    return pK - ln_K_change / log(10.0);
}
