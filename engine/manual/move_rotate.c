/* The move that turns the path of an integral: rotate by ANGLE. The one idea: the integrand is taken apart into powers,
 * exponentials of sums of powers and powers of sums whose terms stay inside a half-plane; of each the modulus in the whole
 * sector is known by exact angles (in units of pi), so that "the arcs vanish and the sector holds no singularity" is
 * decided by rational arithmetic. Where a factor is of another kind it stands as an open condition.
 *
 * int_0^inf f(x) dx = int_0^inf f(x exp(i theta)) exp(i theta) dx if f is analytic in the open sector and continuous on its
 * sides, and R max |f(R exp(i phi))| -> 0 as R -> 0 and R -> inf, or, at infinity, Jordan's lemma holds (Cauchy's theorem;
 * Jordan's lemma as in DLMF 1.10(ii), Whittaker and Watson 1927, 6.222). */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/values.h"
#include "engine/manual/work.h"

/* What is known of |f| at one end of the sector (R -> inf or R -> 0): |f| <= C R^power (log)^k exp(-b R^q), b > 0 inside
 * the sector; `strict`: on its sides, too; else the exponent vanishes on a side (Jordan's case). */
typedef struct sector {
    tw_engine *e;
    expr *x;
    fmpq_t turn;       /* theta/pi, not 0 */
    expr *power[2];    /* at infinity, at 0 */
    bool decays, strict;
    fmpq_t decay_power; /* q of the term that decays */
    const char *why;   /* what is not seen */
} sector;

static bool not_seen(sector *s, const char *why)
{
    if (!s->why) s->why = why;
    return false;
}

/* theta = turn*pi */
static bool read_angle(tw_engine *e, expr *theta, fmpq_t turn)
{
    expr *over = expr_div(e, theta, expr_constant_of(e, CONSTANT_PI));
    if (!over || !expr_is_number(over)) return forgive(e) && false;
    fmpq_set(turn, expr_number(over));
    return true;
}

/* c = |c| exp(i pi a) with a rational a: signs, powers of i, exp(i pi q) and positive factors. */
static bool read_argument(tw_engine *e, expr *c, fmpq_t a)
{
    expr *const *factors;
    size_t count = expr_factors(&c, &factors);
    fmpq_t part;
    fmpq_init(part);
    bool good = true;
    fmpq_zero(a);
    for (size_t k = 0; k < count && good; k++) {
        expr *f = factors[k], *base, *r;
        fmpq_zero(part);
        expr_as_power(e, f, &base, &r);
        if (expr_is_constant(f, CONSTANT_I)) fmpq_set_si(part, 1, 2);
        else if (expr_is_int(base, -1) && expr_is_number(r)) fmpq_set(part, expr_number(r)); /* (-1)^r, principal */
        else if (expr_is_constant(base, CONSTANT_I) && expr_is_number(r)) fmpq_div_2exp(part, expr_number(r), 1);
        else if (expr_is_call(f, FUNCTION_EXP) && !value_is_real(e, f->args[0])) {
            expr *turn = expr_div(e, f->args[0], expr_mul(e, expr_constant_of(e, CONSTANT_I),
                                                          expr_constant_of(e, CONSTANT_PI)));
            good = turn && expr_is_number(turn);
            if (good) fmpq_set(part, expr_number(turn));
        } else {
            int sign = decide_sign(e, f);
            good = sign == 1 || sign == -1;
            if (sign == -1) fmpq_set_si(part, 1, 1);
        }
        fmpq_add(a, a, part);
    }
    fmpq_clear(part);
    return forgive(e) && good;
}

/* c*x^p, p rational. */
static bool read_power_term(sector *s, expr *one, expr **c, fmpq_t p)
{
    tw_engine *e = s->e;
    expr *const *factors;
    size_t count = expr_factors(&one, &factors);
    *c = expr_int(e, 1);
    fmpq_zero(p);
    for (size_t k = 0; k < count; k++) {
        expr *base, *r;
        if (!expr_has(factors[k], s->x)) {
            *c = expr_mul(e, *c, factors[k]);
            continue;
        }
        expr_as_power(e, factors[k], &base, &r);
        if (base != s->x || !expr_is_number(r)) return false;
        fmpq_add(p, p, expr_number(r));
    }
    return *c != NULL;
}

/* The range [low, high] of arg(c x^p)/pi in the sector. */
static void term_angles(const sector *s, const fmpq_t a, const fmpq_t p, fmpq_t low, fmpq_t high)
{
    fmpq_t move;
    fmpq_init(move);
    fmpq_mul(move, p, s->turn);
    fmpq_set(low, a);
    fmpq_add(high, a, move);
    if (fmpq_sgn(move) < 0) fmpq_swap(low, high);
    fmpq_clear(move);
}

