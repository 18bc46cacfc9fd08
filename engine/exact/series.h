/* Exact generalised power series at x -> 0+:
 *
 *     f(x) = sum over strands of constant * log(x)^log_power * x^exponent * sum_n c[n] * x^(n/den)
 *
 * with c[n] in a coefficient domain. A strand's constant takes out what would spoil the domain (2^(1/3), exp(a),
 * log(2)), so that the c[n] are rational whenever possible. Rational coefficients go through FLINT's fmpq_poly;
 * recurrences are used for powers and quotients of polynomials (1000 terms of an algebraic q in milliseconds). */
#ifndef TW_EXACT_SERIES_H
#define TW_EXACT_SERIES_H

#include "engine/expr/expr.h"
#include "engine/expr/facts.h"

/* The words of export.md's field `domain`. */
typedef enum domain_kind {
    DOMAIN_RATIONAL,  /* "rational" */
    DOMAIN_ALGEBRAIC, /* "algebraic": of a number field, written with `root of` */
    DOMAIN_FUNCTIONS, /* "rational functions": of the other parameters, over Q */
    DOMAIN_CONSTANTS, /* "constants": expressions in fixed constants (pi, log(2), sqrt(2), psi values ...) */
    DOMAIN_MIXED      /* "mixed": parameters and constants */
} domain_kind;
const char *domain_word(domain_kind d);

/* A list of coefficients, all in one domain. Rational ones in q, others as expressions in canonical form that is zero
 * exactly when the coefficient is (rational functions are brought to lowest terms). */
typedef struct coefficients {
    domain_kind domain;
    slong count;
    fmpq *q;   /* DOMAIN_RATIONAL: count entries, else NULL */
    expr **x;  /* other domains: count entries, else NULL */
} coefficients;

void coefficients_init(coefficients *c);
void coefficients_clear(coefficients *c);
expr *coefficient_expr(tw_engine *e, const coefficients *c, slong n);      /* n < count */
bool coefficient_is_zero(const coefficients *c, slong n);

typedef struct strand {
    expr *constant; /* free of x, nonzero; 1 when nothing to take out */
    expr *exponent; /* free of x; may hold parameters ("nu") or be any rational */
    slong den;      /* step of the powers: 1/den */
    slong log_power;
    coefficients c; /* c[0] != 0; a strand that is a finite sum beside others that are not is padded with zeros */
} strand;

typedef struct series {
    size_t count;
    strand *strands; /* distinct in (constant, exponent modulo 1/den, den, log_power) */
    bool terminates; /* f is exactly this finite sum (trailing zeros trimmed), no tail left out */
} series;

void series_init(series *s);
void series_clear(series *s);

/* The series of f at x -> 0+, each strand with `length` coefficients (fewer only when it terminates). x is a
 * symbol, positive; the other symbols are parameters with their facts. Coefficients may rest on conditions such as
 * "a != 0": these are returned in conditions (fresh array of EXPR_RELATION, free() it; may be NULL). A sum over
 * constants comes as several strands with rational coefficients where it can: log(2 + x) is log(2) * (1) and 1 *
 * (x/2 - x^2/8 ...), cos(1 + x) a strand of cos(1) and one of sin(1). The identity holds strand by strand and is
 * proved; leading terms of such strands never cancel, later ones are each other's business. ERROR_UNDECIDED when a
 * leading coefficient can be proved neither zero nor nonzero, or stays zero however far one looks.
 * ERROR_UNSUITABLE when f has no such expansion (the words name the subexpression: "exp(-1/x) is flat at x = 0",
 * an unknown function at a singular point, a sign of a parameter that decides the leading term is not known). */
tw_status series_at_zero(tw_engine *e, series *out, expr *f, expr *x, slong length, expr ***conditions,
                         size_t *condition_count);

/* Reversion and composition for local changes of variable: with p(x) = p0 * x^mu * (1 + ...), the series in t of
 *     G(t) = q(x(t)) * dx/dt,   t = p(x),   x(t) the branch with x > 0 for t > 0
 * (DLMF 2.3.16, 2.3.18: g_k = (1/mu) [x^k] ...). p and q are functions of x; p0 > 0 by the facts. Same result
 * form, in t. */
tw_status series_branch(tw_engine *e, series *out, expr *p, expr *q, expr *x, slong length, expr ***conditions,
                        size_t *condition_count);

#endif
