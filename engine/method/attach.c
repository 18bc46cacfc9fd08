/* The recurrence of one lane. The one idea: by the residue form of DLMF 2.3.18 the lane's coefficients are
 *
 *     c[n] = k Gamma(z_n) C^-z_n G_n,   G_n = residue at x = 0 of q p^-z_n,   z_n = z + h n,
 *
 * with the kernel exp(-C s^K p), so that a telescoper of F = q p^-(z + h n) for the shift of n, taken around a closed loop
 * on which F is one-valued, is a recurrence of the G_n: no end of the path and no other critical point enters, and G_n = 0
 * for n < 0. Where the certificate's denominator vanishes for all x the identity says nothing: those n are left out. Knows
 * nothing of the method that made the contribution but its local form. */
#include "engine/method/attach.h"

#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "engine/exact/rationalise.h"
#include "engine/exact/telescope.h"
#include "engine/exact/values.h"
#include "engine/method/lanes.h"

enum { ORDER_LIMIT = 12, PIECES_LIMIT = 12, ROOM_LIMIT = 24, SHIFT_LIMIT = 24 };

struct recurrence_memo {
    size_t count;
    struct remembered {
        expr *constant, *first_exponent;
        fmpq_t step;
        slong log_power;
        recurrence *found; /* NULL: none, for this reason */
        char *why;
    } *list;
};

void recurrence_memo_free(struct recurrence_memo *m)
{
    if (!m) return;
    for (size_t k = 0; k < m->count; k++) {
        fmpq_clear(m->list[k].step);
        recurrence_free(m->list[k].found);
        free(m->list[k].why);
    }
    free(m->list);
    free(m);
}

static struct remembered *remember(contribution *c, const lane *l)
{
    if (!c->recurrences) {
        c->recurrences = base_alloc(sizeof *c->recurrences);
        *c->recurrences = (struct recurrence_memo){0, NULL};
    }
    struct recurrence_memo *m = c->recurrences;
    for (size_t k = 0; k < m->count; k++) {
        struct remembered *one = &m->list[k];
        if (one->constant == l->constant && one->first_exponent == l->first_exponent && one->log_power == l->log_power &&
            fmpq_equal(one->step, l->step))
            return one;
    }
    m->list = base_resize(m->list, (m->count + 1) * sizeof *m->list);
    struct remembered *made = &m->list[m->count++];
    *made = (struct remembered){.constant = l->constant, .first_exponent = l->first_exponent, .log_power = l->log_power};
    fmpq_init(made->step);
    fmpq_set(made->step, l->step);
    return made;
}

/* ---- the lane's place ---- */

typedef struct task {
    tw_engine *e;
    const contribution *c;
    const lane *l;
    kernel k;
    expr *z;  /* of n = 0 */
    slong h;  /* z moves by it */
    expr *n, *x;
    size_t count; /* terms q p^-z; the lane's coefficients are the sum of their residues */
    struct {
        expr *p, *q;
    } pieces[PIECES_LIMIT];
} task;

static tw_status refuse(const task *t, const char *words)
{
    return engine_fail(t->e, ERROR_UNSUITABLE, "%s", words);
}

/* z = (factor_power - exponent)/power */
static tw_status place_lane(task *t)
{
    tw_engine *e = t->e;
    fmpq_t h;
    fmpq_init(h);
    fmpq_div(h, t->l->step, t->k.power);
    fmpq_neg(h, h);
    bool whole = fmpz_is_one(fmpq_denref(h)) && fmpq_sgn(h) > 0 && fmpz_cmp_si(fmpq_numref(h), SHIFT_LIMIT) <= 0;
    t->h = whole ? fmpz_get_si(fmpq_numref(h)) : 0;
    fmpq_clear(h);
    if (!whole) return refuse(t, "the exponents of this lane move by a step that is too large");
    t->z = expr_div(e, expr_sub(e, expr_fmpq(e, t->k.factor_power), t->l->first_exponent), expr_fmpq(e, t->k.power));
    return t->z ? TW_OK : TW_ERROR;
}

