/* Which delimiter a text has, and how cells stand apart in lines that use runs of spaces. */
#include "reader/reader_internal.h"

#include <stdlib.h>
#include <string.h>

#define TOKENS_MAX 128
#define SAMPLE_LINES 200

/* A stretch of a line. */
struct token {
    const char *text;
    size_t length;
};

static size_t split_tokens(const char *line, size_t length, struct token tokens[TOKENS_MAX])
{
    size_t count = 0;
    size_t at = 0;
    while (count < TOKENS_MAX) {
        while (at < length && (line[at] == ' ' || line[at] == '\t')) {
            at++;
        }
        if (at == length) {
            break;
        }
        size_t start = at;
        while (at < length && line[at] != ' ' && line[at] != '\t') {
            at++;
        }
        tokens[count++] = (struct token){line + start, at - start};
    }
    return count;
}

static bool is_unit(const struct token *token)
{
    char folded[32];
    const char *text = token->text;
    size_t length = token->length;
    if (length > 2 && (text[0] == '(' || text[0] == '[')) {
        text++;
        length -= 2;
    }
    size_t folded_length = wa_text_fold(text, length, folded, sizeof folded);
    return wa_unit_find(folded, folded_length) != WA_UNIT_NONE;
}

static size_t put(char *spaced, size_t at, char separator, const struct token *token)
{
    if (at > 0) {
        spaced[at++] = separator;
    }
    memcpy(spaced + at, token->text, token->length);
    return at + token->length;
}

/* A line of numbers: every token is a cell, but a unit belongs to the number before it. */
static size_t join_numbers(const struct token *tokens, size_t count, char *spaced)
{
    size_t at = 0;
    bool bare_number = false;
    for (size_t i = 0; i < count; i++) {
        struct wa_cell_value value = wa_cell_parse(tokens[i].text, tokens[i].length);
        bool number = value.kind == WA_CELL_NUMBER;
        bool unit = !number && bare_number && is_unit(&tokens[i]);
        at = put(spaced, at, unit ? ' ' : '\x1F', &tokens[i]);
        bare_number = number && value.unit == WA_UNIT_NONE;
    }
    return at;
}

/* Whether a word starts the header of another column, given the header so far. */
static bool starts_column(const char *cell, size_t cell_length, const struct token *token)
{
    if (token->text[0] == '(' || token->text[0] == '[' || token->text[0] == '/') {
        return false;
    }
    char last = cell[cell_length - 1];
    if (last == ')' || last == ']') {
        return true;
    }
    if (last == '/' || last == ',') {
        return false;
    }
    struct wa_header before = wa_header_parse(cell, cell_length);
    struct wa_header word = wa_header_parse(token->text, token->length);
    /* Words that say nothing lead: "Corrected Volume". */
    if (before.role == WA_ROLE_UNKNOWN) {
        return false;
    }
    return word.role != WA_ROLE_UNKNOWN && word.role != before.role &&
           !(before.role == WA_ROLE_OTHER && word.unit != WA_UNIT_NONE && word.weak) &&
           !(before.unit == WA_UNIT_NONE && before.role != WA_ROLE_UNKNOWN && is_unit(token) &&
             word.role != WA_ROLE_PH && word.role != WA_ROLE_MV);
}

/* A line of words: two spaces or more set cells apart; with single ones the words decide. */
static size_t join_words(const struct token *tokens, size_t count, bool careful, char *spaced)
{
    bool wide = false;
    for (size_t i = 1; i < count; i++) {
        const char *gap = tokens[i - 1].text + tokens[i - 1].length;
        wide = wide || tokens[i].text - gap > 1 || *gap == '\t';
    }
    size_t at = 0;
    size_t cell_start = 0;
    for (size_t i = 0; i < count; i++) {
        bool apart = true;
        if (i > 0) {
            const char *gap = tokens[i - 1].text + tokens[i - 1].length;
            apart =
                wide ? tokens[i].text - gap > 1 || *gap == '\t'
                     : careful && starts_column(spaced + cell_start, at - cell_start, &tokens[i]);
        }
        size_t before = at;
        at = put(spaced, at, apart ? '\x1F' : ' ', &tokens[i]);
        cell_start = apart && i > 0 ? before + 1 : cell_start;
    }
    return at;
}

