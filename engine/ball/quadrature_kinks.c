/* The points inside a range where an integrand is not analytic by its form: kinks of abs, sign, min, max and
 * conditions; branch points of logarithms and fractional powers; zeros of denominators. Knows nothing of integration.
 *
 * Zeros are isolated, not guessed: by exact factoring for rational polynomials, otherwise by balls of the function and
 * its derivative on halved intervals, and towards infinity by the growth record. A kink that was missed would make a
 * wrong value, so for kinks anything unresolved is an error; a branch point or pole that was missed only makes the
 * integration fail. */
#include "engine/ball/quadrature_kinks.h"

#include <stdlib.h>

#include "engine/ball/growth.h"

enum { DEPTH_LIMIT = 48, POLYNOMIAL_LIMIT = 40, WORK_LIMIT = 20000, REACH_TRIES = 40 };

typedef struct search {
    quad_points *points;
    tw_engine *e;
    expr *x;
    const quad_range *range;
    slong prec, work;
} search;

void quad_points_init(quad_points *p)
{
    *p = (quad_points){.complete = true};
    arb_init(p->near_end[0]);
    arb_init(p->near_end[1]);
}

void quad_points_clear(quad_points *p)
{
    for (size_t k = 0; k < p->count; k++)
        arb_clear(p->list[k].place);
    free(p->list);
    arb_clear(p->near_end[0]);
    arb_clear(p->near_end[1]);
}

/* ---- the list of points ---- */

static expr *rational_of(tw_engine *e, const arf_t x)
{
    fmpq_t q;
    fmpq_init(q);
    arf_get_fmpq(q, x);
    expr *out = expr_fmpq(e, q);
    fmpq_clear(q);
    return out;
}

/* Exactly the ends of the place's ball: the slice around the place then covers all that the pieces leave out. */
static void enclose(tw_engine *e, quad_point *p)
{
    arf_t low, high;
    arf_init(low);
    arf_init(high);
    arb_get_interval_arf(low, high, p->place, ARF_PREC_EXACT);
    p->low = rational_of(e, low);
    p->high = rational_of(e, high);
    arf_clear(low);
    arf_clear(high);
}

static bool end_infinite(const search *s, int side)
{
    return side ? s->range->to_infinite : s->range->from_infinite;
}

static const arb_struct *end_ball(const search *s, int side)
{
    return side ? s->range->b : s->range->a;
}

static bool inside(const search *s, const arb_t place)
{
    return (s->range->from_infinite || arb_gt(place, s->range->a)) && (s->range->to_infinite || arb_lt(place, s->range->b));
}

static bool outside(const search *s, const arb_t place)
{
    return (!s->range->from_infinite && arb_lt(place, s->range->a)) || (!s->range->to_infinite && arb_gt(place, s->range->b));
}

static bool is_zero_exactly(tw_engine *e, expr *f)
{
    expr *g = f ? expr_expand(e, f) : NULL;
    if (!g)
        engine_forgive(e);
    return g && expr_is_zero(g);
}

/* Is an end of the range a zero of f by exact arithmetic, and the only one in `alone` (NULL: anywhere), a box in which f has one at
 * most? */
static bool end_is_the_zero(search *s, expr *f, const arb_struct *alone)
{
    for (int side = 0; side < 2; side++) {
        if (end_infinite(s, side) || (alone && !arb_contains(alone, end_ball(s, side))))
            continue;
        expr *value = expr_substitute(s->e, f, s->x, side ? s->range->to : s->range->from);
        if (!value)
            engine_forgive(s->e);
        else if (is_zero_exactly(s->e, value))
            return true;
    }
    return false;
}

/* A zero whose place overlaps an end of the range, so that nobody knows on which side it lies: what is between the two counts
 * as near that end. */
static void add_near_end(search *s, const arb_t place)
{
    for (int side = 0; side < 2; side++) {
        arb_struct *known = s->points->near_end[side];
        if (end_infinite(s, side) || !arb_overlaps(place, end_ball(s, side)))
            continue;
        if (!s->points->unsure[side])
            arb_set(known, end_ball(s, side));
        s->points->unsure[side] = true;
        arb_union(known, known, place, s->prec + 64);
    }
}