/* No other lane may share the class of exponents: the residues are those of all together. */
static tw_status check_class(const task *t)
{
    if (t->l->log_power != 0) return refuse(t, "the lane has powers of log: its recurrence is not known");
    for (size_t k = 0; k < t->c->lane_count + t->c->zero_count; k++) {
        const lane *other = k < t->c->lane_count ? &t->c->lanes[k] : &t->c->zeros[k - t->c->lane_count];
        if (other == t->l) continue;
        expr *away = expr_sub(t->e, other->first_exponent, t->l->first_exponent);
        if (!away) return TW_ERROR;
        if (!expr_is_number(away)) continue;
        fmpq_t steps;
        fmpq_init(steps);
        fmpq_div(steps, expr_number(away), t->k.power);
        bool same = fmpz_is_one(fmpq_denref(steps));
        fmpq_clear(steps);
        if (same) return refuse(t, "two lanes have the same powers, so the recurrence of each by itself is not known");
    }
    return TW_OK;
}

/* An index that is no parameter. */
static expr *choose_index(tw_engine *e, const task *t)
{
    static const char *const names[] = {"n", "k", "m", "j"};
    const local_form *l = t->c->local.count ? &t->c->local : &t->c->formal;
    for (size_t k = 0; k < sizeof names / sizeof *names; k++) {
        expr *n = expr_symbol(e, names[k]);
        bool used = !n || expr_has(t->z, n) || expr_has(t->k.constant, n);
        for (size_t b = 0; b < l->count && !used; b++) used = expr_has(l->branches[b].p, n) || expr_has(l->branches[b].q, n);
        if (!used) return n;
    }
    return expr_fresh(e, "n");
}

/* ---- terms ---- */

/* Is the integrand made of rational functions, powers and exponentials of them, with p rational? Each room in turn. */
static bool is_hyperexponential(task *t, expr *p, expr *q)
{
    tw_engine *e = t->e;
    bool good = false, again = true;
    for (slong room = 2; room <= ROOM_LIMIT && again && e->error.kind == ERROR_NONE; room++) {
        field f;
        hyper h;
        element one;
        field_init(&f, e, room);
        element_init(&f, &one);
        fmpz_mpoly_q_one(&one, f.ctx);
        tw_status status = hyper_init(&h, &f, t->x);
        if (status == TW_OK) status = hyper_multiply(&h, q, &one);
        if (status == TW_OK) status = hyper_rational(&h, &one, p);
        again = f.full;
        good = status == TW_OK;
        hyper_clear(&h);
        element_clear(&f, &one);
        field_clear(&f);
    }
    return good;
}

static bool add_piece(task *t, expr *p, expr *q)
{
    if (t->count == PIECES_LIMIT) return false;
    t->pieces[t->count].p = p;
    t->pieces[t->count].q = q;
    t->count++;
    return true;
}

/* q as one term, or as a sum of them. */
static bool add_terms(task *t, expr *p, expr *q)
{
    if (is_hyperexponential(t, p, q)) return add_piece(t, p, q);
    expr *spread = expr_expand(t->e, q);
    if (!spread || spread->kind != EXPR_SUM) return false;
    for (uint32_t k = 0; k < spread->count; k++)
        if (!is_hyperexponential(t, p, spread->args[k]) || !add_piece(t, p, spread->args[k])) return false;
    return true;
}

static bool holds_call(expr *f, expr *x, function_id wanted)
{
    if (!expr_has(f, x)) return false;
    if (expr_is_call(f, wanted)) return true;
    for (uint32_t k = 0; k < f->count; k++)
        if (holds_call(f->args[k], x, wanted)) return true;
    return false;
}

