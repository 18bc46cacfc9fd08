/* Conditions: by the facts as they stand, by exact arithmetic, by signs of structure after a shift to the ends of the known
 * intervals, and by balls over bounded boxes. Yes, no or unknown. */
#include "engine/ball/decide.h"

#include <stdlib.h>

#include "engine/ball/sign.h"

enum { BOX_LIMIT = 4000, BOX_SYMBOLS = 3 };

static int sign_by_structure(tw_engine *e, expr *f)
{
    sign_context c = {0};
    int signs = sign_of(e, f, NULL);
    if (signs & (signs - 1)) signs &= sign_of(e, sign_shift(e, f, &c), &c);
    free(c.symbols);
    free(c.signs);
    return signs;
}

/* ---- boxes ---- */

typedef struct box_job {
    tw_engine *e;
    tape *t;
    size_t n;
    slong left;
} box_job;

/* Signs of the tape over the box of real intervals, bisected along the widest side. */
static int signs_over(box_job *j, acb_ptr box, int depth)
{
    acb_t v;
    acb_init(v);
    tape_eval(v, j->t, box, false, 64);
    int signs = SIGN_ANY;
    if (acb_is_real(v) && acb_is_finite(v)) {
        if (arb_is_positive(acb_realref(v))) signs = SIGN_POSITIVE;
        else if (arb_is_negative(acb_realref(v))) signs = SIGN_NEGATIVE;
    }
    acb_clear(v);
    if (signs != SIGN_ANY || depth == 0 || --j->left < 0 || !budget_ok(j->e)) return signs;
    size_t widest = 0;
    for (size_t k = 1; k < j->n; k++)
        if (mag_cmp(arb_radref(acb_realref(box + k)), arb_radref(acb_realref(box + widest))) > 0) widest = k;
    if (mag_is_zero(arb_radref(acb_realref(box + widest)))) return SIGN_ANY;
    acb_ptr half = _acb_vec_init((slong)j->n);
    arf_t low, high, middle;
    arf_init(low);
    arf_init(high);
    arf_init(middle);
    arb_get_lbound_arf(low, acb_realref(box + widest), 64);
    arb_get_ubound_arf(high, acb_realref(box + widest), 64);
    arf_add(middle, low, high, 64, ARF_RND_NEAR);
    arf_mul_2exp_si(middle, middle, -1);
    signs = 0;
    for (int side = 0; side < 2 && signs != SIGN_ANY; side++) {
        _acb_vec_set(half, box, (slong)j->n);
        arb_set_interval_arf(acb_realref(half + widest), side ? middle : low, side ? high : middle, 64);
        signs |= signs_over(j, half, depth - 1);
        if ((signs & SIGN_POSITIVE) && (signs & SIGN_NEGATIVE)) signs = SIGN_ANY;
    }
    arf_clear(low);
    arf_clear(high);
    arf_clear(middle);
    _acb_vec_clear(half, (slong)j->n);
    return signs;
}

/* Only where every symbol has both ends. */
static int sign_by_boxes(tw_engine *e, expr *f)
{
    expr **symbols;
    size_t n = expr_symbols(f, &symbols);
    int signs = SIGN_ANY;
    if (n >= 1 && n <= BOX_SYMBOLS) {
        acb_ptr box = _acb_vec_init((slong)n);
        fmpq_t low, high;
        fmpq_init(low);
        fmpq_init(high);
        bool bounded = true;
        for (size_t k = 0; k < n && bounded; k++) {
            bounded = !facts_is_complex(e, symbols[k]) && (facts_interval(e, symbols[k], low, high) & 3) == 3;
            if (!bounded) break;
            arb_t a, b;
            arb_init(a);
            arb_init(b);
            arb_set_fmpq(a, low, 64);
            arb_set_fmpq(b, high, 64);
            arb_union(acb_realref(box + k), a, b, 64);
            arb_clear(a);
            arb_clear(b);
        }
        fmpq_clear(low);
        fmpq_clear(high);
        tape *t = bounded ? tape_new(e, f, symbols, n) : NULL;
        if (t) {
            box_job j = {.e = e, .t = t, .n = n, .left = BOX_LIMIT};
            signs = signs_over(&j, box, 40);
            tape_free(t);
        } else if (bounded) {
            engine_forgive(e);
        }
        _acb_vec_clear(box, (slong)n);
    }
    free(symbols);
    return signs;
}

/* ---- from one declared fact ---- */

/* Signs of f given the fact g > 0 (or >= 0): f = k*g + r with a number k, r of known sign. */
static int sign_from_fact(tw_engine *e, expr *f, expr *fact)
{
    if (fact->is.relation != RELATION_LESS && fact->is.relation != RELATION_LESS_EQUAL) return SIGN_ANY;
    expr *g = expr_expand(e, expr_sub(e, fact->args[1], fact->args[0]));
    int g_signs = fact->is.relation == RELATION_LESS ? SIGN_POSITIVE : SIGN_ZERO | SIGN_POSITIVE;
    for (int k = -1; k <= 1; k += 2) {
        expr *rest = expr_expand(e, expr_sub(e, f, expr_mul(e, expr_int(e, k), g)));
        if (!rest) return SIGN_ANY;
        int r = sign_by_structure(e, rest);
        if (k > 0 && !(r & SIGN_NEGATIVE)) return (g_signs & r & SIGN_ZERO) | SIGN_POSITIVE;
        if (k < 0 && !(r & SIGN_POSITIVE)) return (g_signs & r & SIGN_ZERO) | SIGN_NEGATIVE;
    }
    return SIGN_ANY;
}

