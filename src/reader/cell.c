/* What one cell holds: a number, its unit, or words. */
#include "reader/reader_internal.h"

#include "base/number.h"

#include <string.h>

struct unit_name {
    const char *name;
    enum wa_unit unit;
};

/* Folded as wa_text_fold does. */
static const struct unit_name unit_names[] = {
    {"ml", WA_UNIT_ML},          {"cm3", WA_UNIT_ML},
    {"cm^3", WA_UNIT_ML},        {"cm**3", WA_UNIT_ML},
    {"ccm", WA_UNIT_ML},         {"cc", WA_UNIT_ML},
    {"mls", WA_UNIT_ML},         {"milliliter", WA_UNIT_ML},
    {"milliliters", WA_UNIT_ML}, {"millilitre", WA_UNIT_ML},
    {"millilitres", WA_UNIT_ML}, {"mililitro", WA_UNIT_ML},
    {"mililitros", WA_UNIT_ML},  {"millilitro", WA_UNIT_ML},
    {"millilitri", WA_UNIT_ML},  {"ul", WA_UNIT_UL},
    {"mcl", WA_UNIT_UL},         {"mm3", WA_UNIT_UL},
    {"mm^3", WA_UNIT_UL},        {"microliter", WA_UNIT_UL},
    {"microliters", WA_UNIT_UL}, {"microlitre", WA_UNIT_UL},
    {"microlitres", WA_UNIT_UL}, {"mikroliter", WA_UNIT_UL},
    {"microlitros", WA_UNIT_UL}, {"cl", WA_UNIT_CL},
    {"dl", WA_UNIT_DL},          {"l", WA_UNIT_L},
    {"dm3", WA_UNIT_L},          {"dm^3", WA_UNIT_L},
    {"liter", WA_UNIT_L},        {"liters", WA_UNIT_L},
    {"litre", WA_UNIT_L},        {"litres", WA_UNIT_L},
    {"litro", WA_UNIT_L},        {"litros", WA_UNIT_L},
    {"drop", WA_UNIT_DROP},      {"drops", WA_UNIT_DROP},
    {"tropfen", WA_UNIT_DROP},   {"goutte", WA_UNIT_DROP},
    {"gouttes", WA_UNIT_DROP},   {"gota", WA_UNIT_DROP},
    {"gotas", WA_UNIT_DROP},     {"goccia", WA_UNIT_DROP},
    {"gocce", WA_UNIT_DROP},     {"druppel", WA_UNIT_DROP},
    {"druppels", WA_UNIT_DROP},  {"ph", WA_UNIT_PH},
    {"ph units", WA_UNIT_PH},    {"mv", WA_UNIT_MV},
    {"millivolt", WA_UNIT_MV},   {"millivolts", WA_UNIT_MV},
    {"v", WA_UNIT_VOLT},         {"volt", WA_UNIT_VOLT},
    {"volts", WA_UNIT_VOLT},     {"s", WA_UNIT_SECOND},
    {"sec", WA_UNIT_SECOND},     {"secs", WA_UNIT_SECOND},
    {"seconds", WA_UNIT_SECOND}, {"sek", WA_UNIT_SECOND},
    {"min", WA_UNIT_MINUTE},     {"mins", WA_UNIT_MINUTE},
    {"minutes", WA_UNIT_MINUTE}, {"h", WA_UNIT_HOUR},
    {"hr", WA_UNIT_HOUR},        {"hours", WA_UNIT_HOUR},
    {"degc", WA_UNIT_CELSIUS},   {"deg c", WA_UNIT_CELSIUS},
    {"c", WA_UNIT_CELSIUS},      {"celsius", WA_UNIT_CELSIUS},
    {"k", WA_UNIT_KELVIN},       {"kelvin", WA_UNIT_KELVIN},
    {"g", WA_UNIT_GRAM},         {"gram", WA_UNIT_GRAM},
    {"grams", WA_UNIT_GRAM},
};

enum wa_unit wa_unit_find(const char *folded, size_t length)
{
    for (size_t i = 0; i < sizeof unit_names / sizeof unit_names[0]; i++) {
        if (strncmp(unit_names[i].name, folded, length) == 0 &&
            unit_names[i].name[length] == '\0') {
            return unit_names[i].unit;
        }
    }
    return WA_UNIT_NONE;
}

double wa_unit_factor(enum wa_unit unit)
{
    switch (unit) {
    case WA_UNIT_UL:
        return 1e-3;
    case WA_UNIT_CL:
        return 10;
    case WA_UNIT_DL:
        return 100;
    case WA_UNIT_L:
    case WA_UNIT_VOLT:
        return 1e3;
    case WA_UNIT_MINUTE:
        return 60;
    case WA_UNIT_HOUR:
        return 3600;
    default:
        return 1;
    }
}

const char *wa_unit_name(enum wa_unit unit)
{
    static const char *const names[] = {"",   "mL", "µL", "cL",  "dL", "L",  "drops", "pH",
                                        "mV", "V",  "s",  "min", "h",  "°C", "K",     "g"};
    return names[unit];
}

