/* Sums, products and powers of generalised series at 0+. The one idea: constants, parameters and logs that need
 * not be multiplied out stay in front of the coefficients, so that these are rational as long as they can be; what
 * meets in one class is added, and what must become one series (the base of a power, the argument of a function)
 * is gathered. Knows the form of a series, not where it comes from. */
#include "engine/exact/pieces.h"

#include <stdlib.h>
#include <string.h>

#include "engine/ball/decide.h"
#include "engine/exact/values.h"

enum { PIECE_LIMIT = 200, FAR_STEPS = 20000 };

/* ---- the work ---- */

void work_init(work *w, tw_engine *e, expr *x, slong terms, slong room)
{
    memset(w, 0, sizeof *w);
    w->e = e;
    w->x = w->shown = x;
    w->terms = terms;
    field_init(&w->f, e, room);
}

void work_clear(work *w)
{
    field_clear(&w->f);
    free(w->conditions);
}

void work_blame(work *w, expr *f)
{
    if (w->depth == 0)
        w->at_fault = f;
}

tw_status work_refuse(work *w, const char *words)
{
    if (w->thin || w->f.full)
        return TW_ERROR;
    char *name = w->at_fault == NULL ? NULL : expr_text(w->e, w->at_fault);
    bool show = name != NULL && strlen(name) <= 200;
    engine_fail(w->e, ERROR_UNSUITABLE, "%s %s at %s = 0", show ? name : "a part of the function", words,
                w->shown->is.name);
    free(name);
    return TW_ERROR;
}

tw_status work_need(work *w, expr *condition)
{
    if (condition == NULL)
        return TW_ERROR;
    answer known = decide(w->e, condition, NULL);
    if (known == ANSWER_YES)
        return TW_OK;
    if (known == ANSWER_NO)
        return work_refuse(w, "rests on a condition that the facts contradict");
    for (size_t k = 0; k < w->condition_count; k++)
        if (w->conditions[k] == condition)
            return TW_OK;
    w->conditions = base_resize(w->conditions, (w->condition_count + 1) * sizeof *w->conditions);
    w->conditions[w->condition_count++] = condition;
    return TW_OK;
}

tw_status work_need_nonzero(work *w, const element *value)
{
    fmpq_t q;
    fmpq_init(q);
    bool rational = field_is_rational(value, &w->f, q);
    fmpq_clear(q);
    if (rational)
        return TW_OK;
    expr **factors;
    size_t n;
    tw_status s = field_numerator_factors(&w->f, value, &factors, &n);
    if (s != TW_OK)
        return s;
    for (size_t k = 0; k < n && s == TW_OK; k++) {
        if (expr_is_closed_value(factors[k])) {
            if (value_is_zero(w->e, factors[k]) != ANSWER_NO)
                s = engine_fail(w->e, ERROR_UNDECIDED, "whether a constant of the series is zero could not be decided");
        } else
            s = work_need(w, expr_relation_of(w->e, RELATION_NOT_EQUAL, factors[k], expr_int(w->e, 0)));
    }
    free(factors);
    return s;
}

/* ---- pieces and their lists ---- */

void piece_init(work *w, piece *p)
{
    p->constant = p->factor = expr_int(w->e, 1);
    p->sigma = expr_int(w->e, 0);
    fmpq_init(p->lead);
    p->den = 1;
    p->log_power = 0;
    tail_init(&p->c);
}

void piece_clear(work *w, piece *p)
{
    fmpq_clear(p->lead);
    tail_clear(&w->f, &p->c);
}

static void piece_set_front(piece *out, const piece *p)
{
    out->constant = p->constant;
    out->factor = p->factor;
    out->sigma = p->sigma;
    fmpq_set(out->lead, p->lead);
    out->den = p->den;
    out->log_power = p->log_power;
}

void piece_set(work *w, piece *out, const piece *p)
{
    piece_set_front(out, p);
    tail_set(&w->f, &out->c, &p->c);
}

