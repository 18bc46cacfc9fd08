/* Short names for printing algebraic numbers. */
#ifndef TW_EXPR_ROOT_NAMES_H
#define TW_EXPR_ROOT_NAMES_H

#include "engine/expr/expr.h"

/* Names for the roots that an expansion holds: while e->root_names points to a list, its roots are printed by name. */
typedef struct root_names {
    size_t count;
    expr **roots;
    char **names; /* "r", "r1", ... */
} root_names;

void root_names_init(root_names *n);
void root_names_clear(root_names *n);
/* Adds the roots in a that are not there yet; names that stand free in `avoid` (may be NULL) are not given. */
void root_names_collect(root_names *n, expr *a, expr *avoid);
/* The name of a root, or NULL. */
const char *root_name_of(const root_names *n, expr *root);

#endif
