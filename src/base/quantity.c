#include "whichacid/quantity.h"

#include "base/number.h"
#include "base/text.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* One unit as folded text, and how a number in it becomes one in the dimension's own unit. */
struct unit {
    enum wa_dimension dimension;
    const char *name;
    double factor;
    double shift; /* added after the factor; not for uncertainties */
};

static const struct unit units[] = {
    {WA_DIMENSION_MASS, "g", 1, 0},
    {WA_DIMENSION_MASS, "mg", 1e-3, 0},
    {WA_DIMENSION_MASS, "ug", 1e-6, 0},
    {WA_DIMENSION_MASS, "kg", 1e3, 0},
    {WA_DIMENSION_MASS, "gram", 1, 0},
    {WA_DIMENSION_MASS, "grams", 1, 0},
    {WA_DIMENSION_MASS, "gramm", 1, 0},
    {WA_DIMENSION_VOLUME, "ml", 1, 0},
    {WA_DIMENSION_VOLUME, "ul", 1e-3, 0},
    {WA_DIMENSION_VOLUME, "cl", 10, 0},
    {WA_DIMENSION_VOLUME, "dl", 100, 0},
    {WA_DIMENSION_VOLUME, "l", 1e3, 0},
    {WA_DIMENSION_VOLUME, "cm3", 1, 0},
    {WA_DIMENSION_VOLUME, "cm^3", 1, 0},
    {WA_DIMENSION_VOLUME, "ccm", 1, 0},
    {WA_DIMENSION_VOLUME, "cc", 1, 0},
    {WA_DIMENSION_VOLUME, "dm3", 1e3, 0},
    {WA_DIMENSION_VOLUME, "dm^3", 1e3, 0},
    {WA_DIMENSION_VOLUME, "mm3", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "mol/l", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mmol/l", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "umol/l", 1e-6, 0},
    {WA_DIMENSION_CONCENTRATION, "mmol/ml", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol/dm3", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol/dm^3", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mmol/dm3", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "mol/m3", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "mol l-1", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol*l-1", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol l^-1", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mmol l-1", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "mmol*l-1", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "mol dm-3", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol*dm-3", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mol dm^-3", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "m", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "mm", 1e-3, 0},
    {WA_DIMENSION_CONCENTRATION, "n", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "eq/l", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "val/l", 1, 0},
    {WA_DIMENSION_CONCENTRATION, "molar", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "degc", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "c", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "deg c", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "deg", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "celsius", 1, 0},
    {WA_DIMENSION_TEMPERATURE, "k", 1, -273.15},
    {WA_DIMENSION_TEMPERATURE, "degf", 5.0 / 9.0, -160.0 / 9.0},
    {WA_DIMENSION_PH, "ph", 1, 0},
    {WA_DIMENSION_VOLTAGE, "mv", 1, 0},
    {WA_DIMENSION_VOLTAGE, "v", 1e3, 0},
    {WA_DIMENSION_VOLTAGE, "uv", 1e-3, 0},
    {WA_DIMENSION_DENSITY, "g/ml", 1, 0},
    {WA_DIMENSION_DENSITY, "g/cm3", 1, 0},
    {WA_DIMENSION_DENSITY, "g/cm^3", 1, 0},
    {WA_DIMENSION_DENSITY, "g cm-3", 1, 0},
    {WA_DIMENSION_DENSITY, "g ml-1", 1, 0},
    {WA_DIMENSION_DENSITY, "kg/m3", 1e-3, 0},
    {WA_DIMENSION_DENSITY, "kg/l", 1, 0},
    {WA_DIMENSION_DENSITY, "kg/dm3", 1, 0},
    {WA_DIMENSION_DENSITY, "g/l", 1e-3, 0},
    {WA_DIMENSION_FRACTION, "%", 1e-2, 0},
    {WA_DIMENSION_FRACTION, "percent", 1e-2, 0},
    {WA_DIMENSION_FRACTION, "per cent", 1e-2, 0},
    {WA_DIMENSION_MOLAR_MASS, "g/mol", 1, 0},
    {WA_DIMENSION_MOLAR_MASS, "g mol-1", 1, 0},
    {WA_DIMENSION_MOLAR_MASS, "g*mol-1", 1, 0},
    {WA_DIMENSION_MOLAR_MASS, "kg/mol", 1e3, 0},
    {WA_DIMENSION_TIME, "s", 1, 0},
    {WA_DIMENSION_TIME, "sec", 1, 0},
    {WA_DIMENSION_TIME, "min", 60, 0},
    {WA_DIMENSION_TIME, "h", 3600, 0},
};

const char *wa_dimension_unit(enum wa_dimension dimension)
{
    static const char *const own[] = {"",   "g",    "mL", "mol/L", "°C", "pH",
                                      "mV", "g/mL", "",   "g/mol", "s"};
    return (size_t)dimension < sizeof own / sizeof own[0] ? own[dimension] : "";
}

/* The units that a message lists. */
static const char *units_that_are_known(enum wa_dimension dimension)
{
    static const char *const words[] = {
        "none",
        "g, mg, µg, kg",
        "mL, µL, L, cm³, dm³",
        "mol/L, mmol/L, M, mM, N, mol/dm³",
        "°C, K, °F",
        "pH",
        "mV, V",
        "g/mL, g/cm³, kg/m³",
        "%",
        "g/mol",
        "s, min, h",
    };
    return (size_t)dimension < sizeof words / sizeof words[0] ? words[dimension] : "none";
}

static const struct unit *find_unit(enum wa_dimension dimension, const char *text, size_t length)
{
    for (size_t i = 0; i < sizeof units / sizeof units[0]; i++) {
        if (units[i].dimension == dimension && strlen(units[i].name) == length &&
            memcmp(units[i].name, text, length) == 0) {
            return &units[i];
        }
    }
    return NULL;
}

/* What stands on one side of the plus-minus sign. */
struct part {
    double value;
    double last_digits; /* uncertainty in brackets as in 0.1023(2); NaN when none */
    const struct unit *unit;
    bool per_cent;
};

static void skip_spaces(const char **text)
{
    while (**text == ' ') {
        ++*text;
    }
}

/* "0.1023(2)": the figure in brackets counts in units of the last digit. */
static bool take_last_digits(const char **text, const struct wa_number *number, double *u)
{
    *u = NAN;
    const char *at = *text;
    if (*at != '(' || at[1] < '0' || at[1] > '9') {
        return true;
    }
    double digits = 0;
    for (at++; *at >= '0' && *at <= '9'; at++) {
        digits = 10 * digits + (*at - '0');
    }
    if (*at != ')') {
        return false;
    }
    *u = digits * pow(10, number->exponent - number->decimals);
    *text = at + 1;
    return true;
}

/* A number and its unit from folded text of exactly that much. */
static bool parse_part(enum wa_dimension dimension, const char *text, size_t length,
                       struct part *part)
{
    char copy[128];
    if (length >= sizeof copy) {
        return false;
    }
    memcpy(copy, text, length);
    copy[length] = '\0';
    struct wa_number number;
    size_t used = wa_number_parse(copy, length, &number);
    if (used == 0 || number.grouped) {
        return false;
    }
    *part = (struct part){.value = number.value};
    const char *at = copy + used;
    if (!take_last_digits(&at, &number, &part->last_digits)) {
        return false;
    }
    skip_spaces(&at);
    size_t rest = strlen(at);
    while (rest > 0 && at[rest - 1] == ' ') {
        rest--;
    }
    if (rest == 0) {
        return true;
    }
    part->per_cent = find_unit(WA_DIMENSION_FRACTION, at, rest) != NULL;
    part->unit = find_unit(dimension, at, rest);
    return part->unit != NULL || part->per_cent;
}

/* Cut a remark in brackets, and a coverage factor, off the end: "(dried)", "(k = 2)", ", k=2". */
static double cut_tail(char *text)
{
    double coverage = 1;
    char *factor = strstr(text, "k=");
    char *spaced = strstr(text, "k =");
    char *found = factor != NULL ? factor : spaced;
    if (found != NULL && found > text) {
        const char *at = strchr(found, '=') + 1;
        skip_spaces(&at);
        struct wa_number number;
        if (wa_number_parse(at, strlen(at), &number) > 0 && number.value >= 1) {
            coverage = number.value;
            while (found > text && strchr(" (,;", found[-1]) != NULL) {
                found--;
            }
            *found = '\0';
        }
    }
    size_t length = strlen(text);
    char *bracket = strrchr(text, '(');
    if (length > 0 && text[length - 1] == ')' && bracket != NULL && bracket > text &&
        bracket[-1] == ' ') {
        bracket[-1] = '\0';
    }
    return coverage;
}

/* "(0.1023 +/- 0.0002) mol/l" becomes "0.1023 +/- 0.0002 mol/l". */
static void open_leading_bracket(char *text)
{
    char *close = strchr(text, ')');
    if (text[0] == '(' && close != NULL) {
        memmove(close, close + 1, strlen(close + 1) + 1);
        memmove(text, text + 1, strlen(text + 1) + 1);
    }
}

static enum wa_status fail_parse(const char *text, enum wa_dimension dimension,
                                 struct wa_error *error)
{
    return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                   "'%.80s' is not understood as a value; write it like '%s' (units known here: "
                   "%s).",
                   text,
                   dimension == WA_DIMENSION_CONCENTRATION ? "0.1023 ± 0.0002 mol/L"
                   : dimension == WA_DIMENSION_FRACTION    ? "99.2 ± 0.4 %"
                   : dimension == WA_DIMENSION_TEMPERATURE ? "25.0 ± 0.2 °C"
                   : dimension == WA_DIMENSION_MASS        ? "0.3127 ± 0.0002 g"
                   : dimension == WA_DIMENSION_VOLUME      ? "50.00 ± 0.05 mL"
                                                           : "1.23 ± 0.04",
                   units_that_are_known(dimension));
}

