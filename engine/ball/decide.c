/* Conditions: by the facts as they stand, by exact arithmetic, by signs of structure after a shift to the ends of the
 * known intervals, and by balls over bounded boxes. Yes, no or unknown. */
#include "engine/ball/decide.h"

#include <stdlib.h>

#include "engine/ball/sign.h"

enum { BOX_LIMIT = 4000, BOX_SYMBOLS = 3 };

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
            forgive_trouble(e);
        }
        _acb_vec_clear(box, (slong)n);
    }
    free(symbols);
    return signs;
}

/* ---- from declared facts ---- */

enum { FACTS_DEEP = 3, FACTS_LIMIT = 24, SIZE_LIMIT = 20000 };

/* right - left of a fact and the signs that it can have. */
static expr *fact_difference(tw_engine *e, expr *fact, int *signs)
{
    switch (fact->is.relation) {
    case RELATION_LESS: *signs = SIGN_POSITIVE; break;
    case RELATION_LESS_EQUAL: *signs = SIGN_ZERO | SIGN_POSITIVE; break;
    case RELATION_EQUAL: *signs = SIGN_ZERO; break;
    default: return NULL;
    }
    return expr_expand(e, expr_sub(e, fact->args[1], fact->args[0]));
}

/* k such that f - k*g has no longer the term number `which` of g; false where f does not have it. */
static bool cancelling_factor(tw_engine *e, expr *f, expr *g, size_t which, fmpq_t k)
{
    expr *const *f_terms, *const *g_terms, *f_rest, *g_rest;
    size_t n = expr_terms(&f, &f_terms), m = expr_terms(&g, &g_terms);
    if (which >= m) return false;
    bool found = false;
    fmpq_t c;
    fmpq_init(c);
    expr_as_coefficient(e, g_terms[which], c, &g_rest);
    for (size_t j = 0; j < n && !found && !expr_is_one(g_rest); j++) {
        expr_as_coefficient(e, f_terms[j], k, &f_rest);
        found = f_rest == g_rest && !fmpq_is_zero(c);
    }
    if (found) fmpq_div(k, k, c);
    fmpq_clear(c);
    return found;
}

/* Signs of f = k*g + rest for declared g > 0, the rest by structure or by further facts. */
static int sign_from_facts(tw_engine *e, expr *f, int depth)
{
    int signs = sign_by_structure(e, f);
    size_t count = facts_count(e) < FACTS_LIMIT ? facts_count(e) : FACTS_LIMIT;
    fmpq_t k;
    fmpq_init(k);
    for (size_t n = 0; depth > 0 && n < count && (signs & (signs - 1)) && budget_ok(e); n++) {
        condition_label l;
        int g_signs;
        expr *g = fact_difference(e, facts_at(e, n, &l), &g_signs);
        for (size_t which = 0; g && which < 4 && (signs & (signs - 1)); which++) {
            if (!cancelling_factor(e, f, g, which, k)) continue;
            expr *rest = expr_expand(e, expr_sub(e, f, expr_mul(e, expr_fmpq(e, k), g)));
            if (!rest) break;
            int k_sign = fmpq_sgn(k) > 0 ? SIGN_POSITIVE : SIGN_NEGATIVE;
            signs &= sign_plus(sign_times(k_sign, g_signs), sign_from_facts(e, rest, depth - 1));
        }
    }
    fmpq_clear(k);
    forgive_trouble(e);
    return signs ? signs : SIGN_ANY;
}

/* ---- one symbol: its whole interval ---- */

static int sign_on_interval(tw_engine *e, expr *f)
{
    expr **symbols;
    size_t n = expr_symbols(f, &symbols);
    expr *x = n == 1 ? symbols[0] : NULL;
    free(symbols);
    if (!x || facts_is_complex(e, x)) return SIGN_ANY;
    fmpq_t low, high;
    fmpq_init(low);
    fmpq_init(high);
    const int known = facts_interval(e, x, low, high);
    expr *inf = expr_constant_of(e, CONSTANT_INF);
    expr *from = known & 1 ? expr_fmpq(e, low) : expr_neg(e, inf), *to = known & 2 ? expr_fmpq(e, high) : inf;
    int signs = SIGN_ANY;
    if ((known & 3) == 3 && fmpq_cmp(low, high) >= 0) { /* one value */
        signs = sign_by_structure(e, expr_substitute(e, f, x, from));
    } else {
        for (int side = 1; side >= -1 && signs == SIGN_ANY; side -= 2) {
            expr *g = side > 0 ? f : expr_neg(e, f);
            const int positive = side > 0 ? SIGN_POSITIVE : SIGN_NEGATIVE;
            if (decide_positive_on(e, g, x, from, to, false) == ANSWER_YES) signs = positive;
            else if (decide_positive_on(e, g, x, from, to, true) == ANSWER_YES) signs = positive | SIGN_ZERO;
        }
        if (signs != SIGN_ANY && (known & 1) && !(known & 4))
            signs |= sign_by_structure(e, expr_substitute(e, f, x, from));
        if (signs != SIGN_ANY && (known & 2) && !(known & 8))
            signs |= sign_by_structure(e, expr_substitute(e, f, x, to));
    }
    fmpq_clear(low);
    fmpq_clear(high);
    forgive_trouble(e);
    return signs;
}

