/* Text from files is hostile until proven otherwise: valid UTF-8 for JSON, harmless for terminals.
 */
#include "report/report_internal.h"

#include <stdint.h>
#include <string.h>

static const char replacement[] = "\xEF\xBF\xBD"; /* U+FFFD */

/* Bytes of the well-formed sequence at `text` (Unicode Standard, table 3-7), 0 when it is none. */
static size_t sequence_length(const unsigned char *text, uint32_t *point)
{
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

void report_clean(struct wa_text *clean, const char *text, bool for_terminal)
{
    wa_text_append_bytes(clean, "", 0);
    for (const unsigned char *at = (const unsigned char *)text; *at != '\0';) {
        uint32_t point = 0;
        size_t length = sequence_length(at, &point);
        if (for_terminal && length == 1 && (*at == '\t' || *at == '\n' || *at == '\r')) {
            wa_text_append_bytes(clean, " ", 1);
        } else if (length == 0 || (for_terminal && is_harmful(point))) {
            wa_text_append_bytes(clean, replacement, sizeof replacement - 1);
        } else {
            wa_text_append_bytes(clean, (const char *)at, length);
        }
        at += length == 0 ? 1 : length;
    }
}

struct range {
    uint32_t first, last;
};

/* Blocks that terminals draw two columns wide (Unicode Standard Annex 11, whole blocks). */
static const struct range wide[] = {
    {0x1100, 0x115F},   {0x2E80, 0x303E},   {0x3041, 0xA4CF},   {0xA960, 0xA97F},
    {0xAC00, 0xD7A3},   {0xF900, 0xFAFF},   {0xFE30, 0xFE6F},   {0xFF00, 0xFF60},
    {0xFFE0, 0xFFE6},   {0x1F300, 0x1F64F}, {0x1F680, 0x1F6FF}, {0x1F900, 0x1FAFF},
    {0x20000, 0x3FFFD},
};

/* Blocks of combining marks, which take no column of their own. */
static const struct range combining[] = {
    {0x0300, 0x036F}, {0x1AB0, 0x1AFF}, {0x1DC0, 0x1DFF},
    {0x20D0, 0x20FF}, {0xFE00, 0xFE0F}, {0xFE20, 0xFE2F},
};

static bool is_among(uint32_t point, const struct range *ranges, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        if (point >= ranges[i].first && point <= ranges[i].last) {
            return true;
        }
    }
    return false;
}

size_t report_point_columns(const char *text, size_t *bytes)
{
    uint32_t point = 0;
    size_t length = sequence_length((const unsigned char *)text, &point);
    *bytes = length == 0 ? 1 : length;
    if (is_among(point, combining, sizeof combining / sizeof combining[0])) {
        return 0;
    }
    return is_among(point, wide, sizeof wide / sizeof wide[0]) ? 2 : 1;
}

size_t report_columns(const char *text)
{
    size_t columns = 0;
    for (size_t bytes = 0; *text != '\0'; text += bytes) {
        columns += report_point_columns(text, &bytes);
    }
    return columns;
}
