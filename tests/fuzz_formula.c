/* Fuzz target: any bytes as a chemical formula. Nothing may crash, and a molar mass that is given
 * is positive. */
#include "whichacid/reference.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

static struct wa_table table;

static void load_table_once(void)
{
    struct wa_error error;
    if (table.storage == NULL &&
        wa_table_load(WHICHACID_REFERENCE_DIR, NULL, 0, &table, &error) != WA_OK) {
        abort();
    }
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    load_table_once();
    char *formula = malloc(size + 1);
    if (formula == NULL) {
        return 0;
    }
    memcpy(formula, bytes, size);
    formula[size] = '\0';
    struct wa_error error;
    double molar_mass = NAN;
    double u = NAN;
    if (wa_table_molar_mass(&table, formula, &molar_mass, &u, &error) == WA_OK &&
        !(molar_mass > 0.0 && u >= 0.0)) {
        abort();
    }
    free(formula);
    return 0;
}
