/* What is drawn: the points of the first run, and what belongs to them. */
#include "figure/figure_internal.h"

#include <math.h>
#include <stdio.h>

static const double slip_probability = 0.5;

const struct wa_curve *figure_curve_of(const struct wa_result *result)
{
    return result->runs.count > 0 && result->curves != NULL && result->curves[0].point_count > 0
               ? &result->curves[0]
               : NULL;
}

const struct wa_experiment *figure_experiment_of(const struct wa_result *result)
{
    return result->runs.count > 0 && result->experiments != NULL && result->experiments[0].count > 0
               ? &result->experiments[0]
               : NULL;
}

struct figure_points figure_points_of(const struct wa_result *result)
{
    const struct wa_experiment *experiment = figure_experiment_of(result);
    const struct wa_curve *curve = figure_curve_of(result);
    if (experiment != NULL && result->fitted) {
        return (struct figure_points){
            .count = experiment->count,
            .volume_mL = experiment->volume_mL,
            .reading = experiment->reading,
            .fitted = true,
            .nominal_pH = experiment->uncalibrated,
            .u_reading = isfinite(result->best.noise_reading) ? result->best.noise_reading : 0.0,
            .u_volume = isfinite(result->best.noise_volume) ? result->best.noise_volume : 0.0,
            .outlier = result->best.outlier};
    }
    if (curve != NULL) {
        return (struct figure_points){.count = curve->point_count,
                                      .volume_mL = curve->volume_mL,
                                      .reading = curve->reading,
                                      .in_mV = curve->in_mV,
                                      .u_reading = isfinite(curve->noise) ? curve->noise : 0.0};
    }
    return (struct figure_points){.count = 0};
}

double figure_reading_at(const struct figure_points *points, double volume_mL)
{
    for (size_t i = 1; i < points->count; i++) {
        const double left = points->volume_mL[i - 1], right = points->volume_mL[i];
        if (volume_mL >= left && volume_mL <= right && right > left) {
            const double part = (volume_mL - left) / (right - left);
            return points->reading[i - 1] + part * (points->reading[i] - points->reading[i - 1]);
        }
    }
    return NAN;
}

bool figure_is_slip(const struct figure_points *points, size_t index)
{
    return points->outlier != NULL && points->outlier[index] > slip_probability;
}

const struct wa_trace *figure_species_of(const struct wa_result *result, const char **name)
{
    *name = "";
    if (result->candidate_count > 0 && result->candidates[0].acid >= 0 &&
        result->candidate_traces[0].count > 1 && result->candidate_traces[0].step_count > 0) {
        const char *acid = result->candidates[0].acid_name;
        *name = acid != NULL ? acid : "";
        return &result->candidate_traces[0];
    }
    return result->best_trace.count > 1 && result->best_trace.step_count > 0 ? &result->best_trace
                                                                             : NULL;
}

const char *figure_reading_label(const struct figure_points *points)
{
    if (points->in_mV) {
        return "reading / mV";
    }
    return points->nominal_pH ? "pH, electrode not calibrated" : "pH";
}

const char *figure_candidate_name(const struct wa_result_candidate *candidate)
{
    if (candidate->form_name != NULL && candidate->form_name[0] != '\0') {
        return candidate->form_name;
    }
    return candidate->acid_name != NULL ? candidate->acid_name : "";
}

void figure_species_label(char *label, size_t size, int step_count, int charge, int lost)
{
    static const char *const low[] = {"₀", "₁", "₂", "₃", "₄", "₅", "₆", "₇", "₈", "₉"};
    static const char *const high[] = {"⁰", "¹", "²", "³", "⁴", "⁵", "⁶", "⁷", "⁸", "⁹"};
    const int protons = step_count - lost;
    const int left = charge - lost;
    const int amount = left < 0 ? -left : left;
    char hydrogen[16] = "";
    if (protons > 1) {
        snprintf(hydrogen, sizeof hydrogen, "H%s%s", protons > 9 ? low[protons / 10 % 10] : "",
                 low[protons % 10]);
    } else if (protons == 1) {
        snprintf(hydrogen, sizeof hydrogen, "H");
    }
    snprintf(label, size, "%sA%s%s", hydrogen, amount > 1 ? high[amount % 10] : "",
             left < 0   ? "⁻"
             : left > 0 ? "⁺"
                        : "");
}
