/* An arena: memory that is given piece by piece and taken back all at once. */
#ifndef TW_BASE_ARENA_H
#define TW_BASE_ARENA_H

#include <stddef.h>

struct arena_block;
typedef struct arena {
    struct arena_block *blocks; /* the newest first */
    struct arena_block *spare;  /* one block kept after a release, so that marks at a block's end stay cheap */
    size_t bytes;               /* handed out in all */
} arena;

void arena_init(arena *a);
void arena_clear(arena *a);

/* bytes of memory, aligned for any object; never NULL (see base_alloc). */
void *arena_alloc(arena *a, size_t bytes);
char *arena_copy(arena *a, const char *words, size_t length); /* adds the closing NUL */

/* A stack's use of an arena: what was handed out after the mark is taken back by the release. */
typedef struct arena_place {
    struct arena_block *block;
    size_t used, bytes;
} arena_place;

arena_place arena_mark(const arena *a);
void arena_release(arena *a, arena_place place);

#endif