/* The zero of f in `place`, the only one in `alone` (NULL: anywhere). exact NULL: known by its ball only. */
static void add_point(search *s, expr *f, expr *exact, const arb_t place, const arb_struct *alone)
{
    if (outside(s, place))
        return;
    if (!inside(s, place)) {
        if (!end_is_the_zero(s, f, alone))
            add_near_end(s, place);
        return;
    }
    quad_points *p = s->points;
    for (size_t k = 0; k < p->count; k++) {
        if (exact && p->list[k].low == exact)
            return;
        if (arb_overlaps(p->list[k].place, place)) {
            arb_union(p->list[k].place, p->list[k].place, place, s->prec + 64);
            enclose(s->e, &p->list[k]);
            return;
        }
    }
    if (p->count == p->room) {
        p->room = p->room ? 2 * p->room : 8;
        p->list = base_resize(p->list, p->room * sizeof *p->list);
    }
    quad_point *q = &p->list[p->count++];
    arb_init(q->place);
    arb_set(q->place, place);
    q->low = q->high = exact;
    if (!exact)
        enclose(s->e, q);
}

static int by_place(const void *a, const void *b)
{
    return arf_cmp(arb_midref(((const quad_point *)a)->place), arb_midref(((const quad_point *)b)->place));
}

/* ---- isolating zeros of g by balls ---- */

static tw_status fail_near(search *s, expr *g, const arb_t where)
{
    char *words = expr_text(s->e, g), *at = arb_get_str(where, 6, ARB_STR_NO_RADIUS);
    engine_fail(s->e, ERROR_UNDECIDED, "the zeros of %s near %s could not be told apart", words ? words : "a part", at);
    free(words);
    flint_free(at);
    return TW_ERROR;
}

static int sign_at(tape *g, const arf_t x, slong prec)
{
    acb_t at, v;
    acb_init(at);
    acb_init(v);
    arb_set_arf(acb_realref(at), x);
    tape_eval(v, g, at, false, prec);
    int sign = !acb_is_finite(v) || !acb_is_real(v) || arb_contains_zero(acb_realref(v)) ? 0
               : arb_is_positive(acb_realref(v))                                         ? 1
                                                                                         : -1;
    acb_clear(at);
    acb_clear(v);
    return sign;
}

/* g is monotone on [a, b] with one zero inside: the zero to about prec bits, by halving and Newton steps. */
static void refine(search *s, expr *f, tape *g, arf_t a, arf_t b)
{
    arb_t I, m;
    acb_struct jet[2];
    acb_t x, v;
    arb_init(I);
    arb_init(m);
    acb_init(jet);
    acb_init(jet + 1);
    acb_init(x);
    acb_init(v);
    slong prec = s->prec + 40;
    arb_set_interval_arf(I, a, b, prec);
    for (int k = 0; k < 80 && arb_rel_accuracy_bits(I) < s->prec && budget_ok(s->e); k++) {
        acb_set_arb(x, I);
        tape_jet(jet, g, x, 2, prec);
        arb_get_mid_arb(m, I);
        acb_set_arb(x, m);
        tape_eval(v, g, x, false, prec);
        if (!acb_is_finite(v) || !arb_is_finite(acb_realref(jet + 1)) || arb_contains_zero(acb_realref(jet + 1)))
            break;
        arb_div(acb_realref(v), acb_realref(v), acb_realref(jet + 1), prec);
        arb_sub(m, m, acb_realref(v), prec);
        mag_t before;
        mag_init(before);
        mag_set(before, arb_radref(I));
        if (!arb_intersection(I, I, m, prec) || mag_cmp(arb_radref(I), before) >= 0) {
            mag_clear(before);
            break;
        }
        mag_clear(before);
    }
    arb_set_interval_arf(m, a, b, prec);
    add_point(s, f, NULL, I, m);
    arb_clear(I);
    arb_clear(m);
    acb_clear(jet);
    acb_clear(jet + 1);
    acb_clear(x);
    acb_clear(v);
}

