/* Names: folding for comparison and the index from names to rows. */
#include "reference/reference_internal.h"

#include <ctype.h>
#include <stdlib.h>
#include <string.h>

/* Letters beyond ASCII that folding changes: to lower case, and to the plain letter. */
static const struct {
    const char *written;
    const char *lower;
    const char *plain;
} letters[] = {
    {"À", "à", "a"}, {"Á", "á", "a"},        {"Â", "â", "a"}, {"Ã", "ã", "a"}, {"Ä", "ä", "a"},
    {"Å", "å", "a"}, {"Æ", "æ", "a"},        {"Ç", "ç", "c"}, {"È", "è", "e"}, {"É", "é", "e"},
    {"Ê", "ê", "e"}, {"Ë", "ë", "e"},        {"Ì", "ì", "i"}, {"Í", "í", "i"}, {"Î", "î", "i"},
    {"Ï", "ï", "i"}, {"Ñ", "ñ", "n"},        {"Ò", "ò", "o"}, {"Ó", "ó", "o"}, {"Ô", "ô", "o"},
    {"Õ", "õ", "o"}, {"Ö", "ö", "o"},        {"Ø", "ø", "o"}, {"Ù", "ù", "u"}, {"Ú", "ú", "u"},
    {"Û", "û", "u"}, {"Ü", "ü", "u"},        {"à", "à", "a"}, {"á", "á", "a"}, {"â", "â", "a"},
    {"ã", "ã", "a"}, {"ä", "ä", "a"},        {"å", "å", "a"}, {"æ", "æ", "a"}, {"ç", "ç", "c"},
    {"è", "è", "e"}, {"é", "é", "e"},        {"ê", "ê", "e"}, {"ë", "ë", "e"}, {"ì", "ì", "i"},
    {"í", "í", "i"}, {"î", "î", "i"},        {"ï", "ï", "i"}, {"ñ", "ñ", "n"}, {"ò", "ò", "o"},
    {"ó", "ó", "o"}, {"ô", "ô", "o"},        {"õ", "õ", "o"}, {"ö", "ö", "o"}, {"ø", "ø", "o"},
    {"ù", "ù", "u"}, {"ú", "ú", "u"},        {"û", "û", "u"}, {"ü", "ü", "u"}, {"ß", "ß", "ss"},
    {"Α", "α", "α"}, {"Β", "β", "β"},        {"Γ", "γ", "γ"}, {"Δ", "δ", "δ"}, {"₀", "0", "0"},
    {"₁", "1", "1"}, {"₂", "2", "2"},        {"₃", "3", "3"}, {"₄", "4", "4"}, {"₅", "5", "5"},
    {"₆", "6", "6"}, {"₇", "7", "7"},        {"₈", "8", "8"}, {"₉", "9", "9"}, {"–", " ", " "},
    {"−", " ", " "}, {"\xc2\xa0", " ", " "}, {"′", "'", "'"}, {"’", "'", "'"},
};

/* Take one sign of UTF-8 from the text and say what it folds to. */
static size_t fold_sign(const char *text, size_t length, bool plain, char single[2],
                        const char **folded)
{
    unsigned char first = (unsigned char)text[0];
    single[1] = '\0';
    *folded = single;
    if (first < 0x80) {
        bool gap = isspace(first) || first == '-' || first == '_';
        single[0] = gap ? ' ' : (char)tolower(first);
        return 1;
    }
    for (size_t i = 0; i < sizeof letters / sizeof letters[0]; i++) {
        size_t size = strlen(letters[i].written);
        if (size <= length && memcmp(text, letters[i].written, size) == 0) {
            *folded = plain ? letters[i].plain : letters[i].lower;
            return size;
        }
    }
    single[0] = text[0];
    return 1;
}

/* What the signs of ASCII fold to; zero: a gap or a sign that needs a closer look. */
static const char plain_fold[128] =
    "\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0\0"
    "\0!\"#$%&'()*+,\0./0123456789:;<=>?"
    "@abcdefghijklmnopqrstuvwxyz[\\]^\0"
    "`abcdefghijklmnopqrstuvwxyz{|}~\0";

