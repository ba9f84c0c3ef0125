/* Readings that cannot be right. The rule is conservative: a curve that rises (or falls) never
 * leaves the span between its two neighbours by more than its noise, however steep the jump; only
 * a reading far outside that span, many times the noise of the whole curve, is called a slip. */
#include "reader/reader_internal.h"

#include <math.h>
#include <stdlib.h>

#define SAMPLE 4001

static int compare_doubles(const void *a, const void *b)
{
    const double *x = a;
    const double *y = b;
    return (*x > *y) - (*x < *y);
}

static void mark(struct wa_raw *raw, const char *why)
{
    raw->wrong = why;
    raw->impossible = true;
}

static void check_range(struct wa_raw *raw, size_t count, enum wa_reading_kind kind)
{
    for (size_t i = 0; i < count; i++) {
        double reading = raw[i].point.reading;
        if (raw[i].wrong != NULL) {
            continue;
        }
        if (kind == WA_READING_PH && !(reading >= -2 && reading <= 16)) {
            mark(&raw[i], "A pH outside -2 to 16 is not possible.");
        } else if (kind == WA_READING_MV && !(fabs(reading) <= 2000)) {
            mark(&raw[i], "A potential beyond 2000 mV is not possible.");
        }
    }
}

/* How far the middle of three lies outside the span of the other two. */
static double outside(double left, double middle, double right)
{
    double low = fmin(left, right);
    double high = fmax(left, right);
    return fmax(fmax(low - middle, middle - high), 0);
}

/* How far readings usually lie outside the span of their neighbours: the upper quartile, which is
 * nothing for a clean curve, however few its points, and about the noise for a noisy one. */
static double noise_of(const double *reading, size_t count)
{
    double sizes[SAMPLE];
    size_t used = 0;
    size_t stride = count / SAMPLE + 1;
    for (size_t i = 1; i + 1 < count && used < SAMPLE; i += stride) {
        sizes[used++] = outside(reading[i - 1], reading[i], reading[i + 1]);
    }
    if (used == 0) {
        return 0;
    }
    qsort(sizes, used, sizeof sizes[0], compare_doubles);
    return sizes[used * 3 / 4];
}

/* Lowest and highest of the two readings on each side of i, itself left out. */
static void range_around(const double *reading, size_t count, size_t i, double *low, double *high)
{
    *low = INFINITY;
    *high = -INFINITY;
    size_t first = i >= 2 ? i - 2 : 0;
    for (size_t k = first; k <= i + 2 && k < count; k++) {
        if (k != i) {
            *low = fmin(*low, reading[k]);
            *high = fmax(*high, reading[k]);
        }
    }
}

static bool is_slip(const double *reading, size_t count, size_t i, double noise, double unit)
{
    double out = outside(reading[i - 1], reading[i], reading[i + 1]);
    if (out <= unit || out <= 8 * noise) {
        return false;
    }
    /* The neighbour may be the slip: it then lies outside its own neighbours still farther. */
    double before = i >= 2 ? outside(reading[i - 2], reading[i - 1], reading[i]) : 0;
    double after = i + 2 < count ? outside(reading[i], reading[i + 1], reading[i + 2]) : 0;
    if (out <= before || out <= after) {
        return false;
    }
    /* After a large addition a badly stirred vessel can overshoot, with the jump and on its scale;
     * it never falls behind where the curve came from. */
    double low;
    double high;
    range_around(reading, count, i, &low, &high);
    bool rising = reading[i + 1] > reading[i - 1];
    bool behind = rising ? reading[i] < low - unit : reading[i] > high + unit;
    return behind || out > 0.5 * (high - low);
}

/* A first or last reading has one neighbour only: it must be off by a decade and run against the
 * curve, since a jump between it and its neighbour would run with the curve. */
static bool is_end_slip(double end, double next, double after_next, double direction, double unit)
{
    double ahead = next + (next - after_next);
    bool decade = fabs(end * 10 - ahead) < 0.5 * unit || fabs(end / 10 - ahead) < 0.5 * unit;
    return decade && direction * (next - end) < -1.5 * unit;
}

static void check_slips(struct wa_raw *raw, size_t *index, const double *reading, size_t count,
                        double unit)
{
    double noise = noise_of(reading, count);
    size_t slips = 0;
    for (size_t i = 1; i + 1 < count; i++) {
        slips += is_slip(reading, count, i, noise, unit);
    }
    /* Many of them are noise of a bad contact, not slips of the pen. */
    if (slips > 2 && slips * 12 > count) {
        return;
    }
    for (size_t i = 1; slips > 0 && i + 1 < count; i++) {
        if (is_slip(reading, count, i, noise, unit)) {
            mark(&raw[index[i]], "The reading is far off both its neighbours, like a slip of the "
                                 "pen.");
        }
    }
    double rise = reading[count - 2] - reading[1];
    double direction = rise > 0 ? 1 : -1;
    if (fabs(rise) > unit && is_end_slip(reading[0], reading[1], reading[2], direction, unit)) {
        mark(&raw[index[0]], "The first reading is off its neighbours by a decade.");
    }
    if (fabs(rise) > unit &&
        is_end_slip(reading[count - 1], reading[count - 2], reading[count - 3], -direction, unit)) {
        mark(&raw[index[count - 1]], "The last reading is off its neighbours by a decade.");
    }
}

enum wa_status wa_screen_readings(struct wa_raw *raw, size_t count, enum wa_reading_kind kind,
                                  struct wa_error *error)
{
    check_range(raw, count, kind);
    double *reading = malloc((count + 1) * sizeof *reading);
    size_t *index = malloc((count + 1) * sizeof *index);
    if (reading == NULL || index == NULL) {
        free(reading);
        free(index);
        return wa_fail_memory(error);
    }
    size_t used = 0;
    for (size_t i = 0; i < count; i++) {
        if (raw[i].wrong == NULL) {
            reading[used] = raw[i].point.reading;
            index[used++] = i;
        }
    }
    if (used >= 6) {
        check_slips(raw, index, reading, used, kind == WA_READING_PH ? 1.25 : 74.0);
    }
    free(reading);
    free(index);
    return WA_OK;
}
