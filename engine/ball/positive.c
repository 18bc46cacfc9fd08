/* Is f > 0 on a whole range? In order: structure; polynomials exactly, by their real roots; factor by factor; then
 * bisection with balls, in monotone or second-order form where plain balls fail, with the first derivative that is
 * not 0 at an end where f is 0, and with the growth records of f and 1/f towards infinity and towards a singular end
 * (a finite bound of 1/f means that f has no zero out there). quadrature.md, section 4. A NO always rests on a point
 * or a one-sided neighbourhood inside the range. */
#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/ball/growth.h"
#include "engine/ball/sign.h"

enum { BOXES = 6000, DEPTH = 60, ORDERS = 8, PARAMETERS = 3, BITS = 64, SIZE_LIMIT = 20000, SPLIT_BITS = 20 };

typedef struct range_job {
    tw_engine *e;
    tape *t;
    expr *f, *x;
    size_t n;         /* variables of the tape: x and parameters with two known ends */
    expr **vars;
    acb_ptr box;      /* the ball of each: [0] is set for each box */
    bool weak;
    slong left;       /* boxes still allowed */
    arf_t in_low, in_high; /* surely inside the range between these */
    bool has_high;
    bool refuted;     /* f is not positive somewhere in the range: proved */
} range_job;

static answer positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak, int level);

/* ---- by structure ---- */

/* f(end + side*w) with w > 0. */
static answer positive_by_structure(tw_engine *e, expr *f, expr *x, expr *end, int side, bool weak)
{
    expr *w = expr_fresh(e, "w");
    sign_context c = {.count = 1, .symbols = base_alloc(sizeof *c.symbols), .signs = base_alloc(sizeof *c.signs)};
    c.symbols[0] = w;
    c.signs[0] = SIGN_POSITIVE;
    expr *g = expr_substitute(e, f, x, side > 0 ? expr_add(e, end, w) : expr_sub(e, end, w));
    int signs = sign_of(e, g, &c);
    if (signs != SIGN_POSITIVE && signs != SIGN_NEGATIVE) signs &= sign_of(e, sign_shift(e, g, &c), &c);
    forgive_trouble(e);
    free(c.symbols);
    free(c.signs);
    if (signs == SIGN_POSITIVE || (weak && !(signs & SIGN_NEGATIVE))) return ANSWER_YES;
    return signs == SIGN_NEGATIVE || (!weak && !(signs & SIGN_POSITIVE)) ? ANSWER_NO : ANSWER_UNKNOWN;
}

/* ---- polynomials with rational coefficients, rational ends ---- */

typedef enum root_place { ROOT_OUTSIDE, ROOT_INSIDE, ROOT_UNSURE } root_place;

/* Does the squarefree g, not 0 at a finite end, have a real root in the open range? */
static root_place roots_inside(const fmpz_poly_t g, const fmpq *low, const fmpq *high)
{
    slong n = fmpz_poly_degree(g);
    root_place place = ROOT_OUTSIDE;
    if (n < 1) return place;
    acb_ptr roots = _acb_vec_init(n);
    arb_t end;
    arb_init(end);
    for (slong prec = 64; prec <= 4096; prec *= 4) {
        arb_fmpz_poly_complex_roots(roots, g, 0, prec);
        place = ROOT_OUTSIDE;
        for (slong k = 0; k < n && place != ROOT_INSIDE; k++) {
            if (!acb_is_real(roots + k)) continue;
            arb_srcptr r = acb_realref(roots + k);
            bool in = true, out = false;
            if (low) {
                arb_set_fmpq(end, low, 2 * prec);
                in = in && arb_gt(r, end);
                out = out || arb_lt(r, end);
            }
            if (high) {
                arb_set_fmpq(end, high, 2 * prec);
                in = in && arb_lt(r, end);
                out = out || arb_gt(r, end);
            }
            if (in) place = ROOT_INSIDE;
            else if (!out) place = ROOT_UNSURE;
        }
        if (place != ROOT_UNSURE) break;
    }
    arb_clear(end);
    _acb_vec_clear(roots, n);
    return place;
}

