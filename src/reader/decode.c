/* Bytes to UTF-8: byte-order marks, UTF-16 without one, Latin-1; what is no text is named. */
#include "reader/reader_internal.h"

#include <errno.h>
#include <iconv.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Beginnings of files that people hand over by mistake. */
struct signature {
    const char *bytes;
    size_t length;
    const char *what;
};

static const struct signature signatures[] = {
    {"\x89PNG", 4, "an image (PNG); a picture of a curve cannot be read, give the table of points"},
    {"\xFF\xD8\xFF", 3,
     "an image (JPEG); a picture of a curve cannot be read, give the table of points"},
    {"GIF8", 4, "an image (GIF); a picture of a curve cannot be read, give the table of points"},
    {"BM", 2, "an image (BMP); a picture of a curve cannot be read, give the table of points"},
    {"II*\0", 4, "an image (TIFF); a picture of a curve cannot be read, give the table of points"},
    {"MM\0*", 4, "an image (TIFF); a picture of a curve cannot be read, give the table of points"},
    {"%PDF", 4, "a PDF document; copy its table of points into a text file"},
    {"PK\x03\x04", 4,
     "a spreadsheet workbook or another zip archive; save the sheet as CSV and give that"},
    {"\xD0\xCF\x11\xE0", 4,
     "an old spreadsheet workbook or document; save the sheet as CSV and give that"},
    {"\x1F\x8B", 2, "compressed (gzip); unpack it first"},
    {"\x7F"
     "ELF",
     4, "a program"},
};

static const char *signature_of(const char *bytes, size_t size)
{
    for (size_t i = 0; i < sizeof signatures / sizeof signatures[0]; i++) {
        const struct signature *signature = &signatures[i];
        /* "BM" may well begin a text: only with control bytes soon after is it an image. */
        bool short_mark = signature->length == 2 && size > 16 && memchr(bytes, 0, 16) == NULL;
        if (size >= signature->length && !short_mark &&
            memcmp(bytes, signature->bytes, signature->length) == 0) {
            return signature->what;
        }
    }
    return NULL;
}

/* Which half of the byte pairs is zero tells the byte order of Latin text in UTF-16. */
static const char *guess_utf16(const char *bytes, size_t size)
{
    size_t sample = size < 4096 ? size & ~(size_t)1 : 4096;
    size_t even = 0;
    size_t odd = 0;
    for (size_t i = 0; i + 1 < sample; i += 2) {
        even += bytes[i] == 0;
        odd += bytes[i + 1] == 0;
    }
    size_t pairs = sample / 2;
    if (pairs >= 4 && odd * 10 >= pairs * 8 && even * 20 <= pairs) {
        return "UTF-16LE";
    }
    if (pairs >= 4 && even * 10 >= pairs * 8 && odd * 20 <= pairs) {
        return "UTF-16BE";
    }
    return NULL;
}

static bool is_utf8(const char *text, size_t size)
{
    const unsigned char *bytes = (const unsigned char *)text;
    for (size_t i = 0; i < size;) {
        size_t more = bytes[i] < 0x80             ? 0
                      : (bytes[i] & 0xE0) == 0xC0 ? 1
                      : (bytes[i] & 0xF0) == 0xE0 ? 2
                      : (bytes[i] & 0xF8) == 0xF0 ? 3
                                                  : SIZE_MAX;
        if (more == SIZE_MAX || more >= size - i || (more == 1 && bytes[i] < 0xC2)) {
            return false;
        }
        for (size_t k = 1; k <= more; k++) {
            if ((bytes[i + k] & 0xC0) != 0x80) {
                return false;
            }
        }
        i += more + 1;
    }
    return true;
}

/* Bytes 0x80 to 0x9F are letters in Windows' code page and controls in Latin-1. */
static const char *guess_8bit(const char *bytes, size_t size)
{
    for (size_t i = 0; i < size; i++) {
        unsigned char byte = (unsigned char)bytes[i];
        if (byte >= 0x80 && byte <= 0x9F) {
            return "WINDOWS-1252";
        }
    }
    return "ISO-8859-1";
}