static tw_status refuse_kind(const task *t, expr *p, expr *q)
{
    tw_engine *e = t->e;
    bool log_p = holds_call(p, t->x, FUNCTION_LOG);
    if (log_p)
        return refuse(t, "no finite recurrence exists: the exponent holds a logarithm, whose sheets give it infinitely many "
                         "critical values");
    char *words = expr_text(e, expr_has(q, t->x) ? q : p);
    engine_fail(e, ERROR_UNSUITABLE,
                "no recurrence can be proved: the integrand is not made of rational functions, powers and exponentials of "
                "them (its amplitude is %.200s)",
                words ? words : "");
    free(words);
    return TW_ERROR;
}

static tw_status add_branch(task *t, const branch *b)
{
    tw_engine *e = t->e;
    expr *p = expr_substitute(e, b->p, b->x, t->x), *q = expr_substitute(e, b->q, b->x, t->x);
    if (!p || !q) return TW_ERROR;
    size_t before = t->count;
    for (int which = 0; which < CHANGE_COUNT && e->error.kind == ERROR_NONE; which++) {
        changed made;
        if (!change_variable(e, &made, which, p, q, t->x)) continue;
        if (made.y != t->x) {
            made.p = expr_substitute(e, made.p, made.y, t->x);
            made.q = expr_substitute(e, made.q, made.y, t->x);
        }
        if (!made.p || !made.q) return TW_ERROR;
        if (add_terms(t, made.p, made.q)) return TW_OK;
        t->count = before;
    }
    return e->error.kind == ERROR_NONE ? refuse_kind(t, p, q) : TW_ERROR;
}

static tw_status add_branches(task *t)
{
    const local_form *l = t->c->local.count ? &t->c->local : &t->c->formal;
    for (size_t k = 0; k < l->count; k++)
        if (add_branch(t, &l->branches[k]) != TW_OK) return TW_ERROR;
    return t->count ? TW_OK : refuse(t, "the contribution has no local form");
}

/* ---- from terms to the recurrence ---- */

/* The telescoper of piece k for n -> n + 1. TW_ERROR with f->full when the field is too narrow. */
static tw_status telescope_piece(const task *t, field *f, size_t k, telescope *out)
{
    hyper h;
    element weight, p;
    element_init(f, &weight), element_init(f, &p);
    tw_status status = hyper_init(&h, f, t->x);
    if (status == TW_OK) {
        fmpz_mpoly_q_one(&weight, f->ctx);
        status = hyper_multiply(&h, t->pieces[k].q, &weight);
    }
    if (status == TW_OK) status = hyper_rational(&h, &p, t->pieces[k].p);
    if (status == TW_OK) status = field_from_expr(f, &weight, expr_neg(t->e, expr_add(t->e, t->z, expr_mul(t->e, expr_int(t->e, t->h), t->n))));
    if (status == TW_OK) status = hyper_multiply_rational(&h, &p, &weight);
    if (status == TW_OK) status = field_pow(f, &p, &p, -t->h);
    if (status == TW_OK) {
        telescope_init(out, f, h.variable);
        status = telescope_find(out, &h, &p, ORDER_LIMIT);
        if (status != TW_OK) telescope_clear(out);
    }
    hyper_clear(&h);
    element_clear(f, &weight), element_clear(f, &p);
    return status;
}

/* Do both say the same of a sequence? */
static bool same_telescoper(const telescope *a, const telescope *b)
{
    const fmpz_mpoly_ctx_struct *ctx = a->f->ctx;
    if (a->order != b->order) return false;
    fmpz_mpoly_t u, v;
    fmpz_mpoly_init(u, ctx), fmpz_mpoly_init(v, ctx);
    bool same = true;
    for (slong j = 0; j < a->order && same; j++) {
        fmpz_mpoly_mul(u, &a->c[j], &b->c[b->order], ctx);
        fmpz_mpoly_mul(v, &b->c[j], &a->c[a->order], ctx);
        same = fmpz_mpoly_equal(u, v, ctx);
    }
    fmpz_mpoly_clear(u, ctx), fmpz_mpoly_clear(v, ctx);
    return same;
}

