/* What is left of a form when its acid systems are taken away: spectator ions and water. */
#include "reference/reference_internal.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define ATOM_TOLERANCE 0.01
#define SEARCH_STEPS_MAX 2000

/* Cations of one element: never part of a compound ion, so they are simply counted. */
static const struct {
    const char *element;
    int charge;
} single_ions[] = {
    {"Na", 1}, {"K", 1},  {"Li", 1}, {"Rb", 1}, {"Cs", 1}, {"Ag", 1}, {"Tl", 1},
    {"Mg", 2}, {"Ca", 2}, {"Sr", 2}, {"Ba", 2}, {"Zn", 2}, {"Mn", 2}, {"Co", 2},
    {"Ni", 2}, {"Cu", 2}, {"Cd", 2}, {"Pb", 2}, {"La", 3}, {"Ce", 3},
};

/* The others, tried largest first. */
static const struct {
    const char *formula;
    int charge;
} compound_ions[] = {
    {"C16H36N", 1},  /* tetrabutylammonium */
    {"C7H7SO3", -1}, /* toluenesulfonate */
    {"C6H5SO3", -1}, /* benzenesulfonate */
    {"C8H20N", 1},   /* tetraethylammonium */
    {"C5H14NO", 1},  /* cholinium */
    {"C4H12N", 1},   /* tetramethylammonium */
    {"C2H5SO3", -1}, /* ethanesulfonate */
    {"CF3SO3", -1},  /* trifluoromethanesulfonate */
    {"CH3SO3", -1},  /* methanesulfonate */
    {"C2F3O2", -1},  /* trifluoroacetate */
    {"PF6", -1},     /* hexafluorophosphate */
    {"BF4", -1},     /* tetrafluoroborate */
    {"SCN", -1},     /* thiocyanate */
    {"ClO4", -1},    /* perchlorate */
    {"ClO3", -1},    /* chlorate */
    {"BrO3", -1},    /* bromate */
    {"NO3", -1},     /* nitrate */
    {"Cl", -1},      /* chloride */
    {"Br", -1},      /* bromide */
    {"I", -1},       /* iodide */
    {"F", -1},       /* fluoride */
};

struct search {
    const struct wa_table_storage *storage;
    int steps; /* bounds the search */
};

void settle_ions(struct wa_table_storage *storage)
{
    storage->hydrogen = element_find(storage, "H");
    storage->carbon = element_find(storage, "C");
    storage->nitrogen = element_find(storage, "N");
    storage->oxygen = element_find(storage, "O");
    for (size_t i = 0; i < sizeof compound_ions / sizeof compound_ions[0]; i++) {
        struct spectator_ion *ion = &storage->ions[storage->ion_count];
        char reason[128];
        if (formula_parse(storage, compound_ions[i].formula, &ion->composition, reason,
                          sizeof reason)) {
            ion->charge = compound_ions[i].charge;
            storage->ion_count++;
        }
    }
}

/* Write what is left, for messages: "Na1.0 H2.0 O1.0" without the clutter. */
static void write_remainder(const struct wa_table_storage *storage,
                            const struct composition *remainder, char *text, size_t size)
{
    size_t used = 0;
    text[0] = '\0';
    for (int i = 0; i < remainder->count; i++) {
        double count = remainder->atoms[i];
        if (fabs(count) < ATOM_TOLERANCE || used + 16 > size) {
            continue;
        }
        int written = snprintf(text + used, size - used, "%s%s %+g", used > 0 ? ", " : "",
                               storage->elements[remainder->element[i]].symbol, count);
        used += written > 0 ? (size_t)written : 0;
    }
}

static bool is_of_water(const struct search *search, int element)
{
    return element == search->storage->hydrogen || element == search->storage->oxygen;
}

/* Whole waters, or nothing? Negative waters belong to anhydrides. */
static bool only_water(const struct search *search, const struct composition *remainder)
{
    for (int i = 0; i < remainder->count; i++) {
        if (!is_of_water(search, remainder->element[i]) &&
            fabs(remainder->atoms[i]) > ATOM_TOLERANCE) {
            return false;
        }
    }
    return fabs(composition_atoms(remainder, search->storage->hydrogen) -
                2.0 * composition_atoms(remainder, search->storage->oxygen)) < ATOM_TOLERANCE;
}

