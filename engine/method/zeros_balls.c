/* Zeros by balls. The one idea: bisection, where a box is done when a ball of f excludes 0, or a ball of f' does (then
 * the signs at its ends tell whether there is one zero), or it lies in the neighbourhood of a zero that is known
 * exactly, whose order m is known exactly too: f^(m) has no zero there, so f has no other. Zeros are given their exact
 * name where one is found and proved; else they are `root of f near a value`. */
#include "engine/method/zeros.h"

#include <math.h>
#include <stdlib.h>

#include "engine/ball/decide.h"
#include "engine/ball/tape.h"
#include "engine/exact/values.h"

enum { BITS = 96, FINE_BITS = 320, DEPTH_MOST = 60, BOXES_MOST = 60000, ORDER_MOST = 10, NAME_DEPTH = 8 };

typedef struct known_zero {
    double low, high; /* the neighbourhood that is free of other zeros */
} known_zero;

typedef struct hunt {
    tw_engine *e;
    expr *f, *x;
    tape *t;
    long boxes;
    size_t known_count;
    known_zero *known;
    expr ***list;
    size_t *count;
} hunt;

static tw_status give_up(hunt *h, double a, double b)
{
    char *words = expr_text(h->e, h->f);
    engine_fail(h->e, ERROR_UNDECIDED, "the zeros of %s between %.6g and %.6g could not be told apart",
                words ? words : "", a, b);
    free(words);
    return TW_ERROR;
}

static int sign_at(hunt *h, const arb_t at, slong bits)
{
    acb_t z, v;
    acb_init(z), acb_init(v);
    arb_set(acb_realref(z), at);
    tape_eval(v, h->t, z, false, bits);
    int sign = !acb_is_finite(v) || arb_contains_zero(acb_realref(v)) ? 0 : arb_is_positive(acb_realref(v)) ? 1 : -1;
    acb_clear(z), acb_clear(v);
    return sign;
}

static int sign_at_d(hunt *h, double at)
{
    arb_t x;
    arb_init(x);
    arb_set_d(x, at);
    int sign = sign_at(h, x, BITS);
    if (sign == 0) sign = sign_at(h, x, 4 * BITS);
    arb_clear(x);
    return sign;
}

/* ---- exact names ---- */

/* The simplest rational within the ball, if it has a small denominator. */
static bool short_rational(fmpq_t out, const arb_t z)
{
    arb_t w, t;
    fmpz_t n;
    bool found = false;
    arb_init(w), arb_init(t);
    fmpz_init(n);
    for (slong d = 1; d <= 720 && !found; d++) {
        arb_mul_si(w, z, d, 2 * FINE_BITS);
        if (arb_get_unique_fmpz(n, w)) {
            fmpq_set_si(out, 0, 1);
            fmpq_set_fmpz(out, n);
            fmpz_t den;
            fmpz_init_set_si(den, d);
            fmpq_div_fmpz(out, out, den);
            fmpz_clear(den);
            found = true;
        }
    }
    fmpz_clear(n);
    arb_clear(w), arb_clear(t);
    return found;
}

typedef enum name_kind { NAME_PLAIN, NAME_PI, NAME_SQUARE, NAME_LOG, NAME_EXP, NAME_COUNT } name_kind;

static expr *name_of(tw_engine *e, name_kind kind, const arb_t z)
{
    arb_t w;
    fmpq_t q;
    arb_init(w);
    fmpq_init(q);
    expr *made = NULL;
    switch (kind) {
    case NAME_PI: arb_const_pi(w, FINE_BITS), arb_div(w, z, w, FINE_BITS); break;
    case NAME_SQUARE: arb_mul(w, z, z, FINE_BITS); break;
    case NAME_LOG: arb_exp(w, z, FINE_BITS); break;
    case NAME_EXP: arb_log(w, z, FINE_BITS); break;
    default: arb_set(w, z);
    }
    if (arb_is_finite(w) && short_rational(q, w)) {
        expr *r = expr_fmpq(e, q);
        switch (kind) {
        case NAME_PI: made = expr_mul(e, r, expr_constant_of(e, CONSTANT_PI)); break;
        case NAME_SQUARE:
            made = fmpq_sgn(q) < 0 ? NULL : expr_sqrt(e, r);
            if (made && arb_is_negative(z)) made = expr_neg(e, made);
            break;
        case NAME_LOG: made = fmpq_sgn(q) <= 0 ? NULL : expr_call1(e, FUNCTION_LOG, r); break;
        case NAME_EXP: made = expr_call1(e, FUNCTION_EXP, r); break;
        default: made = r;
        }
    }
    fmpq_clear(q);
    arb_clear(w);
    return made;
}

