/* What an electrode of unknown calibration leaves open. */
#include "match/match_internal.h"

#include <math.h>

static double log_normal(double x, double u)
{
    return -0.5 * (x / u) * (x / u) - log(u);
}

double wa_log_stray_electrode(const struct wa_experiment *experiment, const struct wa_fit *fit)
{
    const int index = wa_fit_find(fit, WA_PARAMETER_OFFSET, 0, 0);
    if (index < 0 || experiment->uncalibrated || experiment->offset.origin != WA_ORIGIN_DEFAULT) {
        return 0.0;
    }
    const struct wa_parameter *offset = &fit->parameters[index];
    const double prior_precision = 1.0 / (offset->prior.u * offset->prior.u);
    const double precision = 1.0 / (offset->u * offset->u) - prior_precision;
    if (precision < 1e-3 * prior_precision) {
        return 0.0;
    }
    /* The data alone say: offset = mean, within 1/sqrt(precision); both priors are integrated over
     * that Gaussian in closed form. */
    const double mean =
        (offset->value / (offset->u * offset->u) - offset->prior.mean * prior_precision) /
        precision;
    const double deviation = mean - offset->prior.mean;
    const double narrow = log_normal(deviation, sqrt(1.0 / precision + 1.0 / prior_precision));
    const double wide =
        log_normal(deviation, sqrt(1.0 / precision + WA_STRAY_ELECTRODE_U * WA_STRAY_ELECTRODE_U));
    return log1p(WA_STRAY_ELECTRODE_SHARE * expm1(wide - narrow));
}
