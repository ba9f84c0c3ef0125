#include "curve/curve_internal.h"

#include <math.h>
#include <string.h>

/* Most of the points that may be taken out: more than that is noise and not a slip. */
static const double most_share = 0.04;
/* A slip is at least this large, in pH. */
static const double least_slip = 0.05;

/* How far, in standard uncertainties, the reading falls back from point i to point i + 1 although
 * the curve rises. The volume error acts through the slope around. */
static double fall_back(const struct curve_context *context, size_t i)
{
    const struct wa_curve *curve = context->curve;
    const double fall = -curve->direction * (curve->reading[i + 1] - curve->reading[i]);
    if (!(fall > least_slip * context->per_decade)) {
        return 0.0;
    }
    const size_t first = i > 0 ? i - 1 : 0;
    const size_t last = i + 2 < curve->point_count ? i + 2 : curve->point_count - 1;
    const double slope = (curve->reading[last] - curve->reading[first]) /
                         (curve->volume_mL[last] - curve->volume_mL[first]);
    return fall / (sqrt(2.0) * hypot(curve->noise, slope * context->volume_u));
}

/* Which of two points out of order is the slip: the one without which the rest still rises. */
static bool lower_is_slip(const struct wa_curve *curve, size_t i, bool *clear)
{
    const double *y = curve->reading;
    const bool without_low =
        i + 2 >= curve->point_count || curve->direction * (y[i + 2] - y[i]) >= 0.0;
    const bool without_high = i == 0 || curve->direction * (y[i + 1] - y[i - 1]) >= 0.0;
    *clear = without_low != without_high;
    return without_low;
}

static void take_out(struct wa_curve *curve, size_t i)
{
    const size_t behind = curve->point_count - i - 1;
    memmove(&curve->volume_mL[i], &curve->volume_mL[i + 1], behind * sizeof(double));
    memmove(&curve->reading[i], &curve->reading[i + 1], behind * sizeof(double));
    curve->point_count--;
}

enum wa_status curve_drop_outliers(struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    size_t found = 0;
    for (size_t i = 0; i + 1 < curve->point_count; i++) {
        bool clear = false;
        found += fall_back(context, i) > 5.0 && (lower_is_slip(curve, i, &clear), clear);
    }
    if (found == 0 || (double)found > most_share * (double)curve->point_count ||
        curve->point_count < 12) {
        return WA_OK;
    }
    for (size_t i = 0; i + 1 < curve->point_count; i++) {
        bool clear = false;
        if (!(fall_back(context, i) > 5.0)) {
            continue;
        }
        const size_t slip = lower_is_slip(curve, i, &clear) ? i + 1 : i;
        if (!clear) {
            continue;
        }
        const enum wa_status status =
            curve_remark(curve, error,
                         "The reading %.2f at %.2f mL does not fit its neighbours and was left out "
                         "of the analysis of the curve.",
                         curve->reading[slip], curve->volume_mL[slip]);
        if (status != WA_OK) {
            return status;
        }
        take_out(curve, slip);
        i = i > 0 ? i - 1 : 0;
    }
    return WA_OK;
}
