/* Uncertainty budgets of any model: propagation by JCGM 100:2008 (GUM), laid out as the
 * Eurachem/CITAC guide CG 4 does, and propagation of distributions by Monte Carlo (JCGM 101:2008)
 * with the comparison of the two. Also the outlier test that replicates get. */
#ifndef WHICHACID_BENCH_BUDGET_H
#define WHICHACID_BENCH_BUDGET_H

#include "whichacid/error.h"
#include "whichacid/quantity.h"

#include <stdint.h>

/** Most inputs of one budget. */
#define WA_BENCH_INPUTS_MAX 40

/** Volume expansion of water at room temperature, per K (Eurachem/CITAC CG 4, A1.4); glass expands
 * ten times less and is left out, as there. */
#define WA_WATER_EXPANSION 2.1e-4

/** How an uncertainty was evaluated (JCGM 100, 4.2 and 4.3). */
enum wa_evaluation {
    WA_TYPE_A, /**< from repeated observations */
    WA_TYPE_B, /**< from anything else */
};

/** The distribution an input is drawn from. */
enum wa_distribution {
    WA_NORMAL,
    WA_RECTANGULAR,
    WA_TRIANGULAR,
    WA_STUDENT, /**< scaled and shifted t (JCGM 101, 6.4.9); u is its scale s/sqrt(n) */
};

/** One line of a budget; the last four are computed. */
struct wa_bench_input {
    char name[64];
    char unit[8]; /**< "" for a plain number */
    double value;
    double u; /**< standard uncertainty */
    enum wa_evaluation type;
    enum wa_distribution distribution;
    double degrees_of_freedom; /**< 0: infinite */
    double sensitivity;        /**< d result / d input */
    double effect;             /**< |sensitivity| u, in the unit of the result */
    double share;              /**< effect^2 / u(result)^2; 0 when u(result) is 0 */
};

/** A result with its budget. Plain data. */
struct wa_bench_budget {
    char name[64]; /**< of the result */
    char unit[16];
    double value;
    double u;
    double degrees_of_freedom; /**< effective (Welch and Satterthwaite); INFINITY when all are */
    double k95;                /**< factor for 95 % with these degrees of freedom */
    struct wa_bench_input inputs[WA_BENCH_INPUTS_MAX];
    size_t input_count;
};

/** The model: the result from the values of the inputs, in the order they were added. */
typedef double wa_bench_model(const double *values, const void *context);

/** Begin a budget: everything zero but the result's name and unit. */
void wa_bench_start(struct wa_bench_budget *budget, const char *name, const char *unit);

/**
 * Add an input.
 * @return it, to be given a distribution other than normal; the budget owns it. Past
 *         WA_BENCH_INPUTS_MAX the last one is overwritten, which no caller here comes near.
 */
struct wa_bench_input *wa_bench_add(struct wa_bench_budget *budget, const char *name,
                                    const char *unit, double value, double u,
                                    enum wa_evaluation type);

/** The same for limits of error: u is half_width/sqrt(3) or, triangular, half_width/sqrt(6). */
struct wa_bench_input *wa_bench_add_limits(struct wa_bench_budget *budget, const char *name,
                                           const char *unit, double value, double half_width,
                                           enum wa_distribution distribution);

/**
 * Value, sensitivities (central differences), combined and effective figures (JCGM 100, 5.1.2 and
 * G.4.1, independent inputs).
 * @return WA_ERROR_NUMERIC when the model gives no finite value
 */
enum wa_status wa_bench_compute(struct wa_bench_budget *budget, wa_bench_model *model,
                                const void *context, struct wa_error *error) WA_MUST_USE;

/** The largest contribution, or NULL when nothing is uncertain. */
const struct wa_bench_input *wa_bench_largest(const struct wa_bench_budget *budget);

/** What a Monte Carlo run found. */
struct wa_monte_carlo {
    size_t trials;
    double mean;
    double u;         /**< NaN when an input's distribution has no variance */
    double low, high; /**< probabilistically symmetric 95 % interval */
    double tolerance; /**< delta of JCGM 101, 7.9.2, for u to two significant digits */
    double low_difference, high_difference; /**< |end points| of GUM and Monte Carlo apart */
    double scatter; /**< twice the standard error of the end points, whichever is larger */
    bool agrees;    /**< both within the tolerance (JCGM 101, 8.1), the scatter allowed for */
    bool settled;   /**< the adaptive procedure (7.9.4) ended by its own rule, not by its limit */
};

/**
 * Propagate the distributions of a computed budget: blocks of 10^4 trials until value, u and both
 * end points stand to a fifth of the tolerance, at most 10^6 trials.
 * @param[in] seed  from 1; the same seed gives the same figures (Mersenne twister, 1998)
 */
enum wa_status wa_bench_monte_carlo(const struct wa_bench_budget *budget, wa_bench_model *model,
                                    const void *context, uint32_t seed,
                                    struct wa_monte_carlo *result,
                                    struct wa_error *error) WA_MUST_USE;

/** What Grubbs' test says of the value farthest from the mean. */
struct wa_grubbs {
    bool possible;   /**< at least three values that are not all alike */
    size_t index;    /**< of that value */
    double G;        /**< its distance in standard deviations */
    double critical; /**< for a two-sided test at 5 % */
    bool outlier;    /**< G is larger: a suspicion to be looked into, nothing is left out for it */
};

/**
 * Critical value of F. E. Grubbs, Technometrics 11 (1969) 1, from Student's t.
 * @param[in] share  probability beyond it on one side (0.025 for a two-sided test at 5 %)
 */
double wa_grubbs_critical(size_t count, double share);

/** Test the value farthest from the mean, two-sided at 5 %. */
struct wa_grubbs wa_grubbs_test(const double *values, size_t count);

#endif
