/* Memory that is given piece by piece and taken back all at once, or down to a mark. Knows nothing of what lies in it.
 * Its one idea: a chain of blocks, the newest first, of which only the newest has room. */
#include "engine/base/arena.h"

#include <stdalign.h>
#include <stdlib.h>
#include <string.h>

#include "engine/base/engine.h"
#include "engine/base/flint.h"

enum { ARENA_BLOCK = 1 << 16 };

struct arena_block {
    struct arena_block *before;
    size_t size, used;
    alignas(max_align_t) char bytes[];
};

void arena_init(arena *a)
{
    *a = (arena){0};
}

void arena_clear(arena *a)
{
    while (a->blocks) {
        struct arena_block *before = a->blocks->before;
        free(a->blocks);
        a->blocks = before;
    }
    free(a->spare);
    *a = (arena){0};
}

static struct arena_block *block_take(arena *a, size_t bytes)
{
    if (a->spare && a->spare->size >= bytes) {
        struct arena_block *b = a->spare;
        a->spare = NULL;
        return b;
    }
    /* While a test counts allocations every piece is a block of its own, so that each one can be made to fail. */
    size_t size = bytes > ARENA_BLOCK || edge_counts_allocations() ? bytes : ARENA_BLOCK;
    if (size > SIZE_MAX - sizeof(struct arena_block))
        edge_leave_memory();
    struct arena_block *b = base_alloc(sizeof(struct arena_block) + size);
    b->size = size;
    return b;
}

void *arena_alloc(arena *a, size_t bytes)
{
    const size_t unit = alignof(max_align_t);
    if (bytes > SIZE_MAX - unit)
        edge_leave_memory();
    bytes = (bytes + unit - 1) / unit * unit;
    if (!a->blocks || a->blocks->size - a->blocks->used < bytes) {
        struct arena_block *b = block_take(a, bytes);
        b->used = 0;
        b->before = a->blocks;
        a->blocks = b;
    }
    void *piece = a->blocks->bytes + a->blocks->used;
    a->blocks->used += bytes;
    a->bytes += bytes;
    return piece;
}

char *arena_copy(arena *a, const char *words, size_t length)
{
    char *copy = arena_alloc(a, length + 1);
    memcpy(copy, words, length);
    copy[length] = 0;
    return copy;
}

arena_place arena_mark(const arena *a)
{
    return (arena_place){a->blocks, a->blocks ? a->blocks->used : 0, a->bytes};
}

void arena_release(arena *a, arena_place place)
{
    while (a->blocks != place.block) {
        struct arena_block *newest = a->blocks;
        a->blocks = newest->before;
        if (!a->spare || a->spare->size < newest->size) {
            free(a->spare);
            a->spare = newest;
        } else {
            free(newest);
        }
    }
    if (a->blocks)
        a->blocks->used = place.used;
    a->bytes = place.bytes;
}
