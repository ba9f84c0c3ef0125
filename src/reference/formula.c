/* Chemical formulas: elements, brackets, hydrates, a trailing charge. */
#include "reference/reference_internal.h"

#include <ctype.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#define FORMULA_TEXT_MAX 256
#define FORMULA_DEPTH_MAX 8
#define ATOMS_MAX 10000.0

struct formula_reader {
    const struct wa_table_storage *storage;
    const char *at;
    char *reason;
    size_t reason_size;
};

int element_find(const struct wa_table_storage *storage, const char *symbol)
{
    if (symbol[0] < 'A' || symbol[0] > 'Z') {
        return -1;
    }
    int second = 26;
    if (symbol[1] != '\0') {
        if (symbol[1] < 'a' || symbol[1] > 'z' || symbol[2] != '\0') {
            return -1;
        }
        second = symbol[1] - 'a';
    }
    return storage->element_of[symbol[0] - 'A'][second] - 1;
}

/* Signs that are written in several ways, brought to one: the dot of a hydrate becomes '*',
 * subscript digits plain digits, superscript digits follow a '^'. */
static const struct {
    const char *written;
    const char *plain;
} signs[] = {
    {"·", "*"},  {"•", "*"},  {"⋅", "*"},  {"∙", "*"},  {"₀", "0"},   {"₁", "1"},
    {"₂", "2"},  {"₃", "3"},  {"₄", "4"},  {"₅", "5"},  {"₆", "6"},   {"₇", "7"},
    {"₈", "8"},  {"₉", "9"},  {"−", "-"},  {"–", "-"},  {"⁺", "^+"},  {"⁻", "^-"},
    {"²", "^2"}, {"³", "^3"}, {"⁴", "^4"}, {"¹", "^1"}, {"½", "0.5"}, {"\xc2\xa0", ""},
};

static bool plain_formula(const char *formula, char plain[FORMULA_TEXT_MAX])
{
    size_t length = 0;
    while (*formula != '\0') {
        if ((unsigned char)*formula < 0x80) {
            if (*formula != ' ') {
                plain[length] = *formula;
                length++;
            }
            formula++;
            if (length + 1 >= FORMULA_TEXT_MAX) {
                return false;
            }
            continue;
        }
        const char *replacement = NULL;
        size_t taken = 1;
        for (size_t i = 0; i < sizeof signs / sizeof signs[0]; i++) {
            size_t size = strlen(signs[i].written);
            if (strncmp(formula, signs[i].written, size) == 0) {
                replacement = signs[i].plain;
                taken = size;
                break;
            }
        }
        char single[2] = {*formula, '\0'};
        if (replacement == NULL) {
            replacement = single;
        }
        size_t size = strlen(replacement);
        if (length + size >= FORMULA_TEXT_MAX) {
            return false;
        }
        memcpy(plain + length, replacement, size);
        length += size;
        formula += taken;
    }
    plain[length] = '\0';
    return true;
}

/* Take a charge off the end: "+", "-", "^2+", "^+2", "(2+)". A bare digit before the sign belongs
 * to the last atom ("NH4+"), so charges beyond one need the caret or the bracket. */
static int take_charge(char *plain)
{
    size_t length = strlen(plain);
    char *caret = strchr(plain, '^');
    char *bracket = strrchr(plain, '(');
    const char *from = NULL;
    char *cut = NULL;
    if (caret != NULL) {
        from = caret + 1;
        cut = caret;
    } else if (bracket != NULL && length > 0 && plain[length - 1] == ')' &&
               strspn(bracket + 1, "0123456789+-") == strlen(bracket) - 2 &&
               strpbrk(bracket, "+-") != NULL) {
        from = bracket + 1;
        cut = bracket;
    } else if (length > 1 && (plain[length - 1] == '+' || plain[length - 1] == '-')) {
        size_t signs_from = length;
        while (signs_from > 1 && plain[signs_from - 1] == plain[length - 1]) {
            signs_from--;
        }
        int charge = (int)(length - signs_from) * (plain[length - 1] == '+' ? 1 : -1);
        plain[signs_from] = '\0';
        return charge;
    } else {
        return 0;
    }
    int magnitude = 0;
    int sign = 1;
    for (const char *p = from; *p != '\0'; p++) {
        if (isdigit((unsigned char)*p) && magnitude < 100) {
            magnitude = magnitude * 10 + (*p - '0');
        } else if (*p == '-') {
            sign = -1;
        }
    }
    *cut = '\0';
    return sign * (magnitude == 0 ? 1 : magnitude);
}

/* Only what is listed is ever read, so the arrays need no clearing. */
static void composition_clear(struct composition *composition)
{
    composition->count = 0;
    composition->charge = 0;
}

static bool refuse(struct formula_reader *reader, const char *format, const char *what)
{
    snprintf(reader->reason, reader->reason_size, format, what);
    return false;
}

/* A count behind an atom or bracket, or a coefficient before a part; 1 when none is written. */
static double read_count(struct formula_reader *reader)
{
    if (!isdigit((unsigned char)*reader->at)) {
        return 1.0;
    }
    double count = 0.0;
    while (isdigit((unsigned char)*reader->at)) {
        count = fmin(count * 10.0 + (*reader->at - '0'), 10.0 * ATOMS_MAX);
        reader->at++;
    }
    return count;
}

static double read_coefficient(struct formula_reader *reader)
{
    double count = read_count(reader);
    if (reader->at[0] == '.' && isdigit((unsigned char)reader->at[1])) {
        reader->at++;
        double place = 0.1;
        while (isdigit((unsigned char)*reader->at)) {
            count += place * (*reader->at - '0');
            place /= 10.0;
            reader->at++;
        }
    }
    return count;
}

