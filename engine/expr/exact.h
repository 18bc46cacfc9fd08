/* Inside the expression room: values of functions at exact arguments. */
#ifndef TW_EXPR_EXACT_H
#define TW_EXPR_EXACT_H

#include "engine/expr/node.h"

/* The higher functions' part: true when *value is the value (NULL with the error set where there is none). */
bool special_value(tw_engine *e, function_id f, expr *const *args, expr **value);

/* ERROR_VALUE "NAME has no value at WHERE"; returns NULL. */
expr *call_undefined(tw_engine *e, function_id f, const char *where);

bool number_is_integer(expr *a); /* an exact integer */
bool number_is_half(expr *a);    /* an odd multiple of 1/2 */

#endif
