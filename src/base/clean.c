#include "base/clean.h"

static const char replacement[] = "\xEF\xBF\xBD"; /* U+FFFD */

size_t wa_utf8_sequence(const char *bytes, uint32_t *point)
{
    const unsigned char *text = (const unsigned char *)bytes;
    if (text[0] < 0x80) {
        *point = text[0];
        return 1;
    }
    size_t length = text[0] >= 0xF0 ? 4 : text[0] >= 0xE0 ? 3 : 2;
    if (text[0] < 0xC2 || text[0] > 0xF4) {
        return 0;
    }
    *point = text[0] & (0xFFu >> (length + 1));
    for (size_t i = 1; i < length; i++) {
        if ((text[i] & 0xC0) != 0x80) {
            return 0;
        }
        *point = (*point << 6) | (text[i] & 0x3Fu);
    }
    static const uint32_t least[5] = {0, 0, 0x80, 0x800, 0x10000};
    bool surrogate = *point >= 0xD800 && *point <= 0xDFFF;
    return *point < least[length] || *point > 0x10FFFF || surrogate ? 0 : length;
}

/* Controls, and the characters that turn the direction of writing. */
static bool is_harmful(uint32_t point)
{
    return point < 0x20 || (point >= 0x7F && point < 0xA0) || point == 0x061C ||
           (point >= 0x200B && point <= 0x200F) || (point >= 0x2028 && point <= 0x202E) ||
           (point >= 0x2060 && point <= 0x206F) || point == 0xFEFF;
}

void wa_text_clean(struct wa_text *clean, const char *text, bool harmless)
{
    wa_text_append_bytes(clean, "", 0);
    for (const char *at = text; *at != '\0';) {
        uint32_t point = 0;
        size_t length = wa_utf8_sequence(at, &point);
        if (harmless && length == 1 && (*at == '\t' || *at == '\n' || *at == '\r')) {
            wa_text_append_bytes(clean, " ", 1);
        } else if (length == 0 || (harmless && is_harmful(point))) {
            wa_text_append_bytes(clean, replacement, sizeof replacement - 1);
        } else {
            wa_text_append_bytes(clean, at, length);
        }
        at += length == 0 ? 1 : length;
    }
}
