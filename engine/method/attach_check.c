/* Recurrences of lanes tested: the certificate by expressions and their derivatives instead of polynomials, and the numbers
 * against coefficients that were made without it. The one idea: nothing here shares code with the search. */
#include "engine/method/attach.h"

#include <stdlib.h>

#include "engine/exact/values.h"
#include "engine/method/lanes.h"

enum { ROOM_LIMIT = 24 };

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