/* Takes the root q out of the squarefree g, if it is one. */
static void remove_root(fmpz_poly_t g, const fmpq *q)
{
    if (!q || fmpz_poly_degree(g) < 1) return;
    fmpq_t v;
    fmpq_init(v);
    fmpz_poly_evaluate_fmpq(v, g, q);
    if (fmpq_is_zero(v)) {
        fmpz_poly_t line;
        fmpz_poly_init(line);
        fmpz_poly_set_coeff_fmpz(line, 1, fmpq_denref(q));
        fmpz_poly_set_coeff_fmpz(line, 0, fmpq_numref(q));
        fmpz_neg(line->coeffs, line->coeffs);
        fmpz_poly_div(g, g, line);
        fmpz_poly_clear(line);
    }
    fmpq_clear(v);
}

/* Sign of p at some point of the range where it is not 0. */
static int sample_sign(const fmpz_poly_t p, const fmpq *low, const fmpq *high)
{
    fmpq_t t, v, length;
    fmpq_init(t);
    fmpq_init(v);
    fmpq_init(length);
    if (low && high) fmpq_sub(length, high, low);
    else fmpq_one(length);
    int sign = 0;
    for (slong k = 1; k <= fmpz_poly_degree(p) + 1 && sign == 0; k++) {
        fmpq_set_si(t, k, (ulong)fmpz_poly_degree(p) + 2);
        fmpq_mul(t, t, length);
        if (low) fmpq_add(t, low, t);
        else if (high) fmpq_sub(t, high, t);
        fmpz_poly_evaluate_fmpq(v, p, t);
        sign = fmpq_sgn(v);
    }
    fmpq_clear(t);
    fmpq_clear(v);
    fmpq_clear(length);
    return sign;
}

static answer polynomial_positive(const fmpz_poly_t p, const fmpq *low, const fmpq *high, bool weak)
{
    fmpz_poly_factor_t parts;
    fmpz_poly_factor_init(parts);
    fmpz_poly_factor_squarefree(parts, p);
    root_place worst = ROOT_OUTSIDE;
    for (slong k = 0; k < parts->num && worst != ROOT_INSIDE; k++) {
        if (weak && parts->exp[k] % 2 == 0) continue;
        fmpz_poly_struct *g = parts->p + k;
        remove_root(g, low);
        remove_root(g, high);
        root_place place = roots_inside(g, low, high);
        if (place != ROOT_OUTSIDE) worst = place;
    }
    fmpz_poly_factor_clear(parts);
    if (worst == ROOT_INSIDE) return ANSWER_NO;
    if (worst == ROOT_UNSURE) return ANSWER_UNKNOWN;
    int sign = sample_sign(p, low, high);
    return sign > 0 ? ANSWER_YES : sign < 0 ? ANSWER_NO : weak ? ANSWER_YES : ANSWER_NO;
}

static answer positive_polynomial(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak)
{
    expr **c;
    slong degree;
    if (!expr_is_minus_inf(from) && !expr_is_number(from)) return ANSWER_UNKNOWN;
    if (!expr_is_inf(to) && !expr_is_number(to)) return ANSWER_UNKNOWN;
    if (expr_polynomial(e, f, x, 100, &c, &degree) != TW_OK) {
        forgive_trouble(e);
        return ANSWER_UNKNOWN;
    }
    fmpq_poly_t p;
    fmpq_poly_init(p);
    bool rational = true;
    for (slong k = 0; k <= degree && rational; k++) {
        rational = expr_is_number(c[k]);
        if (rational) fmpq_poly_set_coeff_fmpq(p, k, expr_number(c[k]));
    }
    free(c);
    answer a = ANSWER_UNKNOWN;
    if (rational && fmpq_poly_is_zero(p)) {
        a = weak ? ANSWER_YES : ANSWER_NO;
    } else if (rational) {
        fmpz_poly_t z;
        fmpz_poly_init(z);
        fmpq_poly_get_numerator(z, p);
        a = polynomial_positive(z, expr_is_number(from) ? expr_number(from) : NULL,
                                expr_is_number(to) ? expr_number(to) : NULL, weak);
        fmpz_poly_clear(z);
    }
    fmpq_poly_clear(p);
    return a;
}

/* ---- factor by factor ---- */

/* Sign of the factor g over the range: 1, -1, or 2; weakly when `weak`. */
static int factor_sign(tw_engine *e, expr *g, expr *x, expr *from, expr *to, bool weak, int level)
{
    if (!expr_has(g, x)) {
        int signs = sign_by_structure(e, g);
        if (signs == SIGN_POSITIVE || (weak && !(signs & SIGN_NEGATIVE))) return 1;
        return signs == SIGN_NEGATIVE || (weak && !(signs & SIGN_POSITIVE)) ? -1 : 2;
    }
    if (positive_on(e, g, x, from, to, weak, level + 1) == ANSWER_YES) return 1;
    return positive_on(e, expr_neg(e, g), x, from, to, weak, level + 1) == ANSWER_YES ? -1 : 2;
}

