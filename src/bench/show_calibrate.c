/* A calibration as text and as JSON. */
#include "bench/bench_internal.h"
#include "whichacid/bench_report.h"

#include <math.h>
#include <stdio.h>

static void readings(struct wa_text *out, const struct wa_electrode *e)
{
    wa_text_append(out,
                   "\n  buffer              °C     pH     %-9s residual/pH  by the others/pH\n",
                   e->in_mV ? "reading/mV" : "reading");
    for (size_t i = 0; i < e->count; i++) {
        const struct wa_buffer_reading *r = &e->readings[i];
        wa_text_append(out, "  ");
        bench_cell(out, r->buffer, 19);
        wa_text_append(out, "%5.1f  %6.3f  %9.5g  %+.3f       ", r->temperature_C, r->pH,
                       r->reading, r->residual);
        if (isfinite(r->against_others)) {
            wa_text_append(out, "%+.3f\n", r->against_others);
        } else {
            wa_text_append(out, "-\n");
        }
    }
}

static void figures(struct wa_text *out, const struct wa_electrode *e)
{
    wa_text_append(out, "Slope: %.2f ± %.2f %% of theory at %.1f °C%s\n", 100.0 * e->slope,
                   100.0 * e->slope_u, e->temperature_C,
                   e->slope_assumed ? " (assumed: one buffer does not tell)" : "");
    wa_text_append(out, "Offset: %.4f ± %.4f pH at pH 7 (%.1f mV)\n", e->offset, e->offset_u,
                   e->offset_mV);
    wa_text_append(out,
                   "Correlation of the two: %+.2f; none about pH %.2f, offset there %.4f ± %.4f\n",
                   e->correlation, e->pivot, e->pivot_offset, e->pivot_offset_u);
}

static void verdict(struct wa_text *out, const struct wa_electrode *e,
                    const struct wa_electrode_limits *limits)
{
    char why[192], sentence[384];
    const bool accepted = wa_electrode_accepted(e, limits, why, sizeof why);
    snprintf(sentence, sizeof sentence, "%s by the limits of %s%s%s.",
             accepted ? "Accepted" : "Not accepted", limits->name, accepted ? "" : ": ", why);
    bench_paragraph(out, sentence, 0);
}

static void closing(struct wa_text *out, const struct wa_electrode *e)
{
    char sentence[384];
    if (isfinite(e->birge)) {
        snprintf(sentence, sizeof sentence,
                 "The buffers agree %s their uncertainties say (Birge ratio %.2f)%s.",
                 e->birge > 1.0 ? "less well than" : "as well as", e->birge,
                 e->birge > 1.0 ? "; the uncertainties are widened by it" : "");
        bench_paragraph(out, sentence, 2);
    }
    bench_paragraph(out,
                    "Assumed: the isopotential point of the electrode is pH 7. The limits of ISO "
                    "10523 are not applied: their text was not at hand.",
                    2);
}

enum wa_status wa_electrode_text(const struct wa_electrode *electrode,
                                 const struct wa_electrode *after,
                                 const struct wa_electrode_limits *limits, char **text,
                                 struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    figures(&out, electrode);
    verdict(&out, electrode, limits);
    readings(&out, electrode);
    if (after != NULL) {
        const struct wa_electrode_drift drift = wa_electrode_compare(electrode, after);
        wa_text_append(&out, "\nAfterwards: ");
        figures(&out, after);
        verdict(&out, after, limits);
        readings(&out, after);
        wa_text_append(&out, "\nDrift: slope %+.2f ± %.2f %%, offset %+.4f ± %.4f pH:\n  %s.\n",
                       100.0 * drift.slope, 100.0 * drift.slope_u, drift.offset, drift.offset_u,
                       drift.significant ? "more than the uncertainties explain"
                                         : "within the uncertainties");
    }
    wa_text_append(&out, "\n");
    closing(&out, electrode);
    if (out.failed) {
        wa_text_free(&out);
        return wa_fail_memory(error);
    }
    *text = out.bytes;
    return WA_OK;
}

static json_t *readings_json(const struct wa_electrode *e)
{
    json_t *list = json_array();
    for (size_t i = 0; i < e->count && list != NULL; i++) {
        const struct wa_buffer_reading *r = &e->readings[i];
        json_t *entry =
            json_pack("{s:s, s:o, s:o, s:o, s:o, s:o, s:o, s:I}", "buffer", r->buffer,
                      "temperature_C", bench_number(r->temperature_C), "pH", bench_number(r->pH),
                      "u_pH", bench_number(r->pH_u), "reading", bench_number(r->reading),
                      "residual_pH", bench_number(r->residual), "against_others_pH",
                      bench_number(r->against_others), "line", (json_int_t)r->line);
        if (json_array_append_new(list, entry) != 0) {
            json_decref(list);
            list = NULL;
        }
    }
    return list;
}

static json_t *electrode_json(const struct wa_electrode *e, const struct wa_electrode_drift *drift)
{
    /* A drift spread over the work leaves each run off by about half of it. */
    const double slope_half = drift != NULL ? 0.5 * drift->slope : 0.0;
    const double offset_half = drift != NULL ? 0.5 * drift->offset : 0.0;
    const double slope_u = hypot(e->slope_u, slope_half);
    const double offset_u = hypot(e->offset_u, offset_half);
    const double correlation =
        (e->correlation * e->slope_u * e->offset_u + slope_half * offset_half) /
        (slope_u * offset_u);
    return json_pack("{s:o, s:o, s:o, s:o, s:o, s:o, s:o, s:b}", "slope", bench_number(e->slope),
                     "slope_u", bench_number(slope_u), "offset_pH", bench_number(e->offset),
                     "offset_u_pH", bench_number(offset_u), "correlation",
                     bench_number(correlation), "potential_at_7_mV", bench_number(e->offset_mV),
                     "temperature_C", bench_number(e->temperature_C), "slope_assumed",
                     e->slope_assumed);
}

enum wa_status wa_electrode_json(const struct wa_electrode *electrode,
                                 const struct wa_electrode *after,
                                 const struct wa_electrode_limits *limits, char **text,
                                 struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    struct wa_electrode_drift drift = {.slope = 0.0};
    char why[192];
    const bool accepted = wa_electrode_accepted(electrode, limits, why, sizeof why);
    if (after != NULL) {
        drift = wa_electrode_compare(electrode, after);
    }
    json_t *changes =
        after == NULL ? json_null()
                      : json_pack("{s:o, s:o, s:o, s:o, s:b}", "slope", bench_number(drift.slope),
                                  "slope_u", bench_number(drift.slope_u), "offset_pH",
                                  bench_number(drift.offset), "offset_u_pH",
                                  bench_number(drift.offset_u), "significant", drift.significant);
    json_t *json = json_pack("{s:s, s:s, s:o, s:b, s:s, s:s, s:o, s:o, s:o}", "kind",
                             WA_ELECTRODE_FILE_KIND, "made_by", "whichacid calibrate", "electrode",
                             electrode_json(electrode, after != NULL ? &drift : NULL), "accepted",
                             accepted, "limits", limits->name, "why_not", why, "birge_ratio",
                             bench_number(electrode->birge), "readings", readings_json(electrode),
                             "drift", changes);
    const enum wa_status status = bench_dump(json, &out, error);
    if (status != WA_OK) {
        wa_text_free(&out);
        return status;
    }
    *text = out.bytes;
    return WA_OK;
}
