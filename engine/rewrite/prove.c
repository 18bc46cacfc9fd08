/* Identities that the engine proves by itself. Knows normal forms, nothing of samples. Its one idea: the difference of
 * both sides is brought to a normal form in which it is 0 only when they are equal. */
#include "engine/rewrite/prove.h"

bool rule_prove(tw_engine *e, const rule *r)
{
    expr *difference = expr_expand(e, expr_sub(e, r->left, r->right));
    if (!difference && e->error.kind == ERROR_VALUE) engine_forgive(e);
    return difference && expr_is_zero(difference);
}
