#include "base/text.h"

#include "base/grow.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void wa_text_append_bytes(struct wa_text *text, const char *bytes, size_t length)
{
    if (text->failed || !wa_grow(&text->bytes, &text->capacity, text->length + length + 1, 1)) {
        text->failed = true;
        return;
    }
    memcpy(text->bytes + text->length, bytes, length);
    text->length += length;
    text->bytes[text->length] = '\0';
}

void wa_text_append(struct wa_text *text, const char *format, ...)
{
    va_list arguments;
    va_start(arguments, format);
    va_list again;
    va_copy(again, arguments);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    if (length < 0 || text->failed ||
        !wa_grow(&text->bytes, &text->capacity, text->length + (size_t)length + 1, 1)) {
        text->failed = true;
    } else {
        vsnprintf(text->bytes + text->length, (size_t)length + 1, format, again);
        text->length += (size_t)length;
    }
    va_end(again);
}

void wa_text_free(struct wa_text *text)
{
    free(text->bytes);
    *text = (struct wa_text){0};
}

char *wa_text_copy(const char *bytes, size_t length)
{
    char *copy = malloc(length + 1);
    if (copy != NULL) {
        memcpy(copy, bytes, length);
        copy[length] = '\0';
    }
    return copy;
}

/* One code point of UTF-8; a byte that fits no sequence stands for itself. */
static size_t decode_point(const unsigned char *bytes, size_t length, uint32_t *point)
{
    static const uint32_t first_mask[5] = {0, 0x7F, 0x1F, 0x0F, 0x07};
    size_t size = bytes[0] < 0x80   ? 1
                  : bytes[0] < 0xC0 ? 0
                  : bytes[0] < 0xE0 ? 2
                  : bytes[0] < 0xF0 ? 3
                                    : 4;
    if (size == 0 || size > length) {
        *point = bytes[0];
        return 1;
    }
    *point = bytes[0] & first_mask[size];
    for (size_t i = 1; i < size; i++) {
        *point = (*point << 6) | (bytes[i] & 0x3Fu);
    }
    return size;
}

/* Base letters of U+00C0 to U+00FF; 0 where a table entry below says more. */
static const char latin_base[64] = {'a', 'a', 'a', 'a', 'a', 'a', 0,   'c', 'e', 'e', 'e', 'e', 'i',
                                    'i', 'i', 'i', 'd', 'n', 'o', 'o', 'o', 'o', 'o', 'x', 'o', 'u',
                                    'u', 'u', 'u', 'y', 0,   0,   'a', 'a', 'a', 'a', 'a', 'a', 0,
                                    'c', 'e', 'e', 'e', 'e', 'i', 'i', 'i', 'i', 'd', 'n', 'o', 'o',
                                    'o', 'o', 'o', '/', 'o', 'u', 'u', 'u', 'u', 'y', 0,   'y'};

struct replacement {
    uint32_t point;
    const char *text;
};

static const struct replacement replacements[] = {
    {0x00B5, "u"},     {0x03BC, "u"},    {0x00B2, "2"},  {0x00B3, "3"},     {0x00B9, "1"},
    {0x2070, "0"},     {0x2080, "0"},    {0x2081, "1"},  {0x2082, "2"},     {0x2083, "3"},
    {0x2084, "4"},     {0x2074, "4"},    {0x207B, "-"},  {0x207A, "+"},     {0x00B0, "deg"},
    {0x00BA, "deg"},   {0x2103, "degc"}, {0x2212, "-"},  {0x2013, "-"},     {0x2014, "-"},
    {0x2010, "-"},     {0x2011, "-"},    {0x00AD, ""},   {0x0394, "delta"}, {0x2206, "delta"},
    {0x03B4, "delta"}, {0x00C6, "ae"},   {0x00E6, "ae"}, {0x00DF, "ss"},    {0x00DE, "th"},
    {0x00FE, "th"},    {0x0152, "oe"},   {0x0153, "oe"}, {0x00B7, "*"},     {0x22C5, "*"},
    {0x2219, "*"},     {0x00D7, "*"},    {0x00A0, " "},  {0x202F, " "},     {0x2009, " "},
    {0x200B, ""},      {0xFEFF, ""},     {0x2113, "l"},  {0x2215, "/"},     {0x2044, "/"},
    {0x2019, "'"},     {0x2018, "'"},    {0x2032, "'"},  {0x00B1, "+/-"},   {0x2202, "d"},
    {0x0430, "a"},     {0x0410, "a"},    {0x0441, "c"},  {0x0421, "c"},     {0x043E, "o"},
    {0x041E, "o"},     {0x0440, "p"},    {0x0420, "p"},  {0x043D, "h"},     {0x041D, "h"},
    {0x043C, "m"},     {0x041C, "m"},    {0x043B, "l"},  {0x041B, "l"},     {0x33D6, "mol"},
    {0x3396, "ml"},    {0x3395, "ul"},
};

static const char *replacement_of(uint32_t point)
{
    for (size_t i = 0; i < sizeof replacements / sizeof replacements[0]; i++) {
        if (replacements[i].point == point) {
            return replacements[i].text;
        }
    }
    return NULL;
}

/* Where the folded text grows, one byte at a time, with white space collapsed. */
struct folding {
    char *folded;
    size_t size;
    size_t length;
    bool space_pending;
};

static void fold_byte(struct folding *folding, char byte)
{
    if (byte == ' ' || byte == '\t' || byte == '\n' || byte == '\r' || byte == '\v' ||
        byte == '\f') {
        folding->space_pending = folding->length > 0;
        return;
    }
    if (folding->space_pending && folding->length + 1 < folding->size) {
        folding->folded[folding->length++] = ' ';
    }
    folding->space_pending = false;
    if (folding->length + 1 < folding->size) {
        folding->folded[folding->length++] = byte;
    }
}

size_t wa_text_fold(const char *text, size_t length, char *folded, size_t size)
{
    struct folding folding = {.folded = folded, .size = size};
    if (size == 0) {
        return 0;
    }
    for (size_t at = 0; at < length;) {
        uint32_t point;
        size_t step = decode_point((const unsigned char *)text + at, length - at, &point);
        const char *replacement = point < 0x80 ? NULL : replacement_of(point);
        if (point < 0x80) {
            fold_byte(&folding, (char)(point >= 'A' && point <= 'Z' ? point + 32 : point));
        } else if (replacement != NULL) {
            for (; *replacement != '\0'; replacement++) {
                fold_byte(&folding, *replacement);
            }
        } else if (point >= 0xC0 && point <= 0xFF && latin_base[point - 0xC0] != 0) {
            fold_byte(&folding, latin_base[point - 0xC0]);
        } else {
            for (size_t i = 0; i < step; i++) {
                fold_byte(&folding, text[at + i]);
            }
        }
        at += step;
    }
    folded[folding.length] = '\0';
    return folding.length;
}

static bool is_space(char byte)
{
    return byte == ' ' || (byte >= '\t' && byte <= '\r');
}

void wa_text_trim(const char **start, size_t *length)
{
    while (*length > 0 && is_space(**start)) {
        ++*start;
        --*length;
    }
    while (*length > 0 && is_space((*start)[*length - 1])) {
        --*length;
    }
}

size_t wa_text_columns(const char *text)
{
    size_t columns = 0;
    for (; *text != '\0'; text++) {
        columns += ((unsigned char)*text & 0xC0) != 0x80;
    }
    return columns;
}