/* b's certificate divided by what b's c_j have more than a's. */
static void align_certificate(const telescope *a, telescope *b)
{
    field *f = a->f;
    element ratio;
    element_init(f, &ratio);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&ratio), &a->c[a->order], f->ctx);
    fmpz_mpoly_set(fmpz_mpoly_q_denref(&ratio), &b->c[b->order], f->ctx);
    fmpz_mpoly_q_canonicalise(&ratio, f->ctx);
    fmpz_mpoly_q_mul(&b->certificate, &b->certificate, &ratio, f->ctx);
    element_clear(f, &ratio);
}

/* a_j = c_j C^(h j) (z + h n + h j)(z + h n + h j + 1) ... up to z + h n + h r - 1 */
static tw_status set_coefficients(const task *t, field *f, const telescope *s, fmpz_mpoly_struct *a)
{
    tw_engine *e = t->e;
    element scale, z, rising, power, u;
    element_init(f, &scale), element_init(f, &z), element_init(f, &rising), element_init(f, &power), element_init(f, &u);
    expr *constant = t->k.far_end ? expr_neg(e, t->k.constant) : t->k.constant;
    tw_status status = field_from_expr(f, &scale, constant);
    if (status == TW_OK) status = field_from_expr(f, &z, expr_add(e, t->z, expr_mul(e, expr_int(e, t->h), t->n)));
    element *values = elements_new(f, s->order + 1);
    fmpz_mpoly_t common;
    fmpz_mpoly_init(common, f->ctx);
    fmpz_mpoly_one(common, f->ctx);
    if (status == TW_OK) fmpz_mpoly_q_one(&rising, f->ctx);
    for (slong j = s->order; j >= 0 && status == TW_OK; j--) {
        fmpz_mpoly_set(fmpz_mpoly_q_numref(&values[j]), &s->c[j], f->ctx);
        fmpz_mpoly_q_mul(&values[j], &values[j], &rising, f->ctx);
        status = field_pow(f, &power, &scale, t->h * j);
        if (status == TW_OK) fmpz_mpoly_q_mul(&values[j], &values[j], &power, f->ctx);
        for (slong i = 1; i <= t->h && j > 0; i++) {
            fmpz_mpoly_q_add_si(&u, &z, t->h * j - i, f->ctx);
            fmpz_mpoly_q_mul(&rising, &rising, &u, f->ctx);
        }
        fmpz_mpoly_q_struct *v = &values[j];
        fmpz_mpoly_t g;
        fmpz_mpoly_init(g, f->ctx);
        if (fmpz_mpoly_gcd(g, common, fmpz_mpoly_q_denref(v), f->ctx)) {
            fmpz_mpoly_divides(g, fmpz_mpoly_q_denref(v), g, f->ctx);
            fmpz_mpoly_mul(common, common, g, f->ctx);
        }
        fmpz_mpoly_clear(g, f->ctx);
    }
    for (slong j = 0; j <= s->order && status == TW_OK; j++) {
        fmpz_mpoly_divides(&a[j], common, fmpz_mpoly_q_denref(&values[j]), f->ctx);
        fmpz_mpoly_mul(&a[j], &a[j], fmpz_mpoly_q_numref(&values[j]), f->ctx);
    }
    fmpz_mpoly_clear(common, f->ctx);
    elements_free(f, values, s->order + 1);
    element_clear(f, &scale), element_clear(f, &z), element_clear(f, &rising), element_clear(f, &power), element_clear(f, &u);
    return status;
}

static expr *polynomial_expr_of(field *f, const fmpz_mpoly_t p)
{
    element u;
    element_init(f, &u);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&u), p, f->ctx);
    expr *made = field_to_expr(f, &u);
    element_clear(f, &u);
    return made;
}

