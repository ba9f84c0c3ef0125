/* Header words in seven languages: what a column holds, its unit, how its volume counts. */
#include "reader/reader_internal.h"

#include <string.h>

#define WORDS_MAX 24

/* Folded as wa_text_fold does; matched as whole words. */
static const char *const volume_words[] = {"volume",
                                           "volumes",
                                           "vol",
                                           "v",
                                           "volumen",
                                           "volumina",
                                           "volum",
                                           "titrant",
                                           "titrans",
                                           "titriermittel",
                                           "masslosung",
                                           "verbrauch",
                                           "burette",
                                           "buret",
                                           "buretta",
                                           "bureta",
                                           "burettenstand",
                                           "buretstand",
                                           "titrantvolumen",
                                           "titriervolumen",
                                           "dosiervolumen",
                                           "volumenverbrauch",
                                           "titrante",
                                           "titulante",
                                           "titolante",
                                           "valorante",
                                           "naoh",
                                           "koh",
                                           "hcl",
                                           "zugabe",
                                           "zugegeben",
                                           "added",
                                           "addition",
                                           "additions",
                                           "ajoute",
                                           "verse",
                                           "coule",
                                           "anadido",
                                           "agregado",
                                           "gastado",
                                           "aggiunto",
                                           "adicionado",
                                           "gasto",
                                           "toegevoegd",
                                           "toegevoegde",
                                           "toevoeging",
                                           "vb",
                                           "va",
                                           "vt",
                                           "vnaoh",
                                           "vhcl",
                                           "vkoh",
                                           "dose",
                                           "dosage",
                                           "dosing",
                                           "inkrement",
                                           "increment",
                                           "increments",
                                           "titervolumen",
                                           "titratievolume",
                                           "titer",
                                           "reagent",
                                           "natronlauge",
                                           "salzsaure",
                                           "lauge",
                                           "soude",
                                           "base",
                                           "acid",
                                           "incremento",
                                           "cumulative",
                                           "consumption",
                                           "dispensed",
                                           "delivered",
                                           "volumes",
                                           "maatoplossing",
                                           "totalvolumen",
                                           "gesamtvolumen",
                                           "zugabevolumen",
                                           "deltav",
                                           "dv",
                                           NULL};

static const char *const ph_words[] = {"ph",        "phwert", "phvalue", "phmeter", "phwaarde",
                                       "phreading", "pha",    "phb",     NULL};

static const char *const mv_words[] = {"potential",
                                       "potentiel",
                                       "potencial",
                                       "potenziale",
                                       "potentiaal",
                                       "spannung",
                                       "tension",
                                       "voltage",
                                       "emf",
                                       "emk",
                                       "fem",
                                       "ddp",
                                       "e",
                                       "u",
                                       "millivolts",
                                       "spanning",
                                       "tensione",
                                       "voltaje",
                                       "potenzial",
                                       "elektrodenpotential",
                                       "messspannung",
                                       "kettenspannung",
                                       "signal",
                                       "orp",
                                       "redox",
                                       "ems",
                                       NULL};

static const char *const time_words[] = {
    "time",    "zeit",     "temps", "tiempo", "tempo", "tijd",  "elapsed",   "dauer", "duree",
    "uhrzeit", "messzeit", "heure", "hora",   "ora",   "clock", "timestamp", NULL};

static const char *const temperature_words[] = {"temperature", "temperatur",  "temp",
                                                "temperatuur", "temperatura", NULL};

static const char *const other_words[] = {
    "no",          "nr",        "num",         "number",       "index",         "point",
    "points",      "punkt",     "messpunkt",   "id",           "row",           "step",
    "#",           "numero",    "nummer",      "punto",        "ponto",         "punt",
    "lfd",         "comment",   "comments",    "remark",       "remarks",       "bemerkung",
    "bemerkungen", "kommentar", "remarque",    "observation",  "observaciones", "colour",
    "color",       "farbe",     "couleur",     "drift",        "gradient",      "slope",
    "steigung",    "pente",     "stirrer",     "conductivity", "leitfahigkeit", "poh",
    "absorbance",  "date",      "datum",       "rate",         "erc",           "note",
    "notes",       "opmerking", "opmerkingen", "stabil",       "stability",     "status",
    "flag",        "error",     "uncertainty", "sd",           "std",           "stdev",
    "sigma",       "residual",  "log",         "ionic",        "mass",          "n",
    "activity",    "gran",      NULL};

static const char *const increment_words[] = {
    "increment", "increments",    "inkrement",  "incremento", "incr", "dose",
    "portion",   "schritt",       "deltav",     "dv",         "each", "incremental",
    "stap",      "dosierschritt", "toevoeging", NULL};

static const char *const total_words[] = {
    "total",         "cumulative", "cumul",      "cumule", "kumuliert",
    "gesamt",        "totale",     "acumulado",  "totaal", "totalvolumen",
    "gesamtvolumen", "cumulatief", "cumulativo", "summe",  "cum",
    "tot",           "cumulated",  "verbrauch",  "verse",  "consumption",
    "overall",       "sum",        NULL};

