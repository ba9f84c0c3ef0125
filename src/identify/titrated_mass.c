/* The mass that was titrated, from the notes. */
#include "identify/identify_internal.h"

#include <math.h>

static const double default_mass_u = 0.0003;   /* g; a balance that reads to 0.1 mg, twice */
static const double default_density_u = 0.002; /* relative */
static const double default_sample_volume_u = 0.003;

struct wa_titrated_mass wa_titrated_mass_of(const struct wa_conditions *conditions)
{
    struct wa_titrated_mass mass = {.known = false};
    const struct wa_quantity *m = &conditions->sample_mass.quantity;
    const struct wa_quantity *v = &conditions->sample_volume.quantity;
    const struct wa_quantity *d = &conditions->sample_density.quantity;
    if (conditions->sample_mass.known && m->value > 0.0) {
        mass = (struct wa_titrated_mass){
            .known = true, .mass_g = m->value, .u_g = m->has_u ? m->u : default_mass_u};
    } else if (conditions->sample_volume.known && conditions->sample_density.known &&
               v->value > 0.0 && d->value > 0.0) {
        const double u_volume = v->has_u ? v->u / v->value : default_sample_volume_u;
        const double u_density = d->has_u ? d->u / d->value : default_density_u;
        mass.known = true;
        mass.mass_g = v->value * d->value;
        mass.u_g = mass.mass_g * hypot(u_volume, u_density);
    }
    if (mass.known && conditions->aliquot.known && conditions->aliquot.quantity.value > 0.0) {
        const struct wa_quantity *part = &conditions->aliquot.quantity;
        const double u_part = part->has_u ? part->u / part->value : 0.0;
        mass.u_g = part->value * hypot(mass.u_g, mass.mass_g * u_part);
        mass.mass_g *= part->value;
    }
    return mass;
}
