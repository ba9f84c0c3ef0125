/* From forms of the table to what is in beaker and burette. */
#include "simulate/simulate_internal.h"

#include <math.h>
#include <string.h>

static const double titrated_by_base = 12.0; /* a proton above this pKa gives no equivalence */
static const double titrated_by_acid = 2.0;  /* nor does a base below this one */
static const double water_pK = 14.0;

/* The uncharged acid or base alone: what a solid in the solution would be. */
static bool is_plain(const struct wa_table *table, const struct wa_form *form)
{
    const struct wa_form_part *part = &form->parts[0];
    return form->part_count == 1 && part->acid != WA_PART_WATER && part->count == 1 &&
           form->spectator_charge == 0 && !(form->spectator_z2 > 0.0) &&
           table->acids[part->acid].charge == part->lost;
}

int wa_simulation_find_form(const struct wa_table *table, const char *name)
{
    const int form = wa_table_find_form(table, name);
    const int acid = wa_table_find_acid(table, name);
    int first = form;
    for (size_t f = 0; form < 0 && acid >= 0 && f < table->form_count; f++) {
        if (table->forms[f].parts[0].acid != acid) {
            continue;
        }
        if (is_plain(table, &table->forms[f])) {
            return (int)f;
        }
        first = first < 0 ? (int)f : first;
    }
    return first;
}

/* Of the `count` protons of a step, how many are already missing. */
static int lost_of_step(const struct wa_form_part *part, int step)
{
    const int lost = part->lost - step * part->count;
    return lost < 0 ? 0 : (lost > part->count ? part->count : lost);
}

bool wa_simulation_suits_base(const struct wa_table *table, const struct wa_form *const *forms,
                              int form_count)
{
    double gives = INFINITY, takes = -INFINITY;
    for (int f = 0; f < form_count; f++) {
        for (int k = 0; k < forms[f]->part_count; k++) {
            const struct wa_form_part *part = &forms[f]->parts[k];
            if (part->acid == WA_PART_WATER) {
                takes = fmax(takes, water_pK);
                continue;
            }
            const struct wa_acid *acid = &table->acids[part->acid];
            for (int i = 0; i < acid->step_count; i++) {
                const int lost = lost_of_step(part, i);
                gives = lost < part->count ? fmin(gives, acid->steps[i].pKa) : gives;
                takes = lost > 0 ? fmax(takes, acid->steps[i].pKa) : takes;
            }
        }
    }
    return water_pK - gives >= takes;
}

double wa_simulation_equivalents(const struct wa_table *table, const struct wa_form *form,
                                 bool titrant_is_base)
{
    double sum = 0.0;
    for (int k = 0; k < form->part_count; k++) {
        const struct wa_form_part *part = &form->parts[k];
        if (part->acid == WA_PART_WATER) {
            sum += titrant_is_base ? -part->lost : part->lost;
            continue;
        }
        const struct wa_acid *acid = &table->acids[part->acid];
        for (int i = 0; i < acid->step_count; i++) {
            const int lost = lost_of_step(part, i);
            if (titrant_is_base) {
                sum += acid->steps[i].pKa < titrated_by_base ? part->count - lost : 0;
            } else {
                sum += acid->steps[i].pKa > titrated_by_acid ? lost : 0;
            }
        }
    }
    return sum;
}

/* The component of an acid system, new when no form brought it before; NULL when all are taken. */
static struct wa_titration_component *component_of(const struct wa_table *table, int acid,
                                                   int *acids, struct wa_titration *titration)
{
    for (int k = 0; k < titration->component_count; k++) {
        if (acids[k] == acid) {
            return &titration->components[k];
        }
    }
    if (titration->component_count == WA_COMPONENTS_MAX) {
        return NULL;
    }
    acids[titration->component_count] = acid;
    struct wa_titration_component *component = &titration->components[titration->component_count];
    titration->component_count++;
    double pK[WA_PROTONS_MAX];
    const struct wa_acid *from = &table->acids[acid];
    for (int i = 0; i < from->step_count; i++) {
        pK[i] = wa_step_pKa_at(&from->steps[i], titration->medium.temperature_C, NULL);
    }
    *component = (struct wa_titration_component){.solubility = INFINITY};
    wa_system_set(&component->system, from->charge, from->step_count, pK);
    return component;
}

