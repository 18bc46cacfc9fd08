/* Termwise as a library: asymptotic expansions of integrals with exact coefficients and proved remainders. */
#ifndef TERMWISE_H
#define TERMWISE_H

typedef struct tw_engine tw_engine;

/* A new engine with nothing declared, or NULL when memory is out. Free it with tw_engine_free. */
tw_engine *tw_engine_new(void);
void tw_engine_free(tw_engine *e);

#endif
