/* A standardization as text and as JSON. */
#include "bench/bench_internal.h"
#include "whichacid/bench_report.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

static void heading(struct wa_text *out, const struct wa_standardization *work)
{
    const struct wa_bench_budget *budget = &work->budget;
    char value[64], expanded[64];
    wa_quantity_format(value, sizeof value, budget->value, budget->u);
    wa_quantity_format(expanded, sizeof expanded, budget->value, 2.0 * budget->u);
    wa_text_append(out, "%s: %s mol/L\n", work->titrant->name, value);
    wa_text_append(out, "  expanded (k = 2): %s mol/L", expanded);
    if (budget->k95 > 2.3) {
        wa_text_append(out, "\n  for 95 %% take k = %.1f: few degrees of freedom (%.1f)",
                       budget->k95, budget->degrees_of_freedom);
    }
    wa_text_append(out, "\n  against %s%s\n", work->standard->name,
                   work->second ? ", by way of a first titrant" : "");
    if (work->standard->drying[0] != '\0') {
        wa_text_append(out, "  (dried: %s)\n", work->standard->drying);
    }
}

static void titrations(struct wa_text *out, const struct wa_standardization *work)
{
    wa_text_append(out, "\n   n  mass/g      volume/mL   result/(mol/L)  from the mean\n");
    for (size_t i = 0; i < work->replicate_count; i++) {
        const struct wa_replicate *r = &work->replicates[i];
        wa_text_append(out, "  %2zu  %-11.6g %-11.6g %-15.6g %+.3f %%%s%s%s\n", i + 1,
                       r->mass.value, r->volume.value, r->concentration,
                       100.0 * (r->concentration / work->mean - 1.0),
                       r->left_out ? "  left out" : "", r->label != NULL ? "  " : "",
                       r->label != NULL ? r->label : "");
    }
}

static void scatter(struct wa_text *out, const struct wa_standardization *work)
{
    char sentence[512];
    if (!isfinite(work->scatter)) {
        return;
    }
    snprintf(sentence, sizeof sentence, "Scatter of one titration: %.3f %% (n = %zu)%s.",
             100.0 * work->scatter, work->used_count,
             work->repeatability_stated ? "; the stated repeatability is used" : "");
    bench_paragraph(out, sentence, 2);
    const struct wa_grubbs *grubbs = &work->grubbs;
    if (grubbs->possible) {
        snprintf(
            sentence, sizeof sentence,
            "Grubbs' test (1969, two-sided, 5 %%): titration %zu is farthest, G = %.3f against "
            "%.3f: %s",
            grubbs->index + 1, grubbs->G, grubbs->critical,
            grubbs->outlier ? "suspicious. It is still counted: look for a cause, repeat it, "
                              "and leave it out with --leave-out only when there is one."
                            : "no outlier.");
        bench_paragraph(out, sentence, 2);
    }
}

static void closing(struct wa_text *out, const struct wa_standardization *work)
{
    char sentence[256];
    const struct wa_bench_input *largest = wa_bench_largest(&work->budget);
    wa_text_append(out, "\n");
    if (largest != NULL) {
        snprintf(sentence, sizeof sentence, "The largest share, %.0f %%, is the %s.",
                 100.0 * largest->share, largest->name);
        bench_paragraph(out, sentence, 2);
    }
    if (work->titrant_assumed) {
        snprintf(sentence, sizeof sentence, "The titrant was not named: %s is assumed.",
                 work->titrant->name);
        bench_paragraph(out, sentence, 2);
    }
    for (size_t i = 0; i < work->assumed_count; i++) {
        bench_paragraph(out, work->assumed[i], 2);
    }
    if (work->buoyancy != 1.0) {
        snprintf(sentence, sizeof sentence, "Masses are corrected for the buoyancy of air: x %.6f.",
                 work->buoyancy);
        bench_paragraph(out, sentence, 2);
    }
}

enum wa_status wa_standardization_text(const struct wa_standardization *work, char **text,
                                       struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    heading(&out, work);
    titrations(&out, work);
    scatter(&out, work);
    bench_budget_text(&out, &work->budget, &work->monte_carlo);
    closing(&out, work);
    if (out.failed) {
        wa_text_free(&out);
        return wa_fail_memory(error);
    }
    *text = out.bytes;
    return WA_OK;
}

static json_t *titrations_json(const struct wa_standardization *work)
{
    json_t *list = json_array();
    for (size_t i = 0; i < work->replicate_count && list != NULL; i++) {
        const struct wa_replicate *r = &work->replicates[i];
        json_t *entry = json_pack(
            "{s:o, s:o, s:o, s:b, s:b, s:o}", "mass_g", bench_number(r->mass.value), "volume_mL",
            bench_number(r->volume.value), "concentration_mol_L", bench_number(r->concentration),
            "from_curve", r->from_curve, "left_out", r->left_out, "file", bench_words(r->label));
        if (json_array_append_new(list, entry) != 0) {
            json_decref(list);
            list = NULL;
        }
    }
    return list;
}

static json_t *grubbs_json(const struct wa_grubbs *grubbs)
{
    return grubbs->possible
               ? json_pack("{s:I, s:o, s:o, s:b}", "titration", (json_int_t)grubbs->index + 1, "G",
                           bench_number(grubbs->G), "critical", bench_number(grubbs->critical),
                           "suspicious", grubbs->outlier)
               : json_null();
}

static json_t *assumed_json(const struct wa_standardization *work)
{
    json_t *list = json_array();
    for (size_t i = 0; i < work->assumed_count && list != NULL; i++) {
        if (json_array_append_new(list, json_string(work->assumed[i])) != 0) {
            json_decref(list);
            list = NULL;
        }
    }
    return list;
}

enum wa_status wa_standardization_json(const struct wa_standardization *work, char **text,
                                       struct wa_error *error)
{
    struct wa_text out = {.bytes = NULL};
    json_t *json = json_pack(
        "{s:s, s:s, s:{s:s, s:s, s:b, s:o, s:o}, s:s, s:o, s:o, s:o, s:o, s:o, s:o, s:o}", "kind",
        WA_TITRANT_FILE_KIND, "made_by", "whichacid standardize", "titrant", "key",
        work->titrant->key, "name", work->titrant->name, "assumed", work->titrant_assumed,
        "concentration_mol_L", bench_number(work->budget.value), "u_mol_L",
        bench_number(work->budget.u), "standard", work->standard->key, "titrations",
        titrations_json(work), "scatter", bench_number(work->scatter), "grubbs",
        grubbs_json(&work->grubbs), "buoyancy_factor", bench_number(work->buoyancy), "budget",
        bench_budget_json(&work->budget), "monte_carlo", bench_monte_carlo_json(&work->monte_carlo),
        "assumed", assumed_json(work));
    const enum wa_status status = bench_dump(json, &out, error);
    if (status != WA_OK) {
        wa_text_free(&out);
        return status;
    }
    *text = out.bytes;
    return WA_OK;
}
