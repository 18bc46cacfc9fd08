/* The expression: an immutable node, interned, so that equal expressions are equal pointers. Nodes live as long as the
 * engine. Sums and products are flat, sorted, with exact rational coefficients collected; nothing is expanded or
 * factored. Bound variables are nameless inside (de Bruijn indices) and get their names back when printed or opened.
 *
 * Every constructor takes NULL for an argument and then returns NULL, so a chain of constructors is checked once at its
 * end: NULL means that the engine's error is set (too deep, a number too large, division by zero, out of budget).
 *
 * Canonical form, on top of flat and sorted (what the constructors guarantee):
 *   - 0*x = 0 and x^0 = 1 (as formal rules: generic values), x^1 = x, 1^x = 1; numbers folded exactly;
 *   - like terms collected: 2*x + x = 3*x; like factors collected: x^a * x^b = x^(a+b);
 *   - (x^a)^b = x^(a*b) and (x*y)^b = x^b * y^b only where true on the principal branch for all values: b an integer,
 * or
 *     the factor a positive number;  sqrt(u) is u^(1/2), 1/u is u^-1, n! is Gamma(n + 1), -u is (-1)*u;
 *   - rational powers of positive rationals are reduced: 8^(1/3) = 2, 12^(1/2) = 2*3^(1/2), (1/2)^(-1/2) = 2^(1/2);
 *     i^n and integer powers of i folded; a number times a sum is not distributed, except -1 and other numbers over
 *     a sum inside a sum (2*(x + y) stays a product; x + 2*(y + 1) stays as it is);
 *   - exact values of functions at exact arguments: exp(0) = 1, log(1) = 0, sin(0) = 0, Gamma(5) = 24, Gamma(1/2) =
 *     sqrt(pi), exp(log(x)) = x, log(exp(x)) only for x a real number; even and odd functions of a leading minus sign;
 *   - derivatives are carried out; `EXPR at x = v` substitutes. */
#ifndef TW_EXPR_EXPR_H
#define TW_EXPR_EXPR_H

#include <stdbool.h>

#include "engine/base/engine.h"
#include "engine/base/flint.h"
#include "engine/base/text.h"
#include "engine/expr/function.h"

typedef enum expr_kind {
    EXPR_NUMBER,    /* an exact rational */
    EXPR_CONSTANT,  /* pi, i, inf, euler_constant */
    EXPR_SYMBOL,    /* a name */
    EXPR_BOUND,     /* a bound variable: how many binders up (0 = innermost) */
    EXPR_SUM,       /* two or more terms; a number first, if any */
    EXPR_PRODUCT,   /* two or more factors; a number first, if any */
    EXPR_POWER,     /* base, exponent */
    EXPR_CALL,      /* a function of the table, its arguments */
    EXPR_INTEGRAL,  /* from, to, body (under the binder) */
    EXPR_CONTOUR,   /* points of the path ..., last the body (under the binder) */
    EXPR_SUMMATION, /* from, to, body (under the binder) */
    EXPR_PIECEWISE, /* condition, value, condition, value, ..., the value otherwise */
    EXPR_ROOT,      /* polynomial (under the binder), the value near which the root lies */
    EXPR_DIRECTION, /* inf(theta): theta */
    EXPR_RELATION,  /* left, right; the relation in `relation` */
    EXPR_APPLY,     /* a rule's pattern function: its symbol, n arguments, n orders of derivatives (numbers) */
} expr_kind;

typedef enum expr_constant { CONSTANT_PI, CONSTANT_I, CONSTANT_INF, CONSTANT_EULER } expr_constant;

typedef enum expr_relation {
    RELATION_LESS, RELATION_LESS_EQUAL, RELATION_EQUAL, RELATION_NOT_EQUAL, /* > and >= are turned round */
    RELATION_INTEGER, RELATION_REAL, RELATION_COMPLEX /* of the left side; the right side equals it */
} expr_relation;

typedef struct expr expr_node;
typedef const struct expr expr;

struct expr {
    uint8_t kind;          /* expr_kind */
    uint8_t fresh : 1;     /* EXPR_SYMBOL: made by expr_fresh */
    uint8_t infinite : 1;  /* inf, or a sum, product or power that holds it */
    uint16_t depth;        /* 1 for a leaf; at most EXPR_DEPTH_LIMIT */
    uint32_t hash;
    uint32_t loose;        /* 1 + the greatest de Bruijn index that points outside, 0 when closed */
    uint32_t count;        /* children */
    uint64_t serial;       /* order of creation */
    uint64_t size;         /* nodes counted as a tree, saturating at 2^63 */
    uint64_t names;        /* one bit of 64 for each free symbol: a zero says surely that a symbol is absent */
    union {
        fmpq number;                  /* EXPR_NUMBER */
        expr_constant constant;
        const char *name;             /* EXPR_SYMBOL; for a binder the name to print if it is free there */
        uint32_t index;               /* EXPR_BOUND */
        function_id function;         /* EXPR_CALL */
        expr_relation relation;
    } is;
    expr *args[];
};

enum { EXPR_DEPTH_LIMIT = 2000 };

/* Sets up and takes down the table of nodes (termwise.c). */
void expr_table_init(tw_engine *e);
void expr_table_clear(tw_engine *e);

