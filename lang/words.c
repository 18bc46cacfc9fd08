/* The table of words. It knows what a word is for, not what it does: the parser gives the openers their functions,
 * help its texts. A word is listed once; the names of functions are the engine's. */
#include "lang/words.h"

#include <string.h>

#include "engine/expr/function.h"

typedef struct word_row {
    const char *word;
    word_class is;
} word_row;

static const word_row table[] = {
    {"large", WORD_STATEMENT},        {"small", WORD_STATEMENT},      {"given", WORD_STATEMENT},
    {"grant", WORD_STATEMENT},        {"let", WORD_STATEMENT},        {"use", WORD_STATEMENT},
    {"rule", WORD_STATEMENT},         {"pass", WORD_STATEMENT},       {"check", WORD_STATEMENT},
    {"rewrite", WORD_STATEMENT},      {"why", WORD_STATEMENT},        {"derive", WORD_STATEMENT},
    {"done", WORD_STATEMENT},         {"undo", WORD_STATEMENT},       {"replay", WORD_STATEMENT},
    {"expand", WORD_STATEMENT},       {"steps", WORD_STATEMENT},      {"coefficients", WORD_STATEMENT},
    {"recurrence", WORD_STATEMENT},   {"growth", WORD_STATEMENT},     {"remainder", WORD_STATEMENT},
    {"evaluate", WORD_STATEMENT},     {"compare", WORD_STATEMENT},    {"plan", WORD_STATEMENT},
    {"plot", WORD_STATEMENT},         {"write", WORD_STATEMENT},      {"show", WORD_STATEMENT},
    {"drop", WORD_STATEMENT},         {"help", WORD_STATEMENT},       {"quit", WORD_STATEMENT},

    {"substitute", WORD_MOVE},        {"parts", WORD_MOVE},           {"repeat", WORD_MOVE},
    {"differentiate", WORD_MOVE},     {"integrate", WORD_MOVE},       {"split", WORD_MOVE},
    {"rotate", WORD_MOVE},            {"swap", WORD_MOVE},

    {"integral", WORD_EXPRESSION},    {"sum", WORD_EXPRESSION},       {"derivative", WORD_EXPRESSION},
    {"piecewise", WORD_EXPRESSION},   {"root", WORD_EXPRESSION},

    {"sqrt", WORD_FUNCTION}, /* the others stand in the engine's table */

    {"pi", WORD_CONSTANT},            {"i", WORD_CONSTANT},           {"inf", WORD_CONSTANT},
    {"euler_constant", WORD_CONSTANT},

    {"of", WORD_LINK},                {"from", WORD_LINK},            {"to", WORD_LINK},
    {"in", WORD_LINK},                {"at", WORD_LINK},              {"with", WORD_LINK},
    {"by", WORD_LINK},                {"as", WORD_LINK},              {"for", WORD_LINK},
    {"on", WORD_LINK},                {"over", WORD_LINK},            {"along", WORD_LINK},
    {"around", WORD_LINK},            {"near", WORD_LINK},            {"order", WORD_LINK},
    {"step", WORD_LINK},              {"becomes", WORD_LINK},         {"when", WORD_LINK},
    {"because", WORD_LINK},           {"otherwise", WORD_LINK},       {"then", WORD_LINK},
    {"or", WORD_LINK},

    {"integer", WORD_MINOR},          {"real", WORD_MINOR},           {"complex", WORD_MINOR},
    {"everywhere", WORD_MINOR},       {"once", WORD_MINOR},           {"not", WORD_MINOR},
    {"terms", WORD_MINOR},            {"digits", WORD_MINOR},         {"times", WORD_MINOR},
    {"points", WORD_MINOR},           {"all", WORD_MINOR},            {"contributions", WORD_MINOR},
    {"a", WORD_MINOR},                {"log", WORD_MINOR},            {"scale", WORD_MINOR},
    {"relative", WORD_MINOR},         {"error", WORD_MINOR},          {"expansion", WORD_MINOR},
    {"integrating", WORD_MINOR},      {"back", WORD_MINOR},           {"termwise", WORD_MINOR},
    {"json", WORD_MINOR},             {"csv", WORD_MINOR},            {"text", WORD_MINOR},
    {"latex", WORD_MINOR},            {"c", WORD_MINOR},              {"parts", WORD_MINOR},
    {"moments", WORD_MINOR},          {"watson", WORD_MINOR},         {"laplace", WORD_MINOR},
    {"phase", WORD_MINOR},            {"descent", WORD_MINOR},        {"mellin", WORD_MINOR},
};

enum { TABLE_COUNT = sizeof table / sizeof *table };

word_class word_find(const char *word)
{
    for (size_t k = 0; k < TABLE_COUNT; k++)
        if (strcmp(table[k].word, word) == 0 && table[k].is < WORD_MINOR)
            return table[k].is;
    if (function_find(word, -1) != FUNCTION_COUNT)
        return WORD_FUNCTION;
    for (size_t k = 0; k < TABLE_COUNT; k++)
        if (strcmp(table[k].word, word) == 0)
            return table[k].is;
    return WORD_NONE;
}

bool word_is_reserved(const char *word)
{
    word_class c = word_find(word);
    return c == WORD_STATEMENT || c == WORD_EXPRESSION || c == WORD_CONSTANT;
}

const char *word_at(size_t k, word_class *word_class_of)
{
    if (k < TABLE_COUNT) {
        if (word_class_of != NULL)
            *word_class_of = table[k].is;
        return table[k].word;
    }
    k -= TABLE_COUNT;
    if (k >= FUNCTION_COUNT)
        return NULL;
    if (word_class_of != NULL)
        *word_class_of = WORD_FUNCTION;
    return function_name((function_id)k);
}
