#include "curve/curve_internal.h"

#include <math.h>
#include <stdio.h>

/* Most protons in all that the spacing is compared with. */
enum { PROTONS_MAX = 6 };

struct assignment {
    int protons[WA_INFLECTIONS_MAX];
    double misfit; /* chi-square */
    bool found;
};

/* A step whose shape shows several protons must have been given several. */
static bool shape_allows(const struct wa_curve *curve, const int *protons)
{
    for (size_t i = 0; i < curve->half_count; i++) {
        const int step = curve->halves[i].step - 1;
        const int width = protons[step] - (step > 0 ? protons[step - 1] : 0);
        if (curve->halves[i].merged && width < 2) {
            return false;
        }
    }
    return true;
}

/* Best common volume of one proton for an assignment, by least squares, and its chi-square. */
static double misfit_of(const struct curve_context *context, const int *protons)
{
    const struct wa_curve *curve = context->curve;
    double volumes[WA_INFLECTIONS_MAX], weights[WA_INFLECTIONS_MAX];
    double cross = 0.0, square = 0.0, misfit = 0.0;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const struct wa_volume_estimate *here = &curve->inflections[i].equivalence;
        volumes[i] = here->volume_mL - context->blank_mL;
        const double u = hypot(hypot(here->u_mL, context->blank_u), 0.003 * volumes[i]);
        weights[i] = 1.0 / (u * u);
        cross += weights[i] * protons[i] * volumes[i];
        square += weights[i] * protons[i] * protons[i];
    }
    const double unit = cross / square;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        misfit += weights[i] * pow(volumes[i] - unit * protons[i], 2.0);
    }
    return misfit;
}

/* All rising sequences of at most `most` protons, the fewest first: a ratio of 2:4 is 1:2. */
static void assign(const struct curve_context *context, int *protons, size_t position, int total,
                   struct assignment *best)
{
    const size_t count = context->curve->inflection_count;
    if (position == count) {
        if (protons[count - 1] != total || !shape_allows(context->curve, protons)) {
            return;
        }
        const double misfit = misfit_of(context, protons);
        if (!best->found || misfit < best->misfit) {
            best->found = true;
            best->misfit = misfit;
            for (size_t i = 0; i < count; i++) {
                best->protons[i] = protons[i];
            }
        }
        return;
    }
    const int least = position > 0 ? protons[position - 1] + 1 : 1;
    for (int next = least; next <= total; next++) {
        protons[position] = next;
        assign(context, protons, position + 1, total, best);
    }
}

static void write_explained(struct wa_curve *curve)
{
    char ratio[64] = "";
    size_t used = 0;
    for (size_t i = 0; i < curve->inflection_count; i++) {
        const int added = snprintf(ratio + used, sizeof ratio - used, "%s%d", i > 0 ? ":" : "",
                                   curve->inflections[i].protons);
        used += added > 0 ? (size_t)added : 0;
    }
    if (curve->inflection_count > 1) {
        snprintf(curve->spacing, sizeof curve->spacing,
                 "The equivalence volumes stand in the ratio %s within their uncertainty.", ratio);
    }
}

void curve_explain_spacing(struct curve_context *context)
{
    struct wa_curve *curve = context->curve;
    const size_t count = curve->inflection_count;
    curve->spacing_explained = true;
    if (count == 0) {
        return;
    }
    /* 99 % points of chi-square for count - 1 degrees of freedom. */
    static const double limits[WA_INFLECTIONS_MAX] = {0.1,   6.63,  9.21,  11.34,
                                                      13.28, 15.09, 16.81, 18.48};
    for (int total = (int)count; total <= PROTONS_MAX; total++) {
        int protons[WA_INFLECTIONS_MAX] = {0};
        struct assignment best = {.found = false};
        assign(context, protons, 0, total, &best);
        if (best.found && best.misfit <= limits[count - 1]) {
            for (size_t i = 0; i < count; i++) {
                curve->inflections[i].protons = best.protons[i];
            }
            write_explained(curve);
            return;
        }
    }
    curve->spacing_explained = false;
    snprintf(
        curve->spacing, sizeof curve->spacing,
        "The equivalence volumes stand in no ratio of small whole numbers: a mixture, a partly "
        "neutralized sample, an acidic or basic impurity, or carbonate.");
}