static bool vanishes(hunt *h, expr *f, expr *at)
{
    expr *value = f ? expr_substitute(h->e, f, h->x, at) : NULL;
    if (!value) {
        engine_forgive(h->e);
        return false;
    }
    return value_is_zero(h->e, value) == ANSWER_YES;
}

/* A zero of f with an exact name inside z. */
static expr *exact_zero(hunt *h, const arb_t z)
{
    for (int kind = 0; kind < NAME_COUNT; kind++) {
        expr *name = name_of(h->e, (name_kind)kind, z);
        if (name && vanishes(h, h->f, name)) return name;
        if (h->e->error.kind == ERROR_VALUE) engine_forgive(h->e);
        if (h->e->error.kind != ERROR_NONE) return NULL;
    }
    return NULL;
}

/* ---- multiple zeros ---- */

/* f^(m) excludes 0 on [a, b]? */
static bool derivative_excludes(hunt *h, slong m, double a, double b)
{
    acb_t z;
    acb_ptr jet = _acb_vec_init(m + 1);
    arb_t other;
    acb_init(z);
    arb_init(other);
    arb_set_d(acb_realref(z), a);
    arb_set_d(other, b);
    arb_union(acb_realref(z), acb_realref(z), other, BITS);
    tape_jet(jet, h->t, z, m + 1, BITS);
    bool excludes = acb_is_finite(jet + m) && !arb_contains_zero(acb_realref(jet + m));
    arb_clear(other);
    acb_clear(z);
    _acb_vec_clear(jet, m + 1);
    return excludes;
}

/* The exact zero z: its order, and a neighbourhood that contains [a, b] without another zero. */
static bool settle_exact(hunt *h, expr *z, double a, double b)
{
    expr *f = h->f;
    slong m = 0;
    while (m < ORDER_MOST && f && vanishes(h, f, z)) {
        f = expr_derivative(h->e, f, h->x);
        m++;
    }
    if (!f || m == ORDER_MOST) return false;
    double width = b - a;
    for (double grow = 64; grow >= 0; grow = grow > 1e-3 ? grow / 4 : -1) {
        double low = a - grow * width, high = b + grow * width;
        if (!derivative_excludes(h, m, low, high)) continue;
        h->known = base_resize(h->known, (h->known_count + 1) * sizeof *h->known);
        h->known[h->known_count++] = (known_zero){low, high};
        expr_list_add(h->list, h->count, z);
        return true;
    }
    return false;
}

static bool is_known(const hunt *h, double a, double b)
{
    for (size_t k = 0; k < h->known_count; k++)
        if (h->known[k].low <= a && b <= h->known[k].high) return true;
    return false;
}

/* ---- simple zeros ---- */

