/* A discrimination index: which of many rules can match at the root of an expression, without trying each. */
#ifndef TW_REWRITE_INDEX_H
#define TW_REWRITE_INDEX_H

#include "engine/rewrite/rule.h"

typedef struct rule_index rule_index;

/* Of the rules in this order; borrows them. */
rule_index *index_new(tw_engine *e, rule *const *rules, size_t count);
void index_free(rule_index *x);

/* The numbers of the rules that may match at the root of the subject, or at a part of it when it is a sum or product,
 * in rising order; how many. No rule that matches is left out. The list is valid until the next call. */
size_t index_find(rule_index *x, expr *subject, const uint32_t **list);

#endif
