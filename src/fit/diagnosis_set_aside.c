/* A row that is out of order because its volume was misread by 1 mL: mended, it falls on the curve
 * and into its place. */
#include "fit/diagnosis_internal.h"

#include "base/number.h"

#include <math.h>
#include <string.h>

static const double misread_mL = 1.0;
static const double farthest = 3.5;   /* standard uncertainties from the curve */
static const double out_by_mL = 0.03; /* of its place among the rows around it */

/* The numbers in the first two numeric cells of a row as written. */
static bool two_numbers(const struct wa_run *run, const char *text, double *numbers)
{
    const char delimiters[] = {run->delimiter, '\0'};
    int found = 0;
    while (*text != '\0' && found < 2) {
        text += strspn(text, " ");
        const size_t length = strcspn(text, delimiters);
        struct wa_number number;
        if (wa_number_parse(text, length, &number) > 0 && !number.grouped) {
            numbers[found++] = number.value;
        }
        text += length;
        text += *text != '\0' ? 1 : 0;
    }
    return found == 2;
}

/* Running total of a volume as written, by the map that the points of the run show. */
static double total_of(const struct wa_run *run, double written)
{
    const struct wa_point *first = &run->points[0];
    const struct wa_point *last = &run->points[run->point_count - 1];
    const double scale =
        (last->volume_mL - first->volume_mL) / (last->written_volume - first->written_volume);
    return first->volume_mL + scale * (written - first->written_volume);
}

static bool in_place(const struct wa_run *run, long line, double volume_mL)
{
    double before = -INFINITY, after = INFINITY;
    for (size_t p = 0; p < run->point_count; p++) {
        if (run->points[p].line < line) {
            before = fmax(before, run->points[p].volume_mL);
        } else {
            after = fmin(after, run->points[p].volume_mL);
        }
    }
    return volume_mL >= before - out_by_mL && volume_mL <= after + out_by_mL;
}

/* ln of the likelihood of the reading on the curve over that of any reading of the run's range. */
static double gain_of(const struct wa_inquiry *inquiry, double volume_mL, double reading)
{
    const struct wa_experiment *e = inquiry->experiment;
    const struct wa_fit *fit = &inquiry->bases[0]->fit;
    const struct wa_noise noise = {.reading = fit->noise_reading, .volume = fit->noise_volume};
    struct wa_point_model point;
    if (volume_mL < 0.0 || !wa_inquiry_point(e, fit, volume_mL, &point)) {
        return -INFINITY;
    }
    const double variance = wa_noise_variance(&noise, &point);
    const double square = pow(reading - point.expected, 2.0) / variance;
    const double span = fabs(e->reading[e->count - 1] - e->reading[0]);
    return square > farthest * farthest
               ? -INFINITY
               : log(span) - 0.5 * (log(2.0 * M_PI * variance) + square) - log(2.0);
}

void wa_weigh_set_aside(const struct wa_inquiry *inquiry, struct wa_suspicion *suspicion)
{
    const struct wa_run *run = inquiry->run;
    if (run->reading_kind != WA_READING_PH || run->reading_from_mV) {
        return;
    }
    const double blank_mL =
        run->conditions.blank.known ? run->conditions.blank.quantity.value : 0.0;
    for (size_t i = 0; i < run->set_aside_count; i++) {
        const struct wa_set_aside *row = &run->set_aside[i];
        double numbers[2];
        if (strstr(row->reason, "out of order") == NULL || !two_numbers(run, row->text, numbers)) {
            continue;
        }
        for (int sign = -1; sign <= 1; sign += 2) {
            const double volume = total_of(run, numbers[0]) + sign * misread_mL;
            const double gain = in_place(run, row->line, volume)
                                    ? gain_of(inquiry, volume - blank_mL, numbers[1])
                                    : -INFINITY;
            if (isfinite(gain) && (!suspicion->weighed || gain > suspicion->statistic)) {
                suspicion->weighed = true;
                suspicion->statistic = gain;
                suspicion->log_evidence = WA_FAULT_CERTAIN;
                suspicion->value = sign * misread_mL;
                suspicion->row = i;
                suspicion->explains = true;
                suspicion->which = WA_FAULT_SET_ASIDE;
            }
        }
    }
}
