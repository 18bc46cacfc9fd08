/* What must be one series: the base of a power or of a logarithm is gathered on one grid, with a leading
 * coefficient that is proved nonzero; then K x^a (1 + u) is raised, K^r taken out in front. */
#include "engine/exact/pieces.h"

#include <stdlib.h>

#include "engine/exact/values.h"

enum { POWER_LIMIT = 1000, GRID_LIMIT = 10000 };

/* ---- gathering and powers ---- */

static void piece_front(piece *out, const piece *p)
{
    out->constant = p->constant;
    out->factor = p->factor;
    out->sigma = p->sigma;
}

static bool same_front(const pieces *g)
{
    for (size_t k = 1; k < g->count; k++)
        if (g->at[k].constant != g->at[0].constant)
            return false;
    return true;
}

static tw_status gather_check(work *w, const pieces *g, const char *refusal)
{
    if (g->count == 0)
        return work_refuse(w, "is zero where it may not be");
    for (size_t k = 0; k < g->count; k++)
        if (g->at[k].log_power != 0 || g->at[k].sigma != g->at[0].sigma)
            return work_refuse(w, refusal);
    return TW_OK;
}

/* Strips until the leading coefficient is proved nonzero. */
tw_status piece_prove_leading(work *w, piece *p)
{
    element c;
    element_init(&w->f, &c);
    tw_status s = TW_OK;
    for (;;) {
        piece_strip(w, p);
        if (tail_length(&p->c) == 0) {
            if (p->c.known == TAIL_EXACT)
                s = work_refuse(w, "is zero where it may not be");
            else
                w->thin = true, s = TW_ERROR;
            break;
        }
        tail_coefficient(&w->f, &c, &p->c, 0);
        answer zero = field_is_zero(&w->f, &c);
        if (zero == ANSWER_NO)
            break;
        if (zero == ANSWER_UNKNOWN) {
            s = engine_fail(w->e, ERROR_UNDECIDED,
                            "whether the leading coefficient of a series is zero could not be decided");
            break;
        }
        slong known = p->c.known;
        tail first;
        tail_init(&first);
        tail_set_element(&w->f, &first, &c);
        tail_add(&w->f, &p->c, &p->c, &first, -1);
        p->c.known = known;
        tail_clear(&w->f, &first);
    }
    element_clear(&w->f, &c);
    return s;
}

tw_status pieces_gather(work *w, piece *out, const pieces *g, const char *refusal)
{
    tw_status s = gather_check(w, g, refusal);
    if (s != TW_OK)
        return s;
    bool fold = !same_front(g);
    slong den = 1, steps;
    fmpq_t least;
    fmpq_init(least);
    fmpq_set(least, g->at[0].lead);
    for (size_t k = 0; k < g->count; k++) {
        fmpq_t gap;
        fmpq_init(gap);
        fmpq_sub(gap, g->at[k].lead, g->at[0].lead);
        den = lcm_of(den, g->at[k].den);
        if (fmpz_fits_si(fmpq_denref(gap)) && fmpz_cmp_si(fmpq_denref(gap), GRID_LIMIT) < 0)
            den = lcm_of(den, fmpz_get_si(fmpq_denref(gap)));
        else
            den = GRID_LIMIT + 1;
        if (fmpq_cmp(g->at[k].lead, least) < 0)
            fmpq_set(least, g->at[k].lead);
        fmpq_clear(gap);
    }
    if (den > GRID_LIMIT)
        s = work_refuse(w, "has powers with too large denominators");
    piece sum;
    piece_init(w, &sum);
    piece_front(&sum, g->at);
    if (fold)
        sum.constant = expr_int(w->e, 1);
    bool one_factor = true;
    for (size_t k = 0; k < g->count; k++)
        one_factor = one_factor && g->at[k].factor == g->at[0].factor && g->at[k].c.rational;
    if (fold || !one_factor)
        sum.factor = expr_int(w->e, 1);
    fmpq_set(sum.lead, least);
    sum.den = den;
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        if (fold)
            s = piece_fold(w, &p, true);
        else if (!one_factor)
            s = piece_fold(w, &p, false);
        if (s == TW_OK) {
            piece_refine(w, &p, den);
            if (!steps_between(&steps, least, p.lead, den))
                steps = WORD_MAX / 2;
            tail_add_shifted(w, &sum.c, &p.c, steps);
        }
        piece_clear(w, &p);
    }
    if (s == TW_OK) {
        tail_demote(&w->f, &sum.c);
        s = piece_prove_leading(w, &sum);
    }
    if (s == TW_OK) {
        piece t = *out;
        *out = sum;
        sum = t;
    }
    piece_clear(w, &sum);
    fmpq_clear(least);
    return s;
}

