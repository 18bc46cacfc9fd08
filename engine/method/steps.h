/* The steps of the built-in methods by name, and the methods as passes over them. A step that rewrites an expression can
 * stand in a user's pass; one that computes a series works inside its method only. */
#ifndef TW_METHOD_STEPS_H
#define TW_METHOD_STEPS_H

#include "engine/method/method.h"
#include "engine/rewrite/pass.h"

/* The built-in step of this name, NULL when there is none. Its run is NULL when it works inside its method only. */
const pass_step *steps_find(const char *name);
/* All of them; *count. */
const pass_step *steps_table(size_t *count);

/* A method as a pass over named steps. */
typedef struct method_pass {
    const char *method;    /* "watson" */
    const char *strategy;  /* in the words of the language: "turn_path or mirror_path then ..." */
} method_pass;

/* NULL: no such method. */
const method_pass *method_pass_find(const char *name);

/* The method whose name ends the pass, or NULL: `tidy then watson` is to be expanded by watson. */
const char *pass_method(const pass *p);

#endif
