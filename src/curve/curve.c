#include "curve/curve_internal.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void wa_curve_free(struct wa_curve *curve)
{
    if (curve == NULL) {
        return;
    }
    double *columns[] = {curve->volume_mL, curve->reading, curve->smooth, curve->smooth_u,
                         curve->first,     curve->first_u, curve->second, curve->second_u};
    for (size_t i = 0; i < sizeof columns / sizeof columns[0]; i++) {
        free(columns[i]);
    }
    for (size_t i = 0; i < curve->remark_count; i++) {
        free(curve->remarks[i]);
    }
    free(curve->remarks);
    *curve = (struct wa_curve){0};
}

enum wa_status curve_remark(struct wa_curve *curve, struct wa_error *error, const char *format, ...)
{
    char text[512];
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);
    char **longer = realloc(curve->remarks, (curve->remark_count + 1) * sizeof *longer);
    if (longer == NULL) {
        return wa_fail_memory(error);
    }
    curve->remarks = longer;
    longer[curve->remark_count] = strdup(text);
    if (longer[curve->remark_count] == NULL) {
        return wa_fail_memory(error);
    }
    curve->remark_count++;
    return WA_OK;
}

/* A noted value, or the fallback when nobody gave one; the uncertainty likewise. */
static void take(const struct wa_noted *noted, double fallback, double fallback_u, double *value,
                 double *u)
{
    const bool known = noted->known && isfinite(noted->quantity.value);
    *value = known ? noted->quantity.value : fallback;
    *u = known && noted->quantity.has_u ? noted->quantity.u : fallback_u;
}

/* Fallbacks are those of the design for what nobody noted. */
static void take_conditions(const struct wa_run *run, struct curve_context *context)
{
    const struct wa_conditions *conditions = &run->conditions;
    double unused;
    take(&conditions->volume_uncertainty, NAN, 0.0, &context->volume_u, &unused);
    context->volume_u_noted = conditions->volume_uncertainty.known &&
                              conditions->volume_uncertainty.origin != WA_ORIGIN_DEFAULT;
    context->increments = run->volume_kind == WA_VOLUME_INCREMENT;
    take(&conditions->solution_volume, 50.0, 25.0, &context->start_volume,
         &context->start_volume_u);
    take(&conditions->titrant_concentration, NAN, 0.0, &context->titrant, &context->titrant_u);
    take(&conditions->electrode_offset, 0.0, 0.06, &context->offset, &context->offset_u);
    take(&conditions->electrode_slope, 1.0, 0.012, &context->slope, &context->slope_u);
    take(&conditions->temperature, 25.0, 2.0, &context->temperature_C, &unused);
    take(&conditions->background, 0.0, 0.0, &context->background, &unused);
    take(&conditions->blank, 0.0, 0.0, &context->blank_mL, &context->blank_u);
    if (!(context->slope > 0.5)) {
        context->slope = 1.0;
    }
    if (!(context->titrant > 0.0)) {
        context->titrant = NAN;
    }
}

/* Carbonate of an alkaline titrant: what was noted, else up to 1.5 % (one-sided). */
static void take_carbonate(const struct wa_run *run, struct curve_context *context)
{
    const struct wa_noted *noted = &run->conditions.titrant_carbonate;
    const bool stated = noted->known && noted->origin != WA_ORIGIN_DEFAULT;
    context->carbonate_centre = 0.0;
    context->carbonate_width = 0.015;
    if (stated) {
        context->carbonate_centre = noted->quantity.value;
        context->carbonate_width =
            noted->quantity.has_u ? noted->quantity.u : 0.001 + 0.2 * noted->quantity.value;
    }
    if (!context->titrant_is_base) {
        context->carbonate_centre = context->carbonate_width = 0.0;
    }
    curve_truncate(context->carbonate_centre, context->carbonate_width, &context->carbonate,
                   &context->carbonate_u);
}

/* A rise that the curve leaves off in is no jump yet: nothing shows where it ends. */
static enum wa_status remark_open_end(const struct curve_context *context, struct wa_error *error)
{
    struct wa_curve *curve = context->curve;
    const size_t last = curve->point_count - 1;
    const size_t start =
        curve->buffer_count > 0
            ? curve_index_below(curve, curve->buffers[curve->buffer_count - 1].volume_mL)
            : last / 2;
    const double flat = fabs(curve->first[start]);
    const double end = fabs(curve->first[last]);
    const double rise = fabs(curve->smooth[last] - curve->smooth[start]);
    const bool open = end - flat > 5.0 * hypot(curve->first_u[last], curve->first_u[start]) &&
                      end > 2.0 * flat && rise > 0.5 * context->per_decade;
    if (!open) {
        return WA_OK;
    }
    return curve_remark(curve, error,
                        "The curve ends at %.2f mL on a rise: an equivalence point there is not "
                        "passed; add more titrant.",
                        curve->volume_mL[last]);
}

static enum wa_status analyse(const struct wa_run *run, struct curve_context *context,
                              struct wa_error *error)
{
    struct curve_jump jumps[WA_INFLECTIONS_MAX];
    size_t jump_count = 0;
    take_conditions(run, context);
    enum wa_status status = curve_collect(run, context, error);
    if (status != WA_OK) {
        return status;
    }
    take_carbonate(run, context);
    status = curve_estimate_noise(run, context, error);
    if (status == WA_OK) {
        status = curve_drop_outliers(context, error);
    }
    if (status == WA_OK) {
        status = curve_estimate_noise(run, context, error);
    }
    if (status == WA_OK) {
        status = curve_smooth(context, error);
    }
    if (status == WA_OK) {
        status = curve_find_jumps(context, jumps, WA_INFLECTIONS_MAX, &jump_count, error);
    }
    if (status != WA_OK) {
        return status;
    }
    curve_place_inflections(context, jumps, jump_count);
    status = curve_equivalence_volumes(context, error);
    if (status == WA_OK) {
        status = curve_half_equivalences(context, error);
    }
    if (status == WA_OK) {
        curve_explain_spacing(context);
        status = remark_open_end(context, error);
    }
    return status;
}

enum wa_status wa_curve_analyse(const struct wa_run *run, struct wa_curve *curve,
                                struct wa_error *error)
{
    struct wa_curve result = {0};
    struct curve_context context = {.curve = &result};
    const enum wa_status status = analyse(run, &context, error);
    free(context.point_u);
    if (status != WA_OK) {
        wa_curve_free(&result);
        return status;
    }
    *curve = result;
    return WA_OK;
}
