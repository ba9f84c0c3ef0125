/* How the volume column counts, and volumes as running totals. */
#include "reader/reader_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Steps from one volume to the next. */
struct steps {
    size_t up, down, level;
    size_t plus;
    double moved;       /* sum of |change of reading| */
    double moved_level; /* the part of it where the volume stayed */
    double typical;     /* median size of the steps that are not level */
};

static int compare_doubles(const void *a, const void *b)
{
    const double *x = a;
    const double *y = b;
    return (*x > *y) - (*x < *y);
}

static double median_step(const struct wa_raw *raw, size_t count)
{
    enum { sample = 501 };
    double sizes[sample];
    size_t used = 0;
    size_t stride = count / sample + 1;
    for (size_t i = 1; i < count && used < sample; i += stride) {
        double size = fabs(raw[i].point.volume_mL - raw[i - 1].point.volume_mL);
        if (size > 0) {
            sizes[used++] = size;
        }
    }
    if (used == 0) {
        return 0;
    }
    qsort(sizes, used, sizeof sizes[0], compare_doubles);
    return sizes[used / 2];
}

static struct steps count_steps(const struct wa_raw *raw, size_t count)
{
    struct steps steps = {.typical = median_step(raw, count)};
    for (size_t i = 0; i < count; i++) {
        steps.plus += raw[i].plus;
        if (i == 0) {
            continue;
        }
        double change = raw[i].point.volume_mL - raw[i - 1].point.volume_mL;
        double moved = fabs(raw[i].point.reading - raw[i - 1].point.reading);
        moved = isfinite(moved) ? moved : 0;
        steps.up += change > 0;
        steps.down += change < 0;
        steps.level += change == 0;
        steps.moved += moved;
        steps.moved_level += change == 0 ? moved : 0;
    }
    return steps;
}

/* Longest run of rows, not necessarily adjacent, whose volumes never go against `direction`
 * (patience sorting; Fredman 1975). keep[i] tells the rows that belong to it. */
static bool longest_in_order(const struct wa_raw *raw, size_t count, int direction, bool *keep,
                             size_t *length)
{
    size_t *tail = malloc(count * sizeof *tail);
    size_t *before = malloc(count * sizeof *before);
    if (tail == NULL || before == NULL) {
        free(tail);
        free(before);
        return false;
    }
    size_t piles = 0;
    for (size_t i = 0; i < count; i++) {
        double volume = direction * raw[i].point.volume_mL;
        size_t low = 0;
        size_t high = piles;
        while (low < high) {
            size_t middle = (low + high) / 2;
            if (direction * raw[tail[middle]].point.volume_mL <= volume) {
                low = middle + 1;
            } else {
                high = middle;
            }
        }
        before[i] = low > 0 ? tail[low - 1] : SIZE_MAX;
        tail[low] = i;
        piles += low == piles;
    }
    memset(keep, 0, count * sizeof *keep);
    for (size_t i = piles > 0 ? tail[piles - 1] : SIZE_MAX; i != SIZE_MAX; i = before[i]) {
        keep[i] = true;
    }
    *length = piles;
    free(tail);
    free(before);
    return true;
}

/* Increments are told from totals by volumes that go up and down all the time, or by readings
 * that move although the volume stays. Slips are few and stand alone; a burette that was filled
 * again falls once. */
static bool numbers_are_increments(const struct wa_raw *raw, size_t count,
                                   const struct steps *steps)
{
    double lowest = INFINITY;
    for (size_t i = 0; i < count; i++) {
        lowest = fmin(lowest, raw[i].point.volume_mL);
    }
    if (lowest < 0 || count < WA_POINTS_NEEDED) {
        return false;
    }
    bool level_moves = steps->level * 10 >= 3 * (count - 1) && steps->moved > 0 &&
                       steps->moved_level > 0.4 * steps->moved;
    if (level_moves) {
        return true;
    }
    size_t least = steps->up < steps->down ? steps->up : steps->down;
    if (least < 3 || least * 8 < count - 1) {
        return false;
    }
    bool *keep = malloc(count * sizeof *keep);
    size_t rising = 0;
    size_t falling = 0;
    bool known = keep != NULL && longest_in_order(raw, count, 1, keep, &rising) &&
                 longest_in_order(raw, count, -1, keep, &falling);
    free(keep);
    size_t longest = rising > falling ? rising : falling;
    return known && longest * 100 < count * 80;
}

/* A total that was noted without its zero point starts one step (or a round number of steps) up;
 * a burette starts anywhere. */
static bool starts_like_total(const struct wa_raw *raw, size_t count, double typical)
{
    double first = raw[0].point.volume_mL;
    double span = raw[count - 1].point.volume_mL - first;
    double step = raw[1].point.volume_mL - first;
    if (first <= 0.01 * span || first <= 1.02 * typical || first <= 1.02 * step) {
        return true;
    }
    double ratio = step > 0 ? first / step : 0;
    return ratio > 0 && ratio < 3.5 && fabs(ratio - round(ratio)) < 1e-6;
}

