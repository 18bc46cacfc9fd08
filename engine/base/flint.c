/* The edge: the one place where a failure that cannot be returned (memory is out, FLINT gives up) becomes an error
 * value. Knows no mathematics. Its one idea: engine_protect() leaves a jump buffer on a chain of this thread, and both
 * FLINT's process-wide abort hook and base_alloc() jump to the innermost one. What was on the engine's scratch stack
 * is taken back; FLINT objects alive at the jump are lost, so sizes and divisors are checked before FLINT sees them. */
#include "engine/base/flint.h"

#include <pthread.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "engine/base/engine.h"

typedef struct edge {
    struct edge *outer;
    tw_engine *engine;
    jmp_buf back;
} edge;

enum { EDGE_MEMORY = 1, EDGE_FLINT = 2 };

static _Thread_local edge *innermost;

static void edge_leave(int why) __attribute__((noreturn));

static void edge_leave(int why)
{
    if (!innermost)
        abort();
    longjmp(innermost->back, why);
}

void edge_leave_memory(void)
{
    edge_leave(EDGE_MEMORY);
}

static void hook_abort(void) __attribute__((noreturn));

static void hook_abort(void)
{
    edge_leave(EDGE_FLINT);
}

static void hook_set(void)
{
    flint_set_abort(hook_abort);
}

void flint_hook_install(void)
{
    static pthread_once_t once = PTHREAD_ONCE_INIT;
    pthread_once(&once, hook_set);
}

int edge_counts_allocations(void)
{
    return innermost && innermost->engine->allocations_left >= 0;
}

int edge_allocation_fails(void)
{
    if (!edge_counts_allocations())
        return 0;
    if (innermost->engine->allocations_left == 0)
        return 1;
    innermost->engine->allocations_left--;
    return 0;
}

tw_status engine_protect(tw_engine *e, tw_status (*run)(void *host), void *host)
{
    edge here;
    here.outer = innermost;
    here.engine = e;
    const arena_place scratch = arena_mark(&e->scratch);
    volatile tw_status status = TW_ERROR;
    int why = setjmp(here.back);
    if (why == 0) {
        innermost = &here;
        status = run(host);
    }
    innermost = here.outer;
    if (why != 0)
        arena_release(&e->scratch, scratch);
    if (why == EDGE_MEMORY)
        return engine_fail(e, ERROR_MEMORY, "memory is out");
    if (why == EDGE_FLINT)
        return engine_fail(e, ERROR_INTERNAL, "the arithmetic library gave up (memory is out, or a size is too large)");
    return status;
}

void *base_alloc(size_t bytes)
{
    return base_resize(NULL, bytes);
}

void *base_resize(void *old, size_t bytes)
{
    void *memory = edge_allocation_fails() ? NULL : realloc(old, bytes ? bytes : 1);
    if (!memory)
        edge_leave_memory();
    return memory;
}

char *base_copy(const char *words)
{
    size_t length = strlen(words) + 1;
    return memcpy(base_alloc(length), words, length);
}
