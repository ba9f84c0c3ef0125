/* A tiny independent generator of titration curves for the tests: charge balance with
 * concentrations, no activity coefficients, bisection. Also a reproducible source of noise. */
#ifndef WHICHACID_TESTS_CURVE_MODEL_H
#define WHICHACID_TESTS_CURVE_MODEL_H

#include "whichacid/curve.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>

#define MODEL_POINTS_MAX 4096

/** What is titrated with what. A base is its fully deprotonated form, titrated with strong acid. */
struct model {
    int steps;
    double pKa[4];
    double sample;    /**< mol/L in the solution before the titration */
    double titrant;   /**< mol/L, total */
    double volume_mL; /**< of the solution */
    double carbonate; /**< fraction of an alkaline titrant */
    bool sample_is_base;
};

static inline double model_bound(const struct model *model, double pH)
{
    double cumulative = 1.0, sum = 1.0, protons = 0.0;
    for (int k = model->steps; k >= 1; k--) {
        cumulative *= pow(10.0, model->pKa[k - 1] - pH);
        sum += cumulative;
        protons += (model->steps - k + 1) * cumulative;
    }
    return protons / sum;
}

/* Surplus of positive charge at a trial pH; it falls as the pH rises. */
static inline double model_surplus(const struct model *model, double volume, double pH)
{
    const double total = model->volume_mL + volume;
    const double bound = model_bound(model, pH);
    const double first = pow(10.0, 6.35 - pH), second = pow(10.0, 10.25 - pH);
    const double carbonate = (2.0 + second) / (1.0 + second + second * first);
    double surplus = pow(10.0, -pH) - pow(10.0, pH - 13.9);
    const double acid = model->sample * model->volume_mL / total;
    const double added = model->titrant * volume / total;
    if (model->sample_is_base) {
        surplus += acid * bound - added;
    } else {
        surplus += added * (1.0 - 0.5 * model->carbonate * carbonate);
        surplus -= acid * (model->steps - bound);
    }
    return surplus;
}

static inline double model_pH(const struct model *model, double volume)
{
    double low = -1.0, high = 15.0;
    for (int i = 0; i < 60; i++) {
        const double middle = 0.5 * (low + high);
        if (model_surplus(model, volume, middle) > 0.0) {
            low = middle;
        } else {
            high = middle;
        }
    }
    return 0.5 * (low + high);
}

/** Stoichiometric volume of `protons` protons. */
static inline double model_equivalence(const struct model *model, int protons)
{
    return protons * model->sample * model->volume_mL / model->titrant;
}

/** xorshift64* (Vigna 2016) and the Box-Muller transform. */
static inline double noise_uniform(uint64_t *state)
{
    *state ^= *state >> 12;
    *state ^= *state << 25;
    *state ^= *state >> 27;
    return ((double)((*state * 2685821657736338717u) >> 11) + 0.5) / 9007199254740992.0;
}

static inline double noise_gaussian(uint64_t *state)
{
    return sqrt(-2.0 * log(noise_uniform(state))) * cos(6.283185307179586 * noise_uniform(state));
}

/** A run of equally spaced volumes; the arrays stay with the caller. */
struct simulation {
    struct wa_run run;
    struct wa_point points[MODEL_POINTS_MAX];
};

static inline void simulate(struct simulation *simulation, const struct model *model, size_t count,
                            double last_volume, double reading_u, double volume_u, uint64_t *state)
{
    simulation->run = (struct wa_run){.points = simulation->points, .point_count = count};
    for (size_t i = 0; i < count; i++) {
        const double volume = last_volume * (double)i / (double)(count - 1);
        const double true_volume = volume + (i > 0 ? volume_u * noise_gaussian(state) : 0.0);
        simulation->points[i] =
            (struct wa_point){.volume_mL = volume, .time_s = NAN, .temperature_C = NAN};
        simulation->points[i].reading =
            model_pH(model, true_volume) + reading_u * noise_gaussian(state);
    }
    struct wa_conditions *conditions = &simulation->run.conditions;
    conditions->solution_volume =
        (struct wa_noted){{model->volume_mL, 0.1, true}, true, WA_ORIGIN_NOTE, 1};
    conditions->titrant_concentration =
        (struct wa_noted){{model->titrant, 0.001 * model->titrant, true}, true, WA_ORIGIN_NOTE, 2};
    conditions->volume_uncertainty =
        (struct wa_noted){{fmax(volume_u, 0.001), 0.0, false}, true, WA_ORIGIN_NOTE, 3};
}

#endif