static enum wa_status too_many(struct wa_error *error)
{
    return wa_fail(error, WA_ERROR_CALL, NULL, 0,
                   "These forms bring more than %d acid systems; simulate fewer at a time.",
                   WA_COMPONENTS_MAX);
}

static enum wa_status add_form(const struct wa_table *table, const struct wa_form *form,
                               double moles, bool dissolved, int *acids,
                               struct wa_titration *titration, struct wa_error *error)
{
    titration->sample_charge += moles * form->spectator_charge;
    titration->sample_ionic += 0.5 * moles * form->spectator_z2;
    for (int k = 0; k < form->part_count; k++) {
        const struct wa_form_part *part = &form->parts[k];
        if (part->acid == WA_PART_WATER) {
            continue;
        }
        struct wa_titration_component *component =
            component_of(table, part->acid, acids, titration);
        if (component == NULL) {
            return too_many(error);
        }
        component->sample_moles += moles * part->count;
        if (!dissolved && is_plain(table, form) && isfinite(form->solubility_mol_L)) {
            component->solid_species = part->lost;
            const enum wa_status status = wa_species_solubility(
                &component->system, &titration->medium, form->solubility_mol_L, part->lost,
                &component->solubility, error);
            if (status != WA_OK) {
                return status;
            }
        }
    }
    return WA_OK;
}

static enum wa_status add_titrant(const struct wa_table *table,
                                  const struct wa_simulation *simulation, int *acids,
                                  struct wa_titration *titration, struct wa_error *error)
{
    const struct wa_titrant *titrant = simulation->titrant;
    const double concentration = simulation->titrant_concentration;
    double charge = titrant->is_base ? titrant->protons : -titrant->protons;
    if (titrant->acid >= 0) {
        struct wa_titration_component *component =
            component_of(table, titrant->acid, acids, titration);
        if (component == NULL) {
            return too_many(error);
        }
        component->titrant_concentration += titrant->count * concentration;
        charge = titrant->lost - table->acids[titrant->acid].charge * titrant->count;
    }
    titration->titrant_charge = charge * concentration;
    titration->titrant_ionic = 0.5 * fabs(titration->titrant_charge);
    return WA_OK;
}

static enum wa_status add_carbonate(const struct wa_table *table,
                                    const struct wa_simulation *simulation, int *acids,
                                    struct wa_titration *titration, struct wa_error *error)
{
    const bool strong_base = simulation->titrant->is_base && simulation->titrant->acid < 0;
    const double fraction = strong_base ? simulation->titrant_carbonate : 0.0;
    const double dissolved = simulation->options.carbon_dioxide;
    if (!(fraction > 0.0) && !(dissolved > 0.0)) {
        return WA_OK;
    }
    const int acid = wa_table_find_acid(table, "carbonic-acid");
    if (acid < 0) {
        return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                       "The table has no acid 'carbonic-acid', which carbonate and carbon dioxide "
                       "need.");
    }
    struct wa_titration_component *component = component_of(table, acid, acids, titration);
    if (component == NULL) {
        return too_many(error);
    }
    component->sample_moles += dissolved * titration->solution_volume_L;
    /* A carbonate ion counts twice in the alkalinity that the concentration means. */
    component->titrant_concentration +=
        0.5 * fraction * simulation->titrant->protons * simulation->titrant_concentration;
    return WA_OK;
}

enum wa_status wa_simulation_compose(const struct wa_table *table, struct wa_simulation *simulation,
                                     struct wa_error *error)
{
    const struct wa_simulation_options *options = &simulation->options;
    struct wa_titration *titration = &simulation->titration;
    int acids[WA_COMPONENTS_MAX];
    *titration = (struct wa_titration){
        .medium = wa_medium_at(options->temperature_C),
        .davies_coefficient = WA_DAVIES_COEFFICIENT,
        .solution_volume_L = 1e-3 * options->solution_volume.value,
    };
    enum wa_status status = WA_OK;
    for (int f = 0; status == WA_OK && f < options->form_count; f++) {
        const double moles = simulation->mass[f] / simulation->forms[f]->molar_mass;
        status = add_form(table, simulation->forms[f], moles, options->dissolved, acids, titration,
                          error);
    }
    if (status == WA_OK) {
        status = add_titrant(table, simulation, acids, titration, error);
    }
    return status == WA_OK ? add_carbonate(table, simulation, acids, titration, error) : status;
}