static tw_status keep_certificates(const task *t, recurrence *r, const telescope *list)
{
    field *f = r->f;
    r->label = RECURRENCE_PROVED;
    r->z = t->z;
    r->h = t->h;
    r->c = base_alloc((size_t)(r->order + 1) * sizeof *r->c);
    for (slong j = 0; j <= r->order; j++)
        if (!(r->c[j] = polynomial_expr_of(f, &list[0].c[j]))) return TW_ERROR;
    r->certificate_count = t->count;
    r->certificates = base_alloc(t->count * sizeof *r->certificates);
    for (size_t k = 0; k < t->count; k++) {
        r->certificates[k] = (certificate){t->x, t->pieces[k].q, t->pieces[k].p, field_to_expr(f, &list[k].certificate)};
        if (!r->certificates[k].r) return TW_ERROR;
    }
    return TW_OK;
}

/* With this field, unless it is too narrow. f becomes the recurrence's own. */
static tw_status find_in_field(const task *t, field *f, recurrence **out)
{
    telescope *list = base_alloc(t->count * sizeof *list);
    size_t done = 0;
    tw_status status = TW_OK;
    for (; done < t->count && status == TW_OK; done++) {
        status = telescope_piece(t, f, done, &list[done]);
        if (status != TW_OK) break;
        if (done == 0) continue;
        if (same_telescoper(&list[0], &list[done])) align_certificate(&list[0], &list[done]);
        else status = refuse(t, "the parts of the integrand have different recurrences");
    }
    if (status == TW_OK) {
        slong order = list[0].order;
        fmpz_mpoly_struct *a = base_alloc((size_t)(order + 1) * sizeof *a);
        for (slong j = 0; j <= order; j++) fmpz_mpoly_init(&a[j], f->ctx);
        status = set_coefficients(t, f, &list[0], a);
        fmpz_mpoly_t voided;
        fmpz_mpoly_init(voided, f->ctx);
        fmpz_mpoly_one(voided, f->ctx);
        for (size_t k = 0; k < t->count; k++) fmpz_mpoly_mul(voided, voided, list[k].content, f->ctx);
        if (status == TW_OK) {
            *out = recurrence_new(t->e, f, t->n, a, order, voided);
            status = keep_certificates(t, *out, list);
        } else {
            for (slong j = 0; j <= order; j++) fmpz_mpoly_clear(&a[j], f->ctx);
            free(a);
        }
        fmpz_mpoly_clear(voided, f->ctx);
    }
    for (size_t k = 0; k < done; k++) telescope_clear(&list[k]);
    free(list);
    return status;
}

static tw_status find_recurrence(const task *t, recurrence **out)
{
    tw_engine *e = t->e;
    for (slong room = 3; room <= ROOM_LIMIT; room++) {
        field *f = base_alloc(sizeof *f);
        field_init(f, e, room);
        tw_status status = find_in_field(t, f, out);
        bool full = f->full;
        if (status == TW_OK) return TW_OK;
        if (*out) {
            recurrence_free(*out);
            *out = NULL;
        } else {
            field_clear(f);
            free(f);
        }
        if (e->error.kind != ERROR_NONE || !full) break;
    }
    if (e->error.kind == ERROR_NONE) return refuse(t, "the integrand holds too many different parameters and constants");
    return TW_ERROR;
}

static tw_status prepare(task *t, expr *large)
{
    if (kernel_read(t->e, &t->k, t->c, large) != TW_OK || check_class(t) != TW_OK || place_lane(t) != TW_OK) return TW_ERROR;
    t->n = choose_index(t->e, t);
    t->x = expr_fresh(t->e, "x");
    return t->n && t->x ? add_branches(t) : TW_ERROR;
}

