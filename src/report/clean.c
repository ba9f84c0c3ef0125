/* Clean text, and how wide a terminal draws it. */
#include "report/report_internal.h"

#include "base/clean.h"

#include <stdint.h>

void report_clean(struct wa_text *clean, const char *text, bool for_terminal)
{
    wa_text_clean(clean, text, for_terminal);
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
    size_t length = wa_utf8_sequence(text, &point);
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
