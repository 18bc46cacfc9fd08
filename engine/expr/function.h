/* The table of functions. functions.def holds one row a function; each room takes its own columns of it, so a new
 * function is one entry in one place (and the C functions that its row names). */
#ifndef TW_EXPR_FUNCTION_H
#define TW_EXPR_FUNCTION_H

#include <stddef.h>

/* Columns: id, name in the language, fewest and most arguments, derivative rule, ball, jet, growth, summary for help.
 * See functions.def. */
typedef enum function_id {
#define FUNCTION(id, name, fewest, most, derivative, ball, jet, growth, summary) FUNCTION_##id,
#include "engine/expr/functions.def"
#undef FUNCTION
    FUNCTION_COUNT
} function_id;

const char *function_name(function_id f);
/* The function called `name` that takes `arity` arguments, or FUNCTION_COUNT. arity < 0: any. (Gamma has two rows.) */
function_id function_find(const char *name, int arity);
int function_fewest(function_id f);
int function_most(function_id f);       /* INT_MAX for min, max */
const char *function_summary(function_id f); /* one line: what it is, its branch cut, DLMF section */

#endif
