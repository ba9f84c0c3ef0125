/* Faults of single rows: a burette misread by a whole millilitre, an addition that was not written
 * down. Each row is tried in turn, so the evidence is shared over all of them. */
#include "fit/diagnosis_internal.h"
#include "fit/fit_internal.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* More rows are tried evenly, then one by one about the best. */
enum { ROWS_TRIED = 40 };

static const double misread_mL = 1.0;
static const int quick_iterations = 4;
static const double missed_size_u = 0.25; /* of the neighbouring additions */
static const double regular = 0.03;       /* a regular gap is this near the usual one */
static const double regular_share = 0.85; /* of the gaps, in a regular series */

/* One alteration of the volumes: rows from `row` to before `end` get `shift` more. */
struct alteration {
    size_t row;
    size_t end;
    double shift;
    double u; /* of the shift; 0: it is exact */
};

static enum wa_status try_alteration(const struct wa_inquiry *inquiry,
                                     const struct alteration *alteration, int iterations,
                                     struct wa_refit *refit, struct wa_error *error)
{
    struct wa_experiment with = *inquiry->experiment;
    const struct wa_fault fault = {
        .volume_step = {.mean = alteration->shift, .u = fmax(alteration->u, 1e-4)},
        .step_row = alteration->row,
        .step_end = alteration->end};
    with.fault = &fault;
    with.excess_u = 0.0;
    const struct wa_refit_start start = {.value = NAN};
    return wa_refit(inquiry, &with, WA_PARAMETER_VOLUME_STEP, &start, iterations, refit, error);
}

/* The written additions on both sides of a row's volume. */
static double gap_before(const struct wa_experiment *e, size_t row)
{
    return e->volume_mL[row] - e->volume_mL[row - 1];
}

/* Can the true volumes from this row on be `shift` more than written? They must still rise, and
 * not leap where all around is even. */
static bool plausible(const struct wa_experiment *e, size_t row, double shift)
{
    const double gap = gap_before(e, row) + shift;
    const double before = row >= 2 ? gap_before(e, row - 1) : gap_before(e, row + 1);
    const double after = row + 1 < e->count ? gap_before(e, row + 1) : before;
    return gap >= -0.02 && (shift < 0.0 || gap <= 2.0 * fmax(before, after));
}

/* The alteration of that row, false when the row cannot have it. */
typedef bool (*alter_row)(const struct wa_experiment *experiment, size_t row,
                          struct alteration *alteration);

static bool written_more(const struct wa_experiment *e, size_t row, struct alteration *alteration)
{
    *alteration = (struct alteration){.row = row, .end = e->count, .shift = -misread_mL};
    return plausible(e, row, -misread_mL);
}

static bool written_less(const struct wa_experiment *e, size_t row, struct alteration *alteration)
{
    *alteration = (struct alteration){.row = row, .end = e->count, .shift = misread_mL};
    return plausible(e, row, misread_mL);
}

static bool addition_missed(const struct wa_experiment *e, size_t row,
                            struct alteration *alteration)
{
    const double gap = gap_before(e, row);
    *alteration = (struct alteration){
        .row = row, .end = e->count, .shift = gap, .u = missed_size_u * fabs(gap)};
    return gap > 0.0;
}

/* The rows that can have an alteration, at most `most` of them evenly. Returns how many. */
static size_t list_rows(const struct wa_experiment *e, alter_row alter, size_t first, size_t end,
                        size_t most, struct alteration *list)
{
    size_t possible = 0, count = 0, seen = 0;
    struct alteration alteration;
    for (size_t row = first; row < end; row++) {
        possible += alter(e, row, &alteration) ? 1 : 0;
    }
    const size_t stride = 1 + possible / most;
    for (size_t row = first; row < end; row++) {
        if (alter(e, row, &alteration) && seen++ % stride == 0) {
            list[count++] = alteration;
        }
    }
    return count;
}

