/* How a function grows at infinity, as an expression in the parameters, so that "converges for s > a + 3" can be said
 * exactly. The one idea: a record (exponential part b x^c, power a, power k of the logarithm) carried up the tree,
 * sharp or an upper bound; where signs of parameters are needed, the facts are asked; where no rule fits, nothing is
 * claimed. */
#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/method/convergence.h"
#include "engine/method/scale.h"

void behaviour_init(behaviour *f)
{
    memset(f, 0, sizeof *f);
    fmpq_init(f->c);
}

void behaviour_clear(behaviour *f)
{
    fmpq_clear(f->c);
}

static void set_power(tw_engine *e, behaviour *f, expr *a, slong k, bool sharp)
{
    f->known = true;
    f->sharp = sharp;
    f->b = expr_int(e, 0);
    fmpq_zero(f->c);
    f->a = a;
    f->k = k;
    if (!a) f->known = false;
}

static void set_exponential(tw_engine *e, behaviour *f, expr *b, const fmpq_t c, bool sharp)
{
    set_power(e, f, expr_int(e, 0), 0, sharp);
    f->b = b;
    fmpq_set(f->c, c);
    if (!b) f->known = false;
}

static void copy(behaviour *to, const behaviour *from)
{
    fmpq_t c;
    fmpq_init(c);
    fmpq_set(c, from->c);
    to->known = from->known;
    to->sharp = from->sharp;
    to->b = from->b;
    to->a = from->a;
    to->k = from->k;
    fmpq_set(to->c, c);
    fmpq_clear(c);
}

static int sign_of(tw_engine *e, expr *a)
{
    if (!a) return 2;
    return expr_is_number(a) ? fmpq_sgn(expr_number(a)) : decide_sign(e, a);
}

/* Sign of log|f| - log|g| in the long run: 0 alike, 2 unknown. */
static int compare(tw_engine *e, const behaviour *f, const behaviour *g)
{
    int order = expr_is_zero(f->b) || expr_is_zero(g->b) ? 0 : fmpq_cmp(f->c, g->c);
    int sign = order > 0 || expr_is_zero(g->b)   ? sign_of(e, f->b)
               : order < 0 || expr_is_zero(f->b) ? sign_of(e, expr_neg(e, g->b))
                                                 : sign_of(e, expr_sub(e, f->b, g->b));
    if (sign == 0) sign = sign_of(e, expr_sub(e, f->a, g->a));
    if (sign == 0) sign = f->k > g->k ? 1 : f->k < g->k ? -1 : 0;
    return sign;
}

/* Two powers of which the facts do not say which is the larger: the greater of both bounds them. */
static void larger_power(tw_engine *e, behaviour *out, const behaviour *g)
{
    expr *both[] = {out->a, g->a};
    out->a = expr_call(e, FUNCTION_MAX, both, 2);
    out->k = out->k > g->k ? out->k : g->k;
    out->sharp = false;
    out->known = out->a != NULL;
}

static void of_sum(tw_engine *e, behaviour *out, expr *f, expr *x)
{
    behaviour part;
    behaviour_init(&part);
    behaviour_at_infinity(e, out, f->args[0], x);
    for (uint32_t k = 1; k < f->count && out->known; k++) {
        behaviour_at_infinity(e, &part, f->args[k], x);
        int order = part.known ? compare(e, &part, out) : 2;
        if (order == 2 && part.known && expr_is_zero(part.b) && expr_is_zero(out->b)) larger_power(e, out, &part);
        else if (order == 2) out->known = false;
        else if (order > 0) copy(out, &part);
        else if (order == 0) out->sharp = out->sharp && part.sharp && plainly_positive(e, f, x);
    }
    behaviour_clear(&part);
}

