/* Text without a locale: folding of case and accents, trimming, and a growing string. */
#ifndef WHICHACID_BASE_TEXT_H
#define WHICHACID_BASE_TEXT_H

#include "whichacid/error.h"

#include <stdarg.h>

/** A growing string, always terminated once anything was appended. Zero-initialise. */
struct wa_text {
    char *bytes; /**< NULL while empty; free with wa_text_free, or take it over */
    size_t length;
    size_t capacity;
    bool failed; /**< memory ran out at some point; the text is then incomplete */
};

/** Append printf-style. A failure is remembered in text->failed, to be tested once at the end. */
void wa_text_append(struct wa_text *text, const char *format, ...) WA_PRINTF(2, 3);

/** Append `length` bytes as they are. */
void wa_text_append_bytes(struct wa_text *text, const char *bytes, size_t length);

/** Free and empty. */
void wa_text_free(struct wa_text *text);

/** A copy of `length` bytes, terminated; NULL when memory is out. */
char *wa_text_copy(const char *bytes, size_t length);

/**
 * Fold UTF-8 for comparing words: lower case, Latin accents off, both micro signs to "u",
 * superscript digits to digits, degree signs to "deg", dashes and the minus sign to "-", the
 * delta signs to "delta", Cyrillic letters that pass for Latin ones (and the "мл" of a millilitre)
 * to those, runs of white space to one space, none at either end.
 * @param[out] folded  always terminated; cut at `size`
 * @return length of the folded text
 */
size_t wa_text_fold(const char *text, size_t length, char *folded, size_t size);

/** Shrink [*start, *start + *length) so that no white space stands at either end. */
void wa_text_trim(const char **start, size_t *length);

/** Length in terminal columns of UTF-8 text, one column a code point. */
size_t wa_text_columns(const char *text);

#endif