/* Does it fit what is known already? It must: this looks for mistakes of the program, not of the mathematics. */
static tw_status check_known(const task *t, const recurrence *r)
{
    tw_engine *e = t->e;
    slong count = t->l->c.count;
    expr **c = base_alloc((size_t)(count + 1) * sizeof *c);
    bool good = true;
    for (slong n = 0; n < count && good; n++) good = (c[n] = coefficient_expr(e, &t->l->c, n)) != NULL;
    slong misfit = good ? recurrence_misfit(e, r, NULL, c, count) : -2;
    free(c);
    if (misfit >= 0)
        return engine_fail(e, ERROR_INTERNAL, "a recurrence does not fit the coefficients from n = %ld on", (long)misfit);
    return misfit == -1 ? TW_OK : TW_ERROR;
}

static tw_status find_for_lane(tw_engine *e, const contribution *c, const lane *l, expr *large, recurrence **out)
{
    task t = {.e = e, .c = c, .l = l};
    kernel_init(&t.k);
    tw_status status = prepare(&t, large);
    if (status == TW_OK) status = find_recurrence(&t, out);
    if (status == TW_OK) status = check_known(&t, *out);
    kernel_clear(&t.k);
    if (status == TW_OK) return TW_OK;
    recurrence_free(*out);
    *out = NULL;
    return TW_ERROR;
}

tw_status lane_recurrence(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out)
{
    struct remembered *m = remember(c, l);
    if (!m->found && !m->why) {
        recurrence *made = NULL;
        tw_status status = find_for_lane(e, c, l, large, &made);
        if (status == TW_OK) m->found = made;
        else if (e->error.kind == ERROR_UNSUITABLE) m->why = base_copy(e->error.words);
        if (status != TW_OK) return TW_ERROR;
    }
    *out = m->found;
    return m->found ? TW_OK : engine_fail(e, ERROR_UNSUITABLE, "%s", m->why);
}

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

tw_status lane_recurrence_if_quick(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out)
{
    double before = e->deadline, soon = now() + 2;
    if (before == 0 || soon < before) e->deadline = soon;
    tw_status status = lane_recurrence(e, c, l, large, out);
    e->deadline = before;
    if (status == TW_OK) return TW_OK;
    *out = NULL;
    bool slow = e->error.kind == ERROR_TIME && (before == 0 || now() < before);
    if (!slow && e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_UNDECIDED) return TW_ERROR;
    engine_forgive(e);
    return TW_OK;
}

/* ---- the certificate again ---- */

/* f'/f by the rules of logarithmic differentiation, on expressions. */
static expr *log_slope(tw_engine *e, expr *f, expr *x)
{
    if (!f) return NULL;
    if (!expr_has(f, x)) return expr_int(e, 0);
    if (f->kind == EXPR_PRODUCT) {
        expr *sum = expr_int(e, 0);
        for (uint32_t k = 0; k < f->count; k++) sum = expr_add(e, sum, log_slope(e, f->args[k], x));
        return sum;
    }
    if (expr_is_call(f, FUNCTION_EXP)) return expr_derivative(e, f->args[0], x);
    if (f->kind == EXPR_POWER && !expr_has(f->args[1], x)) return expr_mul(e, f->args[1], log_slope(e, f->args[0], x));
    return expr_div(e, expr_derivative(e, f, x), f);
}

/* sum_j c_j p^(-h j) - R' - R F'/F, which is zero when the certificate holds. */
static expr *certificate_defect(tw_engine *e, const recurrence *r, const certificate *one)
{
    expr *sum = expr_int(e, 0);
    for (slong j = 0; j <= r->order; j++)
        sum = expr_add(e, sum, expr_mul(e, r->c[j], expr_pow(e, one->p, expr_int(e, -r->h * j))));
    expr *z = expr_add(e, r->z, expr_mul(e, expr_int(e, r->h), r->n));
    expr *slope = expr_sub(e, log_slope(e, one->q, one->x), expr_mul(e, z, log_slope(e, one->p, one->x)));
    sum = expr_sub(e, sum, expr_derivative(e, one->r, one->x));
    return expr_sub(e, sum, expr_mul(e, one->r, slope));
}