static void fold(const char *name, size_t length, bool plain, char folded[NAME_FOLD_MAX])
{
    size_t used = 0;
    size_t at = 0;
    while (at < length && used + 3 < NAME_FOLD_MAX) {
        /* Most signs are plain ones, which need no look at the list of letters. */
        unsigned char first = (unsigned char)name[at];
        if (!plain && first < 0x80 && plain_fold[first] != 0) {
            folded[used] = plain_fold[first];
            used++;
            at++;
            continue;
        }
        char single[2];
        const char *sign;
        at += fold_sign(name + at, length - at, plain, single, &sign);
        for (; *sign != '\0'; sign++) {
            if (*sign == ' ' && (used == 0 || folded[used - 1] == ' ')) {
                continue;
            }
            if (plain && *sign == 'e' && used > 0 && strchr("aou", folded[used - 1]) != NULL) {
                continue;
            }
            folded[used] = *sign;
            used++;
        }
    }
    if (used > 0 && folded[used - 1] == ' ') {
        used--;
    }
    folded[used] = '\0';
}

void name_fold(const char *name, size_t length, char folded[NAME_FOLD_MAX])
{
    fold(name, length, false, folded);
}

void name_fold_plain(const char *name, size_t length, char folded[NAME_FOLD_MAX])
{
    fold(name, length, true, folded);
}

/* FNV-1a (Fowler, Noll, Vo). */
static uint64_t hash_text(const char *text)
{
    uint64_t hash = UINT64_C(14695981039346656037);
    for (; *text != '\0'; text++) {
        hash = (hash ^ (unsigned char)*text) * UINT64_C(1099511628211);
    }
    return hash;
}

/* Place where a name stands or would stand. */
static size_t place_of(const struct name_index *names, uint64_t hash, const char *folded)
{
    size_t mask = names->capacity - 1;
    size_t place = (size_t)(hash ^ (hash >> 32)) & mask;
    while (
        names->entries[place].folded != NULL &&
        (names->entries[place].hash != hash || strcmp(names->entries[place].folded, folded) != 0)) {
        place = (place + 1) & mask;
    }
    return place;
}

#define FIRST_CAPACITY 1024

static bool widen(struct name_index *names)
{
    struct name_index wider = {.capacity =
                                   names->capacity == 0 ? FIRST_CAPACITY : names->capacity * 4};
    wider.entries = calloc(wider.capacity, sizeof *wider.entries);
    if (wider.entries == NULL) {
        return false;
    }
    wider.count = names->count;
    for (size_t i = 0; i < names->capacity; i++) {
        const struct name_entry *entry = &names->entries[i];
        if (entry->folded != NULL) {
            wider.entries[place_of(&wider, entry->hash, entry->folded)] = *entry;
        }
    }
    free(names->entries);
    *names = wider;
    return true;
}

int name_index_add(struct name_index *names, const char *folded, int index)
{
    if (2 * (names->count + 1) > names->capacity && !widen(names)) {
        return -2;
    }
    uint64_t hash = hash_text(folded);
    struct name_entry *entry = &names->entries[place_of(names, hash, folded)];
    if (entry->folded != NULL) {
        return entry->index;
    }
    *entry = (struct name_entry){hash, folded, index};
    names->count++;
    return -1;
}

void name_index_set(struct name_index *names, const char *folded, int index)
{
    names->entries[place_of(names, hash_text(folded), folded)].index = index;
}

int name_index_find(const struct name_index *names, const char *name)
{
    if (names->capacity == 0 || name == NULL) {
        return -1;
    }
    char folded[NAME_FOLD_MAX];
    name_fold(name, strlen(name), folded);
    const struct name_entry *entry = &names->entries[place_of(names, hash_text(folded), folded)];
    return entry->folded != NULL ? entry->index : -1;
}

void name_index_free(struct name_index *names)
{
    free(names->entries);
    *names = (struct name_index){0};
}

const char *next_other_name(const char **cursor, size_t *length)
{
    const char *start = *cursor;
    while (*start == ' ' || *start == ';') {
        start++;
    }
    if (*start == '\0') {
        return NULL;
    }
    const char *end = start;
    while (*end != '\0' && *end != ';') {
        end++;
    }
    *cursor = *end == ';' ? end + 1 : end;
    while (end > start && end[-1] == ' ') {
        end--;
    }
    *length = (size_t)(end - start);
    return start;
}
