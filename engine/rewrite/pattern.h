/* Patterns: a canonical expression some of whose symbols are pattern variables, and what it matches.
 *
 * A match gives every variable a value so that the pattern with the values put in IS the subject, as canonical
 * expressions; each match is verified so before it is reported. Matching is by form, not by meaning: 2*x + 2*y is no
 * instance of 2*a.
 *
 *  - Sums and products match in any order. Asked for with a rest, a sum or product matches part of the subject's terms
 *    or factors and the others are kept.
 *  - A variable may take the neutral value of its place: 1 as a factor, 1 or 0 as an exponent (a factor x^n matches
 *    where there is no power of x), 0 as a term.
 *  - A variable holds no variable that is bound inside the pattern (integral, sum, root). A pattern function f(x) does,
 *    in the bound variables it is written with, each once (Miller patterns); f stands then for the function. Its other
 *    occurrences, f(0) or f(a), must fit.
 *  - A rational coefficient goes as a whole to one variable. Where a product's parts are all variables (2*a as an
 *    argument) and where a sum's are (a + 1), the number must show in the subject: a positive whole multiple, and a
 *    number of the same sign that is not smaller; so sin(2*a) matches sin(6*y) and not sin(y), and Gamma(a + 1) matches
 *    Gamma(y + 2) and not Gamma(y). In exponents, and beside a part that is no variable, any number will do: x^(n - 1)
 *    matches x^4.
 *
 * Order of matches: parts that are no bare variables first, those without variables before those that may be absent,
 * else in canonical order, each trying the subject's parts in canonical order; then the parts left over, in canonical
 * order, are given each to the first variable (in the order of the list of variables) that may hold it, the rest being
 * the last taker; later choices change first. The order is stable. */
#ifndef TW_REWRITE_PATTERN_H
#define TW_REWRITE_PATTERN_H

#include "engine/expr/expr.h"

typedef struct pattern pattern;

/* A symbol of the pattern that stands for a value (arity 0), or for a function of so many arguments (EXPR_APPLY). The
 * symbols should be fresh: a symbol of the same name in a subject is then another one. */
typedef struct pattern_variable {
    expr *symbol;
    size_t arity;
} pattern_variable;

enum { PATTERN_VARIABLE_LIMIT = 64 };

/* What the variables of a pattern stand for. */
typedef struct match {
    const pattern *of;
    expr *const *values; /* of variable k: its value; of a function its body in pattern_parameters(of, k) */
    const struct matcher *by; /* private */
} match;

/* Called for each match in turn; true: no more are wanted. The match lives for the call only. */
typedef bool match_visitor(void *host, const match *m);

/* Compiles form. NULL with ERROR_VALUE when a variable of the list does not occur in it, a pattern function has no
 * occurrence with different bound variables as its arguments, is differentiated in it, has another number of arguments
 * than declared, or when the whole pattern is one variable. name (of the rule, may be NULL) is for errors. */
pattern *pattern_new(tw_engine *e, const char *name, expr *form, const pattern_variable *variables, size_t count);
void pattern_free(pattern *p);
expr *pattern_form(const pattern *p);
size_t pattern_variables(const pattern *p, const pattern_variable **list);
/* The symbols that stand for the arguments of function k in its body. */
expr *const *pattern_parameters(const pattern *p, size_t k);

/* All matches of the whole subject, or with_rest also of a part of a sum or product. ERROR_UNDECIDED, naming the rule,
 * when more than a fixed number of trials was needed. *found (may be NULL): was there one? */
tw_status pattern_match(tw_engine *e, const pattern *p, expr *subject, bool with_rest, match_visitor *visit, void *host,
                        bool *found);

/* form (pattern, replacement, condition) with the match's values put in, capture-free, pattern functions applied and
 * their derivatives carried out. NULL with the error set. */
expr *match_instance(tw_engine *e, const match *m, expr *form);
/* What the whole subject becomes when the instance in it is replaced: the replacement joined with what was kept. */
expr *match_join(tw_engine *e, const match *m, expr *replacement);
/* The same as match_instance without a match: values of the variables, bodies of functions in `parameters[k]` (NULL for a plain one). */
expr *pattern_instance(tw_engine *e, expr *form, const pattern_variable *variables, size_t count, expr *const *values,
                       expr *const *const *parameters);

#endif
