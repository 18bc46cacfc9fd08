/* Laplace's method to all orders (DLMF 2.3.15): the points where a real exponent is greatest, at ends or inside, of any
 * order, one or several. The one idea stands in lanes.c and series.h: along a branch t = p(x) the amplitude
 * q(x(t)) dx/dt has a series in powers of t, and Watson's lemma integrates it term by term; both sides of an interior
 * point add, and what cancels does so in exact coefficients. This file says when it fits and keeps the record. */
#include <stdlib.h>

#include "engine/method/local.h"

static answer laplace_suits(tw_engine *e, const reading *r, char **why)
{
    size_t dominant = 0, inside = 0;
    for (size_t k = 0; k < r->point_count; k++)
        if (r->points[k].dominant) {
            dominant++;
            inside += r->points[k].kind == POINT_INTERIOR;
        }
    if (dominant == 0 || r->points->local.count == 0)
        return suits_answer(why, ANSWER_NO, "no point of the path is known where the exponent is greatest");
    if (dominant > 1)
        return suits_answer(why, ANSWER_YES, "the exponent is greatest at %lu points of equal depth",
                            (unsigned long)dominant);
    char *place = expr_text(e, r->points->place);
    answer a = suits_answer(why, ANSWER_YES, "the exponent is greatest at %s%s = %s only", inside ? "" : "the end ",
                            r->original_variable->is.name, place ? place : "");
    free(place);
    return a;
}

static void record_point(tw_engine *e, expansion *out, size_t k)
{
    const contribution *c = &out->contributions[k];
    char *place = expr_text(e, c->place);
    step *s = local_record_sum(
        e, out, k, "Laplace's method: take the exponent for the variable and integrate term by term", "DLMF 2.3.15");
    text words;
    text_init(&words);
    text_addf(
        &words,
        "at %s = %s, %lu branch%s; t = p(x) turns each into int G(t)*exp(-scale*t) dt, and each term t^(z - 1) of "
        "G gives Gamma(z)*scale^-z",
        c->variable->is.name, place ? place : "", (unsigned long)c->local.count, c->local.count == 1 ? "" : "es");
    s->detail = text_take(&words);
    free(place);
}

static tw_status laplace_expand(tw_engine *e, expansion *out, const reading *r, slong terms)
{
    if (local_expand(e, out, r, terms, "laplace") != TW_OK) return TW_ERROR;
    for (size_t k = 0; k < out->contribution_count; k++) record_point(e, out, k);
    bool all;
    if (e->error.kind != ERROR_NONE) return TW_ERROR;
    if (local_expand_far_ends(e, out, r, terms, "laplace", &all) != TW_OK) return TW_ERROR;
    out->exact = all && out->rest.count == 0;
    for (size_t k = 0; k < out->contribution_count; k++) out->exact = out->exact && out->contributions[k].terminates;
    return e->error.kind == ERROR_NONE ? TW_OK : TW_ERROR;
}

static tw_status laplace_extend(tw_engine *e, expansion *a, slong terms)
{
    return local_extend(e, a, terms, "laplace");
}

const method method_laplace = {"laplace", "Laplace's method", laplace_suits, laplace_expand, laplace_extend};