expr *piece_leading(work *w, const piece *p)
{
    tw_engine *e = w->e;
    return expr_mul(e, expr_mul(e, p->constant, p->factor), tail_coefficient_expr(&w->f, &p->c, 0));
}

expr *piece_exponent(work *w, const piece *p) { return expr_add(w->e, p->sigma, expr_fmpq(w->e, p->lead)); }

/* Is the leading value nonzero? Records what it rests on. */
tw_status piece_need_leading(work *w, const piece *p)
{
    element c, front;
    element_init(&w->f, &c), element_init(&w->f, &front);
    tail_coefficient(&w->f, &c, &p->c, 0);
    tw_status s = field_from_expr(&w->f, &front, p->factor);
    if (s == TW_OK) {
        field_mul(&w->f, &c, &c, &front);
        s = work_need_nonzero(w, &c);
    }
    if (s == TW_OK && !expr_is_one(p->constant)) {
        s = field_from_expr(&w->f, &front, p->constant);
        if (s == TW_OK)
            s = work_need_nonzero(w, &front);
    }
    element_clear(&w->f, &c), element_clear(&w->f, &front);
    return s;
}

/* (K x^a (1 + u))^r = K^r x^(a r) (1 + u)^r on the principal branch for small x > 0, when r is an integer, or K is
 * off the negative axis (by continuity), or u is real (the argument of K (1 + u) is that of K). */
tw_status piece_need_split(work *w, const piece *p, bool real, bool integer)
{
    if (integer || real)
        return TW_OK;
    expr *leading = piece_leading(w, p);
    if (leading == NULL)
        return TW_ERROR;
    if (value_off_cut(w->e, leading))
        return TW_OK;
    return work_refuse(w, "may lie on the branch cut of its power or logarithm");
}

/* c / c[0], with c[0] = 1 exactly. */
void tail_make_monic(work *w, tail *c)
{
    if (c->rational) {
        fmpq_t first;
        fmpq_init(first);
        fmpq_poly_get_coeff_fmpq(first, c->q, 0);
        fmpq_inv(first, first);
        tail_scale_q(&w->f, c, first);
        fmpq_clear(first);
        return;
    }
    element first;
    element_init(&w->f, &first);
    tail_coefficient(&w->f, &first, c, 0);
    fmpz_mpoly_q_inv(&first, &first, w->f.ctx);
    tail_scale(&w->f, c, &first);
    tail_demote(&w->f, c);
    element_clear(&w->f, &first);
}

/* Positive symbols, so that (a^2)^(1/2) becomes a. */
expr *simplify_value(work *w, expr *a)
{
    if (a == NULL || expr_is_closed_value(a))
        return a;
    expr **symbols;
    size_t n = expr_symbols(a, &symbols), kept = 0;
    for (size_t k = 0; k < n; k++)
        if (value_sign(w->e, symbols[k]) == 1)
            symbols[kept++] = symbols[k];
    expr *out = kept > 0 ? expr_normal(w->e, a, symbols, kept) : a;
    free(symbols);
    return out;
}

static tw_status power_of_piece(work *w, pieces *out, piece *p, bool real, expr *r)
{
    tw_engine *e = w->e;
    bool integer = value_is_integer(e, r), natural = expr_is_number(r) && integer && fmpq_sgn(expr_number(r)) >= 0;
    tw_status s = natural ? TW_OK : piece_need_leading(w, p);
    if (s == TW_OK && !integer && !value_is_real(e, p->sigma))
        s = work_refuse(w, "has a power whose exponent is not known to be real"); /* (x^i)^(1/2) is not x^(i/2) */
    if (s == TW_OK)
        s = piece_need_split(w, p, real, integer);
    expr *leading = s == TW_OK ? piece_leading(w, p) : NULL;
    if (leading == NULL)
        return TW_ERROR;
    expr *front = simplify_value(w, expr_pow(e, leading, r));
    expr *exponent = expr_mul(e, piece_exponent(w, p), r);
    if (front == NULL || exponent == NULL)
        return TW_ERROR;
    tail_make_monic(w, &p->c);
    if (expr_is_number(r))
        tail_pow_q(&w->f, &p->c, &p->c, expr_number(r), w->terms);
    else {
        element power;
        element_init(&w->f, &power);
        s = field_from_expr(&w->f, &power, r);
        if (s == TW_OK)
            tail_pow(&w->f, &p->c, &p->c, &power, w->terms);
        element_clear(&w->f, &power);
    }
    if (s == TW_OK)
        s = pieces_from_tail(w, out, front, exponent, &p->c, p->den, real && (integer || value_is_real(e, front)));
    return s;
}