/* How often an ion fits into the remainder; its hydrogen and oxygen may be lent by water. */
static int most_of(const struct search *search, const struct composition *remainder,
                   const struct composition *ion)
{
    double most = 20.0;
    for (int i = 0; i < ion->count; i++) {
        if (!is_of_water(search, ion->element[i])) {
            double present = composition_atoms(remainder, ion->element[i]) + ATOM_TOLERANCE;
            most = fmin(most, floor(present / ion->atoms[i]));
        }
    }
    return most < 0.0 ? 0 : (int)most;
}

/* Try the ions from `from` on. @return whether the remainder comes out with the charge */
static bool try_ions(struct search *search, int from, const struct composition *remainder,
                     int charge, double *z2, double *waters)
{
    const struct wa_table_storage *storage = search->storage;
    int most = 0;
    if (charge == 0 && only_water(search, remainder)) {
        *waters = composition_atoms(remainder, storage->oxygen);
        return true;
    }
    while (from < storage->ion_count &&
           (most = most_of(search, remainder, &storage->ions[from].composition)) == 0) {
        from++;
    }
    search->steps++;
    if (from == storage->ion_count || search->steps > SEARCH_STEPS_MAX) {
        return false;
    }
    const struct spectator_ion *ion = &storage->ions[from];
    for (int count = most; count >= 0; count--) {
        struct composition rest = *remainder;
        double deeper = *z2 + count;
        if (composition_add(&rest, -count, &ion->composition) &&
            try_ions(search, from + 1, &rest, charge - count * ion->charge, &deeper, waters)) {
            *z2 = deeper;
            return true;
        }
    }
    return false;
}

/* Count and take away the ions of one element. */
static void take_single_ions(const struct search *search, struct composition *remainder,
                             int *charge, double *z2)
{
    for (int i = 0; i < remainder->count; i++) {
        const char *symbol = search->storage->elements[remainder->element[i]].symbol;
        for (size_t j = 0; j < sizeof single_ions / sizeof single_ions[0]; j++) {
            if (remainder->atoms[i] > ATOM_TOLERANCE &&
                strcmp(symbol, single_ions[j].element) == 0) {
                int z = single_ions[j].charge;
                *charge -= (int)lround(remainder->atoms[i] * z);
                *z2 += remainder->atoms[i] * z * z;
                remainder->atoms[i] = 0.0;
            }
        }
    }
}

/* Is there at least as much of everything in the form as in its parts (water aside)? */
static bool no_atom_is_short(const struct search *search, const struct composition *remainder)
{
    for (int i = 0; i < remainder->count; i++) {
        if (!is_of_water(search, remainder->element[i]) && remainder->atoms[i] < -ATOM_TOLERANCE) {
            return false;
        }
    }
    return true;
}

void spectators_find(const struct wa_table_storage *storage, const struct composition *form,
                     const struct composition *parts, struct spectators *spectators)
{
    struct search search = {.storage = storage};
    struct composition remainder = *form;
    memset(spectators, 0, sizeof *spectators);
    spectators->charge = form->charge - parts->charge;
    if (!composition_add(&remainder, -1.0, parts) || storage->hydrogen < 0 || storage->oxygen < 0) {
        return;
    }
    const struct composition whole = remainder;
    bool complete = no_atom_is_short(&search, &remainder);
    /* Carbon left over may be an ion that is not known here, whose charge nobody can check. */
    bool unknown = complete && storage->carbon >= 0 &&
                   composition_atoms(&remainder, storage->carbon) > ATOM_TOLERANCE;
    int charge = spectators->charge;
    double z2 = 0.0;
    take_single_ions(&search, &remainder, &charge, &z2);
    spectators->split =
        complete && try_ions(&search, 0, &remainder, charge, &z2, &spectators->waters);
    spectators->balanced = spectators->split || unknown;
    if (!spectators->split) {
        write_remainder(storage, &whole, spectators->remainder, sizeof spectators->remainder);
    }
    spectators->z2 = spectators->split ? z2 : abs(spectators->charge);
}