static struct wa_volume_rule rising_rule(const struct wa_raw *raw, size_t count,
                                         const struct wa_column *column, const struct steps *steps)
{
    struct wa_volume_rule rule = {.kind = WA_VOLUME_TOTAL, .direction = 1};
    if (column->header.burette && !column->header.total) {
        rule.kind = WA_VOLUME_BURETTE;
        return rule;
    }
    if (raw[0].point.volume_mL == 0 || column->header.total) {
        return rule;
    }
    if (column->header.added || starts_like_total(raw, count, steps->typical)) {
        rule.remark = "The volumes do not start at zero and are taken as running totals; if they "
                      "are burette readings, note 'volume reading: burette'.";
        return rule;
    }
    rule.kind = WA_VOLUME_BURETTE;
    rule.remark = "The volumes do not start at zero and are taken as burette readings, counted "
                  "from the first; if they are running totals, note 'volume reading: total'.";
    return rule;
}

struct wa_volume_rule wa_volume_decide(const struct wa_raw *raw, size_t count,
                                       const struct wa_column *column)
{
    struct wa_volume_rule rule = {.kind = WA_VOLUME_TOTAL, .direction = 1};
    if (count < 2) {
        return rule;
    }
    struct steps steps = count_steps(raw, count);
    bool strictly_up = steps.up + 1 == count;
    if (steps.plus >= 2 && steps.plus * 2 >= count) {
        rule.kind = WA_VOLUME_INCREMENT;
    } else if (column->header.increment && !column->header.total && !strictly_up &&
               steps.down < count - 1) {
        rule.kind = WA_VOLUME_INCREMENT;
    } else if (!column->header.total && numbers_are_increments(raw, count, &steps)) {
        rule.kind = WA_VOLUME_INCREMENT;
        rule.remark = "The volumes go up and down and are taken as single additions, each added "
                      "to those before; if that is wrong, note 'volume reading: total'.";
    } else if (steps.down > 2 * steps.up) {
        rule.kind = WA_VOLUME_BURETTE;
        rule.direction = -1;
        rule.remark = column->header.burette
                          ? NULL
                          : "The volumes fall and are taken as a burette that counts down.";
    } else {
        rule = rising_rule(raw, count, column, &steps);
    }
    return rule;
}

/* A last volume ten times too large has nothing after it to tell by order. */
static void check_last(struct wa_raw *raw, size_t count, const struct wa_volume_rule *rule)
{
    if (count < WA_POINTS_NEEDED || raw[count - 1].wrong != NULL || rule->direction < 0) {
        return;
    }
    double last = raw[count - 1].point.volume_mL;
    double previous = raw[count - 2].point.volume_mL;
    double step = previous - raw[count - 3].point.volume_mL;
    if (previous > 0 && last > 5 * previous && last / 10 >= previous &&
        last / 10 <= previous + 5 * step) {
        raw[count - 1].wrong = "The volume is about ten times what the rows before lead to.";
        raw[count - 1].impossible = true;
    }
}

static enum wa_status mark_disorder(struct wa_raw *raw, size_t count, int direction,
                                    struct wa_error *error)
{
    bool in_order = true;
    for (size_t i = 1; i < count && in_order; i++) {
        in_order = direction * (raw[i].point.volume_mL - raw[i - 1].point.volume_mL) >= 0;
    }
    if (in_order) {
        return WA_OK;
    }
    bool *keep = malloc(count * sizeof *keep);
    size_t length;
    if (keep == NULL || !longest_in_order(raw, count, direction, keep, &length)) {
        free(keep);
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < count; i++) {
        if (!keep[i]) {
            raw[i].wrong = direction > 0 ? "The volume is out of order with the rows around it."
                                         : "The burette reading is out of order with the rows "
                                           "around it.";
            raw[i].impossible = true;
        }
    }
    free(keep);
    return WA_OK;
}

enum wa_status wa_volume_totals(struct wa_raw *raw, size_t count, struct wa_volume_rule rule,
                                struct wa_error *error)
{
    if (rule.kind == WA_VOLUME_INCREMENT) {
        double total = 0;
        for (size_t i = 0; i < count; i++) {
            if (raw[i].point.volume_mL < 0) {
                raw[i].wrong = "An addition cannot be negative.";
                raw[i].impossible = true;
                continue;
            }
            total += raw[i].point.volume_mL;
            raw[i].point.volume_mL = total;
        }
        return WA_OK;
    }
    enum wa_status status = mark_disorder(raw, count, rule.direction, error);
    if (status != WA_OK || count == 0) {
        return status;
    }
    check_last(raw, count, &rule);
    size_t start = 0;
    while (start < count && raw[start].impossible) {
        start++;
    }
    double first = rule.kind == WA_VOLUME_BURETTE && start < count ? raw[start].point.volume_mL : 0;
    for (size_t i = 0; i < count; i++) {
        /* Adding zero turns a negative zero into a plain one. */
        raw[i].point.volume_mL = rule.direction * (raw[i].point.volume_mL - first) + 0.0;
    }
    return WA_OK;
}
