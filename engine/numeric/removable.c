/* Removable singularities at 0: sin(y)/y, y/(exp(y) - 1). The formula cannot be evaluated at 0, the function is analytic there.
 *
 * One idea: a function analytic in a closed disc takes there only values in the convex hull of its values on the circle (maximum
 * principle for Re(e^(i theta) u)). So over the tree: u = y^k w with w analytic and w(0) finite, w known by its balls on the
 * circle; f(u) is analytic if f is analytic on a box that holds the values on the circle; a power w^r likewise, with w != 0. The
 * exact order k at 0 comes from the exact series. */
#include "engine/numeric/analytic.h"

enum { CIRCLE_PARTS = 48, CIRCLE_BITS = 64 };

typedef struct core {
    problem *p;
    double radius;
} core;

/* u = y^order * (analytic, not zero at 0); exact. */
static bool exact_order(core *w, expr *u, slong *order)
{
    series s;
    bool fine;
    series_init(&s);
    fine = series_at_zero(w->p->e, &s, u, w->p->y, 4, NULL, NULL) == TW_OK && s.count > 0;
    if (w->p->e->error.kind == ERROR_UNSUITABLE || w->p->e->error.kind == ERROR_UNDECIDED)
        engine_forgive(w->p->e);
    for (size_t k = 0; k < s.count && fine; k++) {
        expr *exponent = s.strands[k].exponent;
        slong one;
        fine = s.strands[k].den == 1 && s.strands[k].log_power == 0 && expr_is_number(exponent) &&
               fmpz_is_one(fmpq_denref(expr_number(exponent))) && fmpz_fits_si(fmpq_numref(expr_number(exponent)));
        if (!fine)
            break;
        one = fmpz_get_si(fmpq_numref(expr_number(exponent)));
        if (k == 0 || one < *order)
            *order = one;
    }
    series_clear(&s);
    return fine;
}

/* A box that holds the values of u on the circle. */
static bool circle_hull(core *w, acb_t hull, expr *u)
{
    expr *const vars[] = {w->p->y};
    tape *t = tape_new(w->p->e, u, vars, 1);
    acb_t at, value;
    arb_t angle, r;
    bool fine = t != NULL;
    acb_init(at);
    acb_init(value);
    arb_init(angle);
    arb_init(r);
    arb_set_d(r, w->radius);
    for (int k = 0; k < CIRCLE_PARTS && fine; k++) {
        arb_set_si(angle, 2 * k + 1);
        mag_set_ui(arb_radref(angle), 1);
        arb_div_ui(angle, angle, CIRCLE_PARTS, CIRCLE_BITS);
        arb_sin_cos_pi(acb_imagref(at), acb_realref(at), angle, CIRCLE_BITS);
        acb_mul_arb(at, at, r, CIRCLE_BITS);
        tape_eval(value, t, at, true, CIRCLE_BITS);
        fine = acb_is_finite(value);
        if (k == 0)
            acb_set(hull, value);
        else
            acb_union(hull, hull, value, CIRCLE_BITS);
    }
    arb_clear(r);
    arb_clear(angle);
    acb_clear(value);
    acb_clear(at);
    tape_free(t);
    return fine;
}

/* f(u) with u already known to be analytic: f analytic on the hull? */
static bool analytic_on_hull(core *w, expr *f_of, expr *u)
{
    tw_engine *e = w->p->e;
    acb_t hull;
    bool fine;
    acb_init(hull);
    fine = circle_hull(w, hull, u);
    if (fine) {
        expr *z = expr_fresh(e, "z"), *f;
        expr *const vars[] = {z};
        tape *t;
        if (f_of->kind == EXPR_POWER) {
            f = expr_pow(e, z, f_of->args[1]);
        } else {
            expr *args[8];
            for (uint32_t k = 0; k < f_of->count; k++)
                args[k] = f_of->args[k] == u ? z : f_of->args[k];
            f = expr_call(e, f_of->is.function, args, f_of->count);
        }
        t = f ? tape_new(e, f, vars, 1) : NULL;
        fine = t != NULL;
        if (fine) {
            tape_eval(hull, t, hull, true, CIRCLE_BITS);
            fine = acb_is_finite(hull);
        }
        tape_free(t);
    }
    acb_clear(hull);
    return fine;
}

static bool meromorphic(core *w, expr *u);

static bool analytic(core *w, expr *u)
{
    slong order = 0;
    if (!expr_has(u, w->p->y))
        return true;
    return meromorphic(w, u) && exact_order(w, u, &order) && order >= 0;
}

static bool power_meromorphic(core *w, expr *u)
{
    tw_engine *e = w->p->e;
    expr *base = u->args[0], *exponent = u->args[1], *reduced;
    slong order = 0;
    if (expr_has(exponent, w->p->y) || !expr_is_number(exponent) || !meromorphic(w, base))
        return false;
    if (fmpz_is_one(fmpq_denref(expr_number(exponent))) && fmpq_sgn(expr_number(exponent)) > 0)
        return true;
    if (!exact_order(w, base, &order))
        return false;
    /* (y^k w)^r = y^(k r) w^r: k r must be whole */
    if (order != 0 && !fmpz_is_one(fmpq_denref(expr_number(exponent))) &&
        !fmpz_divisible(fmpq_numref(expr_number(expr_int(e, order))), fmpq_denref(expr_number(exponent))))
        return false;
    reduced = expr_mul(e, base, expr_pow(e, w->p->y, expr_int(e, -order)));
    return reduced && analytic_on_hull(w, u, reduced);
}

static bool call_meromorphic(core *w, expr *u)
{
    expr *moving = NULL;
    for (uint32_t k = 0; k < u->count; k++)
        if (expr_has(u->args[k], w->p->y)) {
            if (moving)
                return false;
            moving = u->args[k];
        }
    return !moving || (u->count <= 8 && analytic(w, moving) && analytic_on_hull(w, u, moving));
}

/* y^k times an analytic function, for some integer k, in the closed disc. */
static bool meromorphic(core *w, expr *u)
{
    if (!expr_has(u, w->p->y) || u == w->p->y)
        return true;
    if (!budget_ok(w->p->e))
        return false;
    switch (u->kind) {
    case EXPR_SUM: case EXPR_PRODUCT:
        for (uint32_t k = 0; k < u->count; k++)
            if (!meromorphic(w, u->args[k]))
                return false;
        return true;
    case EXPR_POWER: return power_meromorphic(w, u);
    case EXPR_CALL: return call_meromorphic(w, u);
    default: return false;
    }
}

bool removable_at_zero(problem *p, expr *f, double radius)
{
    core w = {p, radius};
    return analytic(&w, f);
}
