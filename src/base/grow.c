#include "base/grow.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

bool wa_grow(void *array, size_t *capacity, size_t needed, size_t element_size)
{
    if (needed <= *capacity) {
        return true;
    }
    size_t wanted = *capacity < 8 ? 8 : *capacity;
    while (wanted < needed) {
        if (wanted > SIZE_MAX / 2) {
            return false;
        }
        wanted *= 2;
    }
    if (wanted > SIZE_MAX / element_size) {
        return false;
    }
    /* The pointer is copied byte by byte because its type is the caller's. */
    void *old;
    memcpy(&old, array, sizeof old);
    void *grown = realloc(old, wanted * element_size);
    if (grown == NULL) {
        return false;
    }
    memcpy(array, &grown, sizeof grown);
    *capacity = wanted;
    return true;
}
