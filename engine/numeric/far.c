/* What lies far out on the path. Infinite branches: the record of behaviour at infinity (engine/ball/growth.h) of the whole
 * integrand. Finite ones that reach beyond the cut: the maximum of the amplitude by balls, the kernel at the cut, the length. */
#include "engine/ball/growth.h"
#include "engine/numeric/problem.h"

enum { FAR_BITS = 64, FAR_PARTS = 24 };

static bool far_infinite(mag_t bound, problem *p, const sheet *b, expr *S, double *y)
{
    tw_engine *e = p->e;
    env none = {0};
    growth_bound g;
    arb_t tail;
    expr *f = expr_mul(e, b->amplitude, expr_call1(e, FUNCTION_EXP, expr_neg(e, expr_mul(e, S, p->phase_expr))));
    bool fine;
    growth_bound_init(&g);
    arb_init(tail);
    fine = f && growth_at_infinity(e, &g, f, p->y, &none, *y) == TW_OK;
    if (fine) {
        double X = arf_get_d(g.X, ARF_RND_UP);
        if (X > *y)
            *y = X;
        else
            arf_set_d(g.X, *y); /* the record holds from there on as well */
        fine = growth_tail(e, tail, &g) == TW_OK;
    }
    if (fine) {
        arb_exp(tail, tail, FAR_BITS);
        arb_get_mag(bound, tail);
        fine = mag_is_finite(bound);
    } else if (e->error.kind != ERROR_TIME && e->error.kind != ERROR_MEMORY && e->error.kind != ERROR_INTERRUPT) {
        engine_forgive(e);
    }
    arb_clear(tail);
    growth_bound_clear(&g);
    return fine;
}

/* |F| on [y, end] by balls on parts of the interval; F stands for A T^-v / T', whose size on the path is the amplitude's. */
static bool far_finite(mag_t bound, problem *p, const sheet *b, tape *amplitude, expr *S, double y)
{
    arb_t from, step_length, t, s;
    acb_t at, value;
    mag_t most, part;
    bool fine = true;
    arb_init(from);
    arb_init(step_length);
    arb_init(t);
    arb_init(s);
    acb_init(at);
    acb_init(value);
    mag_init(most);
    mag_init(part);
    arb_set_d(from, y);
    arb_sub(step_length, b->end_y, from, FAR_BITS);
    arb_div_ui(step_length, step_length, FAR_PARTS, FAR_BITS);
    for (int k = 0; k < FAR_PARTS && fine; k++) {
        arb_mul_si(t, step_length, k, FAR_BITS);
        arb_add(t, t, from, FAR_BITS);
        arb_add(s, t, step_length, FAR_BITS);
        arb_union(acb_realref(at), t, s, FAR_BITS);
        tape_eval(value, amplitude, at, false, FAR_BITS);
        fine = acb_is_finite(value);
        acb_get_mag(part, value);
        mag_max(most, most, part);
    }
    acb_zero(at);
    fine = fine && ball_value(p->e, value, S, FAR_BITS) == TW_OK;
    if (fine) {
        problem_t(t, p, from, FAR_BITS);
        arb_mul(t, t, acb_realref(value), FAR_BITS);
        arb_neg(t, t);
        arb_exp(t, t, FAR_BITS);
        arb_mul_ui(step_length, step_length, FAR_PARTS, FAR_BITS);
        arb_mul(t, t, step_length, FAR_BITS);
        arb_get_mag(part, t);
        mag_mul(bound, most, part);
        fine = mag_is_finite(bound);
    }
    mag_clear(part);
    mag_clear(most);
    acb_clear(value);
    acb_clear(at);
    arb_clear(s);
    arb_clear(t);
    arb_clear(step_length);
    arb_clear(from);
    return fine;
}

bool far_bound(mag_t bound, problem *p, expr *S, double *y)
{
    mag_t part;
    bool fine = true;
    mag_init(part);
    /* first the infinite ones, which may move the cut */
    mag_zero(bound);
    for (int round = 0; round < 2; round++)
        for (size_t k = 0; k < p->sheet_count && fine; k++) {
            sheet *b = p->sheets + k;
            if (b->end)
                continue;
            fine = far_infinite(part, p, b, S, y);
            if (round == 1)
                mag_add(bound, bound, part);
        }
    for (size_t k = 0; k < p->sheet_count && fine; k++) {
        sheet *b = p->sheets + k;
        tape *amplitude;
        expr *const vars[] = {p->y};
        if (!b->end || arf_cmp_d(arb_midref(b->end_y), *y) <= 0)
            continue;
        amplitude = tape_new(p->e, b->amplitude, vars, 1);
        fine = amplitude && far_finite(part, p, b, amplitude, S, *y);
        mag_add(bound, bound, part);
        tape_free(amplitude);
    }
    mag_clear(part);
    return fine;
}
