/* Derivative and antiderivative of a generalised series at 0+, piece by piece. */
#include "engine/exact/pieces.h"

#include "engine/exact/values.h"

/* sigma as an element, or NULL (in *room) when it is zero. */
static tw_status sigma_element(work *w, const piece *p, element *room, const element **alpha)
{
    *alpha = NULL;
    if (expr_is_zero(p->sigma))
        return TW_OK;
    *alpha = room;
    return field_from_expr(&w->f, room, p->sigma);
}

static tw_status derivative_of_piece(work *w, pieces *out, const piece *p)
{
    element room;
    const element *alpha;
    element_init(&w->f, &room);
    tw_status s = sigma_element(w, p, &room, &alpha);
    fmpq_t one;
    fmpq_init(one);
    fmpq_one(one);
    for (int part = 0; part < 2 && s == TW_OK; part++) {
        if (part == 1 && p->log_power == 0)
            break;
        piece d;
        piece_init(w, &d);
        piece_set(w, &d, p);
        fmpq_sub(d.lead, p->lead, one);
        if (part == 0)
            tail_weigh(&w->f, &d.c, alpha, p->lead, p->den, false);
        else {
            fmpq_t k;
            fmpq_init(k);
            fmpq_set_si(k, p->log_power, 1);
            tail_scale_q(&w->f, &d.c, k);
            d.log_power--;
            fmpq_clear(k);
        }
        if (!d.c.rational)
            s = piece_fold(w, &d, false);
        if (s == TW_OK)
            s = pieces_push(w, out, &d);
        else
            piece_clear(w, &d);
    }
    fmpq_clear(one);
    element_clear(&w->f, &room);
    return s;
}

tw_status pieces_derivative(work *w, pieces *out, const pieces *g)
{
    pieces sum;
    pieces_init(&sum);
    sum.real = g->real;
    tw_status s = TW_OK;
    for (size_t k = 0; k < g->count && s == TW_OK; k++)
        s = derivative_of_piece(w, &sum, g->at + k);
    if (s == TW_OK)
        pieces_swap(out, &sum);
    pieces_clear(w, &sum);
    return s;
}

/* Takes the coefficient of x^-1 out of p: its antiderivative is log(x)^(k+1)/(k+1). */
static tw_status integrate_pole(work *w, pieces *out, piece *p)
{
    fmpq_t minus_one;
    slong at = -1;
    fmpq_init(minus_one);
    fmpq_set_si(minus_one, -1, 1);
    bool on_grid = expr_is_zero(p->sigma) && steps_between(&at, p->lead, minus_one, p->den);
    fmpq_clear(minus_one);
    if (!on_grid || at < 0)
        return TW_OK;
    if (at >= p->c.known) {
        w->thin = true;
        return TW_ERROR;
    }
    if (tail_coefficient_is_zero(&p->c, &w->f, at))
        return TW_OK;
    element c;
    piece pole;
    tail single;
    element_init(&w->f, &c);
    tail_init(&single);
    piece_init(w, &pole);
    piece_set(w, &pole, p);
    tail_coefficient(&w->f, &c, &p->c, at);
    tail_set_element(&w->f, &single, &c);
    tail_demote(&w->f, &single);
    tail_set(&w->f, &pole.c, &single);
    tail_shift(&w->f, &single, at);
    slong known = p->c.known;
    tail_add(&w->f, &p->c, &p->c, &single, -1);
    p->c.known = known;
    fmpq_zero(pole.lead);
    pole.log_power++;
    fmpq_t share;
    fmpq_init(share);
    fmpq_set_si(share, 1, (ulong)pole.log_power);
    tail_scale_q(&w->f, &pole.c, share);
    fmpq_clear(share);
    element_clear(&w->f, &c);
    tail_clear(&w->f, &single);
    return pieces_push(w, out, &pole);
}

/* int x^a log^k = x^(a+1)/(a+1) log^k - k/(a+1) int x^a log^(k-1). Takes p. */
static tw_status integral_of_piece(work *w, pieces *out, piece *p)
{
    element room;
    const element *alpha;
    fmpq_t one, k;
    fmpq_init(one), fmpq_init(k);
    fmpq_one(one);
    element_init(&w->f, &room);
    tw_status s = integrate_pole(w, out, p);
    if (s == TW_OK)
        s = sigma_element(w, p, &room, &alpha);
    fmpq_add(p->lead, p->lead, one);
    while (s == TW_OK) {
        tail_weigh(&w->f, &p->c, alpha, p->lead, p->den, true);
        if (!p->c.rational)
            s = piece_fold(w, p, false);
        if (s != TW_OK)
            break;
        piece term;
        piece_init(w, &term);
        piece_set(w, &term, p);
        s = pieces_push(w, out, &term);
        if (p->log_power == 0)
            break;
        fmpq_set_si(k, -p->log_power, 1);
        tail_scale_q(&w->f, &p->c, k);
        p->log_power--;
    }
    fmpq_clear(one), fmpq_clear(k);
    element_clear(&w->f, &room);
    return s;
}

tw_status pieces_integral(work *w, pieces *out, const pieces *g, bool from_zero)
{
    pieces sum;
    pieces_init(&sum);
    sum.real = g->real;
    tw_status s = TW_OK;
    for (size_t k = 0; k < g->count && s == TW_OK; k++) {
        fmpq_t minus_one;
        fmpq_init(minus_one);
        fmpq_set_si(minus_one, -1, 1);
        bool integrable = expr_is_zero(g->at[k].sigma) && fmpq_cmp(g->at[k].lead, minus_one) > 0;
        if (from_zero && !integrable) {
            expr *gap = expr_add(w->e, piece_exponent(w, g->at + k), expr_int(w->e, 1));
            integrable = gap != NULL && value_sign(w->e, gap) == 1;
        }
        fmpq_clear(minus_one);
        if (from_zero && !integrable) {
            s = work_refuse(w, "is not integrable");
            break;
        }
        piece p;
        piece_init(w, &p);
        piece_set(w, &p, g->at + k);
        s = integral_of_piece(w, &sum, &p);
        piece_clear(w, &p);
    }
    if (s == TW_OK)
        pieces_swap(out, &sum);
    pieces_clear(w, &sum);
    return s;
}