/* 1: no zero in the box, 2: monotone there, 0: neither seen. */
static int judge_box(search *s, tape *g, const arf_t a, const arf_t b)
{
    acb_struct jet[2];
    acb_t x, v;
    acb_init(jet);
    acb_init(jet + 1);
    acb_init(x);
    acb_init(v);
    int verdict = 0;
    arb_set_interval_arf(acb_realref(x), a, b, 128);
    tape_eval(v, g, x, false, 64);
    s->work++;
    if (acb_is_finite(v) && !acb_contains_zero(v)) {
        verdict = 1;
    } else if (acb_is_finite(v)) {
        tape_jet(jet, g, x, 2, 64);
        if (acb_is_finite(jet + 1) && acb_is_real(jet + 1) && !arb_contains_zero(acb_realref(jet + 1)))
            verdict = 2;
    }
    acb_clear(jet);
    acb_clear(jet + 1);
    acb_clear(x);
    acb_clear(v);
    return verdict;
}

static tw_status isolate(search *s, expr *f, tape *g, const arf_t a, const arf_t b, bool strict, int depth)
{
    int verdict = judge_box(s, g, a, b);
    if (verdict == 1 || !budget_ok(s->e))
        return s->e->error.kind ? TW_ERROR : TW_OK;
    if (verdict == 2) {
        int left = sign_at(g, a, s->prec + 64), right = sign_at(g, b, s->prec + 64);
        if (left * right > 0)
            return TW_OK;
        arf_t low, high;
        arf_init(low);
        arf_init(high);
        arf_set(low, a);
        arf_set(high, b);
        if (left * right < 0)
            refine(s, f, g, low, high);
        arf_clear(low);
        arf_clear(high);
        if (left * right < 0)
            return TW_OK;
        /* a zero at an end of the box: an end of the range, or else a point that the next division avoids */
    }
    if (depth >= DEPTH_LIMIT || s->work > WORK_LIMIT) {
        arb_t where;
        arb_init(where);
        arb_set_interval_arf(where, a, b, 128);
        tw_status status = TW_OK;
        if (verdict != 2 || !end_is_the_zero(s, f, where)) {
            s->points->complete = false;
            status = strict ? fail_near(s, f, where) : TW_OK;
        }
        arb_clear(where);
        return status;
    }
    arf_t m, w;
    arf_init(m);
    arf_init(w);
    arf_sub(m, b, a, 128, ARF_RND_DOWN);
    arf_set_d(w, 0.48713); /* no round fraction: zeros at round numbers stay inside a box */
    arf_mul(m, m, w, 128, ARF_RND_DOWN);
    arf_add(m, m, a, 128, ARF_RND_DOWN);
    tw_status status = isolate(s, f, g, a, m, strict, depth + 1);
    if (status == TW_OK)
        status = isolate(s, f, g, m, b, strict, depth + 1);
    arf_clear(m);
    arf_clear(w);
    return status;
}

/* The finite reach beyond which g has no zero towards an infinite end; false where that is not seen. */
static bool reach(search *s, expr *g, bool forward, arf_t out)
{
    expr *v = expr_fresh(s->e, "v");
    expr *h = expr_substitute(s->e, g, s->x, forward ? v : expr_neg(s->e, v));
    growth_program *t = growth_compile(s->e, h, v);
    growth_bound b;
    growth_bound_init(&b);
    bool found = false;
    arf_set_ui(out, 8);
    for (int k = 0; t && k < REACH_TRIES && !found; k++) {
        found = growth_run(t, &b, out) && growth_is_nonzero(t);
        if (!found)
            arf_mul_2exp_si(out, out, 1);
    }
    engine_forgive(s->e);
    if (!forward)
        arf_neg(out, out);
    growth_bound_clear(&b);
    growth_free(t);
    return found;
}