static bool read_element(struct formula_reader *reader, struct composition *sum)
{
    char symbol[3] = {*reader->at, '\0', '\0'};
    reader->at++;
    if (islower((unsigned char)*reader->at)) {
        symbol[1] = *reader->at;
        reader->at++;
    }
    int element = element_find(reader->storage, symbol);
    if (element < 0) {
        return refuse(reader, "'%s' is no element of the table of atomic weights", symbol);
    }
    double count = read_count(reader);
    if (count <= 0.0 || count > ATOMS_MAX) {
        return refuse(reader, "the number of atoms behind '%s' cannot be right", symbol);
    }
    return composition_change(sum, element, count) ||
           refuse(reader, "it names too many different elements, up to '%s'", symbol);
}

static bool read_group(struct formula_reader *reader, struct composition *sum, int depth)
{
    bool any = false;
    while (*reader->at != '\0') {
        char letter = *reader->at;
        if (isupper((unsigned char)letter)) {
            if (!read_element(reader, sum)) {
                return false;
            }
        } else if (letter == '(' || letter == '[') {
            if (depth == FORMULA_DEPTH_MAX) {
                return refuse(reader, "its brackets are nested too deep%s", "");
            }
            struct composition inner;
            composition_clear(&inner);
            reader->at++;
            if (!read_group(reader, &inner, depth + 1)) {
                return false;
            }
            if (*reader->at != (letter == '(' ? ')' : ']')) {
                return refuse(reader, "a bracket '%s' is not closed", letter == '(' ? "(" : "[");
            }
            reader->at++;
            double count = read_count(reader);
            if (count <= 0.0 || count > ATOMS_MAX) {
                return refuse(reader, "the number behind a bracket cannot be right%s", "");
            }
            if (!composition_add(sum, count, &inner)) {
                return refuse(reader, "it names too many different elements%s", "");
            }
        } else {
            break;
        }
        any = true;
    }
    char odd[8] = {0};
    for (size_t i = 0; i < 4 && reader->at[i] != '\0'; i++) {
        odd[i] = reader->at[i];
        if (((unsigned char)reader->at[i + 1] & 0xC0) != 0x80) {
            break;
        }
    }
    return any ? true
               : refuse(reader,
                        odd[0] == '\0' ? "an element is expected at its end%s"
                                       : "an element is expected where '%s' stands",
                        odd);
}

bool formula_parse(const struct wa_table_storage *storage, const char *formula,
                   struct composition *composition, char *reason, size_t reason_size)
{
    char plain[FORMULA_TEXT_MAX];
    struct formula_reader reader = {storage, plain, reason, reason_size};
    composition_clear(composition);
    if (!plain_formula(formula, plain)) {
        return refuse(&reader, "it is too long%s", "");
    }
    composition->charge = take_charge(plain);
    for (;;) {
        struct composition part;
        composition_clear(&part);
        double coefficient = read_coefficient(&reader);
        if (coefficient <= 0.0 || coefficient > ATOMS_MAX) {
            return refuse(&reader, "a coefficient cannot be right%s", "");
        }
        if (!read_group(&reader, &part, 0)) {
            return false;
        }
        if (!composition_add(composition, coefficient, &part)) {
            return refuse(&reader, "it names too many different elements%s", "");
        }
        if (*reader.at == '\0') {
            return true;
        }
        if (*reader.at != '*' && *reader.at != '.') {
            char odd[2] = {*reader.at, '\0'};
            return refuse(&reader, "'%s' is not understood", odd);
        }
        reader.at++;
    }
}

double composition_atoms(const struct composition *composition, int element)
{
    for (int i = 0; i < composition->count; i++) {
        if (composition->element[i] == element) {
            return composition->atoms[i];
        }
    }
    return 0.0;
}

bool composition_change(struct composition *composition, int element, double atoms)
{
    int place = 0;
    while (place < composition->count && composition->element[place] != element) {
        place++;
    }
    if (place == COMPOSITION_MAX) {
        return false;
    }
    if (place == composition->count) {
        composition->element[place] = (unsigned char)element;
        composition->atoms[place] = 0.0;
        composition->count++;
    }
    composition->atoms[place] += atoms;
    return true;
}

bool composition_add(struct composition *sum, double factor, const struct composition *other)
{
    for (int i = 0; i < other->count; i++) {
        if (!composition_change(sum, other->element[i], factor * other->atoms[i])) {
            return false;
        }
    }
    return true;
}

double composition_mass(const struct wa_table_storage *storage,
                        const struct composition *composition, double *u)
{
    double mass = 0.0;
    double variance = 0.0;
    for (int i = 0; i < composition->count; i++) {
        const struct element *element = &storage->elements[composition->element[i]];
        mass += composition->atoms[i] * element->weight;
        variance += pow(composition->atoms[i] * element->u, 2.0);
    }
    if (u != NULL) {
        *u = sqrt(variance);
    }
    return mass;
}

enum wa_status wa_table_molar_mass(const struct wa_table *table, const char *formula,
                                   double *molar_mass, double *u, struct wa_error *error)
{
    struct composition composition;
    char reason[128];
    if (!formula_parse(table->storage, formula, &composition, reason, sizeof reason)) {
        return wa_fail(error, WA_ERROR_INPUT, NULL, 0,
                       "The formula '%.80s' cannot be read: %s; write it like C6H8O7·H2O or "
                       "(NH4)2C2O4.",
                       formula, reason);
    }
    *molar_mass = composition_mass(table->storage, &composition, u);
    return WA_OK;
}