/* ---- constructors ---- */
expr *expr_int(tw_engine *e, slong n);
expr *expr_frac(tw_engine *e, slong p, slong q);               /* q != 0 */
expr *expr_fmpz(tw_engine *e, const fmpz_t n);
expr *expr_fmpq(tw_engine *e, const fmpq_t q);
expr *expr_constant_of(tw_engine *e, expr_constant c);
expr *expr_symbol(tw_engine *e, const char *name);
expr *expr_fresh(tw_engine *e, const char *hint); /* a new symbol unlike any other; prints as hint or hint1 ... */
expr *expr_sum(tw_engine *e, expr *const *terms, size_t n);    /* n >= 0 */
expr *expr_product(tw_engine *e, expr *const *factors, size_t n);
expr *expr_add(tw_engine *e, expr *a, expr *b);
expr *expr_sub(tw_engine *e, expr *a, expr *b);
expr *expr_neg(tw_engine *e, expr *a);
expr *expr_mul(tw_engine *e, expr *a, expr *b);
expr *expr_div(tw_engine *e, expr *a, expr *b);
expr *expr_pow(tw_engine *e, expr *base, expr *exponent);
expr *expr_sqrt(tw_engine *e, expr *a);
expr *expr_call(tw_engine *e, function_id f, expr *const *args, size_t n);
/* a with other children (a->count of them), canonical again: for walks that change what stands inside. */
expr *expr_rebuild(tw_engine *e, expr *a, expr *const *args);
expr *expr_call1(tw_engine *e, function_id f, expr *a);
expr *expr_integral(tw_engine *e, expr *variable, expr *from, expr *to, expr *body); /* body holds the symbol free */
expr *expr_contour(tw_engine *e, expr *variable, expr *const *points, size_t n, expr *body);
expr *expr_summation(tw_engine *e, expr *variable, expr *from, expr *to, expr *body);
expr *expr_piecewise(tw_engine *e, expr *const *conditions, expr *const *values, size_t n, expr *otherwise);
expr *expr_root(tw_engine *e, expr *variable, expr *polynomial, expr *near);
expr *expr_direction(tw_engine *e, expr *theta);
expr *expr_relation_of(tw_engine *e, expr_relation r, expr *left, expr *right);
/* f(arguments) for a function that is only a name, the symbol f; it stands in rules and nowhere else. orders: how often
 * it is differentiated in each argument, numbers; NULL: not at all. n >= 1. */
expr *expr_apply(tw_engine *e, expr *f, expr *const *arguments, expr *const *orders, size_t n);
size_t expr_apply_arity(expr *a); /* of an EXPR_APPLY */

/* The body of a binder with its variable replaced by `value` (often an expr_fresh or expr_symbol). Capture-free. */
expr *expr_open(tw_engine *e, expr *binder, expr *value);
/* The name a binder's variable had when it was typed. */
const char *expr_binder_name(expr *binder);

/* ---- questions (never fail) ---- */
bool expr_is_zero(expr *a);
bool expr_is_one(expr *a);
bool expr_is_int(expr *a, slong n);
bool expr_is_number(expr *a);                           /* an exact rational */
bool expr_is_constant(expr *a, expr_constant c);
bool expr_is_inf(expr *a);                              /* inf */
bool expr_is_minus_inf(expr *a);                        /* -inf */
bool expr_is_call(expr *a, function_id f);
bool expr_has(expr *a, expr *symbol);                   /* symbol occurs free in a */
bool expr_is_closed_value(expr *a);                     /* no symbols at all: a fixed number */
const fmpq *expr_number(expr *a);                       /* of an EXPR_NUMBER */
int expr_order(expr *a, expr *b);                       /* the canonical total order: <0, 0, >0 */
uint64_t expr_size(expr *a);                            /* nodes counted as a tree, saturating at 2^63 */
/* Distinct free symbols, ordered by name, into a fresh array (free() it); returns how many. */
size_t expr_symbols(expr *a, expr ***symbols);

/* The parts of a sum (its terms) or a product (its factors); anything else is its own only part. */
size_t expr_terms(expr *const *a_address, expr *const **parts);
size_t expr_factors(expr *const *a_address, expr *const **parts);
/* Base and exponent: x^a gives x, a; anything else itself, 1. */
void expr_as_power(tw_engine *e, expr *a, expr **base, expr **exponent);
/* The rational coefficient in front and the rest: 3*x*y gives 3, x*y; a number gives itself, 1. */
void expr_as_coefficient(tw_engine *e, expr *a, fmpq_t coefficient, expr **rest);

/* ---- rewriting by nature ---- */
/* Substitution is capture-free; of several symbols it is simultaneous. */
expr *expr_substitute(tw_engine *e, expr *a, expr *symbol, expr *value);
expr *expr_substitute_all(tw_engine *e, expr *a, expr *const *symbols, expr *const *values, size_t n);
/* Also under integral signs, ends that depend on the symbol included. ERROR_VALUE where a derivative has no name in the
 * language: of a Bessel function in its order, of zeta, ... */
expr *expr_derivative(tw_engine *e, expr *a, expr *symbol);
/* Products over sums and natural powers of sums multiplied out; not in arguments, denominators or under binders. */
expr *expr_expand(tw_engine *e, expr *a);
/* Normal form for the methods, valid for x > 0 symbols in `positive`: exponentials merged into one exp, (c*x)^r split
 * for positive c and x, log of products of positives split, powers of x collected. positive may be NULL when n is 0. */
expr *expr_normal(tw_engine *e, expr *a, expr *const *positive, size_t n);
/* a as a polynomial in symbol: coefficients (free of symbol) into a fresh array of *degree + 1 (free() it). TW_ERROR
 * without an engine error set when a is no polynomial of degree <= limit. */
tw_status expr_polynomial(tw_engine *e, expr *a, expr *symbol, slong limit, expr ***coefficients, slong *degree);

/* ---- printing; what is printed parses back to the same expression ---- */
void expr_print(tw_engine *e, text *out, expr *a);
char *expr_text(tw_engine *e, expr *a); /* the caller frees */

#endif