static void multiply(tw_engine *e, behaviour *out, const behaviour *g)
{
    int order = expr_is_zero(out->b) && expr_is_zero(g->b) ? 0
                : expr_is_zero(out->b)                     ? -1
                : expr_is_zero(g->b)                       ? 1
                                                           : fmpq_cmp(out->c, g->c);
    if (order == 0) out->b = expr_add(e, out->b, g->b);
    if (order < 0) {
        out->b = g->b;
        fmpq_set(out->c, g->c);
    }
    out->a = expr_add(e, out->a, g->a);
    out->k += g->k;
    out->sharp = out->sharp && g->sharp;
    out->known = out->known && g->known && out->a && out->b;
}

static void of_product(tw_engine *e, behaviour *out, expr *f, expr *x)
{
    behaviour part;
    behaviour_init(&part);
    behaviour_at_infinity(e, out, f->args[0], x);
    for (uint32_t k = 1; k < f->count && out->known; k++) {
        behaviour_at_infinity(e, &part, f->args[k], x);
        if (part.known) multiply(e, out, &part);
        else out->known = false;
    }
    behaviour_clear(&part);
}

static void of_power(tw_engine *e, behaviour *out, expr *f, expr *x)
{
    expr *r = f->args[1];
    if (expr_has(r, x)) return;
    behaviour_at_infinity(e, out, f->args[0], x);
    if (!out->known) return;
    int sign = out->sharp ? 1 : sign_of(e, r);
    out->known = sign == 1 || sign == 0;
    out->b = expr_mul(e, out->b, r);
    out->a = expr_mul(e, out->a, r);
    if (out->k != 0) {
        bool whole =
            expr_is_number(r) && fmpz_is_one(fmpq_denref(expr_number(r))) && fmpz_fits_si(fmpq_numref(expr_number(r)));
        if (whole) out->k *= fmpz_get_si(fmpq_numref(expr_number(r)));
        else out->known = false;
    }
    out->known = out->known && out->a && out->b;
}

/* ---- what stands inside a function ---- */

typedef enum limit_kind { LIMIT_UNKNOWN, LIMIT_BOUNDED, LIMIT_POWER } limit_kind;

/* The real function u(x) = C x^alpha + o(x^alpha) with alpha > 0 rational, C not 0, or bounded; by its series in 1/x.
 */
static limit_kind limit_by_series(tw_engine *e, expr *u, expr *x, expr **C, fmpq_t alpha)
{
    expr *y = expr_fresh(e, "y");
    series s;
    series_init(&s);
    limit_kind kind = LIMIT_UNKNOWN;
    fmpq_zero(alpha);
    *C = expr_int(e, 0);
    expr *turned = normal_under_facts(e, expr_substitute(e, u, x, expr_pow(e, y, expr_int(e, -1))), &y, 1);
    if (turned && series_at_zero(e, &s, turned, y, 1, NULL, NULL) == TW_OK) {
        kind = LIMIT_BOUNDED;
        for (size_t k = 0; k < s.count; k++) {
            const strand *one = &s.strands[k];
            if (!expr_is_number(one->exponent) || (one->log_power > 0 && fmpq_sgn(expr_number(one->exponent)) <= 0)) {
                kind = LIMIT_UNKNOWN;
                break;
            }
            fmpq_t a;
            fmpq_init(a);
            fmpq_neg(a, expr_number(one->exponent));
            expr *lead = expr_mul(e, one->constant, coefficient_expr(e, &one->c, 0));
            int order = fmpq_cmp(a, alpha);
            if (fmpq_sgn(a) > 0 && order > 0) *C = lead;
            if (fmpq_sgn(a) > 0 && order == 0) *C = expr_add(e, *C, lead);
            if (fmpq_sgn(a) > 0 && order > 0) fmpq_set(alpha, a);
            fmpq_clear(a);
        }
    }
    series_clear(&s);
    if (e->error.kind == ERROR_UNSUITABLE || e->error.kind == ERROR_UNDECIDED || e->error.kind == ERROR_VALUE)
        engine_forgive(e);
    if (!*C) return LIMIT_UNKNOWN;
    return kind == LIMIT_BOUNDED && fmpq_sgn(alpha) > 0 ? LIMIT_POWER : kind;
}

