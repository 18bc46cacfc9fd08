/* A path of straight legs in the complex plane, turned into integrals over real variables: on a leg z = P + d u, u real. Knows
 * nothing of how these are integrated, nor of any method.
 *
 * The one idea: what the quadrature knows of a real variable (ends with fractional powers, growth towards infinity, peaks) holds
 * for complex integrands too, so a leg needs only the substitution, and a look along it for poles and branch cuts. */
#include "engine/ball/quadrature_contour.h"

#include <math.h>
#include <stdlib.h>

#include "engine/ball/decide.h"

enum { LOOK_LIMIT = 6000, LOOK_DEPTH = 56, LOOK_OCTAVES = 24, END_OCTAVES = 60, POINT_BITS = 256 };

void contour_path_init(contour_path *p)
{
    *p = (contour_path){0};
}

void contour_path_clear(contour_path *p)
{
    free(p->list);
}

/* ---- points ---- */

/* The angle of a point at infinity; NULL where the point is finite. */
static expr *direction_of(tw_engine *e, expr *point)
{
    if (expr_is_inf(point))
        return expr_int(e, 0);
    if (expr_is_minus_inf(point))
        return expr_constant_of(e, CONSTANT_PI);
    return point->kind == EXPR_DIRECTION ? point->args[0] : NULL;
}

/* inf or -inf where the direction is the real line's; else the point. */
static expr *plain_point(tw_engine *e, expr *point)
{
    expr *theta = direction_of(e, point), *pi = expr_constant_of(e, CONSTANT_PI);
    if (theta && (theta == pi || theta == expr_neg(e, pi)))
        return expr_neg(e, expr_constant_of(e, CONSTANT_INF));
    return point;
}

static bool is_line_infinity(expr *point)
{
    return expr_is_inf(point) || expr_is_minus_inf(point);
}

/* The point is a finite number, a real angle, or an error. *real: it lies on the real line, infinite ends included. */
static tw_status check_point(tw_engine *e, expr *point, bool *real)
{
    expr *theta = point->kind == EXPR_DIRECTION ? point->args[0] : NULL;
    *real = is_line_infinity(point);
    if (*real)
        return TW_OK;
    acb_t v;
    acb_init(v);
    tw_status status = ball_value(e, v, theta ? theta : point, POINT_BITS);
    char *words = expr_text(e, point);
    if (status == TW_OK && !acb_is_finite(v))
        status = engine_fail(e, ERROR_VALUE, "the point %s of the path has no finite value", words ? words : "");
    if (status == TW_OK && theta && !arb_is_zero(acb_imagref(v)))
        status = engine_fail(e, ERROR_VALUE, "the angle in %s is not known to be real", words ? words : "");
    *real = status == TW_OK && !theta && arb_is_zero(acb_imagref(v));
    free(words);
    acb_clear(v);
    return status;
}

/* ---- is the integrand analytic along a leg? ---- */

/* A function of the variable that is not analytic by its nature; FUNCTION_COUNT: none. */
static function_id rough_function(expr *f, expr *z)
{
    if (!expr_has(f, z))
        return FUNCTION_COUNT;
    if (f->kind == EXPR_CALL)
        switch (f->is.function) {
        case FUNCTION_ABS: case FUNCTION_RE: case FUNCTION_IM: case FUNCTION_CONJ: case FUNCTION_ARG: case FUNCTION_SIGN:
        case FUNCTION_MIN: case FUNCTION_MAX: case FUNCTION_EI: return f->is.function;
        default: break;
        }
    for (uint32_t k = 0; k < f->count; k++) {
        function_id found = rough_function(f->args[k], z);
        if (found != FUNCTION_COUNT)
            return found;
    }
    return FUNCTION_COUNT;
}

static bool has_pieces(expr *f, expr *z)
{
    if (!expr_has(f, z))
        return false;
    if (f->kind == EXPR_PIECEWISE)
        return true;
    for (uint32_t k = 0; k < f->count; k++)
        if (has_pieces(f->args[k], z))
            return true;
    return false;
}

static tw_status check_form(tw_engine *e, expr *f, expr *z)
{
    function_id rough = rough_function(f, z);
    if (rough != FUNCTION_COUNT)
        return engine_fail(e, ERROR_UNSUITABLE, "off the real line a path needs an analytic integrand, and %s is not analytic there",
                           function_name(rough));
    if (has_pieces(f, z))
        return engine_fail(e, ERROR_UNSUITABLE,
                           "off the real line a path needs an analytic integrand, and one given piece by piece is not");
    return TW_OK;
}

typedef struct look {
    tw_engine *e;
    tape *values;
    slong work;
    arb_t trouble; /* where the leg is not seen to be analytic */
    bool unbounded;
} look;