/* Shifts both by a whole even number so that low lies in [-1, 1) + from. */
static void normalise_angles(fmpq_t low, fmpq_t high, slong from)
{
    fmpz_t n;
    fmpq_t t;
    fmpz_init(n);
    fmpq_init(t);
    fmpq_sub_si(t, low, from);
    fmpq_div_2exp(t, t, 1);
    fmpz_fdiv_q(n, fmpq_numref(t), fmpq_denref(t));
    fmpz_mul_2exp(n, n, 1);
    fmpq_sub_fmpz(low, low, n);
    fmpq_sub_fmpz(high, high, n);
    fmpq_clear(t);
    fmpz_clear(n);
}

/* exp(u), u a sum of c x^p: re u <= 0 in the whole sector for each term that is not bounded there. */
static bool read_exponential(sector *s, expr *u)
{
    tw_engine *e = s->e;
    expr *wide = expr_expand(e, u);
    expr *const *parts;
    size_t count = wide ? expr_terms(&wide, &parts) : 0;
    fmpq_t a, p, low, high, half, three_halves;
    fmpq_init(a), fmpq_init(p), fmpq_init(low), fmpq_init(high), fmpq_init(half), fmpq_init(three_halves);
    fmpq_set_si(half, 1, 2);
    fmpq_set_si(three_halves, 3, 2);
    bool good = wide != NULL;
    for (size_t k = 0; k < count && good; k++) {
        expr *c;
        if (!expr_has(parts[k], s->x)) continue;
        if (!read_power_term(s, parts[k], &c, p) || !read_argument(e, c, a)) {
            good = not_seen(s, "the exponent is no sum of powers with known angles");
            break;
        }
        term_angles(s, a, p, low, high);
        normalise_angles(low, high, 0); /* low in [0, 2) */
        if (fmpq_cmp(low, half) < 0 || fmpq_cmp(high, three_halves) > 0) {
            good = not_seen(s, "the exponential grows somewhere in the sector");
            break;
        }
        if (fmpq_sgn(p) <= 0) {
            if (fmpq_sgn(p) < 0) continue; /* falls towards 0: never more than 1 */
            continue;
        }
        bool strict = fmpq_cmp(low, half) > 0 && fmpq_cmp(high, three_halves) < 0;
        if (fmpq_equal(low, high)) {
            if (!strict) continue;
        }
        if (!s->decays || (strict && !s->strict) || (strict == s->strict && fmpq_cmp(p, s->decay_power) > 0))
            fmpq_set(s->decay_power, p);
        s->decays = true;
        s->strict = s->strict || strict;
    }
    fmpq_clear(a), fmpq_clear(p), fmpq_clear(low), fmpq_clear(high), fmpq_clear(half), fmpq_clear(three_halves);
    return forgive(e) && good;
}

/* A sum of c x^p whose terms all stay within one sector of opening less than pi, off the negative axis: not zero, off the
 * cut, and of the modulus of its leading term up to a constant. The least and greatest p. A whole positive power of the sum
 * needs no angles: it is analytic off 0 and bounded by its terms anyhow. */
static bool read_sum(sector *s, expr *base, bool whole, fmpq_t least, fmpq_t most)
{
    tw_engine *e = s->e;
    expr *wide = expr_expand(e, base);
    expr *const *parts;
    size_t count = wide ? expr_terms(&wide, &parts) : 0;
    fmpq_t a, p, low, high, lowest, highest;
    fmpq_init(a), fmpq_init(p), fmpq_init(low), fmpq_init(high), fmpq_init(lowest), fmpq_init(highest);
    bool good = wide != NULL;
    for (size_t k = 0; k < count && good; k++) {
        expr *c;
        good = read_power_term(s, parts[k], &c, p) && (whole || read_argument(e, c, a));
        if (!good) break;
        term_angles(s, a, p, low, high);
        normalise_angles(low, high, -1); /* low in [-1, 1) */
        if (k == 0 || fmpq_cmp(low, lowest) < 0) fmpq_set(lowest, low);
        if (k == 0 || fmpq_cmp(high, highest) > 0) fmpq_set(highest, high);
        if (k == 0 || fmpq_cmp(p, least) < 0) fmpq_set(least, p);
        if (k == 0 || fmpq_cmp(p, most) > 0) fmpq_set(most, p);
    }
    if (good && !whole) {
        good = fmpq_cmp_si(lowest, -1) > 0 && fmpq_cmp_si(highest, 1) < 0;
        fmpq_sub(a, highest, lowest);
        good = good && fmpq_cmp_si(a, 1) < 0;
    }
    if (!good) not_seen(s, "a sum may vanish or cross its cut in the sector");
    fmpq_clear(a), fmpq_clear(p), fmpq_clear(low), fmpq_clear(high), fmpq_clear(lowest), fmpq_clear(highest);
    return forgive(e) && good;
}