bool wa_unit_is_volume(enum wa_unit unit)
{
    return unit >= WA_UNIT_ML && unit <= WA_UNIT_DROP;
}

bool wa_unit_is_voltage(enum wa_unit unit)
{
    return unit == WA_UNIT_MV || unit == WA_UNIT_VOLT;
}

bool wa_unit_is_time(enum wa_unit unit)
{
    return unit >= WA_UNIT_SECOND && unit <= WA_UNIT_HOUR;
}

bool wa_unit_is_temperature(enum wa_unit unit)
{
    return unit == WA_UNIT_CELSIUS || unit == WA_UNIT_KELVIN;
}

static bool is_digit(char byte)
{
    return byte >= '0' && byte <= '9';
}

/* After "1", the " 234,5" of a number whose thousands are set off by a space. */
static bool is_spaced_group(const char *rest)
{
    return rest[0] == ' ' && is_digit(rest[1]) && is_digit(rest[2]) && is_digit(rest[3]) &&
           !is_digit(rest[4]);
}

static struct wa_cell_value from_number(const struct wa_number *number)
{
    /* No volume, reading or time is that large; it also keeps sums finite. */
    if (!(number->value < 1e12 && number->value > -1e12)) {
        return (struct wa_cell_value){.kind = WA_CELL_WORDS};
    }
    return (struct wa_cell_value){
        .kind = number->grouped ? WA_CELL_GROUPED : WA_CELL_NUMBER,
        .value = number->value,
        .decimals = number->decimals > number->exponent ? number->decimals - number->exponent : 0,
        .mark = number->mark,
        .plus = number->plus,
        .three_after = number->three_after,
    };
}

/* "ph 5.31", "ph = 5.31", "v = 2.0 ml": people label what stands in the cell. */
static const char *skip_label(const char *text, enum wa_unit *unit)
{
    static const char *const labels[] = {"ph", "v", "e"};
    *unit = WA_UNIT_NONE;
    for (size_t i = 0; i < sizeof labels / sizeof labels[0]; i++) {
        size_t length = strlen(labels[i]);
        if (strncmp(text, labels[i], length) != 0) {
            continue;
        }
        const char *after = text + length;
        bool separated = *after == ' ' || *after == '=' || *after == ':';
        while (*after == ' ' || *after == '=' || *after == ':') {
            after++;
        }
        if (separated && (is_digit(*after) || *after == '-' || *after == '+')) {
            *unit = i == 0 ? WA_UNIT_PH : WA_UNIT_NONE;
            return after;
        }
    }
    return text;
}

/* What follows the number: nothing, stars, a unit. Anything else makes the cell words. */
static void finish(struct wa_cell_value *cell, const char *rest, enum wa_unit label)
{
    if (is_spaced_group(rest)) {
        cell->kind = WA_CELL_GROUPED;
        return;
    }
    size_t length = strlen(rest);
    /* A backslash or two end a row of a typeset table. */
    while (length > 0 && strchr("* \\", rest[length - 1]) != NULL) {
        cell->starred = cell->starred || rest[length - 1] == '*';
        length--;
    }
    while (length > 0 && *rest == ' ') {
        rest++;
        length--;
    }
    bool bracketed = length > 2 && (rest[0] == '(' || rest[0] == '[');
    cell->unit = bracketed ? wa_unit_find(rest + 1, length - 2) : wa_unit_find(rest, length);
    if (length > 0 && cell->unit == WA_UNIT_NONE) {
        cell->kind = WA_CELL_WORDS;
    } else if (length == 0) {
        cell->unit = label;
    }
}

/* The longer way, for anything beyond plain digits. */
static struct wa_cell_value parse_folded(const char *text, size_t length)
{
    struct wa_cell_value words = {.kind = WA_CELL_WORDS};
    char folded[80];
    if (length >= sizeof folded - 8) {
        return words;
    }
    size_t folded_length = wa_text_fold(text, length, folded, sizeof folded);
    const char *at = folded;
    /* ="5.31" is how some programs force a spreadsheet to keep the text. */
    if (at[0] == '=' && at[1] == '"' && folded[folded_length - 1] == '"' && folded_length > 3) {
        folded[folded_length - 1] = '\0';
        at += 2;
    }
    if (*at == '<' || *at == '>') {
        return (struct wa_cell_value){.kind = WA_CELL_LIMIT};
    }
    enum wa_unit label;
    at = skip_label(at, &label);
    struct wa_number number;
    size_t used = wa_number_parse(at, strlen(at), &number);
    if (used == 0) {
        return words;
    }
    struct wa_cell_value cell = from_number(&number);
    finish(&cell, at + used, label);
    return cell;
}

bool wa_cell_is_numeric(const struct wa_cell_value *value)
{
    return value->kind == WA_CELL_NUMBER || value->kind == WA_CELL_GROUPED;
}

struct wa_cell_value wa_cell_parse(const char *text, size_t length)
{
    wa_text_trim(&text, &length);
    if (length == 0) {
        return (struct wa_cell_value){.kind = WA_CELL_EMPTY};
    }
    struct wa_number number;
    if (wa_number_parse(text, length, &number) == length) {
        return from_number(&number);
    }
    return parse_folded(text, length);
}
