/* Random admissible values for a rule's variables: the corners first, then the open country. */
#ifndef TW_REWRITE_SAMPLE_H
#define TW_REWRITE_SAMPLE_H

#include "engine/rewrite/rule.h"

typedef struct sampler sampler;

/* The symbols that get values are the rule's variables and every other free symbol of its sides and conditions (which
 * the engine's facts then bind, too). seed: the same seed gives the same samples. */
sampler *sampler_new(tw_engine *e, const rule *r, uint64_t seed);
void sampler_free(sampler *s);

/* The next sample that meets all conditions. TW_OK with false: none was found within a bounded search. */
tw_status sampler_next(sampler *s, bool *found);

/* A side or condition of the rule at the sample; NULL where it has no value there (the error is forgiven unless it is
 * of the budget). */
expr *sampler_put(sampler *s, expr *form);

/* "a = 3/2, n = -1/2, f(x) = exp(-x^2)" */
void sampler_describe(sampler *s, text *out);

#endif