/* Best row for an alteration by a few rounds of a fit: first spread over the run, then all rows
 * about the best of these. */
static enum wa_status search_rows(const struct wa_inquiry *inquiry, alter_row alter,
                                  struct alteration *best, struct wa_refit *found,
                                  struct wa_error *error)
{
    const struct wa_experiment *e = inquiry->experiment;
    enum wa_status status = WA_OK;
    size_t first = 1, end = e->count;
    found->log_evidence = -INFINITY;
    for (int round = 0; status == WA_OK && round < 2; round++) {
        struct alteration list[ROWS_TRIED + 1];
        const size_t count = list_rows(e, alter, first, end, ROWS_TRIED, list);
        for (size_t i = 0; status == WA_OK && i < count; i++) {
            struct wa_refit refit;
            status = try_alteration(inquiry, &list[i], quick_iterations, &refit, error);
            if (status == WA_OK && refit.log_evidence > found->log_evidence) {
                *found = refit;
                *best = list[i];
            }
        }
        if (count == 0 || end - first <= ROWS_TRIED) {
            break;
        }
        const size_t reach = e->count / ROWS_TRIED + 1;
        first = best->row > reach ? best->row - reach : 1;
        end = best->row + reach < e->count ? best->row + reach : e->count;
    }
    return status == WA_OK && isfinite(found->log_evidence)
               ? try_alteration(inquiry, best, 0, found, error)
               : status;
}

static void keep(const struct wa_inquiry *inquiry, const struct alteration *alteration,
                 const struct wa_refit *refit, enum wa_fault_row which,
                 struct wa_suspicion *suspicion)
{
    const double rows = 2.0 * (double)inquiry->experiment->count;
    const double odds = refit->log_evidence - inquiry->log_evidence - log(rows);
    if (isfinite(odds) && (!suspicion->weighed || odds > suspicion->statistic)) {
        suspicion->weighed = true;
        suspicion->statistic = odds;
        suspicion->log_evidence = odds;
        suspicion->value = refit->value;
        suspicion->u = refit->u;
        suspicion->explains = refit->explains;
        suspicion->row = alteration->row;
        suspicion->which = which;
    }
}

/* ln likelihood of one reading of the best fit at another volume, less that at the written one. */
static double gain_at(const struct wa_inquiry *inquiry, size_t row, double shift)
{
    const struct wa_experiment *e = inquiry->experiment;
    const struct wa_fit *fit = &inquiry->bases[0]->fit;
    const struct wa_noise noise = {.reading = fit->noise_reading, .volume = fit->noise_volume};
    double sum = 0.0;
    for (int altered = 0; altered <= 1; altered++) {
        const double volume = e->volume_mL[row] + (altered == 1 ? shift : 0.0);
        struct wa_point_model point;
        if (volume < 0.0 || !wa_inquiry_point(e, fit, volume, &point)) {
            return -INFINITY;
        }
        double inlier;
        const double likelihood =
            wa_noise_log_likelihood(wa_outlier_share(e), e->reading[row] - point.expected,
                                    wa_noise_variance(&noise, &point), &inlier);
        sum += altered == 1 ? likelihood : -likelihood;
    }
    return sum;
}

static enum wa_status weigh_one_row(const struct wa_inquiry *inquiry,
                                    struct wa_suspicion *suspicion, struct wa_error *error)
{
    struct alteration best = {.row = 0};
    double most = 0.0;
    for (size_t row = 1; row < inquiry->experiment->count; row++) {
        for (int sign = -1; sign <= 1; sign += 2) {
            const double gain = gain_at(inquiry, row, sign * misread_mL);
            if (gain > most) {
                most = gain;
                best = (struct alteration){.row = row, .end = row + 1, .shift = sign * misread_mL};
            }
        }
    }
    if (most <= 0.0) {
        return WA_OK;
    }
    struct wa_refit refit;
    const enum wa_status status = try_alteration(inquiry, &best, 0, &refit, error);
    if (status == WA_OK) {
        keep(inquiry, &best, &refit, WA_FAULT_ONE_ROW, suspicion);
    }
    return status;
}