static tw_status zeros_by_balls(search *s, expr *g, bool strict)
{
    tape *values = tape_new(s->e, g, &s->x, 1);
    if (!values)
        return TW_ERROR;
    arf_t a, b;
    arf_init(a);
    arf_init(b);
    bool known = (!end_infinite(s, 0) || reach(s, g, false, a)) && (!end_infinite(s, 1) || reach(s, g, true, b));
    tw_status status = TW_OK;
    if (!end_infinite(s, 0))
        arb_get_lbound_arf(a, s->range->a, 128);
    if (!end_infinite(s, 1))
        arb_get_ubound_arf(b, s->range->b, 128);
    if (!known)
        s->points->complete = false;
    if (!known && strict && !s->e->error.kind) {
        char *words = expr_text(s->e, g);
        status = engine_fail(s->e, ERROR_UNDECIDED, "the sign of %s could not be decided towards infinity",
                words ? words : "a part");
        free(words);
    } else if (known && arf_cmp(a, b) < 0) {
        status = isolate(s, g, values, a, b, strict, 0);
    }
    arf_clear(a);
    arf_clear(b);
    tape_free(values);
    return status;
}

/* ---- zeros of polynomials ---- */

static bool rational_polynomial(fmpz_poly_t out, expr *const *coefficients, slong degree)
{
    fmpq_poly_t q;
    fmpq_t c;
    fmpq_poly_init(q);
    fmpq_init(c);
    bool ok = true;
    for (slong k = 0; ok && k <= degree; k++) {
        ok = expr_is_number(coefficients[k]);
        if (ok) {
            fmpq_set(c, expr_number(coefficients[k]));
            fmpq_poly_set_coeff_fmpq(q, k, c);
        }
    }
    if (ok)
        fmpq_poly_get_numerator(out, q);
    fmpq_poly_clear(q);
    fmpq_clear(c);
    return ok;
}

/* zero is the only zero of g. */
static tw_status add_exact(search *s, expr *g, expr *zero)
{
    acb_t v;
    acb_init(v);
    tw_status status = zero ? ball_value(s->e, v, zero, s->prec + 64) : TW_ERROR;
    if (status == TW_OK && acb_is_real(v))
        add_point(s, g, zero, acb_realref(v), NULL);
    acb_clear(v);
    return status;
}

static expr *polynomial_expr(tw_engine *e, const fmpz_poly_struct *f, expr *x)
{
    expr *sum = expr_int(e, 0);
    fmpz_t c;
    fmpz_init(c);
    for (slong k = fmpz_poly_degree(f); k >= 0; k--) {
        fmpz_poly_get_coeff_fmpz(c, f, k);
        sum = expr_add(e, sum, expr_mul(e, expr_fmpz(e, c), expr_pow(e, x, expr_int(e, k))));
    }
    fmpz_clear(c);
    return sum;
}

static tw_status zeros_of_rational(search *s, const fmpz_poly_t f, bool strict)
{
    fmpz_poly_factor_t parts;
    fmpz_poly_factor_init(parts);
    fmpz_poly_factor(parts, f);
    tw_status status = TW_OK;
    for (slong k = 0; k < parts->num && status == TW_OK; k++) {
        const fmpz_poly_struct *p = parts->p + k;
        if (fmpz_poly_degree(p) == 1) {
            fmpq_t root;
            fmpq_init(root);
            fmpz_poly_get_coeff_fmpz(fmpq_numref(root), p, 0);
            fmpz_poly_get_coeff_fmpz(fmpq_denref(root), p, 1);
            fmpz_neg(fmpq_numref(root), fmpq_numref(root));
            fmpq_canonicalise(root);
            status = add_exact(s, expr_sub(s->e, s->x, expr_fmpq(s->e, root)), expr_fmpq(s->e, root));
            fmpq_clear(root);
        } else if (fmpz_poly_degree(p) > 1) {
            status = zeros_by_balls(s, polynomial_expr(s->e, p, s->x), strict);
        }
    }
    fmpz_poly_factor_clear(parts);
    return status;
}