size_t wa_sheet_join_spaces(const char *line, size_t length, bool careful, char *spaced)
{
    struct token tokens[TOKENS_MAX];
    size_t count = split_tokens(line, length, tokens);
    size_t numbers = 0;
    bool leads =
        count > 0 && wa_cell_parse(tokens[0].text, tokens[0].length).kind == WA_CELL_NUMBER;
    for (size_t i = 0; i < count; i++) {
        numbers += wa_cell_parse(tokens[i].text, tokens[i].length).kind == WA_CELL_NUMBER;
    }
    /* "0.1 M HCl (mL) pH 0.1 M HCl (mL) pH" holds two numbers and is a header all the same. */
    bool is_data = numbers >= 2 && (numbers * 3 >= count || (leads && numbers * 4 >= count));
    size_t joined =
        is_data ? join_numbers(tokens, count, spaced) : join_words(tokens, count, careful, spaced);
    spaced[joined] = '\0';
    return joined;
}

/* Counts of one line cut at one delimiter. */
struct cut {
    size_t numbers;
    size_t filled;
};

static void count_cell(struct cut *cut, const char *text, size_t length)
{
    wa_text_trim(&text, &length);
    if (length >= 2 && text[0] == '"' && text[length - 1] == '"') {
        text++;
        length -= 2;
    }
    struct wa_cell_value value = wa_cell_parse(text, length);
    cut->filled += value.kind != WA_CELL_EMPTY;
    cut->numbers += wa_cell_is_numeric(&value);
}

static struct cut cut_line(const char *line, size_t length, char delimiter)
{
    struct cut cut = {0};
    bool quoted = false;
    size_t start = 0;
    for (size_t at = 0; at < length; at++) {
        if (line[at] == '"') {
            quoted = !quoted;
        } else if (line[at] == delimiter && !quoted) {
            count_cell(&cut, line + start, at - start);
            start = at + 1;
        }
    }
    count_cell(&cut, line + start, length - start);
    return cut;
}

/* How much of a line is numbers when it is cut so; nothing unless there are two. */
static double line_score(const char *line, size_t length, char delimiter)
{
    char spaced[2048];
    if (length == 0 || length >= sizeof spaced || line[0] == '#') {
        return 0;
    }
    if (delimiter == ' ') {
        length = wa_sheet_join_spaces(line, length, false, spaced);
        line = spaced;
        delimiter = '\x1F';
    }
    struct cut cut = cut_line(line, length, delimiter);
    return cut.numbers >= 2 ? (double)cut.numbers / (double)cut.filled : 0;
}

char wa_sheet_delimiter(const char *text, size_t length)
{
    static const char candidates[] = {'\t', ';', '|', '&', ',', ' '};
    double scores[sizeof candidates] = {0};
    size_t lines = 0;
    for (size_t i = 0; i < length; i++) {
        lines += text[i] == '\n';
    }
    size_t step = lines / SAMPLE_LINES + 1;
    const char *end = text + length;
    size_t index = 0;
    for (const char *line = text; line < end; index++) {
        const char *stop = memchr(line, '\n', (size_t)(end - line));
        stop = stop != NULL ? stop : end;
        if (index < SAMPLE_LINES || index % step == 0) {
            for (size_t i = 0; i < sizeof candidates; i++) {
                scores[i] += line_score(line, (size_t)(stop - line), candidates[i]);
            }
        }
        line = stop + 1;
    }
    size_t best = 0;
    for (size_t i = 1; i < sizeof candidates; i++) {
        /* A clear lead is needed: stray numbers in a preamble must not decide. */
        best = scores[i] > 1.1 * scores[best] ? i : best;
    }
    return scores[best] > 0 ? candidates[best] : '\0';
}