static answer positive_by_factors(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak, int level)
{
    if (f->kind != EXPR_PRODUCT || level > 2) return ANSWER_UNKNOWN;
    int sign = 1;
    for (uint32_t k = 0; k < f->count && sign != 2; k++) {
        int s = factor_sign(e, f->args[k], x, from, to, weak, level);
        sign = s == 2 ? 2 : sign * s;
    }
    if (sign == 1) return ANSWER_YES;
    return sign == -1 && !weak ? ANSWER_NO : ANSWER_UNKNOWN;
}

/* ---- by balls ---- */

static bool is_good(const range_job *j, const acb_t v)
{
    return acb_is_real(v) && (j->weak ? arb_is_nonnegative(acb_realref(v)) : arb_is_positive(acb_realref(v)));
}

static bool is_bad(const range_job *j, const acb_t v)
{
    return acb_is_real(v) && (j->weak ? arb_is_negative(acb_realref(v)) : arb_is_nonpositive(acb_realref(v)));
}

/* f at the exact point: good, and if bad inside the range the whole is refuted. Parameters spoil refutation: their
 * boxes are wider than the facts. */
static bool good_at(range_job *j, const arf_t point)
{
    acb_t v;
    acb_init(v);
    acb_zero(j->box);
    arb_set_arf(acb_realref(j->box), point);
    tape_eval(v, j->t, j->box, false, BITS);
    const bool inside = arf_cmp(point, j->in_low) > 0 && (!j->has_high || arf_cmp(point, j->in_high) < 0);
    if (inside && j->n == 1 && is_bad(j, v)) j->refuted = true;
    bool good = is_good(j, v);
    acb_clear(v);
    return good;
}

/* f' of one sign on the box: the value at one end counts. Else f(m) + f'(m) d + f''(box)/2 d^2. */
static bool positive_by_series(range_job *j, const arf_t low, const arf_t high, const arf_t middle)
{
    acb_ptr whole = _acb_vec_init(3), centre = _acb_vec_init(2);
    acb_zero(j->box);
    arb_set_interval_arf(acb_realref(j->box), low, high, BITS);
    tape_jet(whole, j->t, j->box, 3, BITS);
    bool positive = false;
    if (acb_is_finite(whole) && acb_is_finite(whole + 1) && acb_is_real(whole) && acb_is_real(whole + 1)) {
        if (arb_is_nonnegative(acb_realref(whole + 1))) positive = good_at(j, low);
        else if (arb_is_nonpositive(acb_realref(whole + 1))) positive = good_at(j, high);
        else if (acb_is_finite(whole + 2) && acb_is_real(whole + 2)) {
            arb_t d, square, sum;
            arb_init(d);
            arb_init(square);
            arb_init(sum);
            arb_set_interval_arf(d, low, high, BITS);
            arb_sub_arf(d, d, middle, BITS);
            acb_zero(j->box);
            arb_set_arf(acb_realref(j->box), middle);
            tape_jet(centre, j->t, j->box, 2, BITS);
            arf_t top; /* d^2 lies in [0, |d|^2] */
            arf_init(top);
            arb_get_abs_ubound_arf(top, d, BITS);
            arf_mul(top, top, top, BITS, ARF_RND_UP);
            arb_set_arf(square, top);
            arb_union(square, square, sum, BITS);
            arb_mul(sum, acb_realref(whole + 2), square, BITS);
            arb_addmul(sum, acb_realref(centre + 1), d, BITS);
            arb_add(sum, sum, acb_realref(centre), BITS);
            positive = acb_is_real(centre) && acb_is_real(centre + 1) && arb_is_finite(sum) &&
                       (j->weak ? arb_is_nonnegative(sum) : arb_is_positive(sum));
            arf_clear(top);
            arb_clear(d);
            arb_clear(square);
            arb_clear(sum);
        }
    }
    _acb_vec_clear(whole, 3);
    _acb_vec_clear(centre, 2);
    return positive;
}