/* Where the plus-minus sign stands in folded text, and how long it is. */
static const char *find_plus_minus(const char *text, size_t *length)
{
    const char *found = strstr(text, "+/-");
    *length = 3;
    if (found == NULL) {
        found = strstr(text, "+-");
        *length = 2;
    }
    return found;
}

static void combine(enum wa_dimension dimension, const struct part *value, const struct part *u,
                    double coverage, struct wa_quantity *quantity)
{
    const struct unit *unit = value->unit != NULL ? value->unit : u != NULL ? u->unit : NULL;
    double factor = unit != NULL ? unit->factor : 1;
    double shift = unit != NULL ? unit->shift : 0;
    *quantity = (struct wa_quantity){.value = value->value * factor + shift};
    if (u == NULL) {
        quantity->has_u = !isnan(value->last_digits);
        quantity->u = quantity->has_u ? value->last_digits * factor / coverage : 0;
        return;
    }
    quantity->has_u = true;
    if (u->per_cent && dimension != WA_DIMENSION_FRACTION) {
        quantity->u = fabs(quantity->value) * u->value * 0.01 / coverage;
    } else {
        quantity->u = u->value * (u->unit != NULL ? u->unit->factor : factor) / coverage;
    }
}

enum wa_status wa_quantity_parse(const char *text, enum wa_dimension dimension,
                                 struct wa_quantity *quantity, struct wa_error *error)
{
    char folded[256];
    if (strlen(text) >= sizeof folded / 2) {
        return fail_parse(text, dimension, error);
    }
    wa_text_fold(text, strlen(text), folded, sizeof folded);
    open_leading_bracket(folded);
    double coverage = cut_tail(folded);
    size_t sign_length;
    const char *sign = find_plus_minus(folded, &sign_length);
    struct part value;
    struct part u = {0};
    size_t value_length = sign != NULL ? (size_t)(sign - folded) : strlen(folded);
    if (!parse_part(dimension, folded, value_length, &value) ||
        (value.per_cent && value.unit == NULL)) {
        return fail_parse(text, dimension, error);
    }
    if (sign != NULL) {
        const char *after = sign + sign_length;
        skip_spaces(&after);
        if (!parse_part(dimension, after, strlen(after), &u) || u.value < 0) {
            return fail_parse(text, dimension, error);
        }
    }
    struct wa_quantity parsed;
    combine(dimension, &value, sign != NULL ? &u : NULL, coverage, &parsed);
    if (!isfinite(parsed.value) || !isfinite(parsed.u)) {
        return fail_parse(text, dimension, error);
    }
    *quantity = parsed;
    return WA_OK;
}

