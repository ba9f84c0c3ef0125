#include "base/number.h"

#include <math.h>
#include <stdint.h>
#include <string.h>

/* Exact in a double; a quotient or product with one of these rounds once (Clinger 1990). */
static const double exact_powers[] = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                      1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                                      1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};

static double scale(uint64_t mantissa, int power)
{
    if (mantissa < (UINT64_C(1) << 53) && power >= -22 && power <= 22) {
        return power < 0 ? (double)mantissa / exact_powers[-power]
                         : (double)mantissa * exact_powers[power];
    }
    return (double)((long double)mantissa * powl(10.0L, (long double)power));
}

static bool is_digit(char byte)
{
    return byte >= '0' && byte <= '9';
}

/* The digits read so far; beyond 18 significant ones only the magnitude counts. */
struct digits {
    uint64_t mantissa;
    int significant;
    int dropped;
    int count;
};

static void take_digit(struct digits *digits, char byte)
{
    digits->count++;
    if (digits->significant < 18) {
        digits->mantissa = 10 * digits->mantissa + (uint64_t)(byte - '0');
        digits->significant += digits->mantissa != 0;
    } else {
        digits->dropped++;
    }
}

static size_t take_digits(const char *text, size_t length, size_t at, struct digits *digits)
{
    while (at < length && is_digit(text[at])) {
        take_digit(digits, text[at++]);
    }
    return at;
}

/* Three digits that are not followed by a fourth. */
static bool three_digits_at(const char *text, size_t length, size_t at)
{
    return at + 3 <= length && is_digit(text[at]) && is_digit(text[at + 1]) &&
           is_digit(text[at + 2]) && !(at + 3 < length && is_digit(text[at + 3]));
}

/* "e-05", "E+01", "x10^-5", "*10^-5"; returns `at` unchanged when there is none. */
static size_t take_exponent(const char *text, size_t length, size_t at, int *exponent)
{
    size_t start = at;
    if (at < length && (text[at] == 'e' || text[at] == 'E')) {
        at++;
    } else if (at + 4 < length && (text[at] == 'x' || text[at] == '*') &&
               memcmp(text + at + 1, "10^", 3) == 0) {
        at += 4;
    } else {
        return start;
    }
    bool negative = at < length && text[at] == '-';
    at += at < length && (text[at] == '-' || text[at] == '+');
    if (at >= length || !is_digit(text[at])) {
        return start;
    }
    int value = 0;
    for (; at < length && is_digit(text[at]); at++) {
        value = value < 1000 ? 10 * value + (text[at] - '0') : value;
    }
    *exponent = negative ? -value : value;
    return at;
}

/* A second mark, or an apostrophe, with groups of three: 1,234.5 or 1.234,5 or 1'234. */
static size_t take_groups(const char *text, size_t length, size_t at, struct wa_number *number)
{
    while (at < length && (text[at] == '.' || text[at] == ',' || text[at] == '\'') &&
           at + 1 < length && is_digit(text[at + 1])) {
        number->grouped = true;
        at++;
        while (at < length && is_digit(text[at])) {
            at++;
        }
    }
    return at;
}

size_t wa_number_parse(const char *text, size_t length, struct wa_number *number)
{
    *number = (struct wa_number){0};
    size_t at = 0;
    if (at < length && (text[at] == '+' || text[at] == '-')) {
        number->plus = text[at] == '+';
        number->negative = text[at] == '-';
        at++;
        while (at < length && text[at] == ' ') {
            at++;
        }
    }
    struct digits digits = {0};
    size_t before_start = at;
    at = take_digits(text, length, at, &digits);
    int before = digits.count;
    bool leading_zero = before > 0 && text[before_start] == '0';
    if (at < length && (text[at] == '.' || text[at] == ',') &&
        (before > 0 || (at + 1 < length && is_digit(text[at + 1])))) {
        number->mark = text[at];
        number->three_after =
            before > 0 && before <= 3 && !leading_zero && three_digits_at(text, length, at + 1);
        at = take_digits(text, length, at + 1, &digits);
        number->decimals = digits.count - before;
    }
    if (digits.count == 0) {
        return 0;
    }
    if (number->mark == 0 || number->three_after) {
        at = take_groups(text, length, at, number);
    }
    at = take_exponent(text, length, at, &number->exponent);
    double value = scale(digits.mantissa, number->exponent - number->decimals + digits.dropped);
    number->value = number->negative ? -value : value;
    return at;
}
