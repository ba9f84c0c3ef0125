/* Systems that resemble given pKa values. */
#include "whichacid/reference.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define VALUES_MAX WA_PROTONS_MAX
#define SEEN_LOW 2.0
#define SEEN_HIGH 12.0
#define UNASKED_PENALTY 0.15 /* pK that an unasked visible step adds to the distance */
#define MASS_TOLERANCE 0.02  /* relative */

static int compare_doubles(const void *left, const void *right)
{
    const double *first = left;
    const double *second = right;
    return (*first > *second) - (*first < *second);
}

/* Least sum of squares when each value takes a step of its own in ascending order: the usual
 * recurrence over values and steps. */
static double least_squares(const double *values, int count, const struct wa_acid *acid)
{
    double best[VALUES_MAX + 1];
    best[0] = 0.0;
    for (int i = 1; i <= count; i++) {
        best[i] = INFINITY;
    }
    for (int step = 0; step < acid->step_count; step++) {
        for (int i = count; i >= 1; i--) {
            double off = values[i - 1] - acid->steps[step].pKa;
            best[i] = fmin(best[i], best[i - 1] + off * off);
        }
    }
    return best[count];
}

static int visible_steps(const struct wa_acid *acid)
{
    int count = 0;
    for (int i = 0; i < acid->step_count; i++) {
        count += acid->steps[i].pKa > SEEN_LOW && acid->steps[i].pKa < SEEN_HIGH;
    }
    return count;
}

static int visible_values(const double *values, int count)
{
    int visible = 0;
    for (int i = 0; i < count; i++) {
        visible += values[i] > SEEN_LOW && values[i] < SEEN_HIGH;
    }
    return visible;
}

/* For each acid the form with the nearest molar mass within the tolerance, -1 when none. */
static void nearest_forms(const struct wa_table *table, double molar_mass, int *form_of)
{
    for (size_t i = 0; i < table->acid_count; i++) {
        form_of[i] = -1;
    }
    for (size_t i = 0; i < table->form_count; i++) {
        double off = fabs(table->forms[i].molar_mass - molar_mass);
        if (!(off <= MASS_TOLERANCE * molar_mass)) {
            continue;
        }
        for (int j = 0; j < table->forms[i].part_count; j++) {
            int acid = table->forms[i].parts[j].acid;
            if (acid >= 0 && (form_of[acid] < 0 ||
                              off < fabs(table->forms[form_of[acid]].molar_mass - molar_mass))) {
                form_of[acid] = (int)i;
            }
        }
    }
}

static int compare_near(const void *left, const void *right)
{
    const struct wa_near *first = left;
    const struct wa_near *second = right;
    double first_score = first->distance + UNASKED_PENALTY * first->unmatched;
    double second_score = second->distance + UNASKED_PENALTY * second->unmatched;
    if (first_score < second_score || first_score > second_score) {
        return first_score < second_score ? -1 : 1;
    }
    double off = fabs(first->mass_off) - fabs(second->mass_off);
    return off < 0.0 ? -1 : off > 0.0 ? 1 : first->acid - second->acid;
}

size_t wa_table_near(const struct wa_table *table, const double *pKa, size_t pKa_count,
                     double molar_mass, double most_apart, struct wa_near *near, size_t room)
{
    double values[VALUES_MAX];
    int count = (int)(pKa_count < VALUES_MAX ? pKa_count : VALUES_MAX);
    size_t found = 0;
    int *form_of = malloc((table->acid_count + 1) * sizeof *form_of);
    struct wa_near *all = malloc((table->acid_count + 1) * sizeof *all);
    if (form_of == NULL || all == NULL) {
        free(form_of);
        free(all);
        return 0;
    }
    if (count > 0) {
        memcpy(values, pKa, (size_t)count * sizeof *values);
        qsort(values, (size_t)count, sizeof *values, compare_doubles);
    }
    nearest_forms(table, molar_mass, form_of);
    for (size_t i = 0; i < table->acid_count; i++) {
        const struct wa_acid *acid = &table->acids[i];
        double distance = count > 0 ? sqrt(least_squares(values, count, acid) / count) : 0.0;
        if (!(distance <= most_apart) || (isfinite(molar_mass) && form_of[i] < 0)) {
            continue;
        }
        int unmatched = count > 0 ? visible_steps(acid) - visible_values(values, count) : 0;
        all[found] = (struct wa_near){
            .acid = (int)i,
            .form = form_of[i],
            .distance = distance,
            .mass_off = form_of[i] < 0 ? 0.0 : table->forms[form_of[i]].molar_mass - molar_mass,
            .unmatched = unmatched > 0 ? unmatched : 0,
        };
        found++;
    }
    qsort(all, found, sizeof *all, compare_near);
    found = found < room ? found : room;
    memcpy(near, all, found * sizeof *near);
    free(form_of);
    free(all);
    return found;
}