/* Words that end where a space or a comma follows. */
static size_t end_of_words(const char *text, size_t start, int words)
{
    size_t end = start;
    while (words-- > 0 && text[end] != '\0') {
        while (text[end] == ' ') {
            end++;
        }
        while (text[end] != '\0' && text[end] != ' ') {
            end++;
        }
    }
    while (end > start && (text[end - 1] == ',' || text[end - 1] == ';')) {
        end--;
    }
    return end;
}

bool wa_quantity_find(const char *text, enum wa_dimension dimension, struct wa_quantity *quantity)
{
    char folded[256];
    wa_text_fold(text, strlen(text), folded, sizeof folded);
    for (size_t start = 0; folded[start] != '\0'; start++) {
        bool starts_word = start == 0 || strchr(" (,;=:", folded[start - 1]) != NULL;
        if (!starts_word || strchr("0123456789.", folded[start]) == NULL) {
            continue;
        }
        /* The longest reading first, so that an uncertainty is not lost. */
        for (int words = 6; words > 0; words--) {
            char part[256];
            size_t end = end_of_words(folded, start, words);
            memcpy(part, folded + start, end - start);
            part[end - start] = '\0';
            bool has_unit = strpbrk(part, "abcdfghijklmnopqrstuvwxyz%") != NULL;
            if (has_unit && wa_quantity_parse(part, dimension, quantity, NULL) == WA_OK) {
                return true;
            }
        }
    }
    return false;
}

