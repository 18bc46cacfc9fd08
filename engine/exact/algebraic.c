/* Algebraic numbers as expressions. One idea: an EXPR_ROOT is its irreducible polynomial and a ball that holds one root
 * of it; everything exact goes through the polynomial, the ball only chooses. */
#include "engine/exact/algebraic.h"

#include <stdlib.h>

#include "engine/ball/tape.h"
#include "engine/exact/field.h"

enum { DEGREE_MOST = 200, CHOICE_BITS = 192, ROOM_FIRST = 8, ROOM_MOST = 256 };

/* The body as a primitive integer polynomial. */
static bool body_polynomial(tw_engine *e, fmpz_poly_t out, expr *root)
{
    expr *x = expr_fresh(e, "r"), *body = x ? expr_open(e, root, x) : NULL, **c = NULL;
    slong degree;
    if (!body || expr_polynomial(e, body, x, DEGREE_MOST, &c, &degree) != TW_OK)
        return false;
    fmpq_poly_t p;
    fmpq_poly_init(p);
    bool rational = degree >= 1;
    for (slong k = 0; k <= degree && rational; k++) {
        rational = expr_is_number(c[k]);
        if (rational)
            fmpq_poly_set_coeff_fmpq(p, k, expr_number(c[k]));
    }
    free(c);
    if (rational) {
        fmpq_poly_get_numerator(out, p);
        fmpz_poly_primitive_part(out, out);
    }
    fmpq_poly_clear(p);
    return rational;
}

bool algebraic_polynomial(tw_engine *e, fmpz_poly_t out, expr *root)
{
    fmpz_poly_t p;
    fmpz_poly_factor_t parts;
    acb_t at, value;
    slong found = -1, count = 0;
    fmpz_poly_init(p);
    if (!body_polynomial(e, p, root)) {
        fmpz_poly_clear(p);
        return false;
    }
    fmpz_poly_factor_init(parts);
    acb_init(at), acb_init(value);
    fmpz_poly_factor(parts, p);
    bool known = ball_value(e, at, root, CHOICE_BITS) == TW_OK && acb_is_finite(at);
    for (slong k = 0; k < parts->num && known; k++) {
        arb_fmpz_poly_evaluate_acb(value, parts->p + k, at, CHOICE_BITS);
        if (acb_contains_zero(value))
            found = k, count++;
    }
    if (count == 1) {
        fmpz_poly_set(out, parts->p + found);
        if (fmpz_sgn(fmpz_poly_lead(out)) < 0)
            fmpz_poly_neg(out, out);
    }
    acb_clear(at), acb_clear(value);
    fmpz_poly_factor_clear(parts);
    fmpz_poly_clear(p);
    return count == 1;
}

bool algebraic_number(tw_engine *e, qqbar_t out, expr *root)
{
    fmpz_poly_t m;
    acb_t at;
    bool found = false;
    fmpz_poly_init(m);
    acb_init(at);
    if (algebraic_polynomial(e, m, root) && ball_value(e, at, root, CHOICE_BITS) == TW_OK) {
        qqbar_ptr all = _qqbar_vec_init(fmpz_poly_degree(m));
        slong choice = -1, count = 0;
        qqbar_roots_fmpz_poly(all, m, QQBAR_ROOTS_IRREDUCIBLE);
        for (slong k = 0; k < fmpz_poly_degree(m); k++)
            if (acb_overlaps(QQBAR_ENCLOSURE(all + k), at))
                choice = k, count++;
        found = count == 1;
        if (found)
            qqbar_set(out, all + choice);
        _qqbar_vec_clear(all, fmpz_poly_degree(m));
    }
    acb_clear(at);
    fmpz_poly_clear(m);
    return found;
}

/* ---- from a polynomial ---- */

/* A short decimal near the ball's middle, good enough to single the root out: fewer than half the distance to the next. */
static expr *short_near(tw_engine *e, const fmpz_poly_t m, const arb_t near)
{
    slong n = fmpz_poly_degree(m);
    acb_ptr roots = _acb_vec_init(n);
    arb_t distance, least;
    acb_t d;
    arb_init(distance), arb_init(least), acb_init(d);
    arf_set_d(arb_midref(least), 1);
    arb_fmpz_poly_complex_roots(roots, m, 0, CHOICE_BITS);
    for (slong k = 0; k < n; k++) {
        acb_sub_arb(d, roots + k, near, CHOICE_BITS);
        acb_abs(distance, d, CHOICE_BITS);
        if (arb_is_positive(distance) && arf_cmp(arb_midref(distance), arb_midref(least)) < 0)
            arb_set(least, distance);
    }
    double gap = arf_get_d(arb_midref(least), ARF_RND_DOWN);
    slong digits = 4;
    for (double step = 1e-4; step > gap / 8 && digits < 40; step /= 10)
        digits++;
    fmpz_t ten, top;
    fmpq_t q;
    fmpz_init(ten), fmpz_init(top), fmpq_init(q);
    fmpz_set_ui(ten, 10);
    fmpz_pow_ui(ten, ten, (ulong)digits);
    arb_mul_fmpz(distance, near, ten, CHOICE_BITS);
    arf_get_fmpz(top, arb_midref(distance), ARF_RND_NEAR);
    fmpq_set_fmpz_frac(q, top, ten);
    expr *made = expr_fmpq(e, q);
    fmpz_clear(ten), fmpz_clear(top), fmpq_clear(q);
    arb_clear(distance), arb_clear(least), acb_clear(d);
    _acb_vec_clear(roots, n);
    return made;
}