/* |base^r| */
static bool read_power(sector *s, expr *base, expr *r)
{
    tw_engine *e = s->e;
    if (expr_has(r, s->x)) return not_seen(s, "a power has a variable exponent");
    fmpq_t least, most;
    fmpq_init(least);
    fmpq_init(most);
    bool whole = expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r))) && fmpq_sgn(expr_number(r)) > 0;
    bool good = value_is_real(e, r);
    if (base == s->x) {
        fmpq_set_si(least, 1, 1);
        fmpq_set_si(most, 1, 1);
    } else {
        good = good && read_sum(s, base, whole, least, most);
    }
    if (good) {
        s->power[0] = expr_add(e, s->power[0], expr_mul(e, r, expr_fmpq(e, most)));
        s->power[1] = expr_add(e, s->power[1], expr_mul(e, r, expr_fmpq(e, least)));
    } else not_seen(s, "a power is of another kind");
    fmpq_clear(least);
    fmpq_clear(most);
    return forgive(e) && good && s->power[0] && s->power[1];
}

static bool read_product(sector *s, expr *f)
{
    tw_engine *e = s->e;
    expr *const *factors;
    size_t count = expr_factors(&f, &factors);
    s->power[0] = s->power[1] = expr_int(e, 0);
    s->decays = s->strict = false;
    fmpq_zero(s->decay_power);
    for (size_t k = 0; k < count; k++) {
        expr *one = factors[k], *base, *r;
        if (!expr_has(one, s->x)) continue;
        if (expr_is_call(one, FUNCTION_EXP)) {
            if (!read_exponential(s, one->args[0])) return false;
            continue;
        }
        expr_as_power(e, one, &base, &r);
        if (expr_is_call(base, FUNCTION_LOG) && base->args[0] == s->x && !expr_has(r, s->x) && expr_is_number(r) &&
            fmpq_sgn(expr_number(r)) > 0 && fmpz_is_one(fmpq_denref(expr_number(r))))
            continue; /* smaller than any power, and the powers are compared strictly */
        if (base->kind == EXPR_CALL) return not_seen(s, "a function is of another kind");
        if (!read_power(s, base, r)) return false;
    }
    return true;
}

/* R |f| -> 0 at 0; at infinity by decay, by the power, or by Jordan's lemma: the integral of exp(-c R^q sin) over the
 * angle is O(R^-q), so R^(1 - q) R^power must vanish. */
static bool arcs_vanish(sector *s)
{
    tw_engine *e = s->e;
    expr *one = expr_int(e, 1);
    if (decide_sign(e, expr_add(e, s->power[1], one)) != 1)
        return forgive(e) && not_seen(s, "the arc at 0 is not seen to vanish");
    if (s->decays && s->strict) return true;
    expr *over = expr_add(e, s->power[0], one);
    if (s->decays) over = expr_sub(e, over, expr_fmpq(e, s->decay_power));
    if (over && decide_sign(e, over) == -1) return true;
    return forgive(e) && not_seen(s, "the arc at infinity is not seen to vanish");
}

/* Circular and hyperbolic functions as exponentials. */
static expr *as_exponentials(tw_engine *e, expr *f)
{
    if (!f || f->kind == EXPR_INTEGRAL || f->kind == EXPR_CONTOUR || f->kind == EXPR_SUMMATION || f->count == 0) return f;
    expr *i = expr_constant_of(e, CONSTANT_I), *half = expr_frac(e, 1, 2);
    if (f->kind == EXPR_CALL && f->count == 1) {
        expr *u = as_exponentials(e, f->args[0]);
        bool circular = f->is.function == FUNCTION_SIN || f->is.function == FUNCTION_COS;
        expr *v = circular ? expr_mul(e, i, u) : u;
        expr *up = expr_call1(e, FUNCTION_EXP, v), *down = expr_call1(e, FUNCTION_EXP, expr_neg(e, v));
        switch (f->is.function) {
        case FUNCTION_COS:
        case FUNCTION_COSH: return expr_mul(e, half, expr_add(e, up, down));
        case FUNCTION_SIN: return expr_mul(e, expr_div(e, half, i), expr_sub(e, up, down));
        case FUNCTION_SINH: return expr_mul(e, half, expr_sub(e, up, down));
        default: return expr_call1(e, f->is.function, u);
        }
    }
    if (f->kind != EXPR_SUM && f->kind != EXPR_PRODUCT && f->kind != EXPR_POWER) return f;
    expr **parts = base_alloc(f->count * sizeof *parts), *made;
    for (uint32_t k = 0; k < f->count; k++) parts[k] = as_exponentials(e, f->args[k]);
    if (f->kind == EXPR_POWER) made = expr_pow(e, parts[0], parts[1]);
    else made = f->kind == EXPR_SUM ? expr_sum(e, parts, f->count) : expr_product(e, parts, f->count);
    free(parts);
    return made;
}