/* Is g analytic on [a, b]? False: not at `trouble`, as far as halving shows; true also when the work is used up. */
static bool look_between(look *l, const arf_t a, const arf_t b, int depth)
{
    acb_t u, v;
    arf_t middle;
    acb_init(u);
    acb_init(v);
    arf_init(middle);
    arb_set_interval_arf(acb_realref(u), a, b, 128);
    tape_eval(v, l->values, u, true, 128);
    bool fine = acb_is_finite(v) || ++l->work > LOOK_LIMIT || !budget_ok(l->e);
    if (!fine && depth == 0) {
        arb_set(l->trouble, acb_realref(u));
        tape_eval(v, l->values, u, false, 128);
        l->unbounded = !acb_is_finite(v);
    } else if (!fine) {
        arf_add(middle, a, b, 128, ARF_RND_DOWN);
        arf_mul_2exp_si(middle, middle, -1);
        fine = look_between(l, a, middle, depth - 1) && look_between(l, middle, b, depth - 1);
    }
    acb_clear(u);
    acb_clear(v);
    arf_clear(middle);
    return fine;
}

/* The octaves [2^k, 2^(k+1)] from the least on, mirrored at 1 for a finite leg; the ends themselves may be singular. */
static bool look_along(look *l, bool infinite)
{
    arf_t a, b;
    arf_init(a);
    arf_init(b);
    bool fine = true;
    for (slong k = -END_OCTAVES; fine && k < (infinite ? LOOK_OCTAVES : -1); k++) {
        arf_one(a);
        arf_one(b);
        arf_mul_2exp_si(a, a, k);
        arf_mul_2exp_si(b, b, k + 1);
        fine = look_between(l, a, b, LOOK_DEPTH);
        if (fine && !infinite) {
            arf_sub_ui(a, a, 1, 200, ARF_RND_DOWN);
            arf_neg(a, a);
            arf_sub_ui(b, b, 1, 200, ARF_RND_DOWN);
            arf_neg(b, b);
            fine = look_between(l, b, a, LOOK_DEPTH);
        }
    }
    arf_clear(a);
    arf_clear(b);
    return fine;
}

static tw_status report_trouble(const look *l, const contour_leg *leg, expr *z)
{
    tw_engine *e = l->e;
    acb_t place;
    acb_init(place);
    tape *at = tape_new(e, z, &leg->u, 1);
    if (at) {
        arb_t u;
        arb_init(u);
        arb_get_mid_arb(u, l->trouble);
        acb_set_arb(place, u);
        tape_eval(place, at, place, false, 64);
        arb_clear(u);
    }
    tape_free(at);
    double re = arf_get_d(arb_midref(acb_realref(place)), ARF_RND_NEAR), im = arf_get_d(arb_midref(acb_imagref(place)), ARF_RND_NEAR);
    double small = 1e-9 * (fabs(re) + fabs(im) + 1);
    acb_clear(place);
    re = fabs(re) < small ? 0 : re;
    im = fabs(im) < small ? 0 : im;
    const char *sign = im < 0 ? "-" : "+";
    if (!e->error.kind && l->unbounded)
        engine_fail(e, ERROR_DIVERGENT, "the path meets a pole or another singular point of the integrand near %.6g %s %.6g*i", re,
                    sign, fabs(im));
    else if (!e->error.kind)
        engine_fail(e, ERROR_UNDECIDED, "the path meets a branch cut of the integrand near %.6g %s %.6g*i: lead it round the cut", re,
                    sign, fabs(im));
    return TW_ERROR;
}

/* z: the path's variable in terms of the leg's. */
static tw_status check_leg(tw_engine *e, const contour_leg *leg, expr *z)
{
    look l = {.e = e};
    l.values = tape_new(e, leg->g, &leg->u, 1);
    if (!l.values)
        return TW_ERROR;
    arb_init(l.trouble);
    bool fine = look_along(&l, expr_is_inf(leg->to));
    tw_status status = e->error.kind ? TW_ERROR : fine ? TW_OK : report_trouble(&l, leg, z);
    tape_free(l.values);
    arb_clear(l.trouble);
    return status;
}

/* ---- legs ---- */

/* From P to Q, one of them possibly at infinity. */
static tw_status add_leg(contour_path *p, tw_engine *e, expr *f, expr *z, expr *P, expr *Q, bool on_line)
{
    if (P == Q)
        return TW_OK;
    bool backwards = direction_of(e, P) != NULL;
    expr *near = backwards ? Q : P, *far = backwards ? P : Q;
    contour_leg leg = {.sign = backwards ? -1 : 1, .on_line = on_line, .near = near, .far = far, .u = expr_fresh(e, "u")};
    if (on_line) {
        leg.sign = 1;
        leg.from = leg.near = P;
        leg.to = leg.far = Q;
        leg.g = expr_substitute(e, f, z, leg.u);
    } else {
        expr *theta = direction_of(e, far);
        expr *i = expr_constant_of(e, CONSTANT_I);
        expr *d = theta ? expr_call1(e, FUNCTION_EXP, expr_mul(e, i, theta)) : expr_sub(e, far, near);
        expr *place = expr_add(e, near, expr_mul(e, d, leg.u));
        leg.from = expr_int(e, 0);
        leg.to = theta ? expr_constant_of(e, CONSTANT_INF) : expr_int(e, 1);
        leg.g = expr_mul(e, d, expr_substitute(e, f, z, place));
        if (!leg.g || !leg.to || check_form(e, f, z) != TW_OK || check_leg(e, &leg, place) != TW_OK)
            return TW_ERROR;
    }
    if (!leg.g || !leg.from || !leg.to)
        return TW_ERROR;
    p->list[p->count++] = leg;
    return TW_OK;
}

