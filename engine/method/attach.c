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

#include "engine/exact/closure.h"
#include "engine/exact/guess.h"
#include "engine/exact/rationalise.h"
#include "engine/exact/telescope.h"
#include "engine/method/lanes.h"

enum { ORDER_LIMIT = 12, PIECES_LIMIT = 12, ROOM_LIMIT = 24, SHIFT_LIMIT = 24, SECONDS_MOST = 20 };

struct recurrence_memo {
    size_t count;
    struct remembered {
        expr *constant, *first_exponent;
        fmpq_t step;
        slong log_power;
        recurrence *found; /* NULL: none, for this reason */
        char *why;
        bool impossible; /* the reason is that there is none */
        bool fit_tried;
        recurrence *fitted;
    } *list;
};

void recurrence_memo_free(struct recurrence_memo *m)
{
    if (!m) return;
    for (size_t k = 0; k < m->count; k++) {
        fmpq_clear(m->list[k].step);
        recurrence_free(m->list[k].found);
        recurrence_free(m->list[k].fitted);
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
    bool impossible; /* it was seen that there is no finite recurrence */
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

/* Is a made of rational functions of x and logarithms of them, one logarithm at least? */
static bool is_rational_with_logs(task *t, expr *a, bool *log)
{
    if (!expr_has(a, t->x) || a == t->x) return true;
    if (expr_is_call(a, FUNCTION_LOG)) {
        bool inside = false;
        *log = true;
        return is_rational_with_logs(t, a->args[0], &inside) && !inside;
    }
    if (a->kind == EXPR_POWER && (!expr_is_number(a->args[1]) || !fmpz_is_one(fmpq_denref(expr_number(a->args[1])))))
        return false;
    if (a->kind != EXPR_SUM && a->kind != EXPR_PRODUCT && a->kind != EXPR_POWER) return false;
    bool good = true;
    for (uint32_t k = 0; k < a->count && good; k++) good = is_rational_with_logs(t, a->args[k], log);
    return good;
}

/* A pole of q, as a rational function of exp(u x) or of tan(u x/2), other than where these have no preimage: it has one in
 * each period. Infinity is an ordinary point of the new variable y, at which dx/dy falls like y^-2. */
static bool has_periodic_poles(task *t, expr *q)
{
    tw_engine *e = t->e;
    bool found = false;
    for (int which = CHANGE_HYPERBOLIC; which <= CHANGE_CIRCULAR && !found && e->error.kind == ERROR_NONE; which++) {
        changed made;
        if (!change_variable(e, &made, which, expr_int(e, 1), q, t->x)) continue;
        expr *inside = expr_substitute(e, made.q, made.y, t->x);
        expr *square = expr_pow(e, t->x, expr_int(e, 2)), *one = expr_int(e, 1);
        expr *away = which == CHANGE_CIRCULAR ? expr_add(e, one, square) : expr_sub(e, one, square);
        bool again = true;
        for (slong room = 2; inside && away && room <= ROOM_LIMIT && again && e->error.kind == ERROR_NONE; room++) {
            field f;
            hyper h;
            element value, gone;
            field_init(&f, e, room);
            element_init(&f, &value), element_init(&f, &gone);
            tw_status status = hyper_init(&h, &f, t->x);
            if (status == TW_OK) status = hyper_rational(&h, &value, inside);
            if (status == TW_OK) status = hyper_rational(&h, &gone, away);
            again = f.full;
            fmpz_mpoly_t rest, g;
            fmpz_mpoly_init(rest, f.ctx), fmpz_mpoly_init(g, f.ctx);
            fmpz_mpoly_set(rest, fmpz_mpoly_q_denref(&value), f.ctx);
            while (status == TW_OK && fmpz_mpoly_gcd(g, rest, fmpz_mpoly_q_numref(&gone), f.ctx) &&
                   fmpz_mpoly_degree_si(g, h.variable, f.ctx) > 0)
                fmpz_mpoly_divides(rest, rest, g, f.ctx);
            slong up = fmpz_mpoly_degree_si(fmpz_mpoly_q_numref(&value), h.variable, f.ctx),
                  down = fmpz_mpoly_degree_si(fmpz_mpoly_q_denref(&value), h.variable, f.ctx);
            found = status == TW_OK && (fmpz_mpoly_degree_si(rest, h.variable, f.ctx) > 0 || up > down - 2);
            fmpz_mpoly_clear(rest, f.ctx), fmpz_mpoly_clear(g, f.ctx);
            hyper_clear(&h);
            element_clear(&f, &value), element_clear(&f, &gone);
            field_clear(&f);
        }
    }
    return found;
}

/* p = b x + a function of exp(u x) or tan(u x/2), b not 0: a period adds a constant to p, so each critical value comes with
 * infinitely many others. */
static bool has_shifted_values(task *t, expr *p)
{
    tw_engine *e = t->e;
    expr *slope = expr_derivative(e, p, t->x);
    bool found = false;
    for (int which = CHANGE_HYPERBOLIC; slope && which <= CHANGE_CIRCULAR && !found; which++) {
        changed made;
        if (!change_variable(e, &made, which, expr_int(e, 1), slope, t->x)) continue;
        found = !change_variable(e, &made, which, expr_int(e, 1), p, t->x);
    }
    if (e->error.kind == ERROR_VALUE) engine_forgive(e);
    return found;
}

/* Sequences with a finite recurrence have a Borel transform with finitely many singularities. */
static tw_status refuse_kind(task *t, expr *p, expr *q)
{
    tw_engine *e = t->e;
    fmpq_t mu;
    fmpq_init(mu);
    bool log = false, pure = is_pure_power(e, p, t->x, mu);
    fmpq_clear(mu);
    t->impossible = true;
    if (is_rational_with_logs(t, p, &log) && log)
        return refuse(t, "no finite recurrence exists: the exponent holds a logarithm, whose sheets give it infinitely many "
                         "critical values");
    if (has_shifted_values(t, p))
        return refuse(t, "no finite recurrence exists: the exponent holds its variable beside an exponential of it, so it has "
                         "infinitely many critical values");
    if (pure && has_periodic_poles(t, q))
        return refuse(t, "no finite recurrence exists: the amplitude has a pole in each period, so infinitely many");
    t->impossible = false;
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

/* F = q p^-(z + h n) of piece k into *h (always initialised), and its ratio p^-h for n -> n + 1. TW_ERROR with f->full when
 * the field is too narrow. */
static tw_status read_piece(const task *t, field *f, size_t k, hyper *into, element *ratio)
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
    if (status == TW_OK) status = field_pow(f, ratio, &p, -t->h);
    *into = h;
    element_clear(f, &weight), element_clear(f, &p);
    return status;
}

/* The telescoper of piece k. */
static tw_status telescope_piece(const task *t, field *f, size_t k, telescope *out, element *ratio)
{
    hyper h;
    tw_status status = read_piece(t, f, k, &h, ratio);
    telescope_init(out, f, h.variable);
    if (status == TW_OK) status = telescope_find(out, &h, ratio, ORDER_LIMIT);
    hyper_clear(&h);
    return status;
}

/* Proves the identity of piece k as it now is. */
static tw_status prove_piece(const task *t, field *f, size_t k, const telescope *one)
{
    hyper h;
    element ratio;
    element_init(f, &ratio);
    tw_status status = read_piece(t, f, k, &h, &ratio);
    if (status == TW_OK && !telescope_holds(one, &h, &ratio))
        status = engine_fail(t->e, ERROR_INTERNAL, "the certificate of a recurrence of a sum does not hold");
    hyper_clear(&h);
    element_clear(f, &ratio);
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
        if (status == TW_OK) field_mul(f, &values[j], &values[j], &power); /* with the relations of the generators */
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

/* Where the polynomial vanishes must be known: constants with relations that the polynomials do not know (i, sqrt(2), pi)
 * may not meet n in it. Reduced by the relations here. */
static tw_status check_voids(const task *t, field *f, fmpz_mpoly_t voided)
{
    element value, one;
    element_init(f, &value), element_init(f, &one);
    fmpz_mpoly_q_one(&one, f->ctx);
    fmpz_mpoly_set(fmpz_mpoly_q_numref(&value), voided, f->ctx);
    field_mul(f, &value, &value, &one);
    fmpz_mpoly_set(voided, fmpz_mpoly_q_numref(&value), f->ctx);
    fmpz_mpoly_factor_t parts;
    fmpz_mpoly_factor_init(parts, f->ctx);
    bool good = !fmpz_mpoly_is_zero(voided, f->ctx) && fmpz_mpoly_factor(parts, voided, f->ctx);
    for (slong k = 0; k < parts->num && good; k++) {
        bool index = fmpz_mpoly_degree_si(parts->poly + k, field_variable(f, t->n), f->ctx) > 0, constants = false;
        for (slong g = 0; g < f->count; g++)
            constants = constants || (f->generators[g].closed &&
                                      fmpz_mpoly_degree_si(parts->poly + k, f->room - 1 - g, f->ctx) > 0);
        fmpz_mpoly_set(fmpz_mpoly_q_numref(&value), parts->poly + k, f->ctx);
        fmpz_mpoly_one(fmpz_mpoly_q_denref(&value), f->ctx);
        if (constants) good = !index && field_is_zero(f, &value) == ANSWER_NO;
    }
    fmpz_mpoly_factor_clear(parts, f->ctx);
    element_clear(f, &value), element_clear(f, &one);
    if (good || t->e->error.kind != ERROR_NONE) return t->e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
    return refuse(t, "where its certificate is void could not be told");
}

/* All pieces satisfy the recurrence of the first, or that of the sum is made. */
static tw_status align_pieces(const task *t, field *f, telescope *list, const element *ratios)
{
    bool same = true;
    for (size_t k = 1; k < t->count && same; k++) same = same_telescoper(&list[0], &list[k]);
    if (same) {
        for (size_t k = 1; k < t->count; k++) align_certificate(&list[0], &list[k]);
        return TW_OK;
    }
    if (telescopes_unite(list, ratios, t->count, field_variable(f, t->n), ORDER_LIMIT) != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < t->count; k++)
        if (prove_piece(t, f, k, &list[k]) != TW_OK) return TW_ERROR;
    return TW_OK;
}

/* With this field, unless it is too narrow. f becomes the recurrence's own. */
static tw_status find_in_field(const task *t, field *f, recurrence **out)
{
    telescope *list = base_alloc(t->count * sizeof *list);
    element *ratios = elements_new(f, (slong)t->count);
    size_t done = 0;
    tw_status status = TW_OK;
    for (; done < t->count && status == TW_OK; done++) status = telescope_piece(t, f, done, &list[done], &ratios[done]);
    if (status == TW_OK) status = align_pieces(t, f, list, ratios);
    elements_free(f, ratios, (slong)t->count);
    if (status == TW_OK) {
        slong order = list[0].order;
        fmpz_mpoly_struct *a = base_alloc((size_t)(order + 1) * sizeof *a);
        for (slong j = 0; j <= order; j++) fmpz_mpoly_init(&a[j], f->ctx);
        status = set_coefficients(t, f, &list[0], a);
        fmpz_mpoly_t voided;
        fmpz_mpoly_init(voided, f->ctx);
        fmpz_mpoly_one(voided, f->ctx);
        for (size_t k = 0; k < t->count; k++) fmpz_mpoly_mul(voided, voided, list[k].content, f->ctx);
        if (status == TW_OK) status = check_voids(t, f, voided);
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

static tw_status find_for_lane(tw_engine *e, const contribution *c, const lane *l, expr *large, recurrence **out,
                               bool *impossible)
{
    if (c->local.count == 0 && c->formal.count == 0)
        return engine_fail(e, ERROR_UNSUITABLE, "the contribution has no integral of its own on the real line, from which "
                                                "a recurrence could be found");
    task t = {.e = e, .c = c, .l = l};
    kernel_init(&t.k);
    tw_status status = prepare(&t, large);
    if (status == TW_OK) status = find_recurrence(&t, out);
    if (status == TW_OK) status = check_known(&t, *out);
    kernel_clear(&t.k);
    *impossible = t.impossible;
    if (status == TW_OK) return TW_OK;
    recurrence_free(*out);
    *out = NULL;
    return TW_ERROR;
}

static double now(void)
{
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

double quick_begin(tw_engine *e, double seconds)
{
    double before = e->deadline, soon = now() + seconds;
    if (before == 0 || soon < before) e->deadline = soon;
    return before;
}

/* The search as one job: a library call that goes on past the deadline is left, and what it held is lost. */
typedef struct find_job {
    tw_engine *e;
    const contribution *c;
    const lane *l;
    expr *large;
    recurrence *made;
    bool impossible;
} find_job;

static tw_status run_find(void *host)
{
    find_job *j = host;
    return find_for_lane(j->e, j->c, j->l, j->large, &j->made, &j->impossible);
}

tw_status lane_recurrence(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out)
{
    struct remembered *m = remember(c, l);
    if (!m->found && !m->why) {
        find_job job = {e, c, l, large, NULL, false};
        double before = quick_begin(e, SECONDS_MOST);
        tw_status status = engine_protect(e, run_find, &job);
        e->deadline = before;
        m->impossible = job.impossible;
        if (status == TW_OK) m->found = job.made;
        if (status != TW_OK && e->error.kind == ERROR_TIME && (before == 0 || now() < before)) {
            engine_forgive(e);
            engine_fail(e, ERROR_UNSUITABLE, "no recurrence was found within %d seconds", SECONDS_MOST);
        }
        if (status != TW_OK && e->error.kind == ERROR_UNSUITABLE) m->why = base_copy(e->error.words);
        if (status != TW_OK) return TW_ERROR;
    }
    *out = m->found;
    return m->found ? TW_OK : engine_fail(e, ERROR_UNSUITABLE, "%s", m->why);
}

tw_status lane_recurrence_fitted(tw_engine *e, contribution *c, const lane *l, expr *large, bool small,
                                 const recurrence **out)
{
    struct remembered *m = remember(c, l);
    *out = m->fitted;
    if (m->fit_tried || m->impossible || c->terminates || !l->c.q) return TW_OK;
    expr **list;
    slong found;
    if (lane_coefficients(e, c, l, large, small, GUESS_COEFFICIENTS, NULL, &list, &found) != TW_OK) return TW_ERROR;
    m = remember(c, l);
    bool rational = true;
    for (slong n = 0; n < found && rational; n++) rational = expr_is_number(list[n]);
    tw_status status = TW_OK;
    if (rational) {
        fmpq *q = _fmpq_vec_init(found);
        for (slong n = 0; n < found; n++) fmpq_set(&q[n], expr_number(list[n]));
        status = recurrence_guess(e, &m->fitted, expr_symbol(e, "n"), q, found);
        _fmpq_vec_clear(q, found);
    }
    free(list);
    m->fit_tried = status == TW_OK;
    *out = m->fitted;
    return status;
}

bool quick_end(tw_engine *e, double before)
{
    e->deadline = before;
    bool slow = e->error.kind == ERROR_TIME && (before == 0 || now() < before);
    if (!slow && e->error.kind != ERROR_UNSUITABLE && e->error.kind != ERROR_UNDECIDED) return e->error.kind == ERROR_NONE;
    engine_forgive(e);
    return true;
}

tw_status lane_recurrence_if_quick(tw_engine *e, contribution *c, const lane *l, expr *large, const recurrence **out)
{
    double before = quick_begin(e, 2);
    if (lane_recurrence(e, c, l, large, out) != TW_OK) *out = NULL;
    return quick_end(e, before) ? TW_OK : TW_ERROR;
}
