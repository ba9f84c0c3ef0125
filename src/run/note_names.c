/* The names of notes: those of the file format and what laboratories call them besides. */
#include "whichacid/run.h"

#include <string.h>

static const struct wa_note_name names[] = {
    {"sample", "vial 17", "what the sample is called"},
    {"sample mass", "0.3127 g", "mass of the sample that was weighed"},
    {"sample volume", "5.00 mL", "volume of a liquid sample"},
    {"sample density", "1.006 g/mL", "density of a liquid sample"},
    {"aliquot", "25 mL of 250 mL", "part of the dissolved sample that was titrated"},
    {"solution volume", "50.0 mL", "volume in the vessel before the first addition"},
    {"titrant", "sodium hydroxide", "what was in the burette"},
    {"titrant concentration", "0.1023 ± 0.0002 mol/L", "its total alkalinity or acidity"},
    {"titrant carbonate", "0.5 %", "part of the titrant's alkalinity that is carbonate"},
    {"temperature", "25.0 °C", "temperature of the solution"},
    {"background electrolyte", "0.1 mol/L", "1:1 salt that was added"},
    {"blank", "0.02 mL", "titrant that the blank used"},
    {"solvent", "water", "what the sample was dissolved in"},
    {"electrode slope", "99.2 ± 0.4 %", "slope of the electrode, of theory or in mV"},
    {"electrode offset", "0.02 ± 0.01 pH", "reading error at pH 7, in pH or mV"},
    {"electrode correlation", "0.15", "of the uncertainties of slope and offset"},
    {"buffer 1", "4.005 = 172.3 mV", "a buffer reading, for readings in mV"},
    {"buffer 2", "9.180 = -127.0 mV", "a second buffer reading"},
    {"reading uncertainty", "0.01", "standard deviation of one reading"},
    {"volume uncertainty", "0.01 mL", "standard deviation of one volume"},
    {"volume reading", "burette", "how volumes were written: total, burette or increment"},
    {"date", "2024-03-02", "when it was measured; kept and printed"},
    {"analyst", "M. Weber", "name of who measured; kept and printed"},
};

struct other_name {
    const char *other;
    const char *name;
};

/* Folded as wa_text_fold does. */
static const struct other_name others[] = {
    {"mass of sample", "sample mass"},
    {"mass", "sample mass"},
    {"sample weight", "sample mass"},
    {"sample size", "sample mass"},
    {"weight of sample", "sample mass"},
    {"weighed sample", "sample mass"},
    {"einwaage", "sample mass"},
    {"probenmasse", "sample mass"},
    {"masse", "sample mass"},
    {"prise d'essai", "sample mass"},
    {"masse de l'echantillon", "sample mass"},
    {"masa de muestra", "sample mass"},
    {"masa de la muestra", "sample mass"},
    {"massa del campione", "sample mass"},
    {"massa campione", "sample mass"},
    {"massa da amostra", "sample mass"},
    {"inweeg", "sample mass"},
    {"probe", "sample"},
    {"echantillon", "sample"},
    {"muestra", "sample"},
    {"campione", "sample"},
    {"amostra", "sample"},
    {"monster", "sample"},
    {"sample name", "sample"},
    {"sample id", "sample"},
    {"volume of sample", "sample volume"},
    {"probenvolumen", "sample volume"},
    {"volume of solution", "solution volume"},
    {"initial volume", "solution volume"},
    {"v0", "solution volume"},
    {"starting volume", "solution volume"},
    {"start volume", "solution volume"},
    {"total solution volume", "solution volume"},
    {"volume initial", "solution volume"},
    {"anfangsvolumen", "solution volume"},
    {"startvolumen", "solution volume"},
    {"vorlage", "solution volume"},
    {"vorlagevolumen", "solution volume"},
    {"volumen inicial", "solution volume"},
    {"volume iniziale", "solution volume"},
    {"volume inicial", "solution volume"},
    {"beginvolume", "solution volume"},
    {"titrator solution", "titrant"},
    {"titrans", "titrant"},
    {"titriermittel", "titrant"},
    {"masslosung", "titrant"},
    {"titrante", "titrant"},
    {"titulante", "titrant"},
    {"valorante", "titrant"},
    {"concentration of titrant", "titrant concentration"},
    {"titrant conc", "titrant concentration"},
    {"titrant conc.", "titrant concentration"},
    {"titrant molarity", "titrant concentration"},
    {"titrant normality", "titrant concentration"},
    {"normality", "titrant concentration"},
    {"molarity", "titrant concentration"},
    {"c titrant", "titrant concentration"},
    {"c(titrant)", "titrant concentration"},
    {"c(naoh)", "titrant concentration"},
    {"c(hcl)", "titrant concentration"},
    {"naoh concentration", "titrant concentration"},
    {"hcl concentration", "titrant concentration"},
    {"konzentration", "titrant concentration"},
    {"konzentration titrant", "titrant concentration"},
    {"titrantkonzentration", "titrant concentration"},
    {"concentration du titrant", "titrant concentration"},
    {"concentracion del titulante", "titrant concentration"},
    {"concentrazione titolante", "titrant concentration"},
    {"titolante", "titrant"},
    {"carbonate", "titrant carbonate"},
    {"temp", "temperature"},
    {"temp.", "temperature"},
    {"temperatur", "temperature"},
    {"temperatura", "temperature"},
    {"temperatuur", "temperature"},
    {"background", "background electrolyte"},
    {"ionic strength", "background electrolyte"},
    {"supporting electrolyte", "background electrolyte"},
    {"slope", "electrode slope"},
    {"steilheit", "electrode slope"},
    {"elektrodensteilheit", "electrode slope"},
    {"offset", "electrode offset"},
    {"e0", "electrode offset"},
    {"asymmetry potential", "electrode offset"},
    {"nullpunkt", "electrode offset"},
    {"volume readings", "volume reading"},
    {"volume kind", "volume reading"},
    {"datum", "date"},
    {"fecha", "date"},
    {"data", "date"},
    {"operator", "analyst"},
    {"bearbeiter", "analyst"},
    {"losemittel", "solvent"},
    {"losungsmittel", "solvent"},
    {"solvant", "solvent"},
    {"disolvente", "solvent"},
    {"buffer1", "buffer 1"},
    {"buffer2", "buffer 2"},
    {"puffer 1", "buffer 1"},
    {"puffer 2", "buffer 2"},
};

const struct wa_note_name *wa_note_names(size_t *count)
{
    *count = sizeof names / sizeof names[0];
    return names;
}

const char *wa_note_known_name(const char *folded)
{
    for (size_t i = 0; i < sizeof names / sizeof names[0]; i++) {
        if (strcmp(names[i].name, folded) == 0) {
            return names[i].name;
        }
    }
    for (size_t i = 0; i < sizeof others / sizeof others[0]; i++) {
        if (strcmp(others[i].other, folded) == 0) {
            return others[i].name;
        }
    }
    return NULL;
}

const struct wa_note *wa_run_find_note(const struct wa_run *run, const char *name)
{
    const struct wa_note *found = NULL;
    for (size_t i = 0; i < run->note_count; i++) {
        const char *known = wa_note_known_name(run->notes[i].name);
        if (strcmp(known != NULL ? known : run->notes[i].name, name) == 0 &&
            (found == NULL || found->origin != WA_ORIGIN_OPTION ||
             run->notes[i].origin == WA_ORIGIN_OPTION)) {
            found = &run->notes[i];
        }
    }
    return found;
}
