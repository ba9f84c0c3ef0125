/* The noise of readings and volumes, and the likelihood that stays one: a Gaussian with a stated
 * share of outliers, normalised, in the space of the readings. */
#include "fit/fit_internal.h"

#include <math.h>

static const double ln_2pi = 1.8378770664093453;

static double extreme_error(double pH)
{
    const double beyond = fmax(WA_ACID_LIMIT - pH, 0.0) + fmax(pH - WA_ALKALINE_LIMIT, 0.0);
    return WA_EXTREME_ERROR * beyond;
}

double wa_noise_variance(const struct wa_noise *noise, const struct wa_point_model *point)
{
    const double extreme = extreme_error(point->pH);
    const double by_volume = point->slope * noise->volume;
    return noise->reading * noise->reading + extreme * extreme + by_volume * by_volume;
}

double wa_outlier_share(const struct wa_experiment *experiment)
{
    return experiment->outlier_share > 0.0 ? experiment->outlier_share : WA_OUTLIER_FRACTION;
}

double wa_noise_log_likelihood(double outlier_share, double residual, double variance,
                               double *inlier)
{
    const double wide = variance + WA_OUTLIER_SPREAD * WA_OUTLIER_SPREAD;
    const double square = residual * residual;
    const double usual = log(1.0 - outlier_share) - 0.5 * (log(variance) + square / variance);
    const double odd = log(outlier_share) - 0.5 * (log(wide) + square / wide);
    const double high = fmax(usual, odd);
    const double sum = high + log1p(exp(fmin(usual, odd) - high));
    *inlier = exp(usual - sum);
    return sum - 0.5 * ln_2pi;
}

/* Gradient and Fisher information of both log standard deviations, priors included. */
struct score {
    double gradient[2];
    double information[3]; /* reading-reading, reading-volume, volume-volume */
};

static void add_point(const struct wa_noise *noise, const struct wa_point_model *point,
                      double square, double weight, struct score *score)
{
    const double variance = wa_noise_variance(noise, point);
    const double by_volume = point->slope * noise->volume;
    const double share_reading = noise->reading * noise->reading / variance;
    const double share_volume = by_volume * by_volume / variance;
    const double excess = square / variance - 1.0;
    score->gradient[0] += weight * share_reading * excess;
    score->gradient[1] += weight * share_volume * excess;
    score->information[0] += 2.0 * weight * share_reading * share_reading;
    score->information[1] += 2.0 * weight * share_reading * share_volume;
    score->information[2] += 2.0 * weight * share_volume * share_volume;
}

void wa_noise_update(const struct wa_experiment *experiment, const struct wa_point_model *points,
                     const double *square, const double *weight, struct wa_noise *noise)
{
    const struct wa_prior *reading = &experiment->ln_noise_reading;
    const struct wa_prior *volume = &experiment->ln_noise_volume;
    for (int round = 0; round < 3; round++) {
        const double precision_reading = 1.0 / (reading->u * reading->u);
        const double precision_volume = 1.0 / (volume->u * volume->u);
        struct score score = {
            .gradient = {(reading->mean - log(noise->reading)) * precision_reading,
                         (volume->mean - log(noise->volume)) * precision_volume},
            .information = {precision_reading, 0.0, precision_volume},
        };
        for (size_t p = 0; p < experiment->count; p++) {
            add_point(noise, &points[p], square[p], weight[p], &score);
        }
        const double determinant = score.information[0] * score.information[2] -
                                   score.information[1] * score.information[1];
        const double step_reading =
            (score.information[2] * score.gradient[0] - score.information[1] * score.gradient[1]) /
            determinant;
        const double step_volume =
            (score.information[0] * score.gradient[1] - score.information[1] * score.gradient[0]) /
            determinant;
        noise->reading *= exp(fmin(fmax(step_reading, -1.0), 1.0));
        noise->volume *= exp(fmin(fmax(step_volume, -1.0), 1.0));
        noise->variance_ln_reading = score.information[2] / determinant;
        noise->variance_ln_volume = score.information[0] / determinant;
        noise->log_determinant = log(determinant);
    }
}

struct wa_noise wa_noise_marginal(const struct wa_noise *noise)
{
    struct wa_noise marginal = *noise;
    marginal.reading *= exp(noise->variance_ln_reading);
    marginal.volume *= exp(noise->variance_ln_volume);
    return marginal;
}