void pieces_init(pieces *g)
{
    g->count = 0;
    g->at = NULL;
    g->real = true;
}

void pieces_clear(work *w, pieces *g)
{
    for (size_t k = 0; k < g->count; k++)
        piece_clear(w, g->at + k);
    free(g->at);
    pieces_init(g);
}

void pieces_swap(pieces *a, pieces *b)
{
    pieces t = *a;
    *a = *b;
    *b = t;
}

static void pieces_append(pieces *g, piece *p)
{
    g->at = base_resize(g->at, (g->count + 1) * sizeof *g->at);
    g->at[g->count++] = *p;
}

void pieces_set(work *w, pieces *out, const pieces *g)
{
    pieces copy;
    pieces_init(&copy);
    copy.real = g->real;
    for (size_t k = 0; k < g->count; k++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        pieces_append(&copy, &p);
    }
    pieces_clear(w, out);
    *out = copy;
}

/* Steps of 1/den from a to b, when b lies on a's grid. */
bool steps_between(slong *steps, const fmpq_t a, const fmpq_t b, slong den)
{
    fmpq_t d;
    fmpq_init(d);
    fmpq_sub(d, b, a);
    fmpz_t scale;
    fmpz_init_set_si(scale, den);
    fmpq_mul_fmpz(d, d, scale);
    bool whole = fmpz_is_one(fmpq_denref(d)) && fmpz_bits(fmpq_numref(d)) < 40;
    if (whole)
        *steps = fmpz_get_si(fmpq_numref(d));
    fmpz_clear(scale);
    fmpq_clear(d);
    return whole;
}

slong lcm_of(slong a, slong b) { return a / (slong)n_gcd((ulong)a, (ulong)b) * b; }

/* The grids of two pieces meet somewhere: then they are one class. */
static bool grids_meet(const piece *a, const piece *b)
{
    slong steps;
    return steps_between(&steps, a->lead, b->lead, lcm_of(a->den, b->den));
}

/* Coefficients beyond those wanted are dropped before they are spread out; a short polynomial stays whole. */
void piece_refine(work *w, piece *p, slong den)
{
    slong finer = den / p->den;
    if (finer > 1 && (p->c.known != TAIL_EXACT || tail_length(&p->c) > FAR_STEPS / finer))
        tail_truncate(&w->f, &p->c, w->terms / finer + 2);
    tail_stretch(&w->f, &p->c, den / p->den);
    p->den = den;
}

/* Moves leading zeros (as polynomials) into the exponent. */
void piece_strip(work *w, piece *p)
{
    slong n = tail_length(&p->c), zeros = 0;
    while (zeros < n && tail_coefficient_is_zero(&p->c, &w->f, zeros))
        zeros++;
    if (zeros == n)
        zeros = p->c.known == TAIL_EXACT ? 0 : p->c.known;
    if (zeros == 0)
        return;
    tail_shift(&w->f, &p->c, -zeros);
    fmpq_t step;
    fmpq_init(step);
    fmpq_set_si(step, zeros, (ulong)p->den);
    fmpq_add(p->lead, p->lead, step);
    fmpq_clear(step);
}

static bool piece_is_exact_zero(const piece *p) { return p->c.known == TAIL_EXACT && tail_length(&p->c) == 0; }

/* An exact single power lies on the coarsest grid there is. */
static void piece_coarsen(work *w, piece *p)
{
    piece_strip(w, p);
    if (p->c.known == TAIL_EXACT && tail_length(&p->c) == 1)
        p->den = 1;
}

tw_status piece_fold(work *w, piece *p, bool constants)
{
    expr *one = expr_int(w->e, 1);
    expr *front = constants ? expr_mul(w->e, p->constant, p->factor) : p->factor;
    if (front == NULL)
        return TW_ERROR;
    if (expr_is_one(front))
        return TW_OK;
    element c;
    element_init(&w->f, &c);
    tw_status s = field_from_expr(&w->f, &c, front);
    if (s == TW_OK) {
        tail_scale(&w->f, &p->c, &c);
        tail_demote(&w->f, &p->c);
        p->factor = one;
        if (constants)
            p->constant = one;
    }
    element_clear(&w->f, &c);
    return s;
}