/* All signs that f can have. */
static int signs_allowed(tw_engine *e, expr *f)
{
    expr *g = f && expr_size(f) < SIZE_LIMIT ? expr_expand(e, f) : NULL;
    if (!g || expr_size(g) > SIZE_LIMIT) {
        forgive_trouble(e);
        return SIGN_ANY;
    }
    int signs = sign_from_facts(e, g, 0);
    if (g != f && (signs & (signs - 1))) signs &= sign_by_structure(e, f);
    if (signs & (signs - 1)) signs &= sign_from_facts(e, g, FACTS_DEEP);
    if (expr_is_closed_value(g)) return signs ? signs : SIGN_ANY;
    if (signs & (signs - 1)) signs &= sign_on_interval(e, g);
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
    answer all = ANSWER_YES;
    switch ((expr_kind)a->kind) {
    case EXPR_NUMBER: return fmpz_is_one(fmpq_denref(expr_number(a))) ? ANSWER_YES : ANSWER_NO;
    case EXPR_SYMBOL: return facts_is_integer(e, a) ? ANSWER_YES : ANSWER_UNKNOWN;
    case EXPR_SUM: /* one term that is none beside integers: no */
        for (uint32_t k = 0; k < a->count && all != ANSWER_UNKNOWN; k++) {
            answer one = is_integer(e, a->args[k]);
            if (one == ANSWER_UNKNOWN || (one == ANSWER_NO && all == ANSWER_NO)) all = ANSWER_UNKNOWN;
            else if (one == ANSWER_NO) all = ANSWER_NO;
        }
        return all;
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
    if (expr_is_constant(a, CONSTANT_I)) return ANSWER_NO;
    return sign_is_real(e, a) || sign_by_structure(e, a) != SIGN_ANY ? ANSWER_YES : ANSWER_UNKNOWN;
}

static bool any_granted(tw_engine *e)
{
    for (size_t k = 0; k < facts_count(e); k++) {
        condition_label l;
        facts_at(e, k, &l);
        if (l == CONDITION_GRANTED) return true;
    }
    return false;
}

static answer decide_by_reasoning(tw_engine *e, expr *condition)
{
    expr *left = condition->args[0], *right = condition->args[1], *difference = NULL;
    const expr_relation r = condition->is.relation;
    /* every real number lies below inf */
    if (r <= RELATION_LESS_EQUAL && (expr_is_inf(right) || expr_is_minus_inf(left)) && left != right)
        return sign_is_real(e, expr_is_inf(right) ? left : right) ? ANSWER_YES : ANSWER_UNKNOWN;
    if (r <= RELATION_NOT_EQUAL) {
        difference = expr_sub(e, right, left);
        if (!difference) { /* inf - inf and the like: nothing is known */
            forgive_trouble(e);
            return ANSWER_UNKNOWN;
        }
    }
    switch (r) {
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

/* Is it YES already by what was given, the granted facts left aside? */
static bool holds_without_granted(tw_engine *e, expr *condition)
{
    struct facts *all = e->facts;
    expr *large = NULL, *from = NULL, *to = NULL;
    const large_kind kind = facts_large(e, &large);
    const size_t count = facts_count(e);
    facts_sector(e, &from, &to);
    facts_init(e);
    struct facts *given = e->facts;
    bool good = kind == LARGE_NONE || facts_set_large(e, large, kind, from, to) == TW_OK;
    for (size_t k = 0; k < count && good; k++) {
        condition_label l;
        e->facts = all;
        expr *fact = facts_at(e, k, &l);
        e->facts = given;
        if (l == CONDITION_GIVEN) good = facts_add(e, fact, l) == TW_OK;
    }
    good = good && decide_by_reasoning(e, condition) == ANSWER_YES;
    forgive_trouble(e);
    facts_restore(e, all); /* frees the given ones */
    return good;
}

answer decide(tw_engine *e, expr *condition, condition_label *label)
{
    condition_label unused;
    if (!label) label = &unused;
    if (!condition || condition->kind != EXPR_RELATION) return ANSWER_UNKNOWN;
    for (size_t k = 0; k < facts_count(e); k++)
        if (facts_at(e, k, label) == condition) return ANSWER_YES;
    answer a = decide_by_reasoning(e, condition);
    const bool rests = a == ANSWER_YES && any_granted(e) && !holds_without_granted(e, condition);
    *label = rests ? CONDITION_GRANTED : CONDITION_PROVED;
    return a;
}