/* The same term by term, where some terms are only known to be bounded (sin(x)). */
static limit_kind limit_of(tw_engine *e, expr *u, expr *x, expr **C, fmpq_t alpha)
{
    limit_kind kind = limit_by_series(e, u, x, C, alpha);
    if (kind != LIMIT_UNKNOWN) return kind;
    if (u->kind != EXPR_SUM) {
        behaviour b;
        behaviour_init(&b);
        behaviour_at_infinity(e, &b, u, x);
        int growth = b.known ? sign_of(e, b.b) : 2;
        bool bounded = growth == -1 || (growth == 0 && b.k <= 0 && sign_of(e, b.a) <= 0);
        behaviour_clear(&b);
        return bounded ? LIMIT_BOUNDED : LIMIT_UNKNOWN;
    }
    fmpq_t one;
    fmpq_init(one);
    fmpq_zero(alpha);
    *C = expr_int(e, 0);
    kind = LIMIT_BOUNDED;
    for (uint32_t k = 0; k < u->count && kind != LIMIT_UNKNOWN; k++) {
        expr *lead;
        limit_kind part = limit_of(e, u->args[k], x, &lead, one);
        if (part == LIMIT_UNKNOWN) kind = part;
        if (part != LIMIT_POWER || fmpq_cmp(one, alpha) < 0) continue;
        *C = fmpq_equal(one, alpha) ? expr_add(e, *C, lead) : lead;
        fmpq_set(alpha, one);
        kind = *C && !expr_is_zero(*C) ? LIMIT_POWER : LIMIT_UNKNOWN;
    }
    fmpq_clear(one);
    return kind;
}

static expr *absolute(tw_engine *e, expr *C)
{
    int sign = sign_of(e, C);
    return sign == 1 || sign == 0 ? C : sign == -1 ? expr_neg(e, C) : expr_call1(e, FUNCTION_ABS, C);
}

static bool holds_i(expr *a)
{
    if (expr_is_constant(a, CONSTANT_I)) return true;
    for (uint32_t k = 0; k < a->count; k++)
        if (holds_i(a->args[k])) return true;
    return false;
}

/* Functions that decay or grow like exp(rate * u^turn) up to powers. */
static void of_exponential(tw_engine *e, behaviour *out, expr *C, const fmpq_t alpha, expr *rate, const fmpq_t turn,
                           bool sharp)
{
    fmpq_t c;
    fmpq_init(c);
    fmpq_mul(c, alpha, turn);
    set_exponential(e, out, expr_mul(e, rate, expr_pow(e, C, expr_fmpq(e, turn))), c, sharp);
    fmpq_clear(c);
}