/* Is f(conj z) = conj f(z) by its form, wherever f is analytic? */
static bool reflects(tw_engine *e, expr *f, expr *z)
{
    if (!expr_has(f, z))
        return decide_real_value(e, f);
    switch ((expr_kind)f->kind) {
    case EXPR_SYMBOL: return true;
    case EXPR_SUM: case EXPR_PRODUCT: case EXPR_POWER: case EXPR_CALL: break;
    default: return false;
    }
    for (uint32_t k = 0; k < f->count; k++)
        if (!reflects(e, f->args[k], z))
            return false;
    return true;
}

/* conj(a) = b for two finite points. */
static bool conjugate(tw_engine *e, expr *a, expr *b)
{
    expr *sum = expr_add(e, a, b), *difference = expr_mul(e, expr_constant_of(e, CONSTANT_I), expr_expand(e, expr_sub(e, a, b)));
    return sum && difference && decide_real_value(e, sum) && decide_real_value(e, expr_expand(e, difference));
}

/* Is the path, turned round, its own mirror image in the real line? Then conj(I) = -I for an f that is real there. */
static bool mirrored(tw_engine *e, expr *const *points, size_t n)
{
    for (size_t k = 0; k < n; k++) {
        expr *a = points[k], *b = points[n - 1 - k], *theta = direction_of(e, a), *other = direction_of(e, b);
        if (!theta != !other || (theta && theta != expr_neg(e, other)) || (!theta && !conjugate(e, a, b)))
            return false;
    }
    return true;
}

static bool all_on_line(const contour_path *p)
{
    for (size_t k = 0; k < p->count; k++)
        if (!p->list[k].on_line)
            return false;
    return true;
}

tw_status contour_path_read(contour_path *p, tw_engine *e, expr *contour)
{
    size_t n = contour->count - 1;
    expr *z = expr_fresh(e, expr_binder_name(contour)), *f = expr_open(e, contour, z);
    if (!f)
        return TW_ERROR;
    expr **points = base_alloc((n + 1) * sizeof *points);
    bool *real = base_alloc((n + 1) * sizeof *real);
    size_t count = 0;
    tw_status status = TW_OK;
    for (size_t k = 0; k < n && status == TW_OK; k++) {
        expr *point = plain_point(e, contour->args[k]);
        if (!point)
            status = TW_ERROR;
        else if (k > 0 && k + 1 < n && direction_of(e, point))
            status = engine_fail(e, ERROR_UNSUITABLE, "only the first and the last point of a path may lie at infinity");
        else
            status = check_point(e, point, &real[count]);
        points[count++] = point;
        if (status == TW_OK && n == 2 && k == 0 && direction_of(e, point) && direction_of(e, contour->args[1])) {
            real[count] = true; /* no finite point was given: the legs meet at 0 */
            points[count++] = expr_int(e, 0);
        }
    }
    p->list = base_alloc((count + 1) * sizeof *p->list);
    for (size_t k = 0; k + 1 < count && status == TW_OK; k++)
        status = add_leg(p, e, f, z, points[k], points[k + 1], real[k] && real[k + 1]);
    p->imaginary = status == TW_OK && !all_on_line(p) && mirrored(e, points, count) && reflects(e, f, z);
    free(points);
    free(real);
    return status;
}

int contour_symmetry(tw_engine *e, expr *integral)
{
    expr *const *factors;
    size_t count = expr_factors(&integral, &factors);
    expr *contour = NULL, *outside = expr_int(e, 1);
    for (size_t k = 0; k < count; k++) {
        if (factors[k]->kind == EXPR_CONTOUR && !contour)
            contour = factors[k];
        else
            outside = expr_mul(e, outside, factors[k]);
    }
    expr *turned = outside ? expr_mul(e, outside, expr_constant_of(e, CONSTANT_I)) : NULL;
    if (!contour || !turned || contour->count < 3)
        return 0;
    contour_path p;
    contour_path_init(&p);
    bool imaginary = contour_path_read(&p, e, contour) == TW_OK && p.imaginary, real = false;
    contour_path_clear(&p);
    if (e->error.kind == ERROR_DIVERGENT || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_UNSUITABLE ||
        e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    if (imaginary && decide_real_value(e, outside))
        return -1;
    real = imaginary && decide_real_value(e, turned);
    return real ? 1 : 0;
}