/* Words that say what was added: such a column holds what has been added so far. */
static const char *const added_words[] = {
    "added",          "addition",   "naoh",        "koh",       "hcl",       "titrant",
    "titrans",        "titrante",   "titulante",   "titolante", "zugegeben", "ajoute",
    "ajoutee",        "verse",      "versee",      "anadido",   "agregado",  "aggiunto",
    "adicionado",     "toegevoegd", "toegevoegde", "base",      "acid",      "vnaoh",
    "vhcl",           "vkoh",       "gastado",     "dispensed", "delivered", "titriermittel",
    "titrantvolumen", "h2so4",      "hno3",        "oh",        NULL};

static const char *const burette_words[] = {
    "reading",    "ablesung",         "lecture", "lectura", "lettura", "leitura",
    "aflezing",   "burette",          "buret",   "buretta", "bureta",  "burettenstand",
    "buretstand", "burettenablesung", "stand",   "scale",   NULL};

static const char *const computed_words[] = {
    "calc",      "calculated", "theor",    "theoretical", "fit",      "fitted",
    "smooth",    "smoothed",   "model",    "berechnet",   "calcule",  "calculado",
    "simulated", "geglattet",  "berekend", "calcolato",   "expected", NULL};

static const char *const second_words[] = {"2nd",      "second", "zweite", "reference",
                                           "referenz", "ref",    NULL};

/* A folded header as words. */
struct words {
    char folded[160];
    const char *word[WORDS_MAX];
    size_t length[WORDS_MAX];
    size_t count;
};

static bool is_word_byte(char byte)
{
    return (byte >= 'a' && byte <= 'z') || (byte >= '0' && byte <= '9') || byte == '#' ||
           byte == '^' || (byte & 0x80) != 0;
}

static void blank_out(char *folded, const char *piece)
{
    for (char *found = strstr(folded, piece); found != NULL; found = strstr(folded, piece)) {
        memset(found, ' ', strlen(piece));
    }
}

/* "VolumeReading" and "VolumeNaOH" are two words each; "pH" and "VNaOH" are one. */
static size_t part_joined_words(const char *text, size_t length, char *apart, size_t size)
{
    size_t at = 0;
    size_t small = 0;
    for (size_t i = 0; i < length && at + 2 < size; i++) {
        bool capital = text[i] >= 'A' && text[i] <= 'Z';
        if (capital && small >= 3) {
            apart[at++] = ' ';
        }
        small = text[i] >= 'a' && text[i] <= 'z' ? small + 1 : 0;
        apart[at++] = text[i];
    }
    return at;
}

static void split_words(const char *text, size_t length, struct words *words)
{
    static const char *const not_volumes[] = {"mmol/l", "mol/l", "mol l-1", "mol*l-1", "mg/l",
                                              "g/l",    "meq/l", "mol/dm3", "mol dm-3"};
    *words = (struct words){0};
    char apart[160];
    size_t apart_length = part_joined_words(text, length, apart, sizeof apart);
    size_t folded = wa_text_fold(apart, apart_length, words->folded, sizeof words->folded);
    for (size_t i = 0; i < sizeof not_volumes / sizeof not_volumes[0]; i++) {
        blank_out(words->folded, not_volumes[i]);
    }
    for (size_t at = 0; at < folded && words->count < WORDS_MAX;) {
        size_t start = at;
        while (at < folded && is_word_byte(words->folded[at])) {
            at++;
        }
        if (at > start) {
            words->word[words->count] = words->folded + start;
            words->length[words->count++] = at - start;
        } else {
            at++;
        }
    }
}

static bool word_is(const struct words *words, size_t i, const char *name)
{
    size_t length = words->length[i];
    return name[0] == words->word[i][0] && strncmp(words->word[i], name, length) == 0 &&
           name[length] == '\0';
}

static bool has_any(const struct words *words, const char *const *list)
{
    for (size_t i = 0; i < words->count; i++) {
        for (size_t k = 0; list[k] != NULL; k++) {
            if (word_is(words, i, list[k])) {
                return true;
            }
        }
    }
    return false;
}

/* "ph", "ph1", "phwert"; also the second half of "ph-value", which the hyphen has cut. */
static bool has_ph(const struct words *words)
{
    for (size_t i = 0; i < words->count; i++) {
        const char *word = words->word[i];
        size_t length = words->length[i];
        bool numbered = length > 2 && length <= 4 && memcmp(word, "ph", 2) == 0 &&
                        strspn(word + 2, "0123456789") >= length - 2;
        if (numbered) {
            return true;
        }
    }
    return has_any(words, ph_words);
}

/* "dpH/dV", "ΔpH", "d2pH/dV2", "dE/dV", "1st derivative", "mV/min". */
static bool is_derived(const struct words *words)
{
    static const char *const pieces[] = {
        "dph",  "deltaph", "d2",     "deriv",  "ableit",   "afgel",  "/dv",     "/deltav",
        "/dt",  "mv/min",  "ml/min", "ph/min", "mv/s",     "ml/s",   "d(ph",    "ddph",
        "de/d", "/ dv",    "[h+",    "[h3o",   "delta ph", "deltae", "delta e", "1/v"};
    for (size_t i = 0; i < sizeof pieces / sizeof pieces[0]; i++) {
        const char *found = strstr(words->folded, pieces[i]);
        bool whole = found != NULL &&
                     (pieces[i][0] != 'd' || found == words->folded || !is_word_byte(found[-1]));
        if (whole) {
            return true;
        }
    }
    return false;
}