/* All signs that f can have. */
static int signs_allowed(tw_engine *e, expr *f)
{
    expr *g = expr_expand(e, f);
    if (!g) return SIGN_ANY;
    int signs = sign_by_structure(e, g);
    for (size_t k = 0; k < facts_count(e) && (signs & (signs - 1)); k++) {
        condition_label l;
        signs &= sign_from_fact(e, g, facts_at(e, k, &l));
    }
    if (signs & (signs - 1)) signs &= sign_by_boxes(e, g);
    return signs ? signs : SIGN_ANY;
}

int decide_sign(tw_engine *e, expr *f)
{
    switch (signs_allowed(e, f)) {
    case SIGN_POSITIVE: return 1;
    case SIGN_NEGATIVE: return -1;
    case SIGN_ZERO: return 0;
    default: return 2;
    }
}

/* ---- conditions ---- */

static answer among(int signs, int wanted)
{
    if (!(signs & ~wanted)) return ANSWER_YES;
    return signs & wanted ? ANSWER_UNKNOWN : ANSWER_NO;
}

/* Is a an integer for all integer values of its integer symbols? */
static answer is_integer(tw_engine *e, expr *a)
{
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: return fmpz_is_one(fmpq_denref(expr_number(a))) ? ANSWER_YES : ANSWER_NO;
    case EXPR_SYMBOL: return facts_is_integer(e, a) ? ANSWER_YES : ANSWER_UNKNOWN;
    case EXPR_SUM:
    case EXPR_PRODUCT:
        for (uint32_t k = 0; k < a->count; k++)
            if (is_integer(e, a->args[k]) != ANSWER_YES) return ANSWER_UNKNOWN;
        return ANSWER_YES;
    case EXPR_POWER:
        if (is_integer(e, a->args[0]) == ANSWER_YES && is_integer(e, a->args[1]) == ANSWER_YES &&
            !(signs_allowed(e, a->args[1]) & SIGN_NEGATIVE))
            return ANSWER_YES;
        return ANSWER_UNKNOWN;
    default: return ANSWER_UNKNOWN;
    }
}

static answer is_real(tw_engine *e, expr *a)
{
    if (sign_by_structure(e, a) != SIGN_ANY) return ANSWER_YES;
    if (a->kind == EXPR_SYMBOL) return facts_is_complex(e, a) ? ANSWER_UNKNOWN : ANSWER_YES;
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT) return ANSWER_UNKNOWN;
    for (uint32_t k = 0; k < a->count; k++)
        if (is_real(e, a->args[k]) != ANSWER_YES) return ANSWER_UNKNOWN;
    return ANSWER_YES;
}

/* Does a granted fact speak of a symbol of the condition? Then the answer may rest on it. */
static bool rests_on_granted(tw_engine *e, expr *condition)
{
    expr **symbols;
    size_t n = expr_symbols(condition, &symbols);
    bool rests = false;
    for (size_t k = 0; k < facts_count(e) && !rests; k++) {
        condition_label l;
        expr *fact = facts_at(e, k, &l);
        for (size_t j = 0; l == CONDITION_GRANTED && j < n; j++) rests = rests || expr_has(fact, symbols[j]);
    }
    free(symbols);
    return rests;
}

answer decide(tw_engine *e, expr *condition, condition_label *label)
{
    condition_label unused;
    if (!label) label = &unused;
    for (size_t k = 0; k < facts_count(e); k++)
        if (facts_at(e, k, label) == condition) return ANSWER_YES;
    *label = rests_on_granted(e, condition) ? CONDITION_GRANTED : CONDITION_PROVED;
    expr *left = condition->args[0], *right = condition->args[1];
    expr *difference = NULL;
    if (condition->is.relation <= RELATION_NOT_EQUAL) {
        difference = expr_sub(e, right, left);
        if (!difference) { /* inf - inf and the like: nothing is known */
            engine_forgive(e);
            return ANSWER_UNKNOWN;
        }
    }
    switch (condition->is.relation) {
    case RELATION_LESS: return among(signs_allowed(e, difference), SIGN_POSITIVE);
    case RELATION_LESS_EQUAL: return among(signs_allowed(e, difference), SIGN_POSITIVE | SIGN_ZERO);
    case RELATION_EQUAL: return among(signs_allowed(e, difference), SIGN_ZERO);
    case RELATION_NOT_EQUAL: return among(signs_allowed(e, difference), SIGN_POSITIVE | SIGN_NEGATIVE);
    case RELATION_INTEGER: return is_integer(e, left);
    case RELATION_REAL: return is_real(e, left);
    case RELATION_COMPLEX: return ANSWER_YES;
    }
    return ANSWER_UNKNOWN;
}
