/* mV to pH: slope and offset from notes or from buffers that were measured. */
#include "run/run_internal.h"

#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define BUFFERS_MAX 8

double wa_nernst_slope(double temperature_C)
{
    const double gas_constant = 8.314462618; /* J/(mol K) */
    const double faraday = 96485.33212;      /* C/mol */
    return 1e3 * log(10) * gas_constant * (temperature_C + 273.15) / faraday;
}

/* "4.005 = 172.3 mV", "pH 4.005: 172.3 mV", "4,005; 172,3", "7.00 0.4 mV". */
static bool parse_buffer(const char *text, double *pH, double *mV)
{
    char folded[256];
    wa_text_fold(text, strlen(text), folded, sizeof folded);
    char *start = strncmp(folded, "ph", 2) == 0 ? folded + 2 : folded;
    char *between = strpbrk(start, "=:;");
    if (between == NULL) {
        between = strchr(start + (*start == ' '), ' ');
    }
    if (between == NULL) {
        return false;
    }
    char after[256];
    snprintf(after, sizeof after, "%s", between + 1);
    *between = '\0';
    char *unit = strstr(start, "ph");
    if (unit != NULL) {
        *unit = '\0';
    }
    struct wa_quantity buffer;
    struct wa_quantity reading;
    bool ok = wa_quantity_parse(start, WA_DIMENSION_PH, &buffer, NULL) == WA_OK &&
              wa_quantity_parse(after, WA_DIMENSION_VOLTAGE, &reading, NULL) == WA_OK &&
              buffer.value > 0 && buffer.value < 14;
    if (ok) {
        *pH = buffer.value;
        *mV = reading.value;
    }
    return ok;
}

static enum wa_status take_buffers(const struct wa_run *run, double pH[BUFFERS_MAX],
                                   double mV[BUFFERS_MAX], size_t *count, struct wa_error *error)
{
    *count = 0;
    for (size_t i = 0; i < run->note_count && *count < BUFFERS_MAX; i++) {
        const struct wa_note *note = &run->notes[i];
        const char *known = wa_note_known_name(note->name);
        const char *name = known != NULL ? known : note->name;
        if (strncmp(name, "buffer", 6) != 0 || strpbrk(note->text, "0123456789") == NULL ||
            wa_run_find_note(run, name) != note) {
            continue;
        }
        if (!parse_buffer(note->text, &pH[*count], &mV[*count])) {
            bool option = note->origin == WA_ORIGIN_OPTION;
            return wa_fail(error, option ? WA_ERROR_CALL : WA_ERROR_INPUT,
                           option ? NULL : run->file, note->line,
                           "The buffer '%.60s' is not understood; write it like '4.005 = 172.3 "
                           "mV'.",
                           note->text);
        }
        ++*count;
    }
    return WA_OK;
}

/* Straight line through the buffers by least squares. Each reading is taken to be good to 0.5 mV
 * and each buffer to 0.01 pH, since nobody notes more. */
static enum wa_status fit_buffers(const struct wa_run *run, const double *pH, const double *mV,
                                  size_t count, double temperature_C,
                                  struct wa_calibration *calibration, struct wa_error *error)
{
    double mean_pH = 0;
    double mean_mV = 0;
    for (size_t i = 0; i < count; i++) {
        mean_pH += pH[i] / (double)count;
        mean_mV += mV[i] / (double)count;
    }
    double square = 0;
    double product = 0;
    for (size_t i = 0; i < count; i++) {
        square += (pH[i] - mean_pH) * (pH[i] - mean_pH);
        product += (pH[i] - mean_pH) * (mV[i] - mean_mV);
    }
    double theory = wa_nernst_slope(temperature_C);
    double slope = square > 0 ? -product / square / theory : 0;
    if (!(square >= 1 && slope > 0.7 && slope < 1.2)) {
        return wa_fail(error, WA_ERROR_INPUT, run->file, 0,
                       "The buffers give an electrode slope of %.0f %% of theory, which is not "
                       "possible; check the buffer notes.",
                       100 * slope);
    }
    double u_mV = hypot(0.5, 0.01 * theory);
    calibration->known = true;
    calibration->slope = slope;
    calibration->slope_u = u_mV / sqrt(square) / theory;
    calibration->mV_at_7 = mean_mV - slope * theory * (7 - mean_pH);
    calibration->mV_at_7_u =
        u_mV * sqrt(1 / (double)count + (7 - mean_pH) * (7 - mean_pH) / square);
    snprintf(calibration->how, sizeof calibration->how,
             "%zu buffers: slope %.1f %% of theory, "
             "%.1f mV at pH 7",
             count, 100 * slope, calibration->mV_at_7);
    return WA_OK;
}