/* The one zero in [a, b], f' of one sign there: Newton from the middle, then a change of sign proves the ball. */
static bool refine(hunt *h, arb_t z, double a, double b)
{
    acb_t at;
    acb_ptr jet = _acb_vec_init(2);
    arb_t low, high, step;
    acb_init(at);
    arb_init(low), arb_init(high), arb_init(step);
    int left = sign_at_d(h, a);
    for (int k = 0; k < 60; k++) {
        double c = a + (b - a) / 2;
        int sign = sign_at_d(h, c);
        if (sign == 0 || c <= a || c >= b) break;
        if (sign == left)
            a = c;
        else
            b = c;
        if (b - a < 1e-12 * fmax(fabs(a), fabs(b))) break;
    }
    arb_set_d(z, a + (b - a) / 2);
    for (int k = 0; k < 8; k++) {
        arb_set(acb_realref(at), z);
        tape_jet(jet, h->t, at, 2, 2 * FINE_BITS);
        if (!acb_is_finite(jet) || !acb_is_finite(jet + 1) || arb_contains_zero(acb_realref(jet + 1))) break;
        arb_div(step, acb_realref(jet), acb_realref(jet + 1), 2 * FINE_BITS);
        arb_sub(z, z, step, 2 * FINE_BITS);
        mag_zero(arb_radref(z));
    }
    bool proved = false;
    for (slong bits = FINE_BITS; bits >= 40 && !proved; bits -= 40) {
        arb_set_ui(step, 1);
        arb_mul_2exp_si(step, step,
                        arf_is_zero(arb_midref(z)) ? -bits : (slong)arf_abs_bound_lt_2exp_si(arb_midref(z)) - bits);
        arb_sub(low, z, step, ARF_PREC_EXACT);
        arb_add(high, z, step, ARF_PREC_EXACT);
        int one = sign_at(h, low, 2 * FINE_BITS), two = sign_at(h, high, 2 * FINE_BITS);
        proved = one != 0 && two != 0 && one != two && arf_cmp_d(arb_midref(low), a) >= 0 &&
                 arf_cmp_d(arb_midref(high), b) <= 0;
        if (!proved) { /* the Newton point may have left [a, b] by a rounding: its own ends decide */
            proved = one != 0 && two != 0 && one != two && one == left;
        }
        if (proved) arb_add_error(z, step);
    }
    arb_clear(low), arb_clear(high), arb_clear(step);
    acb_clear(at);
    _acb_vec_clear(jet, 2);
    return proved;
}

/* `root of f in r near v`, v to 30 digits. */
static expr *name_root(hunt *h, const arb_t z)
{
    tw_engine *e = h->e;
    fmpz_t ten, top;
    fmpq_t q;
    arb_t w;
    fmpz_init(ten), fmpz_init(top);
    fmpq_init(q);
    arb_init(w);
    fmpz_set_ui(ten, 10);
    fmpz_pow_ui(ten, ten, 20);
    arb_mul_fmpz(w, z, ten, FINE_BITS);
    arf_get_fmpz(top, arb_midref(w), ARF_RND_NEAR);
    fmpq_set_fmpz_frac(q, top, ten);
    expr *r = expr_symbol(e, "r");
    expr *made = expr_root(e, r, expr_substitute(e, h->f, h->x, r), expr_fmpq(e, q));
    arb_clear(w);
    fmpq_clear(q);
    fmpz_clear(ten), fmpz_clear(top);
    return made;
}

static tw_status add_simple_zero(hunt *h, double a, double b)
{
    arb_t z;
    arb_init(z);
    tw_status status = TW_OK;
    if (!refine(h, z, a, b)) {
        status = give_up(h, a, b);
    } else {
        expr *name = exact_zero(h, z);
        if (!name && h->e->error.kind == ERROR_NONE) name = name_root(h, z);
        if (name)
            expr_list_add(h->list, h->count, name);
        else
            status = TW_ERROR;
    }
    arb_clear(z);
    return status;
}

/* ---- bisection ---- */

static tw_status search(hunt *h, double a, double b, int depth)
{
    acb_t box;
    acb_ptr jet;
    arb_t other;
    if (!budget_ok(h->e)) return TW_ERROR;
    if (is_known(h, a, b)) return TW_OK;
    if (++h->boxes > BOXES_MOST) return give_up(h, a, b);
    acb_init(box);
    arb_init(other);
    jet = _acb_vec_init(2);
    arb_set_d(acb_realref(box), a);
    arb_set_d(other, b);
    arb_union(acb_realref(box), acb_realref(box), other, BITS);
    tape_jet(jet, h->t, box, 2, BITS);
    bool away = acb_is_finite(jet) && !arb_contains_zero(acb_realref(jet));
    bool monotone = acb_is_finite(jet + 1) && !arb_contains_zero(acb_realref(jet + 1));
    int left = monotone ? sign_at_d(h, a) : 0, right = monotone ? sign_at_d(h, b) : 0;
    tw_status status = TW_OK;
    bool done = away || (left != 0 && right != 0);
    if (!away && left * right < 0) status = add_simple_zero(h, a, b);
    if (!done && depth >= NAME_DEPTH && depth % 4 == 0) {
        expr *z = exact_zero(h, acb_realref(box));
        done = z && settle_exact(h, z, a, b);
    }
    _acb_vec_clear(jet, 2);
    arb_clear(other);
    acb_clear(box);
    if (done || status != TW_OK || h->e->error.kind != ERROR_NONE)
        return h->e->error.kind == ERROR_NONE ? status : TW_ERROR;
    if (depth == DEPTH_MOST) return give_up(h, a, b);
    double c = a > 0 && b > 4 * a   ? sqrt(a) * sqrt(b)
               : b < 0 && a < 4 * b ? -sqrt(-a) * sqrt(-b)
                                    : a + 0.4871 * (b - a);
    return search(h, a, c, depth + 1) == TW_OK ? search(h, c, b, depth + 1) : TW_ERROR;
}

