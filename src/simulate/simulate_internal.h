/* Steps of a simulation, shared by the sources of the room. */
#ifndef WHICHACID_SIMULATE_INTERNAL_H
#define WHICHACID_SIMULATE_INTERNAL_H

#include "whichacid/simulate.h"

/** The form a name means: a form, or the acid's own form that brings nothing else; or -1. */
int wa_simulation_find_form(const struct wa_table *table, const char *name);

/** Whether a strong base suits a sample better than a strong acid: by the larger constant of the
 * two titration reactions. */
bool wa_simulation_suits_base(const struct wa_table *table, const struct wa_form *const *forms,
                              int form_count);

/** Protons that one formula unit gives to a base, or takes from an acid, in water; negative for a
 * form that uses up nothing but brings what the titrant brings. */
double wa_simulation_equivalents(const struct wa_table *table, const struct wa_form *form,
                                 bool titrant_is_base);

/**
 * Put sample and titrant together.
 * @param[in,out] simulation  everything that acts is set; titration is filled in
 */
enum wa_status wa_simulation_compose(const struct wa_table *table, struct wa_simulation *simulation,
                                     struct wa_error *error) WA_MUST_USE;

/** Choose the volumes; allocates volume_mL and reading, sets count and volume_decimals. */
enum wa_status wa_simulation_place(struct wa_simulation *simulation,
                                   struct wa_error *error) WA_MUST_USE;

#endif