static tw_status zeros_of(search *s, expr *g, bool strict)
{
    if (!g || !budget_ok(s->e))
        return TW_ERROR;
    if (!expr_has(g, s->x))
        return TW_OK;
    if (g->kind == EXPR_PRODUCT) {
        for (uint32_t k = 0; k < g->count; k++)
            if (zeros_of(s, g->args[k], strict) != TW_OK)
                return TW_ERROR;
        return TW_OK;
    }
    if (g->kind == EXPR_POWER && !expr_has(g->args[1], s->x))
        return zeros_of(s, g->args[0], strict);
    if (expr_is_call(g, FUNCTION_EXP) || expr_is_call(g, FUNCTION_COSH))
        return strict && expr_is_call(g, FUNCTION_COSH) ? zeros_by_balls(s, g, strict) : TW_OK;
    expr **coefficients = NULL;
    slong degree = 0;
    tw_status status = TW_OK;
    if (expr_polynomial(s->e, g, s->x, POLYNOMIAL_LIMIT, &coefficients, &degree) != TW_OK)
        return zeros_by_balls(s, g, strict);
    fmpz_poly_t f;
    fmpz_poly_init(f);
    if (degree == 1)
        status = add_exact(s, g, expr_neg(s->e, expr_div(s->e, coefficients[0], coefficients[1])));
    else if (rational_polynomial(f, coefficients, degree))
        status = zeros_of_rational(s, f, strict);
    else
        status = zeros_by_balls(s, g, strict);
    fmpz_poly_clear(f);
    free(coefficients);
    return status;
}

/* ---- what to look at in the integrand ---- */

static tw_status walk_call(search *s, expr *f)
{
    switch (f->is.function) {
    case FUNCTION_ABS:
    case FUNCTION_SIGN:
        return zeros_of(s, f->args[0], true);
    case FUNCTION_LOG:
        return zeros_of(s, f->args[0], false);
    case FUNCTION_MIN:
    case FUNCTION_MAX:
        for (uint32_t j = 0; j < f->count; j++)
            for (uint32_t k = j + 1; k < f->count; k++)
                if (zeros_of(s, expr_sub(s->e, f->args[j], f->args[k]), true) != TW_OK)
                    return TW_ERROR;
        return TW_OK;
    default:
        return TW_OK;
    }
}

static bool is_natural(expr *a)
{
    return expr_is_number(a) && fmpz_is_one(fmpq_denref(expr_number(a))) && fmpq_sgn(expr_number(a)) > 0;
}

static tw_status walk(search *s, expr *f)
{
    if (!expr_has(f, s->x))
        return TW_OK;
    tw_status status = TW_OK;
    if (f->kind == EXPR_CALL)
        status = walk_call(s, f);
    else if (f->kind == EXPR_POWER && !is_natural(f->args[1]))
        status = zeros_of(s, f->args[0], false);
    else if (f->kind == EXPR_RELATION)
        status = zeros_of(s, expr_sub(s->e, f->args[0], f->args[1]), true);
    for (uint32_t k = 0; k < f->count && status == TW_OK; k++)
        status = walk(s, f->args[k]);
    return status;
}

tw_status quad_points_find(quad_points *p, tw_engine *e, expr *f, expr *x, const quad_range *range, slong prec)
{
    search s = {.points = p, .e = e, .x = x, .range = range, .prec = prec};
    tw_status status = walk(&s, f);
    if (p->count)
        qsort(p->list, p->count, sizeof *p->list, by_place);
    return status;
}

/* ---- choosing the branches ---- */

static int sign_inside(tw_engine *e, expr *g, expr *x, const arf_t at)
{
    tape *t = tape_new(e, g, &x, 1);
    int sign = t ? sign_at(t, at, 256) : 0;
    tape_free(t);
    return sign;
}

/* 1 true, 0 false, 2 unknown, for points near `at` */
static int truth_inside(tw_engine *e, expr *relation, expr *x, const arf_t at)
{
    if (relation->kind != EXPR_RELATION)
        return 2;
    expr *d = expr_sub(e, relation->args[0], relation->args[1]);
    int sign = d ? sign_inside(e, d, x, at) : 0;
    if (!sign)
        return 2;
    switch (relation->is.relation) {
    case RELATION_LESS:
    case RELATION_LESS_EQUAL:
        return sign < 0;
    case RELATION_EQUAL:
        return 0;
    case RELATION_NOT_EQUAL:
        return 1;
    default:
        return 2;
    }
}