static enum wa_status convert(const char *from, const char *bytes, size_t size,
                              struct wa_decoded *decoded, struct wa_error *error)
{
    iconv_t conversion = iconv_open("UTF-8", from);
    size_t room = size * 3 + 4;
    char *text = malloc(room + 1);
    if (conversion == (iconv_t)-1 || text == NULL) {
        free(text);
        if (conversion != (iconv_t)-1) {
            iconv_close(conversion);
        }
        return wa_fail_memory(error);
    }
    char *in = (char *)(uintptr_t)bytes;
    char *out = text;
    size_t in_left = size;
    size_t out_left = room;
    while (in_left > 0 && iconv(conversion, &in, &in_left, &out, &out_left) == (size_t)-1 &&
           errno == EILSEQ && in_left > 0 && out_left > 0) {
        /* A byte without a meaning must not hide the rest: a question mark stands for it. */
        size_t unit = from[0] == 'U' && in_left > 1 ? 2 : 1;
        in += unit;
        in_left -= unit;
        *out++ = '?';
        out_left--;
    }
    iconv_close(conversion);
    decoded->text = text;
    decoded->length = room - out_left;
    text[decoded->length] = '\0';
    snprintf(decoded->encoding, sizeof decoded->encoding, "%s", from);
    return WA_OK;
}

/* CRLF and lone CR become LF; no-break and thin spaces become spaces; byte-order marks go. */
static void normalise(struct wa_decoded *decoded)
{
    char *text = decoded->text;
    size_t length = decoded->length;
    size_t to = 0;
    for (size_t at = 0; at < length; at++) {
        unsigned char byte = (unsigned char)text[at];
        if (byte == '\r') {
            while (at + 1 < length && text[at + 1] == '\r' && at + 2 < length &&
                   text[at + 2] == '\n') {
                at++;
            }
            at += at + 1 < length && text[at + 1] == '\n';
            text[to++] = '\n';
        } else if (byte == '\v' || byte == '\f') {
            text[to++] = ' ';
        } else if (byte == 0xC2 && at + 1 < length && (unsigned char)text[at + 1] == 0xA0) {
            text[to++] = ' ';
            at++;
        } else if (byte == 0xE2 && at + 2 < length && (unsigned char)text[at + 1] == 0x80 &&
                   ((unsigned char)text[at + 2] == 0xAF || (unsigned char)text[at + 2] == 0x89)) {
            text[to++] = ' ';
            at += 2;
        } else if (byte == 0xEF && at + 2 < length && (unsigned char)text[at + 1] == 0xBB &&
                   (unsigned char)text[at + 2] == 0xBF) {
            at += 2;
        } else {
            text[to++] = (char)byte;
        }
    }
    text[to] = '\0';
    decoded->length = to;
}

static bool has_control_bytes(const struct wa_decoded *decoded)
{
    size_t controls = 0;
    for (size_t i = 0; i < decoded->length; i++) {
        unsigned char byte = (unsigned char)decoded->text[i];
        if (byte == 0) {
            return true;
        }
        controls += byte < 0x20 && byte != '\n' && byte != '\t';
    }
    return controls > 4 + decoded->length / 1000;
}

static enum wa_status take_as_is(const char *bytes, size_t size, struct wa_decoded *decoded,
                                 struct wa_error *error)
{
    decoded->text = wa_text_copy(bytes, size);
    decoded->length = size;
    snprintf(decoded->encoding, sizeof decoded->encoding, "UTF-8");
    return decoded->text == NULL ? wa_fail_memory(error) : WA_OK;
}

enum wa_status wa_reader_decode(const char *bytes, size_t size, const char *name,
                                struct wa_decoded *decoded, struct wa_error *error)
{
    *decoded = (struct wa_decoded){0};
    const unsigned char *start = (const unsigned char *)bytes;
    const char *what = signature_of(bytes, size);
    if (size == 0) {
        return wa_fail(error, WA_ERROR_INPUT, name, 0,
                       "The file is empty; give a table with a volume and a reading.");
    }
    if (what != NULL) {
        return wa_fail(error, WA_ERROR_INPUT, name, 0, "The file is %s.", what);
    }
    const char *utf16 = size >= 2 && start[0] == 0xFF && start[1] == 0xFE   ? "UTF-16LE"
                        : size >= 2 && start[0] == 0xFE && start[1] == 0xFF ? "UTF-16BE"
                                                                            : NULL;
    utf16 = utf16 != NULL ? utf16 : guess_utf16(bytes, size);
    enum wa_status status;
    if (utf16 != NULL) {
        status = convert(utf16, bytes, size, decoded, error);
    } else if (is_utf8(bytes, size)) {
        status = take_as_is(bytes, size, decoded, error);
    } else {
        status = convert(guess_8bit(bytes, size), bytes, size, decoded, error);
    }
    if (status != WA_OK) {
        return status;
    }
    normalise(decoded);
    if (has_control_bytes(decoded)) {
        free(decoded->text);
        *decoded = (struct wa_decoded){0};
        return wa_fail(error, WA_ERROR_INPUT, name, 0,
                       "The file is not text; give the table of points as a text file such as "
                       "CSV.");
    }
    return WA_OK;
}
