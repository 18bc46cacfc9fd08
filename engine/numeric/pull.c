/* What is singular at y = 0 only through y^r and log(y) is made regular by writing those in front: sqrt(y + y^2) becomes
 * y^(1/2) * sqrt(1 + y). Identities for y > 0; ball arithmetic decides afterwards whether the rest is analytic at 0. */
#include "engine/numeric/pull.h"

#include <stdlib.h>

typedef struct puller {
    tw_engine *e;
    expr *y, *L;
} puller;

static void pull(const puller *w, expr *a, expr **power, expr **rest);

static void pull_product(const puller *w, expr *a, expr **power, expr **rest)
{
    expr *sum = expr_int(w->e, 0), *product = expr_int(w->e, 1);
    for (size_t k = 0; k < a->count; k++) {
        expr *p, *r;
        pull(w, a->args[k], &p, &r);
        sum = expr_add(w->e, sum, p);
        product = expr_mul(w->e, product, r);
    }
    *power = sum;
    *rest = product;
}

/* Is p - q a rational number? Then its sign in *sign. */
static bool powers_compare(tw_engine *e, expr *p, expr *q, int *sign)
{
    expr *d = expr_sub(e, p, q);
    if (!d || !expr_is_number(d))
        return false;
    *sign = fmpq_sgn(expr_number(d));
    return true;
}

static void pull_sum(const puller *w, expr *a, expr **power, expr **rest)
{
    expr **powers = base_alloc(a->count * sizeof *powers), **rests = base_alloc(a->count * sizeof *rests), *least = NULL;
    bool comparable = true;
    for (size_t k = 0; k < a->count; k++) {
        int sign = 0;
        pull(w, a->args[k], powers + k, rests + k);
        comparable = comparable && (!least || powers_compare(w->e, powers[k], least, &sign));
        if (!least || sign < 0)
            least = powers[k];
    }
    if (!comparable)
        least = expr_int(w->e, 0);
    for (size_t k = 0; k < a->count; k++)
        rests[k] = expr_mul(w->e, rests[k], expr_pow(w->e, w->y, expr_sub(w->e, powers[k], least)));
    *power = least;
    *rest = expr_sum(w->e, rests, a->count);
    free(powers);
    free(rests);
}

static void pull_power(const puller *w, expr *a, expr **power, expr **rest)
{
    expr *p, *r;
    pull(w, a->args[0], &p, &r);
    if (expr_has(a->args[1], w->y) || expr_is_zero(p)) {
        *power = expr_int(w->e, 0);
        *rest = expr_pow(w->e, expr_mul(w->e, expr_pow(w->e, w->y, p), r), a->args[1]);
        return;
    }
    *power = expr_mul(w->e, p, a->args[1]);
    *rest = expr_pow(w->e, r, a->args[1]);
}

static void pull_call(const puller *w, expr *a, expr **power, expr **rest)
{
    expr *args[8];
    *power = expr_int(w->e, 0);
    if (a->count > 8) {
        *rest = a;
        return;
    }
    for (size_t k = 0; k < a->count; k++) {
        expr *p, *r;
        pull(w, a->args[k], &p, &r);
        if (a->is.function == FUNCTION_LOG && p && !expr_is_zero(p)) {
            *rest = expr_add(w->e, expr_mul(w->e, p, w->L), expr_call1(w->e, FUNCTION_LOG, r));
            return;
        }
        args[k] = expr_mul(w->e, expr_pow(w->e, w->y, p), r);
    }
    *rest = expr_call(w->e, a->is.function, args, a->count);
}

static void pull(const puller *w, expr *a, expr **power, expr **rest)
{
    *power = expr_int(w->e, 0);
    *rest = a;
    if (!a || !budget_ok(w->e)) {
        *rest = NULL;
        return;
    }
    if (a == w->y) {
        *power = *rest = expr_int(w->e, 1);
        return;
    }
    if (!expr_has(a, w->y))
        return;
    switch (a->kind) {
    case EXPR_PRODUCT: pull_product(w, a, power, rest); return;
    case EXPR_SUM: pull_sum(w, a, power, rest); return;
    case EXPR_POWER: pull_power(w, a, power, rest); return;
    case EXPR_CALL: pull_call(w, a, power, rest); return;
    default: return;
    }
}

void power_pull(tw_engine *e, expr *a, expr *y, expr *L, expr **power, expr **rest)
{
    puller w = {e, y, L};
    pull(&w, a, power, rest);
    if (!*power)
        *rest = NULL;
}