/* f = F(u) with u = C x^alpha + ..., alpha > 0. */
static void of_call_growing(tw_engine *e, behaviour *out, function_id F, expr *C, const fmpq_t alpha)
{
    int sign = sign_of(e, C);
    expr *zero = expr_int(e, 0), *one = expr_int(e, 1), *minus = expr_int(e, -1);
    fmpq_t turn;
    fmpq_init(turn);
    fmpq_one(turn);
    switch (F) {
    case FUNCTION_EXP: of_exponential(e, out, C, alpha, one, turn, true); break;
    case FUNCTION_COSH:
    case FUNCTION_SINH: of_exponential(e, out, absolute(e, C), alpha, one, turn, sign != 2); break;
    case FUNCTION_SIN:
    case FUNCTION_COS: set_power(e, out, zero, 0, false); break;
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ERF:
    case FUNCTION_SIGN: set_power(e, out, zero, 0, sign == 1 || sign == -1); break;
    case FUNCTION_ABS: set_power(e, out, expr_fmpq(e, alpha), 0, true); break;
    case FUNCTION_LOG:
    case FUNCTION_ASINH:
        if (sign == 1) set_power(e, out, zero, 1, true);
        break;
    case FUNCTION_ERFC:
        fmpq_set_si(turn, 2, 1);
        if (sign == 1) of_exponential(e, out, C, alpha, minus, turn, true);
        else set_power(e, out, zero, 0, sign == -1);
        break;
    case FUNCTION_E1:
    case FUNCTION_BESSEL_K:
    case FUNCTION_GAMMA_UPPER:
        if (sign == 1) of_exponential(e, out, C, alpha, minus, turn, F != FUNCTION_GAMMA_UPPER);
        break;
    case FUNCTION_BESSEL_I:
        if (sign == 1) of_exponential(e, out, C, alpha, one, turn, true);
        break;
    case FUNCTION_BESSEL_J:
    case FUNCTION_BESSEL_Y:
        if (sign == 1) set_power(e, out, zero, 0, false);
        break;
    case FUNCTION_AI:
    case FUNCTION_BI: /* exp(-+ (2/3) u^(3/2)) (DLMF 9.7.5, 9.7.7) */
        fmpq_set_si(turn, 3, 2);
        if (sign == 1) of_exponential(e, out, C, alpha, expr_frac(e, F == FUNCTION_AI ? -2 : 2, 3), turn, true);
        else if (sign == -1) set_power(e, out, zero, 0, false);
        break;
    case FUNCTION_PSI:
        if (sign == 1) set_power(e, out, zero, 1, true);
        break;
    case FUNCTION_LNGAMMA:
        if (sign == 1) set_power(e, out, expr_fmpq(e, alpha), 1, true);
        break;
    case FUNCTION_ZETA:
        if (sign == 1) set_power(e, out, zero, 0, true);
        break;
    default: break;
    }
    fmpq_clear(turn);
}

/* f = F(u), u bounded: bounded where F is continuous on the whole real axis. */
static bool is_continuous_everywhere(function_id F)
{
    switch (F) {
    case FUNCTION_EXP:
    case FUNCTION_SIN:
    case FUNCTION_COS:
    case FUNCTION_SINH:
    case FUNCTION_COSH:
    case FUNCTION_TANH:
    case FUNCTION_ATAN:
    case FUNCTION_ASINH:
    case FUNCTION_ABS:
    case FUNCTION_ERF:
    case FUNCTION_ERFC:
    case FUNCTION_AI:
    case FUNCTION_BI:
    case FUNCTION_SIGN: return true;
    default: return false;
    }
}

static void of_call(tw_engine *e, behaviour *out, expr *f, expr *x)
{
    function_id F = f->is.function;
    bool two = F == FUNCTION_BESSEL_J || F == FUNCTION_BESSEL_Y || F == FUNCTION_BESSEL_I || F == FUNCTION_BESSEL_K ||
               F == FUNCTION_GAMMA_UPPER;
    if (f->count != (two ? 2u : 1u) || holds_i(f) || (two && expr_has(f->args[0], x))) return;
    expr *C;
    fmpq_t alpha;
    fmpq_init(alpha);
    limit_kind kind = limit_of(e, f->args[f->count - 1], x, &C, alpha);
    if (kind == LIMIT_POWER) of_call_growing(e, out, F, C, alpha);
    if (kind == LIMIT_BOUNDED && is_continuous_everywhere(F))
        set_power(e, out, expr_int(e, 0), 0, F == FUNCTION_EXP || F == FUNCTION_COSH);
    fmpq_clear(alpha);
}

void behaviour_at_infinity(tw_engine *e, behaviour *out, expr *f, expr *x)
{
    out->known = false;
    if (!f || !budget_ok(e)) return;
    if (!expr_has(f, x)) {
        set_power(e, out, expr_int(e, 0), 0, !expr_is_zero(f));
        return;
    }
    if (f == x) set_power(e, out, expr_int(e, 1), 0, true);
    else if (f->kind == EXPR_SUM) of_sum(e, out, f, x);
    else if (f->kind == EXPR_PRODUCT) of_product(e, out, f, x);
    else if (f->kind == EXPR_POWER) of_power(e, out, f, x);
    else if (f->kind == EXPR_CALL) of_call(e, out, f, x);
    if (out->known && out->b && !expr_is_zero(out->b) && holds_i(out->b)) out->known = false;
}
