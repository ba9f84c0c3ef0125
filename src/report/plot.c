/* The curve drawn with characters: volume to the right, reading upwards, equivalence points as
 * columns of colons. */
#include "report/report_internal.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#define ROWS_AIMED 17
#define ROWS_MOST 32
#define CANVAS_MOST 88
#define MARGIN 9 /* columns left of the canvas: tick label and axis */
#define COLUMNS_NEEDED 72

struct plot {
    char canvas[ROWS_MOST][CANVAS_MOST];
    size_t width;
    int rows;
    double volume_low, volume_high;
    double reading_low, reading_high;
    double shift; /* blank, taken off every volume */
};

/* A round step (1, 2 or 5 times a power of ten) that cuts a span into at most `parts`. */
static double round_step(double span, double parts)
{
    double step = pow(10.0, floor(log10(span / parts)));
    static const double factors[] = {1.0, 2.0, 5.0, 10.0};
    for (size_t i = 0; i < sizeof factors / sizeof factors[0]; i++) {
        if (span / (factors[i] * step) <= parts) {
            return factors[i] * step;
        }
    }
    return 10.0 * step;
}

/* Widen a range to whole steps; false when it holds nothing that can be drawn. */
static bool widen(double *low, double *high, double parts, double *step)
{
    if (!isfinite(*low) || !isfinite(*high) || !(*high > *low) ||
        *high - *low < 1e-9 * fabs(*high)) {
        return false;
    }
    *step = round_step(*high - *low, parts);
    *low = floor(*low / *step) * *step;
    *high = ceil(*high / *step) * *step;
    return true;
}

static int column_of(const struct plot *plot, double volume)
{
    double share = (volume - plot->volume_low) / (plot->volume_high - plot->volume_low);
    return share >= 0.0 && share <= 1.0 ? (int)lround(share * (double)(plot->width - 1)) : -1;
}

static int row_of(const struct plot *plot, double reading)
{
    double share = (reading - plot->reading_low) / (plot->reading_high - plot->reading_low);
    return share >= 0.0 && share <= 1.0 ? plot->rows - 1 - (int)lround(share * (plot->rows - 1))
                                        : -1;
}

static void mark(struct plot *plot, double volume, double reading, char character)
{
    int column = column_of(plot, volume);
    int row = row_of(plot, reading);
    if (column >= 0 && row >= 0) {
        plot->canvas[row][column] = character;
    }
}

static void draw_equivalence(struct plot *plot, const struct wa_result *result)
{
    for (size_t i = 0; i < result->equivalence_count; i++) {
        double volume = result->equivalence_points[i].volume_mL;
        int column = isfinite(volume) ? column_of(plot, volume) : -1;
        for (int row = 0; column >= 0 && row < plot->rows; row++) {
            plot->canvas[row][column] = ':';
        }
    }
}

/* Between two points the curve is carried on with dots, so that a jump does not fall apart. */
static void draw_between(struct plot *plot, const struct wa_point *from, const struct wa_point *to)
{
    const int steps = 4 * CANVAS_MOST;
    for (int i = 0; i <= steps; i++) {
        double share = (double)i / steps;
        mark(plot, from->volume_mL + share * (to->volume_mL - from->volume_mL) - plot->shift,
             from->reading + share * (to->reading - from->reading), '.');
    }
}

/* A run of a million points needs no more than a few at each column. */
static size_t stride_of(const struct wa_run *run)
{
    size_t stride = run->point_count / (8 * CANVAS_MOST);
    return stride == 0 ? 1 : stride;
}

static void draw_points(struct plot *plot, const struct wa_run *run)
{
    size_t stride = stride_of(run);
    for (size_t i = 0; i + stride < run->point_count; i += stride) {
        draw_between(plot, &run->points[i], &run->points[i + stride]);
    }
    for (size_t i = 0; i < run->point_count; i += stride) {
        mark(plot, run->points[i].volume_mL - plot->shift, run->points[i].reading, 'o');
    }
}

static void write_rows(struct report_writer *writer, const struct plot *plot, double step)
{
    struct wa_text *text = &writer->text;
    for (int row = 0; row < plot->rows; row++) {
        char label[24] = "";
        char axis = '|';
        int ticks = (int)lround((plot->reading_high - plot->reading_low) / step);
        for (int i = 0; i <= ticks; i++) {
            double reading = plot->reading_low + i * step;
            if (row_of(plot, reading) == row) {
                snprintf(label, sizeof label, "%.6g", fabs(reading) < 1e-9 * step ? 0.0 : reading);
                axis = '+';
            }
        }
        size_t length = plot->width;
        while (length > 0 && plot->canvas[row][length - 1] == ' ') {
            length--;
        }
        wa_text_append(text, "%*s %c", MARGIN - 2, label, axis);
        wa_text_append_bytes(text, plot->canvas[row], length);
        wa_text_append(text, "\n");
    }
}

/* Put a label into a line of blanks, centred; a label that would touch another is left out. */
static void put_label(char *line, size_t width, int column, const char *label)
{
    size_t length = strlen(label);
    int start = column - (int)length / 2;
    start = start < 0 ? 0 : start;
    if ((size_t)start + length > width) {
        start = (int)(width - length);
    }
    for (int i = start - 1; i <= start + (int)length; i++) {
        if (i >= 0 && (size_t)i < width && line[i] != ' ') {
            return;
        }
    }
    memcpy(line + start, label, length);
}

