/* Lists of coefficients and finished series: what other rooms hold in their hands. No mathematics. */
#include "engine/exact/series.h"

#include <stdlib.h>

const char *domain_word(domain_kind d)
{
    switch (d) {
    case DOMAIN_RATIONAL: return "rational";
    case DOMAIN_ALGEBRAIC: return "algebraic";
    case DOMAIN_FUNCTIONS: return "rational functions";
    case DOMAIN_CONSTANTS: return "constants";
    case DOMAIN_MIXED: return "mixed";
    }
    return "mixed";
}

void coefficients_init(coefficients *c)
{
    c->domain = DOMAIN_RATIONAL;
    c->count = 0;
    c->q = NULL;
    c->x = NULL;
}

void coefficients_clear(coefficients *c)
{
    for (slong k = 0; c->q != NULL && k < c->count; k++)
        fmpq_clear(c->q + k);
    free(c->q);
    free(c->x);
    coefficients_init(c);
}

expr *coefficient_expr(tw_engine *e, const coefficients *c, slong n)
{
    return c->q != NULL ? expr_fmpq(e, c->q + n) : c->x[n];
}

bool coefficient_is_zero(const coefficients *c, slong n)
{
    return c->q != NULL ? fmpq_is_zero(c->q + n) : expr_is_zero(c->x[n]);
}

void series_init(series *s)
{
    s->count = 0;
    s->strands = NULL;
    s->terminates = false;
}

void series_clear(series *s)
{
    for (size_t k = 0; k < s->count; k++)
        coefficients_clear(&s->strands[k].c);
    free(s->strands);
    series_init(s);
}