/* The unit: in brackets, after a slash, after a comma, or as a word of its own. The last one
 * counts, because "V / mL" names a volume in mL and "E / V" a potential in V. */
static enum wa_unit unit_of(const struct words *words, size_t *at)
{
    *at = SIZE_MAX;
    for (size_t i = words->count; i > 0; i--) {
        enum wa_unit unit = wa_unit_find(words->word[i - 1], words->length[i - 1]);
        bool letter = words->length[i - 1] == 1;
        bool alone = words->count == 1;
        /* One letter is a unit only where a unit stands: after another word, in brackets or
         * behind a slash or comma. */
        if (unit != WA_UNIT_NONE && (!letter || (!alone && i > 1))) {
            char before = words->word[i - 1] > words->folded ? words->word[i - 1][-1] : ' ';
            bool marked = before == '(' || before == '[' || before == '/' || before == '_' ||
                          (words->word[i - 1] > words->folded + 1 && before == ' ' &&
                           strchr("/,([", words->word[i - 1][-2]) != NULL);
            if (!letter || marked) {
                *at = i - 1;
                return unit;
            }
        }
    }
    return WA_UNIT_NONE;
}

/* A single letter is what textbooks use: V for the volume, E or U for the potential. */
static bool only_letter(const struct words *words, const char *letters)
{
    if (words->count == 0 || strchr(letters, words->word[0][0]) == NULL) {
        return false;
    }
    size_t digits = strspn(words->word[0] + 1, "0123456789");
    return words->length[0] == 1 || (words->length[0] <= 3 && digits + 1 >= words->length[0]);
}

static enum wa_role role_of(const struct words *words, enum wa_unit unit)
{
    if (words->count == 0) {
        return WA_ROLE_UNKNOWN;
    }
    if (is_derived(words)) {
        return WA_ROLE_OTHER;
    }
    if (unit == WA_UNIT_PH || has_ph(words)) {
        return WA_ROLE_PH;
    }
    if (wa_unit_is_time(unit) || (unit == WA_UNIT_NONE && has_any(words, time_words))) {
        return WA_ROLE_TIME;
    }
    if (wa_unit_is_temperature(unit) || has_any(words, temperature_words)) {
        return WA_ROLE_TEMPERATURE;
    }
    if (wa_unit_is_volume(unit)) {
        return WA_ROLE_VOLUME;
    }
    if (wa_unit_is_voltage(unit)) {
        return WA_ROLE_MV;
    }
    if (unit != WA_UNIT_NONE) {
        return WA_ROLE_OTHER;
    }
    if (strstr(words->folded, "equivalents") != NULL ||
        strstr(words->folded, "aquivalent") != NULL || only_letter(words, "v") ||
        has_any(words, volume_words)) {
        return WA_ROLE_VOLUME;
    }
    if (only_letter(words, "eu") || has_any(words, mv_words)) {
        return WA_ROLE_MV;
    }
    return has_any(words, other_words) ? WA_ROLE_OTHER : WA_ROLE_UNKNOWN;
}

struct wa_header wa_header_parse(const char *text, size_t length)
{
    struct words words;
    struct wa_header header = {0};
    split_words(text, length, &words);
    size_t unit_at;
    header.unit = unit_of(&words, &unit_at);
    header.role = role_of(&words, header.unit);
    /* T is a temperature and t a time; folding has lost the difference. */
    if (header.role == WA_ROLE_UNKNOWN && words.count == 1 && word_is(&words, 0, "t")) {
        header.role = memchr(text, 'T', length) != NULL ? WA_ROLE_TEMPERATURE : WA_ROLE_TIME;
    }
    header.weak = words.count == 1 && words.length[0] == 1;
    header.increment = has_any(&words, increment_words) || strstr(words.folded, "deltav") != NULL;
    header.total = has_any(&words, total_words);
    header.burette = has_any(&words, burette_words);
    header.added = has_any(&words, added_words);
    header.second =
        has_any(&words, second_words) ||
        ((strstr(words.folded, "electrode") != NULL || strstr(words.folded, "elektrode") != NULL ||
          strstr(words.folded, "elettrodo") != NULL || strstr(words.folded, "electrodo") != NULL ||
          strstr(words.folded, "eletrodo") != NULL) &&
         (strchr(words.folded, '2') != NULL || strstr(words.folded, "electrode b") != NULL));
    header.equivalents =
        header.role == WA_ROLE_VOLUME && header.unit == WA_UNIT_NONE &&
        (strstr(words.folded, "equivalents") != NULL || strstr(words.folded, "aquivalent") != NULL);
    header.computed = has_any(&words, computed_words);
    return header;
}
