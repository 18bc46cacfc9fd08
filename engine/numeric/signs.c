/* The second enclosing route. One idea: with r_N the amplitude less its first N terms, the first omitted term is R_N - R_(N+1); if r_N
 * is of one sign on the whole range and r_(N+1) of the opposite one, both parts of that difference have the sign of the term, so that
 * R_N lies between 0 and it (Olver 1974, ch. 3 section 2: the error test). "The whole range" is that of the terms, (0, inf): beyond a
 * finite end the amplitude is 0 and the kept terms alone must have the sign. Signs are proved by engine/ball/decide.h. */
#include "engine/numeric/signs.h"

#include <stdlib.h>

#include "engine/ball/decide.h"

typedef struct sides {
    tw_engine *e;
    expr *x, *amplitude, *end;     /* on (0, end) of x; end NULL: infinite */
    expr *unit, *front;            /* kept terms: front * sum c_k unit^k, as functions of x */
    slong shift;                   /* of the order at 0: front is unit^shift there */
    expr *t, *t_end;               /* beyond a finite end: sum c_k t^k on (t_end, inf) */
    series s;
} sides;

static expr *kept(sides *w, expr *unit, slong count)
{
    tw_engine *e = w->e;
    const strand *one = w->s.strands;
    expr *sum = expr_int(e, 0);
    for (slong k = 0; k < count; k++)
        if (!coefficient_is_zero(&one->c, k))
            sum = expr_add(e, sum, expr_mul(e, coefficient_expr(e, &one->c, k), expr_pow(e, unit, expr_int(e, k))));
    return expr_mul(e, one->constant, sum);
}

/* f >= 0 on (0, end)? f vanishes at 0 to the order `order`, so that it is enough that its derivative of that order is >= 0. */
static bool never_negative(sides *w, expr *f, slong order)
{
    enum { ORDER_MOST = 9 };
    tw_engine *e = w->e;
    expr *zero = expr_int(e, 0), *end = w->end ? w->end : expr_constant_of(e, CONSTANT_INF);
    if (f && decide_positive_on(e, f, w->x, zero, end, true) == ANSWER_YES)
        return true;
    for (slong k = 0; k < order && order <= ORDER_MOST; k++)
        f = expr_derivative(e, f, w->x);
    return f && order <= ORDER_MOST && budget_ok(e) && decide_positive_on(e, f, w->x, zero, end, true) == ANSWER_YES;
}

/* Has r, with `count` coefficients kept, this sign everywhere? */
static bool rest_has_sign(sides *w, slong count, int sign)
{
    tw_engine *e = w->e;
    expr *front = expr_int(e, sign);
    expr *r = expr_mul(e, front, expr_sub(e, w->amplitude, expr_mul(e, w->front, kept(w, w->unit, count))));
    if (!never_negative(w, r, count + w->shift))
        return false;
    if (!w->end)
        return true;
    expr *beyond = expr_mul(e, expr_neg(e, front), kept(w, w->t, count));
    return beyond && (expr_is_zero(beyond) || decide_positive_on(e, beyond, w->t, w->t_end, expr_constant_of(e, CONSTANT_INF), true) == ANSWER_YES);
}

/* r has the sign of its first term next to 0. */
static int coefficient_sign(sides *w, slong n)
{
    const strand *one = w->s.strands;
    int sign = decide_sign(w->e, expr_mul(w->e, one->constant, coefficient_expr(w->e, &one->c, n)));
    return sign == 1 || sign == -1 ? sign : 0;
}

/* The index of the nonzero coefficient number `terms`, -1 when fewer are known. */
static slong nonzero_index(const coefficients *c, slong terms)
{
    for (slong k = 0; k < c->count; k++)
        if (!coefficient_is_zero(c, k) && terms-- == 0)
            return k;
    return -1;
}

static bool is_power(tw_engine *e, expr *p, expr *x)
{
    expr *base, *exponent;
    expr_as_power(e, p, &base, &exponent);
    return base == x && expr_is_number(exponent) && fmpq_sgn(expr_number(exponent)) > 0;
}