/* ---- ends ---- */

static bool keeps_sign(hunt *h, expr *from, expr *to)
{
    return decide_positive_on(h->e, h->f, h->x, from, to, false) == ANSWER_YES ||
           decide_positive_on(h->e, expr_neg(h->e, h->f), h->x, from, to, false) == ANSWER_YES;
}

static expr *from_double(tw_engine *e, double x)
{
    arf_t a;
    fmpq_t q;
    arf_init(a);
    fmpq_init(q);
    arf_set_d(a, x);
    arf_get_fmpq(q, a);
    expr *made = expr_fmpq(e, q);
    fmpq_clear(q);
    arf_clear(a);
    return made;
}

static bool value_of(hunt *h, expr *a, double *out)
{
    acb_t z;
    acb_init(z);
    bool good = ball_value(h->e, z, a, 64) == TW_OK && acb_is_finite(z);
    *out = arf_get_d(arb_midref(acb_realref(z)), ARF_RND_NEAR);
    acb_clear(z);
    return good;
}

/* *out: an inner point such that f keeps its sign between it and the end. side 1: the upper end. */
static tw_status pass_end(hunt *h, expr *end, double inner, int side, double *out)
{
    tw_engine *e = h->e;
    bool endless = expr_is_inf(end) || expr_is_minus_inf(end);
    double at = 0, reach = endless ? fmax(1, 2 * fabs(inner)) : 0;
    if (!endless && !value_of(h, end, &at)) return give_up(h, inner, at);
    if (!endless) reach = fabs(at - inner) / 3;
    for (int k = 0; k < 40 && budget_ok(e); k++) {
        double point = endless ? side * reach : at - side * reach;
        expr *here = from_double(e, point);
        if (keeps_sign(h, side > 0 ? here : end, side > 0 ? end : here)) {
            *out = point;
            return TW_OK;
        }
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        reach = endless ? reach * 2 : reach / 3;
    }
    return e->error.kind == ERROR_NONE ? give_up(h, inner, endless ? side * HUGE_VAL : at) : TW_ERROR;
}

static double inner_point(hunt *h, expr *from, expr *to)
{
    double a = 0, b = 0;
    bool low = expr_is_minus_inf(from), high = expr_is_inf(to);
    if (!low) value_of(h, from, &a);
    if (!high) value_of(h, to, &b);
    return low && high ? 0.137 : low ? b - 1.137 : high ? a + 1.137 : a + 0.4871 * (b - a);
}

tw_status zeros_by_balls(tw_engine *e, expr *f, expr *x, expr *from, expr *to, expr ***list, size_t *count)
{
    hunt h = {.e = e, .f = f, .x = x, .list = list, .count = count};
    expr *const vars[] = {x};
    h.t = tape_new(e, f, vars, 1);
    if (!h.t) return TW_ERROR;
    double inner = inner_point(&h, from, to), low = inner, high = inner;
    tw_status status = pass_end(&h, from, inner, -1, &low);
    if (status == TW_OK) status = pass_end(&h, to, inner, 1, &high);
    if (status == TW_OK && low < high) status = search(&h, low, high, 0);
    free(h.known);
    tape_free(h.t);
    return status;
}