enum wa_status wa_quantity_parse_within(const char *text, enum wa_dimension dimension,
                                        struct wa_quantity *quantity, struct wa_error *error)
{
    enum wa_status status = wa_quantity_parse(text, dimension, quantity, error);
    if (status != WA_OK && wa_quantity_find(text, dimension, quantity)) {
        return WA_OK;
    }
    return status;
}

/* Decimal places that show u with two significant digits; negative left of the point. */
static int places_for(double u)
{
    int places = 1 - (int)floor(log10(u));
    /* 0.0996 would show as 0.100: the rounding itself can add a digit. */
    double scaled = u * pow(10, places);
    return round(scaled) >= 100 ? places - 1 : places;
}

void wa_quantity_format(char *text, size_t size, double value, double u)
{
    if (!(u > 0) || !isfinite(u) || !isfinite(value)) {
        snprintf(text, size, "%.6g", value);
        return;
    }
    double largest = fmax(fabs(value), u);
    int exponent = largest >= 1e7 || largest < 1e-4 ? (int)floor(log10(largest)) : 0;
    double scale = pow(10, exponent);
    int places = places_for(u / scale);
    double unit_of_place = pow(10, -places);
    double shown_value = value / scale;
    double shown_u = u / scale;
    if (places < 0) {
        shown_value = round(shown_value / unit_of_place) * unit_of_place;
        shown_u = round(shown_u / unit_of_place) * unit_of_place;
        places = 0;
    }
    if (exponent != 0) {
        snprintf(text, size, "(%.*f ± %.*f)e%d", places, shown_value, places, shown_u, exponent);
    } else {
        snprintf(text, size, "%.*f ± %.*f", places, shown_value, places, shown_u);
    }
}