/* x^a (f(y) - sum c_k y^k) with x = y^den: the sign is that of the bracket. */
static bool sides_pure(sides *w, const branch *b)
{
    tw_engine *e = w->e;
    const strand *one = w->s.strands;
    expr *y = expr_fresh(e, "y"), *positive_x[] = {b->x}, *positive_y[] = {y};
    expr *power = expr_int(e, one->den);
    bool plain = one->den == 1 && expr_is_number(one->exponent) && fmpz_is_one(fmpq_denref(expr_number(one->exponent))) &&
                 fmpq_sgn(expr_number(one->exponent)) >= 0 && fmpz_cmp_si(fmpq_numref(expr_number(one->exponent)), 20) < 0;
    if (plain) { /* nothing to take out: log(1 + x) stays what it is */
        w->x = w->t = w->unit = b->x;
        w->amplitude = b->q;
        w->front = expr_pow(e, b->x, one->exponent);
        w->shift = fmpz_get_si(fmpq_numref(expr_number(one->exponent)));
        w->t_end = w->end;
        return w->front != NULL;
    }
    expr *f = expr_normal(e, expr_mul(e, b->q, expr_pow(e, b->x, expr_neg(e, one->exponent))), positive_x, 1);
    f = f ? expr_normal(e, expr_substitute(e, f, b->x, expr_pow(e, y, power)), positive_y, 1) : NULL;
    w->x = w->t = w->unit = y;
    w->amplitude = f;
    w->front = expr_int(e, 1);
    if (w->end)
        w->end = w->t_end = expr_pow(e, w->end, expr_frac(e, 1, one->den));
    return f != NULL;
}

/* q - p' sum c_k p^k in x itself. */
static bool sides_general(sides *w, const branch *b)
{
    tw_engine *e = w->e;
    const strand *one = w->s.strands;
    if (one->den != 1 || !expr_is_zero(one->exponent))
        return false;
    w->x = b->x;
    w->amplitude = b->q;
    w->unit = b->p;
    w->front = expr_derivative(e, b->p, b->x);
    w->t = expr_fresh(e, "t");
    if (w->end)
        w->t_end = expr_substitute(e, b->p, b->x, w->end);
    return w->front != NULL && (!w->end || w->t_end);
}

static bool sides_make(sides *w, const branch *b, slong terms)
{
    tw_engine *e = w->e;
    bool pure = is_power(e, b->p, b->x);
    slong length = 2 * terms + 8;
    tw_status status = pure ? series_at_zero(e, &w->s, b->q, b->x, length, NULL, NULL)
                            : series_branch(e, &w->s, b->p, b->q, b->x, length, NULL, NULL);
    if (status != TW_OK || w->s.count != 1 || w->s.strands[0].log_power != 0)
        return false;
    w->end = expr_is_inf(b->end) ? NULL : b->end;
    return pure ? sides_pure(w, b) : sides_general(w, b);
}

static bool only_x(expr *f, expr *x)
{
    expr **symbols;
    size_t n = expr_symbols(f, &symbols);
    bool fine = true;
    for (size_t k = 0; k < n; k++)
        fine = fine && symbols[k] == x;
    free(symbols);
    return fine;
}

answer signs_enclose(tw_engine *e, const local_form *l, expr *large, const env *at, slong terms)
{
    enum { TERMS_MOST = 24 };
    sides w = {.e = e};
    branch b;
    answer result = ANSWER_UNKNOWN;
    slong first, second;
    if (l->count != 1 || terms > TERMS_MOST)
        return ANSWER_UNKNOWN;
    b = l->branches[0];
    for (size_t k = 0; k < at->count; k++)
        if (at->symbols[k] != large) {
            b.q = expr_substitute(e, b.q, at->symbols[k], at->values[k]);
            b.p = expr_substitute(e, b.p, at->symbols[k], at->values[k]);
            b.end = expr_substitute(e, b.end, at->symbols[k], at->values[k]);
        }
    if (!b.q || !b.p || !b.end || !only_x(b.q, b.x) || !only_x(b.p, b.x) || !only_x(b.end, b.x))
        return ANSWER_UNKNOWN;
    series_init(&w.s);
    if (sides_make(&w, &b, terms)) {
        first = nonzero_index(&w.s.strands[0].c, terms);
        second = nonzero_index(&w.s.strands[0].c, terms + 1);
        int sign = first >= 0 ? coefficient_sign(&w, first) : 0;
        if (sign && second >= 0 && rest_has_sign(&w, first, sign) && rest_has_sign(&w, second, -sign))
            result = ANSWER_YES;
    }
    series_clear(&w.s);
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    return e->error.kind == ERROR_NONE ? result : ANSWER_UNKNOWN;
}
