/* What the mass of the sample says of a form: the amount by the fit against the amount that a
 * sample of some purity would hold. */
#include "match/match_internal.h"

#include <gsl/gsl_sf_erf.h>

#include <math.h>

static const double ln_sqrt_2pi = 0.91893853320467274;
static const double sqrt_half = 0.70710678118654752;

/* Soft ends of the molar masses of an acid that nobody named, in ln: half a per cent of purity
 * must not decide. */
static const double soft_end = 0.05;

struct wa_purity wa_purity_default(void)
{
    return (struct wa_purity){
        .reagent_share = WA_PURITY_REAGENT_SHARE,
        .reagent_ln_mean = WA_PURITY_REAGENT_LN_MEAN,
        .reagent_ln_u = WA_PURITY_REAGENT_LN_U,
        .found_ln_s = WA_PURITY_FOUND_LN_S,
    };
}

double wa_log_sum(double a, double b)
{
    const double high = fmax(a, b);
    return isfinite(high) ? high + log1p(exp(fmin(a, b) - high)) : high;
}

static double log_normal_density(double x, double mean, double u)
{
    const double deviation = (x - mean) / u;
    return -0.5 * deviation * deviation - log(u) - ln_sqrt_2pi;
}

/* A half-normal at and below zero, of scale s, seen through a Gaussian of width u: 2 N(x; 0,
 * sqrt(s^2 + u^2)) Phi(-x s / (u sqrt(s^2 + u^2))). */
static double log_half_normal_density(double x, double s, double u)
{
    const double width = hypot(s, u);
    return log_normal_density(x, 0.0, width) + gsl_sf_log_erfc(x * s / (u * width) * sqrt_half);
}

double wa_log_mass_evidence(const struct wa_titrated_mass *mass, const struct wa_purity *purity,
                            double molar_mass, double ln_amount, double ln_amount_u,
                            const struct wa_prior *broad)
{
    if (!mass->known) {
        return 0.0;
    }
    const double short_of = ln_amount - log(mass->mass_g / molar_mass);
    const double u = hypot(ln_amount_u, mass->u_g / mass->mass_g);
    const double reagent =
        log(purity->reagent_share) +
        log_normal_density(short_of, purity->reagent_ln_mean, hypot(u, purity->reagent_ln_u));
    const double found =
        log(1.0 - purity->reagent_share) + log_half_normal_density(short_of, purity->found_ln_s, u);
    return wa_log_sum(reagent, found) - log_normal_density(ln_amount, broad->mean, broad->u);
}

double wa_log_mass_evidence_generic(const struct wa_titrated_mass *mass, double ln_amount,
                                    const struct wa_prior *broad)
{
    if (!mass->known) {
        return 0.0;
    }
    const double molar_mass = mass->mass_g / exp(ln_amount);
    const double outside = fmax(log(WA_MOLAR_MASS_LOW / molar_mass), 0.0) +
                           fmax(log(molar_mass / WA_MOLAR_MASS_HIGH), 0.0);
    const double density =
        -log(log(WA_MOLAR_MASS_HIGH / WA_MOLAR_MASS_LOW)) - 0.5 * pow(outside / soft_end, 2.0);
    return density - log_normal_density(ln_amount, broad->mean, broad->u);
}
