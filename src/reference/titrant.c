/* Titrants: their rows, and finding one from an analyst's words. */
#include "base/grow.h"
#include "reference/reference_internal.h"

#include <ctype.h>
#include <math.h>
#include <string.h>

#define COMPOUND_NAME_MIN 6 /* shortest name that may begin a longer word */
#define STRONG_PKA 2.5      /* a proton below this counts as an equivalent of a strong acid */

static const struct {
    const char *word;
    bool base;
    bool weak;
} titrant_kinds[] = {
    {"strong base", true, false},
    {"weak base", true, true},
    {"strong acid", false, false},
    {"weak acid", false, true},
};

/* Equivalents that one formula unit brings. */
static int count_protons(const struct loader *loader, const struct wa_titrant *titrant,
                         const struct wa_form_part *part)
{
    if (titrant->is_base) {
        return part->lost;
    }
    if (part->acid == WA_PART_WATER) {
        return 0;
    }
    const struct wa_acid *acid = &loader->table.acids[part->acid];
    int protons = 0;
    for (int i = 0; i < acid->step_count; i++) {
        protons += titrant->is_weak || acid->steps[i].pKa < STRONG_PKA;
    }
    return part->count * protons - part->lost;
}

static bool settle_titrant(struct loader *loader, const struct table_file *file,
                           const struct table_row *row, const char *system,
                           struct wa_titrant *titrant)
{
    struct wa_form_part parts[WA_PARTS_MAX];
    int part_count = 0;
    char reason[256];
    if (!parts_parse(loader, system, parts, &part_count, reason, sizeof reason)) {
        loader_problem(loader, file, row->line, TITRANT_SYSTEM, true,
                       "The system '%.80s' cannot be used: %s.", system, reason);
        return false;
    }
    if (part_count != 1) {
        loader_problem(loader, file, row->line, TITRANT_SYSTEM, true,
                       "A titrant is one system, not %d.", part_count);
        return false;
    }
    check_part_spelling(loader, file, row, TITRANT_SYSTEM, system, parts);
    titrant->protons = count_protons(loader, titrant, &parts[0]);
    if (titrant->protons < 1) {
        loader_problem(loader, file, row->line, TITRANT_SYSTEM, true,
                       "'%.80s' neither gives nor takes a proton as a %s; check 'lost' and the "
                       "kind.",
                       system, titrant->is_base ? "base" : "acid");
        return false;
    }
    titrant->acid = titrant->is_weak || titrant->protons > 1 ? parts[0].acid : WA_PART_WATER;
    titrant->count = parts[0].count;
    titrant->lost = parts[0].lost;
    return true;
}

static bool read_titrant(struct loader *loader, const struct table_file *file,
                         const struct table_row *row, struct wa_titrant *titrant)
{
    const char *kind = required_cell(loader, file, row, TITRANT_KIND);
    const char *system = required_cell(loader, file, row, TITRANT_SYSTEM);
    *titrant = (struct wa_titrant){
        .key = required_cell(loader, file, row, TITRANT_KEY),
        .name = required_cell(loader, file, row, TITRANT_NAME),
        .other_names = table_cell(file, row, TITRANT_OTHER),
    };
    if (kind == NULL || system == NULL || titrant->key == NULL || titrant->name == NULL) {
        return false;
    }
    for (size_t i = 0; i < sizeof titrant_kinds / sizeof titrant_kinds[0]; i++) {
        if (strcasecmp(kind, titrant_kinds[i].word) == 0) {
            titrant->is_base = titrant_kinds[i].base;
            titrant->is_weak = titrant_kinds[i].weak;
            return settle_titrant(loader, file, row, system, titrant);
        }
    }
    loader_problem(loader, file, row->line, TITRANT_KIND, true,
                   "'%.30s' is no kind of titrant; strong base, weak base, strong acid or weak "
                   "acid is expected.",
                   kind);
    return false;
}

void take_titrants(struct loader *loader, const struct table_file *file)
{
    for (size_t i = 0; i < file->row_count && !loader->out_of_memory; i++) {
        const struct table_row *row = &file->rows[i];
        struct wa_titrant titrant;
        if (!read_titrant(loader, file, row, &titrant)) {
            continue;
        }
        long place = keyed_place(loader, file, row, titrant.key, loader->table.titrant_count);
        if (place < 0) {
            continue;
        }
        if (!wa_grow(&loader->table.titrants, &loader->titrant_capacity, (size_t)place + 1,
                     sizeof *loader->table.titrants)) {
            loader->out_of_memory = true;
            return;
        }
        loader->table.titrants[place] = titrant;
        loader->table.titrant_count += (size_t)place == loader->table.titrant_count;
    }
}

/* ---- lookup -----------------------------------------------------------------------------------
 */

static bool is_letter(char sign)
{
    return isalnum((unsigned char)sign) || (unsigned char)sign >= 0x80;
}

/* How well a name stands in the words: its length as words of their own, or as the beginning of a
 * longer word ("Natriumhydroxidlösung"); 0 when it does not stand there. */
static size_t name_weight(const char *words, const char *name)
{
    size_t length = strlen(name);
    size_t best = 0;
    for (const char *at = length > 0 ? strstr(words, name) : NULL; at != NULL;
         at = strstr(at + 1, name)) {
        bool begins = at == words || !is_letter(at[-1]);
        bool ends = !is_letter(at[length]);
        if (begins && ends) {
            return 2 * length;
        }
        if (begins && length >= COMPOUND_NAME_MIN) {
            best = 2 * length - 1;
        }
    }
    return best;
}

static size_t titrant_weight(const struct wa_titrant *titrant, const char *words)
{
    char folded[NAME_FOLD_MAX];
    size_t best = 0;
    const char *named[] = {titrant->key, titrant->name};
    for (size_t i = 0; i < sizeof named / sizeof named[0]; i++) {
        name_fold_plain(named[i], strlen(named[i]), folded);
        size_t weight = name_weight(words, folded);
        best = weight > best ? weight : best;
    }
    const char *cursor = titrant->other_names;
    size_t length;
    const char *name;
    while ((name = next_other_name(&cursor, &length)) != NULL) {
        name_fold_plain(name, length, folded);
        size_t weight = name_weight(words, folded);
        best = weight > best ? weight : best;
    }
    return best;
}

int wa_table_find_titrant(const struct wa_table *table, const char *words)
{
    char folded[NAME_FOLD_MAX];
    int found = -1;
    size_t best = 0;
    if (words == NULL) {
        return -1;
    }
    name_fold_plain(words, strlen(words), folded);
    for (size_t i = 0; i < table->titrant_count; i++) {
        size_t weight = titrant_weight(&table->titrants[i], folded);
        if (weight > best) {
            best = weight;
            found = (int)i;
        }
    }
    return found;
}