static enum wa_status from_notes(const struct wa_run *run, double temperature_C,
                                 struct wa_calibration *calibration, struct wa_error *error)
{
    const struct wa_note *slope_note = wa_run_find_note(run, "electrode slope");
    const struct wa_note *offset_note = wa_run_find_note(run, "electrode offset");
    if (slope_note == NULL || offset_note == NULL) {
        return WA_OK;
    }
    struct wa_quantity slope;
    struct wa_quantity offset;
    enum wa_status status = wa_run_parse_slope(run, slope_note, temperature_C, &slope, error);
    if (status == WA_OK) {
        status = wa_run_parse_offset(run, offset_note, temperature_C, &offset, error);
    }
    if (status != WA_OK) {
        return status;
    }
    double theory = wa_nernst_slope(temperature_C);
    calibration->known = true;
    calibration->slope = slope.value;
    calibration->slope_u = slope.has_u ? slope.u : 0.004;
    calibration->mV_at_7 = -offset.value * theory;
    calibration->mV_at_7_u = theory * (offset.has_u ? offset.u : 0.02);
    snprintf(calibration->how, sizeof calibration->how,
             "the noted slope and offset: %.1f %% of theory, %.1f mV at pH 7", 100 * slope.value,
             calibration->mV_at_7);
    return WA_OK;
}

enum wa_status wa_run_calibration(const struct wa_run *run, double temperature_C,
                                  struct wa_calibration *calibration, struct wa_error *error)
{
    double pH[BUFFERS_MAX];
    double mV[BUFFERS_MAX];
    size_t count;
    *calibration = (struct wa_calibration){0};
    enum wa_status status = take_buffers(run, pH, mV, &count, error);
    if (status == WA_OK && count >= 2) {
        return fit_buffers(run, pH, mV, count, temperature_C, calibration, error);
    }
    return status == WA_OK ? from_notes(run, temperature_C, calibration, error) : status;
}

enum wa_status wa_run_convert_mV(struct wa_run *run, const struct wa_calibration *calibration,
                                 double temperature_C, struct wa_error *error)
{
    double per_pH = calibration->slope * wa_nernst_slope(temperature_C);
    for (size_t i = 0; i < run->point_count; i++) {
        double pH = 7 - (run->points[i].reading - calibration->mV_at_7) / per_pH;
        if (!(pH > -2 && pH < 16)) {
            return wa_fail(error, WA_ERROR_INPUT, run->file, run->points[i].line,
                           "%.1f mV would be pH %.1f by the calibration (%s), which is not "
                           "possible; check the calibration and the sign of the readings.",
                           run->points[i].reading, pH, calibration->how);
        }
    }
    for (size_t i = 0; i < run->point_count; i++) {
        run->points[i].reading = 7 - (run->points[i].reading - calibration->mV_at_7) / per_pH;
    }
    struct wa_quantity *u = &run->conditions.reading_uncertainty.quantity;
    u->value /= per_pH;
    u->u /= per_pH;
    run->reading_kind = WA_READING_PH;
    run->reading_from_mV = true;
    return wa_run_remark(run, error, "The readings were mV and are pH now, by %s.",
                         calibration->how);
}