static enum wa_status weigh_search(const struct wa_inquiry *inquiry, alter_row alter,
                                   struct wa_suspicion *suspicion, struct wa_error *error)
{
    struct alteration best = {.row = 0};
    struct wa_refit refit;
    const enum wa_status status = search_rows(inquiry, alter, &best, &refit, error);
    if (status == WA_OK) {
        keep(inquiry, &best, &refit, WA_FAULT_FROM_ROW_ON, suspicion);
    }
    return status;
}

static int by_size(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static bool set_aside_between(const struct wa_run *run, long first, long last)
{
    for (size_t i = 0; i < run->set_aside_count; i++) {
        if (run->set_aside[i].line > first && run->set_aside[i].line < last) {
            return true;
        }
    }
    return false;
}

/* A regular series with one gap of twice the usual size. The statistic is the share of regular
 * gaps among the others over the share that is demanded. */
static enum wa_status weigh_regular(const struct wa_inquiry *inquiry,
                                    struct wa_suspicion *suspicion, struct wa_error *error)
{
    const struct wa_experiment *e = inquiry->experiment;
    const size_t count = e->count - 1;
    double *gaps = malloc(count * sizeof *gaps);
    if (gaps == NULL) {
        return wa_fail_memory(error);
    }
    for (size_t i = 0; i < count; i++) {
        gaps[i] = gap_before(e, i + 1);
    }
    qsort(gaps, count, sizeof *gaps, by_size);
    const double usual = gaps[count / 2];
    free(gaps);
    size_t like = 0, doubled = 0, row = 0;
    for (size_t i = 1; i < e->count; i++) {
        const double gap = gap_before(e, i);
        /* The volume column is rounded: half a unit of its last place at either end. */
        const double slack = regular * usual + pow(10.0, -inquiry->run->volume_decimals);
        like += fabs(gap - usual) <= slack ? 1 : 0;
        if (fabs(gap - 2.0 * usual) <= slack && i > 1 && i + 1 < e->count) {
            doubled++;
            row = set_aside_between(inquiry->run, e->line[i - 1], e->line[i]) ? 0 : i;
        }
    }
    if (doubled == 1 && row > 0 && count >= 8 && usual > 0.0 &&
        (double)like >= regular_share * (double)(count - 1)) {
        suspicion->weighed = true;
        suspicion->statistic = WA_FAULT_CERTAIN;
        suspicion->log_evidence = WA_FAULT_CERTAIN;
        suspicion->value = usual;
        suspicion->u = 0.0;
        suspicion->explains = true;
        suspicion->row = row;
        suspicion->which = WA_FAULT_IN_SERIES;
    }
    return WA_OK;
}

enum wa_status wa_weigh_rows(const struct wa_inquiry *inquiry, struct wa_diagnosis *diagnosis,
                             struct wa_error *error)
{
    struct wa_suspicion *burette = &diagnosis->suspicions[WA_FAULT_BURETTE];
    struct wa_suspicion *missed = &diagnosis->suspicions[WA_FAULT_MISSED_ROW];
    enum wa_status status = WA_OK;
    if (inquiry->run->volume_kind == WA_VOLUME_INCREMENT) {
        status = weigh_search(inquiry, addition_missed, missed, error);
    } else {
        status = weigh_one_row(inquiry, burette, error);
        wa_weigh_set_aside(inquiry, burette);
        if (status == WA_OK) {
            status = weigh_search(inquiry, written_more, burette, error);
        }
        if (status == WA_OK) {
            status = weigh_search(inquiry, written_less, burette, error);
        }
    }
    return status == WA_OK ? weigh_regular(inquiry, missed, error) : status;
}
