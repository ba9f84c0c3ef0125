/* Numbers as people write them, read without a locale. */
#ifndef WHICHACID_BASE_NUMBER_H
#define WHICHACID_BASE_NUMBER_H

#include <stdbool.h>
#include <stddef.h>

/** A number and how it was written. */
struct wa_number {
    double value;
    int decimals;     /**< digits after the decimal mark */
    int exponent;     /**< of ten, as written after e or E; 0 when none */
    char mark;        /**< '.', ',' or 0 for no decimal mark */
    bool plus;        /**< written with a leading plus sign */
    bool negative;    /**< written with a leading minus sign */
    bool grouped;     /**< written with a thousands separator; value is then not to be used */
    bool three_after; /**< exactly three digits follow the mark, at most three stand before it:
                           it could be a thousands separator */
};

/**
 * Read a number at the start of folded or ASCII text: sign, digits, decimal point or comma,
 * exponent (e, E or "x10^", "*10^").
 * @return bytes used, 0 when there is no number
 */
size_t wa_number_parse(const char *text, size_t length, struct wa_number *number);

#endif
