/* What a reader of the report must know before acting on it. */
#include "identify/cautions.h"

#include "base/text.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/** Append a caution; the sentence is copied. */
static enum wa_status add(struct wa_result *result, const char *code, const char *sentence,
                          struct wa_error *error)
{
    struct wa_result_sentence *longer =
        realloc(result->cautions, (result->caution_count + 1) * sizeof *longer);
    if (longer == NULL) {
        return wa_fail_memory(error);
    }
    result->cautions = longer;
    char *copy = wa_text_copy(sentence, strlen(sentence));
    if (copy == NULL) {
        return wa_fail_memory(error);
    }
    longer[result->caution_count++] = (struct wa_result_sentence){.code = code, .sentence = copy};
    return WA_OK;
}

static const struct {
    const char *code;
    const char *sentence;
} always[] = {
    {"screening-aid", "This is a screening aid: a titration curve alone does not confirm an "
                      "identity; confirm it by an independent method."},
    {"responsible-analyst",
     "The local safety code and the judgement of a licensed or otherwise responsible analyst come "
     "before anything written here."},
    {"unknown-sample", "Treat the unknown as dangerous until it is known: it may be toxic, "
                       "oxidising or energetic."},
};

static const char acid_frees_gas[] =
    "The titrant is an acid: added to an unknown base or salt it can set free hydrogen cyanide, "
    "hydrogen sulfide or other gases; work in a fume cupboard.";

static const char titrant_may_be_acid[] =
    "The titrant is not known to be a base: an acid added to an unknown base or salt can set free "
    "hydrogen cyanide, hydrogen sulfide or other gases; work in a fume cupboard.";

enum titrant_side { SIDE_BASE, SIDE_ACID, SIDE_UNKNOWN };

/* Which side the titrant of a run is on: as fitted, else as noted, else as the pH went. */
static enum titrant_side side_of(const struct wa_table *table, const struct wa_result *result,
                                 size_t run)
{
    if (result->experiments != NULL && result->experiments[run].count > 0) {
        return result->experiments[run].titrant_is_base ? SIDE_BASE : SIDE_ACID;
    }
    const char *words = result->runs.runs[run].conditions.titrant;
    int titrant = words != NULL && table != NULL ? wa_table_find_titrant(table, words) : -1;
    if (titrant >= 0) {
        return table->titrants[titrant].is_base ? SIDE_BASE : SIDE_ACID;
    }
    if (result->curves != NULL && !result->curves[run].in_mV &&
        result->curves[run].direction != 0) {
        return result->curves[run].direction > 0 ? SIDE_BASE : SIDE_ACID;
    }
    return SIDE_UNKNOWN;
}

static enum wa_status add_titrant(const struct wa_table *table, struct wa_result *result,
                                  struct wa_error *error)
{
    bool acid = false;
    bool unknown = false;
    for (size_t i = 0; i < result->runs.count; i++) {
        enum titrant_side side = side_of(table, result, i);
        acid = acid || side == SIDE_ACID;
        unknown = unknown || side == SIDE_UNKNOWN;
    }
    if (acid) {
        return add(result, "acid-frees-gas", acid_frees_gas, error);
    }
    return unknown ? add(result, "acid-frees-gas", titrant_may_be_acid, error) : WA_OK;
}

/* "H302 H319" as sentences with their codes; a code without a sentence stands alone. */
static char *hazard_words(const struct wa_table *table, const char *codes)
{
    struct wa_text words = {0};
    wa_text_append(&words, "%s", "");
    for (const char *at = codes; *at != '\0';) {
        size_t length = strcspn(at, " ;,");
        if (length > 0) {
            char code[16];
            size_t kept = length < sizeof code - 1 ? length : sizeof code - 1;
            memcpy(code, at, kept);
            code[kept] = '\0';
            const char *sentence = wa_table_hazard_sentence(table, code);
            wa_text_append(&words, "%s%s%s%s", words.length > 0 ? "; " : "", code,
                           sentence != NULL ? " " : "", sentence != NULL ? sentence : "");
        }
        at += length + strspn(at + length, " ;,");
    }
    if (words.failed) {
        wa_text_free(&words);
    }
    return words.bytes;
}

/* The candidate's hazards and care from the row of its form, unless they are there already. */
static enum wa_status fill_hazards(const struct wa_table *table,
                                   struct wa_result_candidate *candidate, struct wa_error *error)
{
    bool has_row =
        table != NULL && candidate->form >= 0 && (size_t)candidate->form < table->form_count;
    const struct wa_form *form = has_row ? &table->forms[candidate->form] : NULL;
    if (candidate->hazards == NULL) {
        candidate->hazards =
            hazard_words(table, form != NULL && form->hazards != NULL ? form->hazards : "");
    }
    if (candidate->care == NULL) {
        const char *care = form != NULL && form->care != NULL ? form->care : "";
        candidate->care = wa_text_copy(care, strlen(care));
    }
    return candidate->hazards == NULL || candidate->care == NULL ? wa_fail_memory(error) : WA_OK;
}

static enum wa_status add_named(struct wa_result *result, const char *code, const char *name,
                                const char *words, struct wa_error *error)
{
    if (words == NULL || words[0] == '\0') {
        return WA_OK;
    }
    struct wa_text sentence = {0};
    size_t length = strlen(words);
    bool closed = strchr(".!?", words[length - 1]) != NULL;
    wa_text_append(&sentence, "%s: %s%s", name, words, closed ? "" : ".");
    enum wa_status status =
        sentence.failed ? wa_fail_memory(error) : add(result, code, sentence.bytes, error);
    wa_text_free(&sentence);
    return status;
}

static enum wa_status add_candidate(const struct wa_table *table, struct wa_result *result,
                                    size_t index, struct wa_error *error)
{
    struct wa_result_candidate *candidate = &result->candidates[index];
    enum wa_status status = fill_hazards(table, candidate, error);
    const char *name = candidate->form_name != NULL   ? candidate->form_name
                       : candidate->acid_name != NULL ? candidate->acid_name
                                                      : "A candidate";
    if (status == WA_OK) {
        status = add_named(result, "candidate-hazards", name, candidate->hazards, error);
    }
    if (status == WA_OK) {
        status = add_named(result, "candidate-care", name, candidate->care, error);
    }
    return status;
}

enum wa_status wa_identify_cautions(const struct wa_table *table, struct wa_result *result,
                                    struct wa_error *error)
{
    enum wa_status status = WA_OK;
    for (size_t i = 0; i < sizeof always / sizeof always[0] && status == WA_OK; i++) {
        status = add(result, always[i].code, always[i].sentence, error);
    }
    if (status == WA_OK) {
        status = add_titrant(table, result, error);
    }
    for (size_t i = 0; i < result->candidate_count && status == WA_OK; i++) {
        status = add_candidate(table, result, i, error);
    }
    return status;
}