static expr *resolve_piecewise(tw_engine *e, expr *f, expr *x, const arf_t at, bool on_cut)
{
    for (uint32_t k = 0; k + 1 < f->count; k += 2) {
        int truth = truth_inside(e, f->args[k], x, at);
        if (truth == 2)
            return f;
        if (truth == 1)
            return quad_resolve(e, f->args[k + 1], x, at, on_cut);
    }
    return quad_resolve(e, f->args[f->count - 1], x, at, on_cut);
}

static expr *resolve_extreme(tw_engine *e, expr *f, expr *const *args, expr *x, const arf_t at)
{
    int wanted = f->is.function == FUNCTION_MIN ? -1 : 1;
    expr *best = args[0];
    for (uint32_t k = 1; k < f->count; k++) {
        expr *d = expr_sub(e, args[k], best);
        if (!d || expr_is_zero(d))
            continue;
        int sign = sign_inside(e, d, x, at);
        if (!sign)
            return expr_call(e, f->is.function, args, f->count);
        if (sign == wanted)
            best = args[k];
    }
    return best;
}

static expr *resolve_call(tw_engine *e, expr *f, expr *const *args, expr *x, const arf_t at, bool on_cut)
{
    int sign;
    switch (f->is.function) {
    case FUNCTION_ABS:
        sign = args[0] ? sign_inside(e, args[0], x, at) : 0;
        return sign ? expr_mul(e, expr_int(e, sign), args[0]) : expr_call(e, f->is.function, args, f->count);
    case FUNCTION_SIGN:
        sign = args[0] ? sign_inside(e, args[0], x, at) : 0;
        return sign ? expr_int(e, sign) : expr_call(e, f->is.function, args, f->count);
    case FUNCTION_LOG: /* of negative numbers along the cut: log(-u) + i pi, analytic across it */
        if (on_cut && args[0] && sign_inside(e, args[0], x, at) < 0)
            return expr_add(e, expr_call1(e, FUNCTION_LOG, expr_neg(e, args[0])),
                            expr_mul(e, expr_constant_of(e, CONSTANT_I), expr_constant_of(e, CONSTANT_PI)));
        return expr_call(e, f->is.function, args, f->count);
    case FUNCTION_MIN:
    case FUNCTION_MAX:
        return resolve_extreme(e, f, args, x, at);
    default:
        return expr_call(e, f->is.function, args, f->count);
    }
}

/* u^p of negative u along the cut: (-u)^p (-1)^p */
static expr *resolve_power(tw_engine *e, expr *const *args, expr *x, const arf_t at, bool on_cut)
{
    if (on_cut && args[0] && args[1] && expr_has(args[0], x) && expr_is_number(args[1]) &&
        !fmpz_is_one(fmpq_denref(expr_number(args[1]))) && sign_inside(e, args[0], x, at) < 0)
        return expr_mul(e, expr_pow(e, expr_neg(e, args[0]), args[1]), expr_pow(e, expr_int(e, -1), args[1]));
    return expr_pow(e, args[0], args[1]);
}

expr *quad_resolve(tw_engine *e, expr *f, expr *x, const arf_t at, bool on_cut)
{
    if (!f || !expr_has(f, x) || f == x)
        return f;
    if (f->kind == EXPR_PIECEWISE)
        return resolve_piecewise(e, f, x, at, on_cut);
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER && f->kind != EXPR_CALL)
        return f;
    expr **args = base_alloc(f->count * sizeof *args);
    for (uint32_t k = 0; k < f->count; k++)
        args[k] = quad_resolve(e, f->args[k], x, at, on_cut);
    expr *out = f->kind == EXPR_SUM       ? expr_sum(e, args, f->count)
                : f->kind == EXPR_PRODUCT ? expr_product(e, args, f->count)
                : f->kind == EXPR_POWER   ? resolve_power(e, args, x, at, on_cut)
                                          : resolve_call(e, f, args, x, at, on_cut);
    free(args);
    return out;
}