static void write_labels(struct report_writer *writer, const char *line, size_t width)
{
    size_t length = width;
    while (length > 0 && line[length - 1] == ' ') {
        length--;
    }
    wa_text_append(&writer->text, "%*s", MARGIN, "");
    wa_text_append_bytes(&writer->text, line, length);
    wa_text_append(&writer->text, "\n");
}

static void write_volume_axis(struct report_writer *writer, const struct plot *plot, double step)
{
    char axis[CANVAS_MOST];
    char labels[CANVAS_MOST];
    memset(axis, '-', sizeof axis);
    memset(labels, ' ', sizeof labels);
    int ticks = (int)lround((plot->volume_high - plot->volume_low) / step);
    for (int i = 0; i <= ticks; i++) {
        double volume = plot->volume_low + i * step;
        int column = column_of(plot, volume);
        if (column >= 0) {
            char label[24];
            snprintf(label, sizeof label, "%.6g", fabs(volume) < 1e-9 * step ? 0.0 : volume);
            axis[column] = '+';
            put_label(labels, plot->width, column, label);
        }
    }
    wa_text_append(&writer->text, "%*s+", MARGIN - 1, "");
    wa_text_append_bytes(&writer->text, axis, plot->width);
    wa_text_append(&writer->text, "\n");
    write_labels(writer, labels, plot->width);
}

static void write_equivalence_labels(struct report_writer *writer, const struct plot *plot,
                                     const struct wa_result *result)
{
    char labels[CANVAS_MOST];
    memset(labels, ' ', sizeof labels);
    bool any = false;
    for (size_t i = 0; i < result->equivalence_count; i++) {
        double volume = result->equivalence_points[i].volume_mL;
        int column = isfinite(volume) ? column_of(plot, volume) : -1;
        if (column >= 0) {
            char label[24];
            snprintf(label, sizeof label, "E%zu", i + 1);
            put_label(labels, plot->width, column, label);
            any = true;
        }
    }
    if (any) {
        write_labels(writer, labels, plot->width);
    }
}

/* As many rows and columns as put every tick on one, evenly. */
static bool lay_out(struct plot *plot, size_t room, double reading_step, double volume_step)
{
    int reading_ticks = (int)lround((plot->reading_high - plot->reading_low) / reading_step);
    int volume_ticks = (int)lround((plot->volume_high - plot->volume_low) / volume_step);
    if (reading_ticks < 1 || volume_ticks < 1 || (size_t)volume_ticks >= room) {
        return false;
    }
    int rows_each = (ROWS_AIMED - 1 + reading_ticks / 2) / reading_ticks;
    plot->rows = (rows_each < 1 ? 1 : rows_each) * reading_ticks + 1;
    plot->width = (room - 1) / (size_t)volume_ticks * (size_t)volume_ticks + 1;
    return plot->rows <= ROWS_MOST;
}

/* Ranges of the points. */
static void measure(struct plot *plot, const struct wa_run *run)
{
    plot->volume_low = plot->reading_low = INFINITY;
    plot->volume_high = plot->reading_high = -INFINITY;
    for (size_t i = 0; i < run->point_count; i++) {
        double volume = run->points[i].volume_mL - plot->shift;
        plot->volume_low = fmin(plot->volume_low, volume);
        plot->volume_high = fmax(plot->volume_high, volume);
        plot->reading_low = fmin(plot->reading_low, run->points[i].reading);
        plot->reading_high = fmax(plot->reading_high, run->points[i].reading);
    }
}

void report_plot(struct report_writer *writer, const struct wa_result *result)
{
    if (writer->columns < COLUMNS_NEEDED || result->runs.count == 0 ||
        result->runs.runs[0].point_count < 2) {
        return;
    }
    const struct wa_run *run = &result->runs.runs[0];
    const struct wa_noted *blank = &run->conditions.blank;
    struct plot plot = {.shift = blank->known ? blank->quantity.value : 0.0};
    size_t room = writer->columns - MARGIN - 3;
    room = room > CANVAS_MOST ? CANVAS_MOST : room;
    memset(plot.canvas, ' ', sizeof plot.canvas);
    measure(&plot, run);
    double reading_step;
    double volume_step;
    if (!widen(&plot.reading_low, &plot.reading_high, 8.0, &reading_step) ||
        !widen(&plot.volume_low, &plot.volume_high, 10.0, &volume_step) ||
        !lay_out(&plot, room, reading_step, volume_step)) {
        return;
    }
    draw_equivalence(&plot, result);
    draw_points(&plot, run);
    report_heading(writer, "THE CURVE");
    wa_text_append(&writer->text, "%*s\n", MARGIN,
                   run->reading_kind == WA_READING_MV ? "E / mV" : "pH");
    write_rows(writer, &plot, reading_step);
    write_volume_axis(writer, &plot, volume_step);
    write_equivalence_labels(writer, &plot, result);
    report_paragraph(writer, "  ", 2,
                     "To the right: titrant volume / mL%s. o measured, : equivalence point%s.",
                     plot.shift != 0.0 ? ", less the blank" : "",
                     result->runs.count > 1 ? "; the first run is drawn" : "");
}
