/* Free acids and bases that dissolve poorly: some stays undissolved, or comes out when a salt is
 * titrated back. */
#include "match/match_internal.h"

#include <math.h>

void wa_group_solubility(const struct wa_table *table, double temperature_C, struct wa_group *group)
{
    group->solubility = INFINITY;
    for (size_t f = 0; group->acid >= 0 && f < table->form_count; f++) {
        const struct wa_form *form = &table->forms[f];
        const struct wa_form_part *part = &form->parts[0];
        if (form->part_count == 1 && part->acid == group->acid && part->count == 1 &&
            part->lost == table->acids[group->acid].charge && isfinite(form->solubility_mol_L) &&
            form->solubility_mol_L > 0.0) {
            group->solubility = fmin(group->solubility, form->solubility_mol_L);
            group->solid_species = part->lost;
        }
    }
    if (isfinite(group->solubility)) {
        const struct wa_model_part *part = &group->sample.parts[0];
        const struct wa_medium medium = wa_medium_at(temperature_C);
        struct wa_system system;
        wa_system_set(&system, part->charge, part->step_count, part->pK);
        if (wa_species_solubility(&system, &medium, group->solubility, group->solid_species,
                                  &group->solubility, NULL) != WA_OK) {
            group->solubility = INFINITY;
        }
    }
}

bool wa_group_leaves_solid(const struct wa_experiment *experiment, const struct wa_group *group)
{
    static const double gamma = 0.8; /* near enough to tell whether a solid is worth a fit */
    if (!isfinite(group->solubility) || group->sample.part_count == 0 ||
        group->fit->parameter_count == 0) {
        return false;
    }
    const struct wa_titration *titration = &group->fit->titration;
    const struct wa_titration_component *component = &titration->components[0];
    bool solid = false;
    for (size_t p = 0; !solid && p < experiment->count; p++) {
        double fraction[WA_PROTONS_MAX + 1];
        const double total_L = titration->solution_volume_L + 1e-3 * experiment->volume_mL[p];
        wa_system_fractions(&component->system, pow(10.0, -experiment->reading[p]), gamma,
                            fraction);
        solid = exp(group->ln_amount) * group->sample.parts[0].count / total_L *
                    fraction[group->solid_species] >
                group->solubility;
    }
    return solid;
}
