/* What a titration of a form will look like: pH at the start, half-way and at equivalence. */
#include "command/table_internal.h"

#include <math.h>

#define SAMPLE_VOLUME_L 0.050
#define MILLILITRES_PER_LITRE 1000.0
#define JUMP_SHARE 0.005  /* of the titrant up to the point, on each side of it */
#define ACID_PKA_MAX 12.0 /* a weaker proton gives no end with base in water */
#define BASE_PKA_MIN 1.5  /* a stronger acid's anion takes no proton in water */

/* Protons that a form gives to strong base, or takes from strong acid, in water. */
static int titratable(const struct wa_table *table, const struct wa_form *form, bool with_base)
{
    int protons = 0;
    int hydroxide = 0;
    for (int i = 0; i < form->part_count; i++) {
        const struct wa_form_part *part = &form->parts[i];
        if (part->acid == WA_PART_WATER) {
            hydroxide += part->lost;
            continue;
        }
        const struct wa_acid *acid = &table->acids[part->acid];
        for (int molecule = 0; molecule < part->count; molecule++) {
            /* The protons missing in total are spread as evenly as they can be. */
            int lost = part->lost / part->count + (molecule < part->lost % part->count ? 1 : 0);
            for (int step = 0; step < acid->step_count; step++) {
                protons += with_base ? step >= lost && acid->steps[step].pKa < ACID_PKA_MAX
                                     : step < lost && acid->steps[step].pKa > BASE_PKA_MIN;
            }
        }
    }
    return with_base ? protons - hydroxide : protons + hydroxide;
}

/* Solubility of the neutral species, when the table weighs it as such. */
static void find_solid(const struct wa_table *table, int acid,
                       struct wa_titration_component *component)
{
    component->solubility = INFINITY;
    component->solid_species = 0;
    for (size_t i = 0; i < table->form_count; i++) {
        const struct wa_form *form = &table->forms[i];
        if (form->part_count == 1 && form->parts[0].acid == acid && form->parts[0].count == 1 &&
            form->spectator_charge == 0 && form->spectator_z2 < 0.5 &&
            form->solubility_mol_L > 0.0) {
            component->solubility = form->solubility_mol_L;
            component->solid_species = form->parts[0].lost;
            return;
        }
    }
}

static bool build(const struct wa_table *table, const struct wa_form *form, bool with_base,
                  double concentration, double temperature_C, struct wa_titration *titration)
{
    double moles = concentration * SAMPLE_VOLUME_L;
    *titration = (struct wa_titration){
        .medium = wa_medium_at(temperature_C),
        .davies_coefficient = WA_DAVIES_COEFFICIENT,
        .solution_volume_L = SAMPLE_VOLUME_L,
        .sample_charge = moles * form->spectator_charge,
        .sample_ionic = 0.5 * moles * form->spectator_z2,
        .titrant_charge = with_base ? concentration : -concentration,
        .titrant_ionic = 0.5 * concentration,
    };
    for (int i = 0; i < form->part_count; i++) {
        const struct wa_form_part *part = &form->parts[i];
        if (part->acid == WA_PART_WATER) {
            continue;
        }
        const struct wa_acid *acid = &table->acids[part->acid];
        struct wa_titration_component *component =
            &titration->components[titration->component_count];
        double pK[WA_PROTONS_MAX];
        for (int step = 0; step < acid->step_count; step++) {
            pK[step] = wa_step_pKa_at(&acid->steps[step], temperature_C, NULL);
        }
        wa_system_set(&component->system, acid->charge, acid->step_count, pK);
        component->sample_moles = moles * part->count;
        find_solid(table, part->acid, component);
        titration->component_count++;
    }
    return form->modelled;
}

static bool pH_at(const struct wa_titration *titration, double volume_mL, double *pH)
{
    struct wa_solution solution;
    struct wa_error error;
    if (wa_titration_pH(titration, volume_mL, 7.0, &solution, NULL, &error) != WA_OK) {
        return false;
    }
    *pH = solution.pH;
    return true;
}

bool landmarks_compute(const struct wa_table *table, const struct wa_form *form, bool with_base,
                       double concentration, double temperature_C, struct landmarks *landmarks)
{
    struct wa_titration titration;
    int protons = titratable(table, form, with_base);
    *landmarks = (struct landmarks){.with_base = with_base,
                                    .count = protons < LANDMARKS_MAX ? protons : LANDMARKS_MAX};
    if (protons < 1 || !build(table, form, with_base, concentration, temperature_C, &titration) ||
        !pH_at(&titration, 0.0, &landmarks->start_pH)) {
        return false;
    }
    double each = SAMPLE_VOLUME_L * MILLILITRES_PER_LITRE;
    for (int i = 0; i < landmarks->count; i++) {
        double volume = each * (i + 1);
        double before;
        double behind;
        if (!pH_at(&titration, volume - 0.5 * each, &landmarks->half_pH[i]) ||
            !pH_at(&titration, volume, &landmarks->equivalence_pH[i]) ||
            !pH_at(&titration, volume * (1.0 - JUMP_SHARE), &before) ||
            !pH_at(&titration, volume * (1.0 + JUMP_SHARE), &behind)) {
            return false;
        }
        landmarks->jump_low[i] = fmin(before, behind);
        landmarks->jump_high[i] = fmax(before, behind);
    }
    return true;
}

int landmark_forms(const struct wa_table *table, int acid, int forms[LANDMARKS_MAX])
{
    bool seen[WA_PROTONS_MAX + 1] = {false};
    int count = 0;
    for (size_t i = 0; i < table->form_count && count < LANDMARKS_MAX; i++) {
        const struct wa_form *form = &table->forms[i];
        const struct wa_form_part *part = &form->parts[0];
        if (form->part_count != 1 || part->acid != acid || part->count != 1 ||
            part->lost > WA_PROTONS_MAX || seen[part->lost] || !form->modelled) {
            continue;
        }
        seen[part->lost] = true;
        forms[count] = (int)i;
        count++;
    }
    return count;
}