/* Zero as a rational function? */
static answer is_zero_function(tw_engine *e, expr *a)
{
    if (!a) return ANSWER_UNKNOWN;
    for (slong room = 4; room <= ROOM_LIMIT; room += 4) {
        field f;
        element value;
        field_init(&f, e, room);
        element_init(&f, &value);
        tw_status status = field_from_expr(&f, &value, a);
        bool full = f.full;
        answer zero = status == TW_OK ? field_is_zero(&f, &value) : ANSWER_UNKNOWN;
        element_clear(&f, &value);
        field_clear(&f);
        if (!full) return zero;
    }
    return ANSWER_UNKNOWN;
}

tw_status recurrence_verify(tw_engine *e, const recurrence *r)
{
    for (size_t k = 0; k < r->certificate_count; k++) {
        answer zero = is_zero_function(e, certificate_defect(e, r, &r->certificates[k]));
        if (e->error.kind != ERROR_NONE) return TW_ERROR;
        if (zero == ANSWER_NO) return engine_fail(e, ERROR_REFUTED, "the certificate does not hold: the identity is false");
        if (zero == ANSWER_UNKNOWN)
            return engine_fail(e, ERROR_UNDECIDED, "the certificate could be neither proved nor refuted in this form");
    }
    return TW_OK;
}

static void add_expr(tw_engine *e, text *out, const char *before, expr *a)
{
    text_add(out, before);
    if (a) expr_print(e, out, a);
}

char *recurrence_certificate(tw_engine *e, const recurrence *r)
{
    if (r->certificate_count == 0) return NULL;
    text t;
    text_init(&t);
    expr *z = expr_add(e, r->z, expr_mul(e, expr_int(e, r->h), r->n));
    text_add(&t, "sum over j of C_j*p^(-");
    text_addf(&t, "%ld*j)*F = derivative of R*F in %s, F = q*p^(-z)", (long)r->h, r->certificates[0].x->is.name);
    add_expr(e, &t, ", z = ", z);
    for (slong j = 0; j <= r->order; j++) {
        text_addf(&t, ", C_%ld = ", (long)j);
        add_expr(e, &t, "", r->c[j]);
    }
    for (size_t k = 0; k < r->certificate_count; k++) {
        add_expr(e, &t, k ? "; p = " : ", p = ", r->certificates[k].p);
        add_expr(e, &t, ", q = ", r->certificates[k].q);
        add_expr(e, &t, ", R = ", r->certificates[k].r);
    }
    return text_take(&t);
}

/* ---- direct coefficients ---- */

static expr *put_in(tw_engine *e, expr *a, const env *at)
{
    return !a || !at || at->count == 0 ? a : expr_substitute_all(e, a, at->symbols, at->values, at->count);
}

static void copy_form(tw_engine *e, local_form *to, const local_form *from, const env *at)
{
    if (from->count == 0) return;
    to->scale = put_in(e, from->scale, at);
    to->factor = put_in(e, from->factor, at);
    for (size_t k = 0; k < from->count; k++) {
        const branch *b = &from->branches[k];
        local_form_add(to, b->x, b->end, put_in(e, b->p, at), put_in(e, b->q, at));
    }
}

/* A copy of the contribution with its local forms only. */
static void copy_forms(tw_engine *e, contribution *to, const contribution *c, const env *at)
{
    contribution_init(to);
    to->variable = c->variable;
    to->place = c->place;
    to->kind = c->kind;
    to->method = c->method;
    to->prefactor = c->prefactor;
    copy_form(e, &to->local, &c->local, at);
    copy_form(e, &to->formal, &c->formal, at);
}

/* Is l the lane `wanted` with the values put in? Its constant may have taken another form then. */
static bool is_same_lane(tw_engine *e, const lane *l, const lane *wanted, const env *at)
{
    return l->log_power == wanted->log_power && l->first_exponent == put_in(e, wanted->first_exponent, at) &&
           fmpq_equal(l->step, wanted->step) && (at || l->constant == wanted->constant);
}

