/* The model that every amount shares: a number times powers of volumes and masses times the
 * equivalents that titrants brought. */
#ifndef WHICHACID_BENCH_AMOUNTS_INTERNAL_H
#define WHICHACID_BENCH_AMOUNTS_INTERNAL_H

#include "whichacid/bench_amount.h"

/** A volume among the inputs: its value and the errors on top of it, -1 for one that is not there.
 */
struct amount_volume {
    int value, calibration, temperature, blank;
};

/** Equivalents: coefficient times concentration times volume. */
struct amount_term {
    double coefficient;
    int concentration;
    struct amount_volume volume;
};

struct amount_factor {
    struct amount_volume volume; /**< or any plain input in its place */
    double exponent;
};

/** One result under construction. */
struct amount_model {
    double constant;
    double terms_exponent; /**< of the sum of the terms; 0: no terms */
    double added;          /**< to the whole, at the end */
    struct amount_term terms[3];
    size_t term_count;
    struct amount_factor factors[16];
    size_t factor_count;
};

/** The model as wa_bench_compute wants it; context is an amount_model. */
double amount_model_value(const double *values, const void *context);

/** A plain input. */
struct amount_volume amount_plain(int place);

#endif
