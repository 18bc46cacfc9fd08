/* Did you mean: the nearest of some names to one that means nothing. */
#ifndef TW_LANG_SUGGEST_H
#define TW_LANG_SUGGEST_H

#include <stddef.h>

/* A search under way: offer it each name that would be right, then ask for the best. */
typedef struct suggestion {
    const char *wrong;
    const char *best;  /* the nearest so far, or NULL when none is near */
    size_t distance;   /* in halves of a letter */
} suggestion;

void suggestion_init(suggestion *s, const char *wrong);
/* name must outlive the suggestion. A name is near when few letters were mistaken, left out, added or swapped: at
 * most one in three begun; letters that differ in case only count half. A name of one or two letters is near in
 * another case only. */
void suggestion_offer(suggestion *s, const char *name);

#endif