/* Few bits, so that boxes are exact; geometric where the ends differ by a lot. */
static void split_point(arf_t middle, const arf_t low, const arf_t high)
{
    arf_t four;
    arf_init(four);
    arf_mul_2exp_si(four, low, 2);
    if (arf_sgn(low) > 0 && arf_cmp(high, four) > 0) {
        arf_mul(middle, low, high, BITS, ARF_RND_NEAR);
        arf_sqrt(middle, middle, SPLIT_BITS, ARF_RND_NEAR);
    } else {
        arf_add(middle, low, high, BITS, ARF_RND_NEAR);
        arf_mul_2exp_si(middle, middle, -1);
        arf_set_round(four, middle, SPLIT_BITS, ARF_RND_NEAR);
        if (arf_cmp(four, low) > 0 && arf_cmp(four, high) < 0) arf_set(middle, four);
    }
    arf_clear(four);
}

static bool positive_over(range_job *j, const arf_t low, const arf_t high, int depth)
{
    if (--j->left < 0 || !budget_ok(j->e)) return false;
    acb_t v;
    arf_t middle;
    acb_init(v);
    arf_init(middle);
    acb_zero(j->box);
    arb_set_interval_arf(acb_realref(j->box), low, high, BITS);
    tape_eval(v, j->t, j->box, false, BITS);
    bool good = is_good(j, v);
    if (!good) {
        split_point(middle, low, high);
        const bool good_inside = good_at(j, middle) || j->n > 1;
        good = good_inside && depth >= 3 && positive_by_series(j, low, high, middle);
        if (!good && !j->refuted && depth < DEPTH && arf_cmp(middle, low) > 0 && arf_cmp(middle, high) < 0)
            good = positive_over(j, low, middle, depth + 1) && positive_over(j, middle, high, depth + 1);
    }
    acb_clear(v);
    arf_clear(middle);
    return good;
}

/* ---- near an end ---- */

/* The ball [c, reach]. */
static void reach_ball(acb_t out, const acb_t c, const arf_t reach)
{
    arb_t other;
    arb_init(other);
    arb_set_arf(other, reach);
    arb_union(acb_realref(out), acb_realref(c), other, BITS);
    arb_zero(acb_imagref(out));
    arb_clear(other);
}

/* The derivative g of order k has the sign `wanted` on [c, reach], and f is analytic there (k > 0): then Taylor's
 * theorem gives f's sign. Shrinks reach until it is so. */
static bool sign_up_to(range_job *j, expr *g, int order, int wanted, const acb_t c, int side, arf_t reach)
{
    tape *t = tape_new(j->e, g, j->vars, j->n);
    bool good = false;
    acb_t v;
    acb_init(v);
    for (int shrink = 0; t && shrink < 40 && !good; shrink++) {
        arf_set_si_2exp_si(reach, side, 2 - shrink);
        arf_add(reach, arb_midref(acb_realref(c)), reach, SPLIT_BITS + 40, ARF_RND_NEAR);
        reach_ball(j->box, c, reach);
        tape_eval(v, t, j->box, order > 0, BITS);
        good = acb_is_real(v) && (wanted > 0 ? arb_is_positive(acb_realref(v)) : arb_is_negative(acb_realref(v)));
        if (good && order > 0) {
            tape_eval(v, j->t, j->box, true, BITS);
            good = acb_is_finite(v);
        }
    }
    acb_clear(v);
    tape_free(t);
    forgive_trouble(j->e);
    return good;
}

/* f near the end c, in direction side: the first derivative that is not exactly 0 there decides up to `reach`, which
 * is set. */
static bool positive_near(range_job *j, expr *end, const acb_t c, int side, arf_t reach)
{
    expr *g = j->f;
    for (int order = 0; order < ORDERS && g && budget_ok(j->e); order++) {
        expr *value = expr_substitute(j->e, g, j->x, end);
        int signs = value ? sign_by_structure(j->e, expr_expand(j->e, value)) : SIGN_ANY;
        if (signs == SIGN_POSITIVE || signs == SIGN_NEGATIVE) {
            const int wanted = signs == SIGN_POSITIVE ? 1 : -1, f_sign = side < 0 && order % 2 ? -wanted : wanted;
            if (!sign_up_to(j, g, order, wanted, c, side, reach)) return false;
            if (f_sign < 0) j->refuted = true;
            return f_sign > 0;
        }
        if (signs != SIGN_ZERO) break;
        g = expr_derivative(j->e, g, j->x);
    }
    forgive_trouble(j->e);
    return false;
}

