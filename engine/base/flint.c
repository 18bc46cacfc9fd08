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

enum { EDGE_MEMORY = 1, EDGE_FLINT, EDGE_TIME, EDGE_INTERRUPT, EDGE_LIMIT };

static _Thread_local edge *innermost;
static void (*told_of_abort)(void); /* the host's, beside FLINT's own process-wide hook */

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
    if (told_of_abort) told_of_abort();
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

/* ---- allocators for a program of one's own ---- */

/* How long a library call may go on past the deadline, or past an interrupt, before it is left at its next allocation: the
 * loops of the engine, which end in good order, shall come first. */
static const double patience = 0.3;

enum { WATCH_EVERY = 64, WATCH_BYTES = 1 << 15, MEMORY_EVERY = 1 << 24 };

static void watch(size_t bytes)
{
    static _Thread_local unsigned calls;
    static _Thread_local size_t taken;
    static _Thread_local double interrupt_seen; /* 0: none */
    if (!innermost) return;
    taken += bytes;
    if (++calls % WATCH_EVERY != 0 && bytes < WATCH_BYTES) return;
    tw_engine *e = innermost->engine;
    if (e->deadline == 0 && e->memory_limit == 0 && !e->interrupted) {
        interrupt_seen = 0;
        return;
    }
    double now = budget_clock();
    if (!e->interrupted) interrupt_seen = 0;
    else if (interrupt_seen == 0) interrupt_seen = now;
    else if (now > interrupt_seen + patience) edge_leave(EDGE_INTERRUPT);
    if (e->deadline != 0 && now > e->deadline + patience) edge_leave(EDGE_TIME);
    if (e->memory_limit != 0 && taken > MEMORY_EVERY) {
        taken = 0;
        if (!budget_memory_ok(e)) edge_leave(EDGE_LIMIT);
    }
}

static void *watched_alloc(size_t bytes)
{
    watch(bytes);
    return base_resize(NULL, bytes);
}

static void *watched_calloc(size_t count, size_t bytes_each)
{
    if (bytes_each && count > SIZE_MAX / bytes_each) edge_leave_memory();
    watch(count * bytes_each);
    return memset(base_resize(NULL, count * bytes_each), 0, count * bytes_each);
}

/* GMP's caller keeps the old piece until this returns; FLINT's may have noted the new size already, so only GMP's is left
 * in time. */
static void *watched_gmp_resize(void *old, size_t old_bytes, size_t bytes)
{
    if (bytes > old_bytes) watch(bytes);
    return base_resize(old, bytes);
}

static void gmp_free(void *old, size_t bytes)
{
    (void)bytes;
    free(old);
}

void edge_install_allocators(void (*on_abort)(void))
{
    told_of_abort = on_abort;
    mp_set_memory_functions(watched_alloc, watched_gmp_resize, gmp_free);
    __flint_set_memory_functions(watched_alloc, watched_calloc, base_resize, free);
}

/* ---- the edge ---- */

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
    if (why != 0) {
        arena_release(&e->scratch, scratch);
        e->jumps++;
        flint_cleanup(); /* a constant that was being computed may stand half made in FLINT's memory of constants */
    }
    if (why == EDGE_MEMORY)
        return engine_fail(e, ERROR_MEMORY, "memory is out");
    if (why == EDGE_FLINT)
        return engine_fail(e, ERROR_INTERNAL, "the arithmetic library gave up (memory is out, or a size is too large)");
    if (why == EDGE_TIME)
        return engine_fail(e, ERROR_TIME, "the time limit has passed");
    if (why == EDGE_INTERRUPT)
        return engine_fail(e, ERROR_INTERRUPT, "interrupted");
    if (why == EDGE_LIMIT)
        return engine_fail(e, ERROR_MEMORY, "the memory limit of %zu MiB is exceeded", e->memory_limit >> 20);
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
