/* What stands in for a note that nobody gave, and the sentence that says so. */
#include "run/run_internal.h"

#include <math.h>

static const double offset_u = 0.06;         /* pH */
static const double slope_u = 0.012;         /* fraction of theory */
static const double carbonate_u = 0.015;     /* fraction of the titrant's alkalinity, one-sided */
static const double temperature_u = 2.0;     /* degree Celsius */
static const double concentration_u = 0.005; /* relative */
static const double sample_as_solution_u = 0.05; /* relative; water may have been added */

const char *const *wa_conditions_defaults(void)
{
    static const char *const sentences[] = {
        "electrode offset: 0 ± 0.06 pH",
        "electrode slope: 1.000 ± 0.012 of theory",
        "titrant carbonate: 0 to about 1.5 % of the titrant's alkalinity (one-sided)",
        "temperature: the mean of a temperature column, else 25 ± 2 °C",
        "titrant concentration given without an uncertainty: 0.5 % relative",
        NULL,
    };
    return sentences;
}

static struct wa_noted assumed(double value, double u)
{
    return (struct wa_noted){
        .quantity = {.value = value, .u = u, .has_u = true},
        .known = true,
        .origin = WA_ORIGIN_DEFAULT,
    };
}

/* A thermometer column is better than a guess. */
static bool mean_temperature(const struct wa_run *run, struct wa_noted *noted)
{
    double sum = 0;
    double squares = 0;
    double count = 0;
    for (size_t i = 0; i < run->point_count; i++) {
        double temperature = run->points[i].temperature_C;
        if (isfinite(temperature) && temperature > -10 && temperature < 110) {
            sum += temperature;
            squares += temperature * temperature;
            count++;
        }
    }
    if (count < 1) {
        return false;
    }
    double mean = sum / count;
    double variance = fmax(squares / count - mean * mean, 0);
    *noted = assumed(mean, fmax(sqrt(variance), 0.5));
    return true;
}

static enum wa_status fill_temperature(struct wa_run *run, struct wa_error *error)
{
    struct wa_noted *noted = &run->conditions.temperature;
    if (noted->known) {
        if (!noted->quantity.has_u) {
            noted->quantity.u = 0.5;
            noted->quantity.has_u = true;
            return wa_run_remark(run, error,
                                 "The temperature has no uncertainty: 0.5 °C is assumed.");
        }
        return WA_OK;
    }
    if (mean_temperature(run, noted)) {
        return wa_run_remark(run, error,
                             "The temperature is the mean of the temperature column, %.1f °C.",
                             noted->quantity.value);
    }
    *noted = assumed(25, temperature_u);
    return wa_run_remark(run, error, "The temperature was not noted: 25 ± 2 °C is assumed.");
}

static enum wa_status fill_titrant(struct wa_run *run, struct wa_error *error)
{
    struct wa_conditions *conditions = &run->conditions;
    struct wa_quantity *concentration = &conditions->titrant_concentration.quantity;
    enum wa_status status = WA_OK;
    if (conditions->titrant_concentration.known && !concentration->has_u) {
        concentration->u = concentration_u * concentration->value;
        concentration->has_u = true;
        status = wa_run_remark(run, error,
                               "The titrant concentration has no uncertainty: 0.5 %% relative is "
                               "assumed.");
    } else if (!conditions->titrant_concentration.known) {
        status = wa_run_remark(run, error,
                               "The titrant concentration was not noted: 0.1 mol/L within a factor "
                               "of two is assumed, and amounts are known no better.");
    }
    if (status == WA_OK && !conditions->titrant_carbonate.known) {
        conditions->titrant_carbonate = assumed(0, carbonate_u);
        status = wa_run_remark(run, error,
                               "Carbonate in the titrant was not noted: between none and about "
                               "1.5 %% of the alkalinity of a base is assumed.");
    } else if (!conditions->titrant_carbonate.quantity.has_u) {
        struct wa_quantity *carbonate = &conditions->titrant_carbonate.quantity;
        carbonate->u = fmax(0.5 * carbonate->value, 0.002);
        carbonate->has_u = true;
    }
    return status;
}