/* Every term of the body vanishes on the arcs; else *why. */
static bool proves_rotation(work *w, const piece *p, const fmpq_t turn, const char **why)
{
    tw_engine *e = w->e;
    sector s = {e, p->x, {{0}}, {NULL, NULL}, false, false, {{0}}, NULL};
    fmpq_init(s.turn);
    fmpq_init(s.decay_power);
    fmpq_set(s.turn, turn);
    expr *body = as_exponentials(e, p->body);
    bool good = body && read_product(&s, body) && arcs_vanish(&s);
    if (!good && body && forgive(e)) {
        s.why = NULL;
        expr *wide = expr_expand(e, body);
        if (wide) wide = tidy(e, wide, p->x, true);
        expr *const *parts;
        size_t count = wide ? expr_terms(&wide, &parts) : 0;
        good = wide && count > 1;
        if (!good) {
            read_product(&s, body);
            arcs_vanish(&s);
        }
        for (size_t k = 0; k < count && good; k++) good = read_product(&s, parts[k]) && arcs_vanish(&s);
    }
    *why = s.why ? s.why : "a factor is of a kind that is not known in the sector";
    fmpq_clear(s.turn);
    fmpq_clear(s.decay_power);
    return forgive(e) && good;
}

tw_status move_rotate(work *w, const piece *p)
{
    tw_engine *e = w->e;
    fmpq_t turn;
    fmpq_init(turn);
    bool known = read_angle(e, w->move->value, turn);
    tw_status status = TW_OK;
    if (!expr_is_zero(p->from) || !expr_is_inf(p->to))
        status = engine_fail(e, ERROR_UNSUITABLE, "a path is turned about 0: the range must be 0 to inf (substitute first)");
    else if (!known)
        status = engine_fail(e, ERROR_UNSUITABLE, "the angle must be a rational multiple of pi");
    else if (fmpq_is_zero(turn)) status = engine_fail(e, ERROR_VALUE, "an angle of 0 turns nothing");
    else if (fmpq_cmp_si(turn, 1) >= 0 || fmpq_cmp_si(turn, -1) <= 0)
        status = engine_fail(e, ERROR_UNSUITABLE, "the angle must lie between -pi and pi, where the principal branches hold");
    const char *why = NULL;
    bool proved = status == TW_OK && proves_rotation(w, p, turn, &why);
    if (status == TW_OK && e->error.kind != ERROR_NONE) status = TW_ERROR;
    if (status == TW_OK) {
        work_needs(w, proved ? CONDITION_PROVED : CONDITION_OPEN,
                   "the arcs vanish and the sector holds no singularity%s%s", proved ? "" : ": ", proved ? "" : why);
        w->proved = w->proved && proved;
        w->source = proved ? "Cauchy's theorem, Jordan's lemma" : "Cauchy's theorem";
        expr *unit = expr_call1(e, FUNCTION_EXP, expr_mul(e, expr_constant_of(e, CONSTANT_I), w->move->value));
        expr *rise = NULL;
        fmpq_t two;
        fmpq_init(two);
        fmpq_mul_2exp(two, turn, 1); /* exp(i pi/2) = i exactly */
        if (fmpz_is_one(fmpq_denref(two)))
            rise = expr_pow(e, expr_constant_of(e, CONSTANT_I), expr_fmpq(e, two));
        fmpq_clear(two);
        if (rise) unit = rise;
        piece made = *p;
        made.body = expr_mul(e, unit, expr_substitute(e, p->body, p->x, expr_mul(e, unit, p->x)));
        status = work_add_integral(w, &made);
        const manual_frame *now = manual_now(w->m);
        if (status == TW_OK && proved && !now->converges && now->live.count == 1 && now->split_off.count == 0 &&
            expr_is_zero(now->plain) && !now->pending) /* the two converge together */
            w->next.converges = converges_absolutely(e, made.body, p->x, p->from, p->to) == ANSWER_YES;
        if (status == TW_OK && !forgive(e)) status = TW_ERROR;
    }
    fmpq_clear(turn);
    return status;
}