/* Beyond some X > start: f(place(y)) and its reciprocal both have records, so neither pole nor zero; and f(X) > 0. */
static bool positive_far(range_job *j, expr *g, expr *y, double start, arf_t X)
{
    if (j->n > 1 || !g) return false;
    env nowhere = {0};
    growth_bound up, down;
    growth_bound_init(&up);
    growth_bound_init(&down);
    bool good = growth_at_infinity(j->e, &up, g, y, &nowhere, start) == TW_OK &&
                growth_at_infinity(j->e, &down, expr_pow(j->e, g, expr_int(j->e, -1)), y, &nowhere, start) == TW_OK;
    if (good) {
        arf_set(X, arf_cmp(up.X, down.X) > 0 ? up.X : down.X);
        arf_ceil(X, X);
        tape *t = tape_new(j->e, g, &y, 1);
        acb_t at, v;
        acb_init(at);
        acb_init(v);
        arb_set_arf(acb_realref(at), X);
        if (t) tape_eval(v, t, at, false, BITS);
        good = t && acb_is_real(v) && arb_is_positive(acb_realref(v));
        if (t && acb_is_real(v) && arb_is_negative(acb_realref(v))) j->refuted = true;
        acb_clear(at);
        acb_clear(v);
        tape_free(t);
    }
    forgive_trouble(j->e);
    growth_bound_clear(&up);
    growth_bound_clear(&down);
    return good;
}

/* The singular end c: f(c + side/y) for y to infinity; reach = c + side/X. */
static bool positive_beside(range_job *j, expr *end, const acb_t c, int side, arf_t reach)
{
    expr *y = expr_fresh(j->e, "y"), *moved = expr_div(j->e, expr_int(j->e, side), y);
    double start = 4;
    if (j->has_high) { /* f's bound must not reach over the other end */
        arf_t length;
        arf_init(length);
        arf_sub(length, j->in_high, j->in_low, 53, ARF_RND_DOWN);
        double l = arf_get_d(length, ARF_RND_DOWN);
        if (l > 0 && 2 / l > start) start = 2 / l;
        arf_clear(length);
    }
    arf_t X;
    arb_t r;
    arf_init(X);
    arb_init(r);
    bool good = moved && positive_far(j, expr_substitute(j->e, j->f, j->x, expr_add(j->e, end, moved)), y, start, X);
    if (good) { /* a little nearer than 1/X, so that the proved part reaches over it */
        arb_set_arf(r, X);
        arb_inv(r, r, BITS);
        if (side < 0) arb_neg(r, r);
        arb_add(r, r, acb_realref(c), BITS);
        if (side > 0) arb_get_lbound_arf(reach, r, BITS);
        else arb_get_ubound_arf(reach, r, BITS);
    }
    forgive_trouble(j->e);
    arf_clear(X);
    arb_clear(r);
    return good;
}

/* ---- putting it together ---- */

/* The tape's variables: x and the other symbols of f, all with two known ends; false when one has none. */
static bool job_variables(range_job *j)
{
    expr **symbols;
    size_t n = expr_symbols(j->f, &symbols);
    j->vars = base_alloc((n + 1) * sizeof *j->vars);
    j->vars[0] = j->x;
    j->n = 1;
    j->box = _acb_vec_init((slong)n + 1);
    bool known = n <= PARAMETERS + 1;
    fmpq_t low, high;
    arb_t a;
    fmpq_init(low);
    fmpq_init(high);
    arb_init(a);
    for (size_t k = 0; k < n && known; k++) {
        if (symbols[k] == j->x) continue;
        known = !facts_is_complex(j->e, symbols[k]) && (facts_interval(j->e, symbols[k], low, high) & 3) == 3;
        if (!known) break;
        arb_set_fmpq(a, low, BITS);
        arb_set_fmpq(acb_realref(j->box + j->n), high, BITS);
        arb_union(acb_realref(j->box + j->n), acb_realref(j->box + j->n), a, BITS);
        j->vars[j->n++] = symbols[k];
    }
    arb_clear(a);
    fmpq_clear(low);
    fmpq_clear(high);
    free(symbols);
    return known;
}

static bool end_ball(tw_engine *e, acb_t c, expr *end)
{
    bool known = expr_is_closed_value(end) && ball_value(e, c, end, BITS) == TW_OK;
    forgive_trouble(e);
    return known && acb_is_real(c) && acb_is_finite(c);
}

