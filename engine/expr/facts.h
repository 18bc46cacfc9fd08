/* Facts about symbols: what the user declared (`given`), took as true (`grant`), and which parameter is large or small.
 * This room only stores them and answers from them by simple reasoning (intervals with rational ends); deciding a
 * condition with ball arithmetic is engine/ball/decide.h. */
#ifndef TW_EXPR_FACTS_H
#define TW_EXPR_FACTS_H

#include "engine/expr/expr.h"

typedef enum answer { ANSWER_NO = -1, ANSWER_UNKNOWN = 0, ANSWER_YES = 1 } answer;

/* How a condition is known; the words of language.md. */
typedef enum condition_label { CONDITION_GIVEN, CONDITION_PROVED, CONDITION_GRANTED, CONDITION_OPEN } condition_label;
const char *condition_label_word(condition_label l);

/* None; s -> inf; n -> inf through the integers; h -> 0+ */
typedef enum large_kind { LARGE_NONE, LARGE_POSITIVE, LARGE_INTEGER, LARGE_SMALL } large_kind;

void facts_init(tw_engine *e);
void facts_clear(tw_engine *e);

/* A copy of all facts, and the way back to it: what was known since is forgotten. facts_restore and facts_discard take
 * the copy over. */
struct facts *facts_copy(tw_engine *e);
void facts_restore(tw_engine *e, struct facts *copy);
void facts_discard(struct facts *copy);

/* Declares the large (or small) parameter; it is positive from then on. A later declaration replaces an earlier one.
 * sector: the closed or open range of its argument as typed, or NULL, NULL. */
tw_status facts_set_large(tw_engine *e, expr *symbol, large_kind kind, expr *arg_from, expr *arg_to);
large_kind facts_large(tw_engine *e, expr **symbol); /* the kind, and the symbol unless LARGE_NONE */
bool facts_sector(tw_engine *e, expr **arg_from, expr **arg_to); /* false: none was declared */

/* Adds a condition (EXPR_RELATION). ERROR_VALUE when it contradicts what is known. */
tw_status facts_add(tw_engine *e, expr *condition, condition_label label /* GIVEN or GRANTED */);
size_t facts_count(tw_engine *e);
expr *facts_at(tw_engine *e, size_t k, condition_label *label);
void facts_forget(tw_engine *e, expr *symbol); /* all facts that mention the symbol */

/* The best rational interval known for a real symbol from facts about it alone (and from the declaration of the large
 * parameter): lower/upper are set when the return has bit 1/2; bits 4/8: that end is excluded (open). */
int facts_interval(tw_engine *e, expr *symbol, fmpq_t lower, fmpq_t upper);
bool facts_is_complex(tw_engine *e, expr *symbol);
bool facts_is_integer(tw_engine *e, expr *symbol);

#endif
