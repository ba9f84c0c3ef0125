/* Quantities with units and standard uncertainties: parsing what an analyst writes, and printing
 * with the digits that the uncertainty deserves. */
#ifndef WHICHACID_QUANTITY_H
#define WHICHACID_QUANTITY_H

#include "whichacid/error.h"

/** What a number measures; each has one internal unit, given here. */
enum wa_dimension {
    WA_DIMENSION_NUMBER,        /**< plain number */
    WA_DIMENSION_MASS,          /**< g */
    WA_DIMENSION_VOLUME,        /**< mL */
    WA_DIMENSION_CONCENTRATION, /**< mol/L */
    WA_DIMENSION_TEMPERATURE,   /**< degree Celsius */
    WA_DIMENSION_PH,            /**< pH */
    WA_DIMENSION_VOLTAGE,       /**< mV */
    WA_DIMENSION_DENSITY,       /**< g/mL */
    WA_DIMENSION_FRACTION,      /**< 1 (a per cent is 0.01) */
    WA_DIMENSION_MOLAR_MASS,    /**< g/mol */
    WA_DIMENSION_TIME,          /**< s */
};

/** A value and its standard uncertainty (JCGM 100:2008, k = 1), in the dimension's unit above. */
struct wa_quantity {
    double value;
    double u;   /**< standard uncertainty; meaningful only when has_u */
    bool has_u; /**< whether the text stated an uncertainty */
};

/**
 * Parse "0.1023 ± 0.0002 mol/L" and its relatives: decimal point or comma, `±` or `+/-`, the unit
 * at the end or after each number, per cent or absolute uncertainty, units converted to the
 * dimension's own. A bare number takes the dimension's own unit.
 * @param[in]  text      UTF-8
 * @param[out] quantity  set only on success
 * @return WA_OK, or WA_ERROR_INPUT with a sentence naming the text and the units that are known
 */
enum wa_status wa_quantity_parse(const char *text, enum wa_dimension dimension,
                                 struct wa_quantity *quantity, struct wa_error *error) WA_MUST_USE;

/**
 * The same with words before or after: "0.1 mol/L KCl", "KCl, 0.1 mol/L", "50 mL (pipette)".
 * Text that reads as a whole is read as a whole.
 */
enum wa_status wa_quantity_parse_within(const char *text, enum wa_dimension dimension,
                                        struct wa_quantity *quantity,
                                        struct wa_error *error) WA_MUST_USE;

/**
 * Look for a number followed by a unit of that dimension among other words ("0.1 M NaOH").
 * @return whether one was found; a number without a unit does not count
 */
bool wa_quantity_find(const char *text, enum wa_dimension dimension, struct wa_quantity *quantity);

/** The dimension's own unit as printed ("mL", "g/mol", "" for a plain number). */
const char *wa_dimension_unit(enum wa_dimension dimension);

/**
 * Write "value ± u" with u to two significant digits and the value to the same place (JCGM
 * 100:2008, 7.2.6). u <= 0 or not finite: the value alone with six significant digits.
 * @param[out] text  always terminated
 */
void wa_quantity_format(char *text, size_t size, double value, double u);

#endif