static enum wa_status fill_electrode(struct wa_run *run, struct wa_error *error)
{
    struct wa_conditions *conditions = &run->conditions;
    enum wa_status status = WA_OK;
    if (!conditions->electrode_offset.known) {
        conditions->electrode_offset = assumed(0, offset_u);
        status = wa_run_remark(run, error,
                               "The electrode offset was not noted: 0 ± 0.06 pH is assumed.");
    } else if (!conditions->electrode_offset.quantity.has_u) {
        conditions->electrode_offset.quantity.u = 0.02;
        conditions->electrode_offset.quantity.has_u = true;
        status = wa_run_remark(run, error,
                               "The electrode offset has no uncertainty: 0.02 pH is assumed.");
    }
    if (status == WA_OK && !conditions->electrode_slope.known) {
        conditions->electrode_slope = assumed(1, slope_u);
        status = wa_run_remark(run, error,
                               "The electrode slope was not noted: 1.000 ± 0.012 of theory is "
                               "assumed.");
    } else if (status == WA_OK && !conditions->electrode_slope.quantity.has_u) {
        conditions->electrode_slope.quantity.u = 0.004;
        conditions->electrode_slope.quantity.has_u = true;
        status =
            wa_run_remark(run, error, "The electrode slope has no uncertainty: 0.4 %% is assumed.");
    }
    return status;
}

/* Slope and offset of an mV run are corrected for; what is left are their uncertainties. */
static enum wa_status calibrate(struct wa_run *run, struct wa_error *error)
{
    double temperature = run->conditions.temperature.quantity.value;
    struct wa_calibration calibration;
    enum wa_status status = wa_run_calibration(run, temperature, &calibration, error);
    if (status != WA_OK) {
        return status;
    }
    if (!calibration.known) {
        return wa_run_remark(run, error,
                             "The readings are mV without a calibration, so no pKa can be given; "
                             "note two buffers like 'buffer 1: 4.005 = 172.3 mV', or the "
                             "electrode's slope and offset.");
    }
    status = wa_run_convert_mV(run, &calibration, temperature, error);
    double per_pH = calibration.slope * wa_nernst_slope(temperature);
    run->conditions.electrode_slope = assumed(1, calibration.slope_u / calibration.slope);
    run->conditions.electrode_offset = assumed(0, calibration.mV_at_7_u / per_pH);
    run->conditions.electrode_slope.origin = WA_ORIGIN_NOTE;
    run->conditions.electrode_offset.origin = WA_ORIGIN_NOTE;
    return status;
}

/* A liquid titrated as it is, such as natural water, is its own solution. A sample that was
 * weighed, or whose density was noted, is a substance that was dissolved in something. */
static enum wa_status fill_solution_volume(struct wa_run *run, struct wa_error *error)
{
    struct wa_conditions *conditions = &run->conditions;
    const struct wa_noted *sample = &conditions->sample_volume;
    if (conditions->solution_volume.known) {
        return WA_OK;
    }
    if (sample->known && sample->quantity.value > 0 && !conditions->sample_mass.known &&
        !conditions->sample_density.known && !conditions->aliquot.known) {
        conditions->solution_volume =
            assumed(sample->quantity.value, sample_as_solution_u * sample->quantity.value);
        return wa_run_remark(run, error,
                             "The solution volume was not noted: the sample volume, %g mL, is "
                             "taken for it.",
                             sample->quantity.value);
    }
    return wa_run_remark(run, error,
                         "The solution volume was not noted: 50 mL within a factor of two is "
                         "assumed.");
}

enum wa_status wa_run_fill_defaults(struct wa_run *run, struct wa_error *error)
{
    enum wa_status status = fill_temperature(run, error);
    if (status == WA_OK && run->reading_kind == WA_READING_MV) {
        status = calibrate(run, error);
    }
    if (status == WA_OK) {
        status = fill_titrant(run, error);
    }
    if (status == WA_OK && run->reading_kind == WA_READING_PH) {
        status = fill_electrode(run, error);
    }
    return status == WA_OK ? fill_solution_volume(run, error) : status;
}
