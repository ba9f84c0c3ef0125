/* Text from files is hostile until proven otherwise: valid UTF-8 for data, harmless for people. */
#ifndef WHICHACID_BASE_CLEAN_H
#define WHICHACID_BASE_CLEAN_H

#include "base/text.h"

#include <stdint.h>

/**
 * Bytes of the well-formed UTF-8 sequence at `bytes` (Unicode Standard, table 3-7), 0 when it is
 * none.
 * @param[out] point  its code point
 */
size_t wa_utf8_sequence(const char *bytes, uint32_t *point);

/**
 * Append text as valid UTF-8. What is no UTF-8 becomes U+FFFD.
 * @param[in] harmless  control characters and those that turn the direction of writing become
 * U+FFFD too (line ends and tabs a space)
 */
void wa_text_clean(struct wa_text *clean, const char *text, bool harmless);

#endif
