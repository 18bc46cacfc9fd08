/* Names, arities and summaries of the functions: the language's columns of functions.def. */
#include "engine/expr/function.h"

#include <string.h>

typedef struct function_row {
    const char *name;
    int fewest, most;
    const char *summary;
} function_row;

static const function_row functions[FUNCTION_COUNT] = {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) {name, fewest, most, summary},
#include "engine/expr/functions.def"
#undef FUNCTION
};

const char *function_name(function_id f)
{
    return functions[f].name;
}

int function_fewest(function_id f)
{
    return functions[f].fewest;
}

int function_most(function_id f)
{
    return functions[f].most;
}

const char *function_summary(function_id f)
{
    return functions[f].summary;
}

function_id function_find(const char *name, int arity)
{
    for (int f = 0; f < FUNCTION_COUNT; f++)
        if (strcmp(functions[f].name, name) == 0 &&
            (arity < 0 || (arity >= functions[f].fewest && arity <= functions[f].most)))
            return (function_id)f;
    return FUNCTION_COUNT;
}
