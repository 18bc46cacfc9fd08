/* Termwise as a library: asymptotic expansions of integrals with exact coefficients and proved remainders, without the
 * language. This is the one public header; link with `pkg-config --libs termwise`.
 *
 * An engine holds all state; engines are independent of one another, and one engine is used by one thread at a time.
 * Functions that can fail return NULL or a value other than 0; tw_error_words() then says why. Expressions live as long as
 * their engine and are never freed one by one; everything else has its own _free. Passing NULL for an expression gives NULL
 * back, so a chain of constructors needs one check at its end.
 *
 *     tw_engine *e = tw_engine_new();
 *     tw_expr *s = tw_symbol(e, "s"), *x = tw_symbol(e, "x");
 *     tw_large(e, s);
 *     tw_expr *body = tw_mul(e, tw_call(e, "exp", (tw_expr *[]){tw_neg(e, tw_mul(e, s, x))}, 1), ...);
 *     tw_expansion *a = tw_expand(e, tw_integral(e, x, tw_rational(e, "0"), tw_inf(e), body), 8, NULL);
 *     if (!a) fprintf(stderr, "%s\n", tw_error_words(e));
 */
#ifndef TERMWISE_H
#define TERMWISE_H

#include <stddef.h>

typedef struct tw_engine tw_engine;
typedef const struct expr tw_expr;
typedef struct tw_expansion tw_expansion;

/* ---- the engine ---- */

/* A new engine with nothing declared, or NULL when memory is out. Free it with tw_engine_free. */
tw_engine *tw_engine_new(void);
void tw_engine_free(tw_engine *e);

/* Why the last call on this engine failed, in plain English, or "" when it did not; and the kind of error as one word
 * ("value", "unsuitable", "divergent", "precision", "time", ...). Valid until the next call. */
const char *tw_error_words(const tw_engine *e);
const char *tw_error_kind(const tw_engine *e);

/* Limits of every later call: seconds (0: none) and MiB of resident memory of the process (0: none). */
void tw_set_limits(tw_engine *e, double seconds, size_t mib);

/* Stops the call that is running; may be called from a signal handler or another thread. */
void tw_interrupt(tw_engine *e);

/* ---- expressions ---- */

tw_expr *tw_rational(tw_engine *e, const char *words); /* "3", "-7/2" */
tw_expr *tw_symbol(tw_engine *e, const char *name);    /* a real parameter or variable */
tw_expr *tw_pi(tw_engine *e);
tw_expr *tw_imaginary_unit(tw_engine *e);
tw_expr *tw_inf(tw_engine *e);
tw_expr *tw_add(tw_engine *e, tw_expr *a, tw_expr *b);
tw_expr *tw_sub(tw_engine *e, tw_expr *a, tw_expr *b);
tw_expr *tw_mul(tw_engine *e, tw_expr *a, tw_expr *b);
tw_expr *tw_div(tw_engine *e, tw_expr *a, tw_expr *b);
tw_expr *tw_neg(tw_engine *e, tw_expr *a);
tw_expr *tw_pow(tw_engine *e, tw_expr *base, tw_expr *exponent);
/* A function of the language by its name ("exp", "Gamma", "J", ...) with n arguments. */
tw_expr *tw_call(tw_engine *e, const char *function, tw_expr *const *arguments, size_t n);
/* The integral of body over variable from `from` to `to`; the variable is bound in it. */
tw_expr *tw_integral(tw_engine *e, tw_expr *variable, tw_expr *from, tw_expr *to, tw_expr *body);

/* The expression as text of the language; free() it. */
char *tw_text(tw_engine *e, tw_expr *a);

/* ---- declarations ---- */

int tw_large(tw_engine *e, tw_expr *symbol);                     /* symbol -> +inf */
int tw_small(tw_engine *e, tw_expr *symbol);                     /* symbol -> 0+ */
int tw_given_less(tw_engine *e, tw_expr *left, tw_expr *right);  /* the fact left < right */
int tw_given_integer(tw_engine *e, tw_expr *symbol);

/* ---- expansions ---- */

/* `terms` nonzero terms of each contribution. method: "watson", "parts", "moments", or NULL to let the engine choose. */
tw_expansion *tw_expand(tw_engine *e, tw_expr *integral, long terms, const char *method);
void tw_expansion_free(tw_expansion *a);

/* Term n (from 0, in order of size) of the dominant contribution as an exact expression, prefactor included; NULL beyond. */
tw_expr *tw_term(tw_engine *e, tw_expansion *a, long n);

/* The expansion as a file of another program would want it: format "json", "csv" or "text". Free() it. */
char *tw_write(tw_engine *e, tw_expansion *a, const char *name, const char *format);

/* A number: decimals that name a ball which holds the value, and how it is known. */
typedef struct tw_value {
    char *mid, *radius;           /* of the real part */
    char *mid_imaginary, *radius_imaginary;
    const char *label;            /* "exact", "proved", "conditional", "estimated", "unknown" */
    long terms;                   /* terms kept, or -1 */
} tw_value;
void tw_value_clear(tw_value *v);

/* The expansion at a point: symbols[k] = values[k] for the large parameter and all others. digits: relative decimal digits
 * wanted, 0 for the best the expansion gives. 0 on success. */
int tw_evaluate(tw_engine *e, tw_value *out, tw_expansion *a, tw_expr *const *symbols, tw_expr *const *values, size_t n,
                long digits);

/* Certified quadrature of an expression with integrals, no expansion. digits >= 1. 0 on success. */
int tw_quadrature(tw_engine *e, tw_value *out, tw_expr *f, tw_expr *const *symbols, tw_expr *const *values, size_t n,
                  long digits);

#endif
