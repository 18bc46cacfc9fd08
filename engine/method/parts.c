/* Repeated integration by parts at an end where the slope of the exponent is not zero (DLMF 2.3.2 for p = x):
 *     int_0^T q exp(-S p) dx = sum over n < N of S^-(n+1) [(D^n q / p')(0) - exp(-S p(T)) (D^n q / p')(T)] + R_N,
 *     R_N = S^-N int_0^T (D^N q) exp(-S p) dx,   D f = (f / p')'.
 * The one idea: (D^n q / p')(0) = n! times the n-th coefficient of q(x(t)) dx/dt in t = p(x), so the coefficients come
 * from the series, at no growing cost, while the remainder stays the exact integral of the operator's power. */
#include <stdlib.h>

#include "engine/method/convergence.h"
#include "engine/method/local.h"

/* The series of f at 0 is a Taylor series: one strand, whole exponents from 0 on, no log. */
static bool is_smooth_at_zero(tw_engine *e, expr *f, expr *x, bool *failed)
{
    series s;
    series_init(&s);
    *failed = series_at_zero(e, &s, f, x, 4, NULL, NULL) != TW_OK;
    bool smooth = !*failed;
    for (size_t k = 0; k < s.count && smooth; k++) {
        const strand *one = &s.strands[k];
        const fmpq *a = expr_is_number(one->exponent) ? expr_number(one->exponent) : NULL;
        smooth = a && one->den == 1 && one->log_power == 0 && fmpz_is_one(fmpq_denref(a)) && fmpq_sgn(a) >= 0;
    }
    series_clear(&s);
    return smooth;
}

/* p = p1 x + ... with p1 not 0. */
static bool has_slope(tw_engine *e, const branch *b)
{
    if (b->p == b->x) return true;
    series s;
    series_init(&s);
    bool slope = series_at_zero(e, &s, b->p, b->x, 1, NULL, NULL) == TW_OK && s.count == 1 &&
                 expr_is_one(s.strands[0].exponent) && s.strands[0].log_power == 0;
    series_clear(&s);
    return slope;
}

static answer parts_suits(tw_engine *e, const reading *r, char **why)
{
    const branch *b = &r->points->local.branches[0];
    if (r->point_count != 1 || r->rest.count > 0)
        return suits_answer(why, ANSWER_NO, "more than one point of the path counts");
    if (r->points->local.count != 1 || !has_slope(e, b)) {
        engine_forgive(e);
        return suits_answer(why, ANSWER_NO,
                            "the slope of the exponent is not a finite number other than 0 at the critical point");
    }
    bool failed;
    if (!is_smooth_at_zero(e, b->q, b->x, &failed)) {
        if (failed) engine_forgive(e);
        return suits_answer(why, ANSWER_NO,
                            "the amplitude is not smooth at the critical point, so its derivatives there do not exist");
    }
    return suits_answer(why, ANSWER_YES,
                        "the slope of the exponent is not zero at the end and the amplitude is smooth there");
}

enum { REMAINDER_SIZE_LIMIT = 120 };

/* D f = (f / p')' */
static expr *apply_operator(tw_engine *e, expr *f, const branch *b)
{
    expr *slope = expr_derivative(e, b->p, b->x);
    return expr_derivative(e, expr_div(e, f, slope), b->x);
}

/* scale^-n * integral of f * kernel */
static expr *remainder_integral(tw_engine *e, const local_form *l, expr *f, slong n)
{
    local_form one;
    local_form_init(&one);
    const branch *b = &l->branches[0];
    one.scale = l->scale;
    one.factor = expr_mul(e, l->factor, expr_pow(e, l->scale, expr_int(e, -n)));
    local_form_add(&one, b->x, b->end, b->p, f);
    expr *whole = local_form_integral(e, &one);
    local_form_clear(&one);
    return whole;
}

/* The steps of integration by parts, each with its exact remainder, as long as D^n q can be read; then the rest in one
 * step. */
static tw_status record_parts(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    enum { STEPS_SHOWN = 3 };
    const branch *b = &r->points->local.branches[0];
    expr *f = b->q;
    slong n = 0;
    while (n < terms && n < STEPS_SHOWN) {
        expr *next = apply_operator(e, f, b);
        if (!next) return TW_ERROR;
        if (expr_size(next) > REMAINDER_SIZE_LIMIT) break;
        f = next;
        n++;
        step *s = derivation_add(&out->derivation, "integrate by parts", n == 1 ? "DLMF 2.3.2" : NULL);
        char *words = expr_text(e, f);
        text t;
        text_init(&t);
        text_addf(&t, "the end gives its term of order scale^-%ld; the amplitude becomes %s", (long)n,
                  words ? words : "");
        free(words);
        s->form = text_take(&t);
        s->remainder = remainder_integral(e, &r->points->local, f, n);
    }
    if (n >= terms) return TW_OK;
    step *s = derivation_add(&out->derivation, "repeat integration by parts", n == 0 ? "DLMF 2.3.2" : NULL);
    char *scale = expr_text(e, r->points->local.scale), *p = expr_text(e, b->p), *q = expr_text(e, b->q);
    text t;
    text_init(&t);
    text_addf(&t,
              "with D f = derivative of (f/p') in x, p = %s, q = %s: after n steps the remainder is exactly (%s)^-n "
              "times the "
              "integral of (D^n q)*exp(-(%s)*p)",
              p ? p : "", q ? q : "", scale ? scale : "", scale ? scale : "");
    s->detail = text_take(&t);
    free(scale);
    free(p);
    free(q);
    return TW_OK;
}

/* D needs p' without a zero; a zero inside the path (the exponent still monotone) would spoil the remainder integral.
 */
static tw_status require_slope(tw_engine *e, expansion *out, const branch *b)
{
    answer known = positive_on_branch(e, expr_derivative(e, b->p, b->x), b->x, b->end);
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (known != ANSWER_YES)
        conditions_add(&out->conditions, "the slope of the exponent has no zero on the path", NULL, CONDITION_OPEN);
    return TW_OK;
}

static tw_status parts_expand(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    if (require_slope(e, out, &r->points->local.branches[0]) != TW_OK) return TW_ERROR;
    if (local_expand(e, out, r, terms, "parts") != TW_OK || record_parts(e, out, r, terms) != TW_OK) return TW_ERROR;
    local_record_sum(e, out, 0, "collect the end's terms", NULL);
    bool all;
    if (local_expand_far_ends(e, out, r, terms, "parts", &all) != TW_OK) return TW_ERROR;
    out->exact = all;
    for (size_t k = 0; k < out->contribution_count; k++) out->exact = out->exact && out->contributions[k].terminates;
    return TW_OK;
}

static tw_status parts_extend(tw_engine *e, expansion *a, slong terms)
{
    return local_extend(e, a, terms, "parts");
}

const method method_parts = {"parts", "integration by parts", parts_suits, parts_expand, parts_extend};
