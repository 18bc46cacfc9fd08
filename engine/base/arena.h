/* An arena: memory that is given piece by piece and taken back all at once. */
#ifndef TW_BASE_ARENA_H
#define TW_BASE_ARENA_H

#include <stddef.h>

struct arena_block;
typedef struct arena {
    struct arena_block *blocks;
    size_t bytes; /* handed out in all */
} arena;

void arena_init(arena *a);
void arena_clear(arena *a);

/* bytes of memory, aligned for any object; never NULL (see base_alloc). */
void *arena_alloc(arena *a, size_t bytes);
char *arena_copy(arena *a, const char *words, size_t length); /* adds the closing NUL */

#endif
