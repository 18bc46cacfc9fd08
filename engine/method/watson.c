/* Watson's lemma in full (DLMF 2.3(ii)): the kernel is exp(-scale x^mu), the amplitude has a series in powers of x and
 * log(x) at 0, and the integral of each term is known. The one idea stands in lanes.c; this file says when it fits and
 * keeps the record. */
#include <stdlib.h>

#include "engine/method/local.h"

static answer watson_suits(tw_engine *e, const reading *r, char **why)
{
    const char *x = r->original_variable->is.name;
    if (r->point_count != 1 || r->rest.count > 0)
        return suits_answer(why, ANSWER_NO, "more than one point of the path counts");
    if (!r->points->pure)
        return suits_answer(why, ANSWER_NO, "the exponent is no pure power of the distance from the critical point");
    char *place = expr_text(e, r->points->place);
    answer a = suits_answer(why, ANSWER_YES, "the kernel is exp(-scale*y^mu) with y the distance from %s = %s", x,
                            place ? place : "");
    free(place);
    return a;
}

/* The integral minus the terms kept, exactly: the same kernel, and the amplitude less its first terms. Only for a
 * single branch and few terms, where it can be read. */
static expr *exact_remainder(tw_engine *e, const reading *r, slong terms)
{
    enum { TERMS_SHOWN = 4 };
    if (r->points->local.count != 1 || terms > TERMS_SHOWN) return NULL;
    const branch *b = &r->points->local.branches[0];
    series s;
    series_init(&s);
    expr *rest = NULL;
    if (series_at_zero(e, &s, b->q, b->x, terms, NULL, NULL) == TW_OK && s.count == 1 && s.strands[0].log_power == 0) {
        const strand *one = &s.strands[0];
        rest = b->q;
        for (slong n = 0; n < one->c.count; n++) {
            expr *power = expr_pow(e, b->x, expr_add(e, one->exponent, expr_frac(e, n, one->den)));
            rest = expr_sub(e, rest, expr_mul(e, one->constant, expr_mul(e, coefficient_expr(e, &one->c, n), power)));
        }
    }
    series_clear(&s);
    if (!rest) return NULL;
    local_form l;
    local_form_init(&l);
    l.scale = r->points->local.scale;
    l.factor = r->points->local.factor;
    local_form_add(&l, b->x, b->end, b->p, rest);
    expr *whole = local_form_integral(e, &l);
    local_form_clear(&l);
    return whole;
}

static bool has_logs(const expansion *a)
{
    for (size_t k = 0; k < a->contributions[0].lane_count; k++)
        if (a->contributions[0].lanes[k].log_power > 0) return true;
    return false;
}

static tw_status watson_expand(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    if (local_expand(e, out, r, terms, "watson") != TW_OK) return TW_ERROR;
    step *s = local_record_sum(e, out, 0, "Watson's lemma: expand the amplitude and integrate term by term",
                               has_logs(out) ? "DLMF 2.3.8, 2.3.9" : "DLMF 2.3.8");
    s->detail = base_copy(
        "each term x^a*log(x)^k of the amplitude gives derivatives of Gamma(z)*scale^-z/mu in z = (a + 1)/mu");
    if (!out->contributions[0].terminates) s->remainder = exact_remainder(e, r, terms);
    bool all;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (local_expand_far_ends(e, out, r, terms, "watson", &all) != TW_OK) return TW_ERROR;
    out->exact = all;
    for (size_t k = 0; k < out->contribution_count; k++) out->exact = out->exact && out->contributions[k].terminates;
    return TW_OK;
}

static tw_status watson_extend(tw_engine *e, expansion *a, slong terms)
{
    return local_extend(e, a, terms, "watson");
}

const method method_watson = {"watson", "Watson's lemma", watson_suits, watson_expand, watson_extend};