void tail_add_shifted(work *w, tail *c, tail *d, slong steps)
{
    if (steps > FAR_STEPS && steps > 4 * w->terms) { /* far beyond what is wanted: unknown from there on */
        tail zero;
        tail_init(&zero);
        zero.known = steps;
        zero.gap = 1;
        tail_add(&w->f, c, c, &zero, 1);
        tail_clear(&w->f, &zero);
        return;
    }
    tail_shift(&w->f, d, steps);
    tail_add(&w->f, c, c, d, 1);
}

/* p += q on the common grid; same constant, sigma, log_power. */
static tw_status piece_merge(work *w, piece *p, piece *q)
{
    if (p->factor != q->factor || !p->c.rational || !q->c.rational)
        if (piece_fold(w, p, false) != TW_OK || piece_fold(w, q, false) != TW_OK)
            return TW_ERROR;
    slong den = lcm_of(p->den, q->den), steps = 0;
    piece_refine(w, p, den);
    piece_refine(w, q, den);
    steps_between(&steps, p->lead, q->lead, den);
    if (steps < 0) {
        tail_swap(&p->c, &q->c);
        fmpq_set(p->lead, q->lead);
        steps = -steps;
    }
    tail_add_shifted(w, &p->c, &q->c, steps);
    tail_demote(&w->f, &p->c);
    piece_coarsen(w, p);
    return TW_OK;
}

tw_status pieces_push(work *w, pieces *g, piece *p)
{
    tw_status s = p->constant == NULL || p->factor == NULL || p->sigma == NULL ? TW_ERROR : TW_OK;
    if (s == TW_OK)
        piece_coarsen(w, p);
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        piece *q = g->at + k;
        if (q->constant != p->constant || q->sigma != p->sigma || q->log_power != p->log_power || !grids_meet(q, p))
            continue;
        s = piece_merge(w, p, q);
        piece_clear(w, q);
        *q = g->at[--g->count];
        k = (size_t)-1; /* the wider grid may meet others */
    }
    if (s != TW_OK || piece_is_exact_zero(p)) {
        piece_clear(w, p);
        return s;
    }
    if (g->count >= PIECE_LIMIT) {
        piece_clear(w, p);
        return work_refuse(w, "falls into too many different constants and powers");
    }
    pieces_append(g, p);
    return TW_OK;
}

/* ---- values free of x ---- */

/* A rational function of the parameters alone. */
static bool is_parametric(expr *a)
{
    switch (a->kind) {
    case EXPR_NUMBER: return true;
    case EXPR_SYMBOL: return true;
    case EXPR_SUM:
    case EXPR_PRODUCT:
        for (uint32_t k = 0; k < a->count; k++)
            if (!is_parametric(a->args[k]))
                return false;
        return true;
    case EXPR_POWER:
        return is_parametric(a->args[0]) && expr_is_number(a->args[1]) &&
               fmpz_is_one(fmpq_denref(expr_number(a->args[1])));
    default: return false;
    }
}

/* Splits integer parts off exponents, a^(b + 1) = a * a^b, and sums in exp into products: so that equal constants look
 * equal. Puts one factor of a product into p. */
