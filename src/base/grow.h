/* Growing arrays: one rule for every room, so that no room multiplies sizes by hand. */
#ifndef WHICHACID_BASE_GROW_H
#define WHICHACID_BASE_GROW_H

#include "whichacid/error.h"

/**
 * Make room for at least `needed` elements, doubling the capacity.
 * @param[in,out] array     address of the array pointer (NULL at first)
 * @param[in,out] capacity  elements that fit now
 * @return false when memory is out; array and capacity are then unchanged
 */
bool wa_grow(void *array, size_t *capacity, size_t needed, size_t element_size) WA_MUST_USE;

#endif