tw_status lane_coefficients(tw_engine *e, const contribution *c, const lane *wanted, expr *large, bool small, slong count,
                            const env *at, expr ***out, slong *found)
{
    contribution fresh;
    *out = NULL;
    *found = 0;
    copy_forms(e, &fresh, c, at);
    slong terms = count * (slong)FLINT_MAX(c->lane_count, 1);
    tw_status status = e->error.kind == ERROR_NONE
                           ? contribution_fill_directly(e, &fresh, large, small, terms, NULL) : TW_ERROR;
    bool same = status == TW_OK && (!at || fresh.lane_count == c->lane_count);
    for (size_t k = 0; k < fresh.lane_count && same && !*out; k++) {
        const struct lane *l = &fresh.lanes[k];
        if (!is_same_lane(e, l, wanted, at)) continue;
        *found = FLINT_MIN(l->c.count, count);
        *out = base_alloc((size_t)(*found + 1) * sizeof **out);
        for (slong n = 0; n < *found; n++)
            if (!((*out)[n] = coefficient_expr(e, &l->c, n))) status = TW_ERROR;
    }
    contribution_clear(&fresh);
    if (status == TW_OK && *out) return TW_OK;
    free(*out);
    *out = NULL;
    return status == TW_OK ? engine_fail(e, ERROR_UNSUITABLE, "the lane's direct coefficients could not be found again")
                           : TW_ERROR;
}

/* ---- parameters ---- */

static void add_parameters(expr *a, expr *large, expr *x, expr **symbols, size_t *count)
{
    expr **list;
    size_t n = a ? expr_symbols(a, &list) : 0;
    for (size_t k = 0; k < n; k++) {
        bool old = list[k] == large || list[k] == x || *count == PARAMETERS_LIMIT;
        for (size_t m = 0; m < *count && !old; m++) old = symbols[m] == list[k];
        if (!old) symbols[(*count)++] = list[k];
    }
    if (a) free(list);
}

size_t contribution_parameters(const contribution *c, expr *large, expr **symbols)
{
    size_t count = 0;
    const local_form *l = c->local.count ? &c->local : &c->formal;
    add_parameters(l->scale, large, NULL, symbols, &count);
    add_parameters(l->factor, large, NULL, symbols, &count);
    for (size_t k = 0; k < l->count; k++) {
        add_parameters(l->branches[k].p, large, l->branches[k].x, symbols, &count);
        add_parameters(l->branches[k].q, large, l->branches[k].x, symbols, &count);
    }
    return count;
}

slong lane_compare(tw_engine *e, const contribution *c, const lane *l, expr *large, bool small, const recurrence *r,
                   slong count, slong *compared, expr **left, expr **right)
{
    expr *symbols[PARAMETERS_LIMIT], *values[PARAMETERS_LIMIT], **list;
    env at = {contribution_parameters(c, large, symbols), symbols, values};
    *compared = 0;
    *left = *right = NULL;
    for (int trial = 0; trial < 3; trial++) {
        for (size_t k = 0; k < at.count; k++)
            if (!(values[k] = value_sample(e, symbols[k], trial))) return -2;
        const env *here = at.count ? &at : NULL;
        if (lane_coefficients(e, c, l, large, small, count, here, &list, compared) == TW_OK) {
            slong misfit = recurrence_misfit(e, r, here, list, *compared);
            if (misfit >= 0) recurrence_sides(e, r, here, list, misfit, left, right);
            free(list);
            return misfit;
        }
        if (!here || (e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_DIVERGENT && e->error.kind != ERROR_VALUE)) return -2;
        engine_forgive(e); /* other values may keep the lanes apart */
    }
    engine_fail(e, ERROR_UNDECIDED, "no values of the parameters were found at which the lanes can be compared");
    return -2;
}