static tw_status piece_take_factor(work *w, piece *p, expr *a)
{
    tw_engine *e = w->e;
    if (a == NULL)
        return TW_ERROR;
    if (expr_is_number(a)) {
        tail_scale_q(&w->f, &p->c, expr_number(a));
        return TW_OK;
    }
    if (is_parametric(a)) {
        p->factor = expr_mul(e, p->factor, a);
        return p->factor == NULL ? TW_ERROR : TW_OK;
    }
    bool power = a->kind == EXPR_POWER, exponential = expr_is_call(a, FUNCTION_EXP);
    expr *exponent = power ? a->args[1] : exponential ? a->args[0] : NULL;
    if (exponent != NULL) {
        expr *spread = expr_expand(e, exponent);
        if (spread == NULL)
            return TW_ERROR;
        if (spread->kind == EXPR_SUM) {
            expr *const *terms;
            size_t n = expr_terms(&spread, &terms);
            for (size_t k = 0; k < n; k++)
                if (piece_take_factor(w, p, power ? expr_pow(e, a->args[0], terms[k])
                                                  : expr_call1(e, FUNCTION_EXP, terms[k])) != TW_OK)
                    return TW_ERROR;
            return TW_OK;
        }
    }
    /* kept apart until the end: the constructors would put a^b * a together again only in `constant` */
    expr *product = expr_mul(e, p->constant, a);
    if (product == NULL)
        return TW_ERROR;
    fmpq_t c;
    fmpq_init(c);
    expr_as_coefficient(e, product, c, &p->constant);
    if (!fmpq_is_one(c))
        tail_scale_q(&w->f, &p->c, c);
    fmpq_clear(c);
    return p->constant == NULL ? TW_ERROR : TW_OK;
}

static tw_status piece_take_product(work *w, piece *p, expr *a)
{
    expr *const *factors;
    size_t n = expr_factors(&a, &factors);
    for (size_t k = 0; k < n; k++)
        if (piece_take_factor(w, p, factors[k]) != TW_OK)
            return TW_ERROR;
    if (!p->c.rational)
        return piece_fold(w, p, false);
    return TW_OK;
}

/* The constant of a product of pieces: again in the form above, since 2^(1/2) * 2^(1/2) = 2. */
static tw_status piece_take_constants(work *w, piece *p, expr *a, expr *b)
{
    if (expr_is_one(a) || expr_is_one(b)) {
        p->constant = expr_is_one(a) ? b : a;
        return TW_OK;
    }
    expr *product = expr_mul(w->e, a, b);
    p->constant = expr_int(w->e, 1);
    return product == NULL ? TW_ERROR : piece_take_product(w, p, product);
}

static tw_status piece_set_exponent(work *w, piece *p, expr *exponent)
{
    tw_engine *e = w->e;
    expr *spread = expr_expand(e, exponent);
    if (spread == NULL)
        return TW_ERROR;
    fmpq_zero(p->lead);
    if (expr_is_number(spread)) {
        fmpq_set(p->lead, expr_number(spread));
        p->sigma = expr_int(e, 0);
        return TW_OK;
    }
    if (spread->kind == EXPR_SUM && expr_is_number(spread->args[0])) {
        fmpq_set(p->lead, expr_number(spread->args[0]));
        spread = expr_sub(e, spread, spread->args[0]);
    }
    p->sigma = spread;
    return spread == NULL ? TW_ERROR : TW_OK;
}

tw_status pieces_from_tail(work *w, pieces *g, expr *value, expr *exponent, const tail *c, slong den, bool real)
{
    if (value == NULL || exponent == NULL)
        return TW_ERROR;
    expr *const *terms;
    size_t n = value->kind == EXPR_SUM && !is_parametric(value) ? expr_terms(&value, &terms) : 1;
    if (n == 1)
        terms = &value;
    pieces_clear(w, g);
    g->real = real && value_is_real(w->e, exponent);
    if (expr_is_zero(value))
        return TW_OK;
    for (size_t k = 0; k < n; k++) {
        piece p;
        piece_init(w, &p);
        tail_set(&w->f, &p.c, c);
        p.den = den;
        if (piece_set_exponent(w, &p, exponent) != TW_OK || piece_take_product(w, &p, terms[k]) != TW_OK) {
            piece_clear(w, &p);
            return TW_ERROR;
        }
        if (pieces_push(w, g, &p) != TW_OK)
            return TW_ERROR;
    }
    return TW_OK;
}

