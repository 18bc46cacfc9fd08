/* Inside the expression room: interning, the memo of walks, and rebuilding. Not for other rooms. */
#ifndef TW_EXPR_NODE_H
#define TW_EXPR_NODE_H

#include "engine/expr/expr.h"

/* Numbers with more bits than this are refused ("the number is too large"). */
enum { NUMBER_BITS_LIMIT = 1 << 24 };

/* The interned node with this content. args hold no NULL. tag: constant, index, function or relation. NULL with the
 * error set when the node would nest too deep. Does no canonical work. */
expr *node_make(tw_engine *e, expr_kind kind, unsigned tag, expr *const *args, size_t n);
/* The same for a binder; name is used when the node is new. */
expr *node_make_binder(tw_engine *e, expr_kind kind, const char *name, expr *const *args, size_t n);
expr *node_power(tw_engine *e, expr *base, expr *exponent);
expr *node_bound(tw_engine *e, uint32_t index);

bool node_is_binder(expr *a);
/* Is child k of n of a node of this kind under its binder? */
bool node_child_is_under(expr_kind kind, size_t n, size_t k);
/* Binder from a body that already holds the bound variable. */
expr *node_rebind(tw_engine *e, expr_kind kind, const char *name, expr *const *args, size_t n);

/* The bound indices of a that point outside raised by `by`. */
expr *node_shift(tw_engine *e, expr *a, uint32_t by);

/* A memo of a walk over a shared tree: (node, level) to a pointer. On the engine's scratch stack: the walk's entry
 * takes a mark before memo_init and releases it at the end; the recursion in between must not release marks of its own
 * around a memo_keep (the memo may have grown above them). */
typedef struct memo {
    tw_engine *engine;
    size_t count, room;
    struct memo_entry *entries;
} memo;

void memo_init(memo *m, tw_engine *e);
void *memo_find(const memo *m, expr *a, uint32_t level); /* NULL: unknown */
void memo_keep(memo *m, expr *a, uint32_t level, void *value);

/* As expr_symbols, into scratch memory of the caller's mark. */
size_t node_symbols(tw_engine *e, expr *a, expr ***symbols);

/* As expr_text, into scratch memory of the caller's mark. */
const char *node_text(tw_engine *e, expr *a);

expr *fail_too_large(tw_engine *e);
bool number_fits(const fmpq_t q);
/* number.c: base != 0 to a rational power, and to a power that is no number; (-1)^r. */
expr *number_power(tw_engine *e, const fmpq_t base, const fmpq_t exponent);
expr *number_power_symbolic(tw_engine *e, const fmpq_t base, expr *exponent);
expr *minus_one_power(tw_engine *e, const fmpq_t r);
/* A value known by its form to be a real number (closed, small, made of rationals, pi, euler_constant, positive
 * powers, exp of such ...). */
bool expr_is_real_constant(expr *a);
/* Known to be a positive real number by its form alone: rationals, pi, their products, real powers. */
bool expr_is_positive_constant(expr *a);
/* Is the leading coefficient negative? Of a sum: of its first term that is no number, so x - 1 is not. */
bool expr_leads_negative(expr *a);
/* The ball of a closed real value made of rationals, pi, euler_constant, their sums, products, powers, exp and log;
 * false for anything else. For the ends of intervals; full evaluation is engine/ball's. */
bool expr_enclose_constant(expr *a, arb_t value, slong prec);
/* Positive by the given facts (granted ones left aside) or as the large or small parameter? */
bool facts_symbol_is_positive(tw_engine *e, expr *symbol);
/* Real by its form and the declarations (names are real unless declared complex)? Bound variables count as real when
 * bound_real. Conservative: false means unknown, as it is for trees larger than REAL_SIZE_LIMIT. */
enum { REAL_SIZE_LIMIT = 10000 };
bool expr_is_real(tw_engine *e, expr *a, bool bound_real);

#endif