/* Natural powers of a sum of pieces, by squaring. */
static tw_status power_by_products(work *w, pieces *out, const pieces *g, slong n)
{
    pieces power, base;
    pieces_init(&power), pieces_init(&base);
    pieces_set(w, &base, g);
    tw_status s = pieces_from_value(w, &power, expr_int(w->e, 1));
    for (slong m = n; m > 0 && s == TW_OK; m >>= 1) {
        if (m & 1)
            s = pieces_mul(w, &power, &power, &base);
        if (m > 1 && s == TW_OK)
            s = pieces_mul(w, &base, &base, &base);
    }
    if (s == TW_OK)
        pieces_swap(out, &power);
    pieces_clear(w, &power), pieces_clear(w, &base);
    return s;
}

static bool has_log_or_many_sigmas(const pieces *g)
{
    for (size_t k = 0; k < g->count; k++)
        if (g->at[k].log_power != 0 || g->at[k].sigma != g->at[0].sigma)
            return true;
    return !same_front(g);
}

tw_status pieces_pow(work *w, pieces *out, const pieces *g, expr *exponent)
{
    if (exponent == NULL)
        return TW_ERROR;
    if (!value_is_real(w->e, exponent) && !expr_is_closed_value(exponent))
        return work_refuse(w, "has an exponent that is not known to be real");
    const fmpq *r = expr_is_number(exponent) ? expr_number(exponent) : NULL;
    bool natural = r != NULL && fmpz_is_one(fmpq_denref(r)) && fmpq_sgn(r) >= 0;
    if (natural && (g->count == 0 || has_log_or_many_sigmas(g))) {
        if (fmpz_cmp_si(fmpq_numref(r), POWER_LIMIT) > 0)
            return work_refuse(w, "has too large an exponent");
        return power_by_products(w, out, g, fmpz_get_si(fmpq_numref(r)));
    }
    piece p;
    piece_init(w, &p);
    tw_status s = pieces_gather(
        w, &p, g, "has no expansion in powers with a fixed step (powers and logarithms mix in its base)");
    bool real = g->real;
    if (s == TW_OK)
        s = power_of_piece(w, out, &p, real, exponent);
    piece_clear(w, &p);
    return s;
}

/* out = a / b^n for single pieces; b rational or not, its front taken apart. */
static tw_status piece_div(work *w, pieces *out, const piece *a, const piece *b, expr *front, slong n, bool real)
{
    piece left, right;
    piece_init(w, &left), piece_init(w, &right);
    piece_set(w, &left, a), piece_set(w, &right, b);
    tw_status s = TW_OK;
    if (!left.c.rational || !right.c.rational)
        s = piece_fold(w, &left, false);
    slong den = lcm_of(left.den, right.den);
    piece_refine(w, &left, den);
    piece_refine(w, &right, den);
    for (slong k = 0; k < n && s == TW_OK; k++) {
        tail_div(&w->f, &left.c, &left.c, &right.c, w->terms);
        fmpq_sub(left.lead, left.lead, right.lead);
    }
    tail_demote(&w->f, &left.c);
    if (s == TW_OK) {
        expr *times = expr_int(w->e, n);
        expr *value = expr_mul(w->e, expr_mul(w->e, left.constant, left.factor), front);
        expr *exponent = expr_sub(w->e, piece_exponent(w, &left), expr_mul(w->e, right.sigma, times));
        pieces part;
        pieces_init(&part);
        s = pieces_from_tail(w, &part, value, exponent, &left.c, den, real);
        for (size_t k = 0; k < part.count && s == TW_OK; k++) {
            piece p;
            piece_init(w, &p);
            piece_set(w, &p, part.at + k);
            p.log_power = a->log_power;
            s = pieces_push(w, out, &p);
        }
        pieces_clear(w, &part);
    }
    piece_clear(w, &left), piece_clear(w, &right);
    return s;
}

tw_status pieces_div(work *w, pieces *out, const pieces *a, const pieces *g, slong n)
{
    piece b;
    pieces quotient;
    piece_init(w, &b);
    pieces_init(&quotient);
    quotient.real = a->real && g->real;
    tw_status s =
        pieces_gather(w, &b, g, "has no inverse in powers with a fixed step (powers and logarithms mix in it)");
    if (s == TW_OK)
        s = piece_need_leading(w, &b);
    expr *front = s == TW_OK ? expr_pow(w->e, expr_mul(w->e, b.constant, b.factor), expr_int(w->e, -n)) : NULL;
    if (front == NULL)
        s = TW_ERROR;
    for (size_t k = 0; k < a->count && s == TW_OK; k++)
        s = piece_div(w, &quotient, a->at + k, &b, front, n, quotient.real);
    if (s == TW_OK)
        pieces_swap(out, &quotient);
    pieces_clear(w, &quotient);
    piece_clear(w, &b);
    return s;
}