tw_status pieces_from_monomial(work *w, pieces *g, expr *value, expr *exponent)
{
    tail one;
    fmpq_t unit;
    if (value == NULL || exponent == NULL)
        return TW_ERROR;
    fmpq_init(unit);
    fmpq_one(unit);
    tail_init(&one);
    tail_set_q(&w->f, &one, unit);
    tw_status s = pieces_from_tail(w, g, value, exponent, &one, 1, value_is_real(w->e, value));
    tail_clear(&w->f, &one);
    fmpq_clear(unit);
    return s;
}

tw_status pieces_from_value(work *w, pieces *g, expr *value)
{
    return pieces_from_monomial(w, g, value, expr_int(w->e, 0));
}

/* ---- sums and products ---- */

tw_status pieces_add(work *w, pieces *out, const pieces *a, const pieces *b, int sign)
{
    pieces sum;
    pieces_init(&sum);
    pieces_set(w, &sum, a);
    sum.real = a->real && b->real;
    tw_status s = TW_OK;
    fmpq_t minus;
    fmpq_init(minus);
    fmpq_set_si(minus, -1, 1);
    for (size_t k = 0; k < b->count && s == TW_OK; k++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, b->at + k);
        if (sign < 0)
            tail_scale_q(&w->f, &p.c, minus);
        s = pieces_push(w, &sum, &p);
    }
    fmpq_clear(minus);
    if (s == TW_OK)
        pieces_swap(out, &sum);
    pieces_clear(w, &sum);
    return s;
}

static tw_status piece_mul(work *w, piece *out, const piece *a, const piece *b)
{
    tw_engine *e = w->e;
    piece left, right;
    piece_init(w, &left), piece_init(w, &right);
    piece_set(w, &left, a), piece_set(w, &right, b);
    tw_status s = TW_OK;
    if (!a->c.rational || !b->c.rational)
        if (piece_fold(w, &left, false) != TW_OK || piece_fold(w, &right, false) != TW_OK)
            s = TW_ERROR;
    if (s == TW_OK) {
        slong den = lcm_of(left.den, right.den);
        piece_refine(w, &left, den);
        piece_refine(w, &right, den);
        tail_mul(&w->f, &out->c, &left.c, &right.c, w->terms);
        tail_demote(&w->f, &out->c);
        out->den = den;
        fmpq_add(out->lead, left.lead, right.lead);
        out->log_power = left.log_power + right.log_power;
        out->sigma = expr_add(e, left.sigma, right.sigma);
        out->factor = expr_mul(e, left.factor, right.factor);
        s = out->sigma == NULL || out->factor == NULL ? TW_ERROR
                                                      : piece_take_constants(w, out, left.constant, right.constant);
        if (s == TW_OK && !out->c.rational)
            s = piece_fold(w, out, false);
    }
    piece_clear(w, &left), piece_clear(w, &right);
    return s;
}

tw_status pieces_mul(work *w, pieces *out, const pieces *a, const pieces *b)
{
    pieces product;
    pieces_init(&product);
    product.real = a->real && b->real;
    tw_status s = TW_OK;
    for (size_t i = 0; i < a->count && s == TW_OK; i++)
        for (size_t j = 0; j < b->count && s == TW_OK; j++) {
            if (!budget_ok(w->e)) {
                s = TW_ERROR;
                break;
            }
            piece p;
            piece_init(w, &p);
            s = piece_mul(w, &p, a->at + i, b->at + j);
            if (s == TW_OK)
                s = pieces_push(w, &product, &p);
            else
                piece_clear(w, &p);
        }
    if (s == TW_OK)
        pieces_swap(out, &product);
    pieces_clear(w, &product);
    return s;
}

tw_status pieces_scale(work *w, pieces *g, expr *value)
{
    if (value == NULL)
        return TW_ERROR;
    if (expr_is_one(value))
        return TW_OK;
    pieces front;
    pieces_init(&front);
    tw_status s = pieces_from_value(w, &front, value);
    if (s == TW_OK)
        s = pieces_mul(w, g, g, &front);
    pieces_clear(w, &front);
    return s;
}
