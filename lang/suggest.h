/* Did you mean: the nearest of some names to one that means nothing. */
#ifndef TW_LANG_SUGGEST_H
#define TW_LANG_SUGGEST_H

#include <stddef.h>

/* A search under way: offer it each name that would be right, then ask for the best. */
typedef struct suggestion {
    const char *wrong;
    const char *best;  /* the nearest so far, or NULL when none is near */
    size_t distance;
} suggestion;

void suggestion_init(suggestion *s, const char *wrong);
/* name must outlive the suggestion. A name is near when few letters were mistaken, left out, doubled or swapped: at most one in
 * three; letters that differ in case only count half. */
void suggestion_offer(suggestion *s, const char *name);

#endif
