/* Names for roots: the printer asks for them while the engine points to a list. Knows nothing of what a root is worth. */
#include "engine/expr/root_names.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void root_names_init(root_names *n)
{
    memset(n, 0, sizeof *n);
}

void root_names_clear(root_names *n)
{
    for (size_t k = 0; k < n->count; k++)
        free(n->names[k]);
    free(n->names);
    free(n->roots);
    root_names_init(n);
}

const char *root_name_of(const root_names *n, expr *root)
{
    for (size_t k = 0; k < n->count; k++)
        if (n->roots[k] == root)
            return n->names[k];
    return NULL;
}

static bool stands_free(expr *a, const char *name)
{
    if (a->kind == EXPR_SYMBOL)
        return strcmp(a->is.name, name) == 0;
    for (uint32_t k = 0; k < a->count; k++)
        if (stands_free(a->args[k], name))
            return true;
    return false;
}

static void give_name(root_names *n, expr *root, expr *avoid)
{
    char name[32] = "r";
    for (size_t k = n->count; k == 0 ? avoid && stands_free(avoid, name) : true; k++) {
        snprintf(name, sizeof name, k == 0 ? "r1" : "r%lu", (unsigned long)k);
        if (!avoid || !stands_free(avoid, name)) {
            bool taken = false;
            for (size_t j = 0; j < n->count; j++)
                taken = taken || strcmp(n->names[j], name) == 0;
            if (!taken)
                break;
        }
    }
    n->roots = base_resize(n->roots, (n->count + 1) * sizeof *n->roots);
    n->names = base_resize(n->names, (n->count + 1) * sizeof *n->names);
    n->roots[n->count] = root;
    n->names[n->count++] = base_copy(name);
}

void root_names_collect(root_names *n, expr *a, expr *avoid)
{
    if (!a)
        return;
    if (a->kind == EXPR_ROOT) {
        if (!root_name_of(n, a))
            give_name(n, a, avoid);
        return;
    }
    for (uint32_t k = 0; k < a->count; k++)
        root_names_collect(n, a->args[k], avoid);
}