/* (-b + sign sqrt(b^2 - 4ac))/(2a), the sign by the ball. */
static expr *quadratic_root(tw_engine *e, const fmpz_poly_t m, const arb_t near)
{
    const fmpz *c = m->coeffs;
    fmpz_t d, t;
    arb_t value;
    fmpz_init(d), fmpz_init(t);
    arb_init(value);
    fmpz_mul(d, c + 1, c + 1);
    fmpz_mul(t, c, c + 2);
    fmpz_submul_ui(d, t, 4);
    expr *root = expr_sqrt(e, expr_fmpz(e, d));
    arb_mul_fmpz(value, near, c + 2, CHOICE_BITS);
    arb_mul_2exp_si(value, value, 1);
    arb_add_fmpz(value, value, c + 1, CHOICE_BITS);
    if (arf_sgn(arb_midref(value)) < 0)
        root = expr_neg(e, root);
    fmpz_neg(t, c + 1);
    expr *half = expr_frac(e, 1, 2);
    expr *over = expr_pow(e, expr_fmpz(e, c + 2), expr_int(e, -1));
    expr *made = expr_add(e, expr_mul(e, expr_mul(e, half, over), expr_fmpz(e, t)), expr_mul(e, expr_mul(e, half, over), root));
    fmpz_clear(d), fmpz_clear(t);
    arb_clear(value);
    return made;
}

/* c x^n + b with a real root: a root of a rational number, with its sign; NULL: it is not of this kind. */
static expr *binomial_root(tw_engine *e, const fmpz_poly_t m, const arb_t near)
{
    slong n = fmpz_poly_degree(m);
    for (slong k = 1; k < n; k++)
        if (!fmpz_is_zero(m->coeffs + k))
            return NULL;
    fmpq_t q;
    fmpq_init(q);
    fmpq_set_fmpz_frac(q, m->coeffs, m->coeffs + n);
    int sign = arf_sgn(arb_midref(near));
    fmpq_abs(q, q);
    expr *root = expr_pow(e, expr_fmpq(e, q), expr_frac(e, 1, n));
    fmpq_clear(q);
    return sign < 0 ? expr_neg(e, root) : root;
}

expr *algebraic_expr(tw_engine *e, const fmpz_poly_t m, const arb_t near)
{
    slong n = fmpz_poly_degree(m);
    if (n == 1) {
        fmpq_t q;
        fmpq_init(q);
        fmpq_set_fmpz_frac(q, m->coeffs, m->coeffs + 1);
        fmpq_neg(q, q);
        expr *made = expr_fmpq(e, q);
        fmpq_clear(q);
        return made;
    }
    if (n == 2)
        return quadratic_root(e, m, near);
    expr *plain = binomial_root(e, m, near);
    if (plain || e->error.kind != ERROR_NONE)
        return plain;
    expr *r = expr_symbol(e, "r"), *sum = expr_int(e, 0);
    for (slong k = 0; k <= n; k++)
        sum = expr_add(e, sum, expr_mul(e, expr_fmpz(e, m->coeffs + k), expr_pow(e, r, expr_int(e, k))));
    return expr_root(e, r, sum, short_near(e, m, near));
}

/* ---- lowest terms ---- */

expr *value_canonical(tw_engine *e, expr *a)
{
    if (!a || expr_is_number(a))
        return a;
    for (slong room = ROOM_FIRST; room <= ROOM_MOST; room *= 2) {
        field f;
        element v;
        field_init(&f, e, room);
        element_init(&f, &v);
        tw_status s = field_from_expr(&f, &v, a);
        expr *made = s == TW_OK ? field_to_expr(&f, &v) : NULL;
        bool wider = s != TW_OK && e->error.kind == ERROR_NONE && f.full;
        element_clear(&f, &v);
        field_clear(&f);
        if (made)
            return made;
        if (!wider)
            break;
    }
    return e->error.kind == ERROR_NONE ? a : NULL;
}