static answer positive_by_balls(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak)
{
    range_job j = {.e = e, .f = f, .x = x, .weak = weak, .left = BOXES, .has_high = !expr_is_inf(to)};
    acb_t a, b;
    arf_t low, high, reach;
    acb_init(a);
    acb_init(b);
    arf_init(low);
    arf_init(high);
    arf_init(reach);
    arf_init(j.in_low);
    arf_init(j.in_high);
    bool good = job_variables(&j) && end_ball(e, a, from) && (!j.has_high || end_ball(e, b, to));
    j.t = good ? tape_new(e, f, j.vars, j.n) : NULL;
    good = j.t;
    if (good) {
        arb_get_lbound_arf(low, acb_realref(a), BITS);
        arb_get_ubound_arf(j.in_low, acb_realref(a), BITS);
        arb_get_ubound_arf(high, acb_realref(b), BITS);
        arb_get_lbound_arf(j.in_high, acb_realref(b), BITS);
        good = !j.has_high || arf_cmp(j.in_low, j.in_high) < 0;
    }
    if (good && (positive_near(&j, from, a, 1, reach) || (!j.refuted && positive_beside(&j, from, a, 1, reach))))
        arf_set(low, reach);
    if (good && !j.refuted && !j.has_high) {
        double start = arf_get_d(low, ARF_RND_UP);
        good = positive_far(&j, f, x, start > 0 ? 4 + 2 * start : 4, high);
    } else if (good && !j.refuted &&
               (positive_near(&j, to, b, -1, reach) || (!j.refuted && positive_beside(&j, to, b, -1, reach)))) {
        arf_set(high, reach);
    }
    if (good && !j.refuted && arf_cmp(low, high) < 0) good = positive_over(&j, low, high, 0);
    forgive_trouble(e);
    tape_free(j.t);
    free(j.vars);
    _acb_vec_clear(j.box, (slong)j.n);
    acb_clear(a);
    acb_clear(b);
    arf_clear(low);
    arf_clear(high);
    arf_clear(reach);
    arf_clear(j.in_low);
    arf_clear(j.in_high);
    return j.refuted ? ANSWER_NO : good ? ANSWER_YES : ANSWER_UNKNOWN;
}

/* f(-x) on the mirrored range. */
static answer positive_mirrored(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak, int level)
{
    expr *g = expr_substitute(e, f, x, expr_neg(e, x));
    return positive_on(e, g, x, expr_neg(e, to), expr_neg(e, from), weak, level);
}

/* The whole line, cut at 0. */
static answer positive_on_line(tw_engine *e, expr *f, expr *x, bool weak, int level)
{
    expr *zero = expr_int(e, 0), *inf = expr_constant_of(e, CONSTANT_INF);
    int signs = sign_of(e, expr_substitute(e, f, x, zero), NULL);
    forgive_trouble(e);
    if (signs == SIGN_NEGATIVE || (!weak && !(signs & SIGN_POSITIVE))) return ANSWER_NO;
    const bool at_zero = signs == SIGN_POSITIVE || (weak && !(signs & SIGN_NEGATIVE));
    answer right = positive_on(e, f, x, zero, inf, weak, level);
    if (right == ANSWER_NO) return ANSWER_NO;
    answer left = positive_mirrored(e, f, x, expr_neg(e, inf), zero, weak, level);
    if (left == ANSWER_NO) return ANSWER_NO;
    return at_zero && left == ANSWER_YES && right == ANSWER_YES ? ANSWER_YES : ANSWER_UNKNOWN;
}

static answer positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak, int level)
{
    if (!f || !from || !to || !budget_ok(e) || expr_size(f) > SIZE_LIMIT) return ANSWER_UNKNOWN;
    if (expr_is_inf(from) || expr_is_minus_inf(to)) return ANSWER_UNKNOWN;
    answer a = positive_polynomial(e, f, x, from, to, weak);
    if (a != ANSWER_UNKNOWN) return a;
    if (expr_is_minus_inf(from) && expr_is_inf(to)) return positive_on_line(e, f, x, weak, level);
    if (expr_is_minus_inf(from)) return positive_mirrored(e, f, x, from, to, weak, level);
    a = positive_by_structure(e, f, x, from, 1, weak);
    if (a == ANSWER_UNKNOWN && !expr_is_inf(to)) a = positive_by_structure(e, f, x, to, -1, weak);
    if (a == ANSWER_YES || (a == ANSWER_NO && expr_is_inf(to))) return a;
    a = positive_by_factors(e, f, x, from, to, weak, level);
    return a != ANSWER_UNKNOWN ? a : positive_by_balls(e, f, x, from, to, weak);
}

answer decide_positive_on(tw_engine *e, expr *f, expr *x, expr *from, expr *to, bool weak)
{
    return positive_on(e, f, x, from, to, weak, 0);
}
