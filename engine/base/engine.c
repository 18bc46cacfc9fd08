/* Errors and the budget of an engine. Knows no mathematics. Its one idea: the first error stays until it is forgiven,
 * so whoever finds a fault says it in its own words and everybody else only passes the status on. */
#include "engine/base/engine.h"

#include <stdarg.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

#include "engine/base/flint.h"

/* What an error says when there is no memory for its words. Never freed. */
static char no_words[] = "memory is out";

static const char *const kind_words[] = {
#define X(id, word) word,
    ERROR_KINDS(X)
#undef X
};

const char *error_kind_word(error_kind kind)
{
    return kind_words[kind];
}

void engine_forgive(tw_engine *e)
{
    if (e->error.words != no_words)
        free(e->error.words);
    e->error = (tw_error){ERROR_NONE, NULL};
}

tw_status engine_fail(tw_engine *e, error_kind kind, const char *format, ...)
{
    if (e->error.kind != ERROR_NONE)
        return TW_ERROR;
    char *words = NULL;
    va_list list;
    va_start(list, format);
    if (vasprintf(&words, format, list) < 0)
        words = no_words;
    va_end(list);
    e->error = (tw_error){kind, words};
    return TW_ERROR;
}

void engine_progress(tw_engine *e, const char *words)
{
    if (e->progress)
        e->progress(e->progress_host, words);
}

double budget_clock(void)
{
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

/* Resident memory of the process in bytes, 0 when the system does not tell. */
static size_t memory_resident(void)
{
    FILE *statm = fopen("/proc/self/statm", "r");
    if (!statm)
        return 0;
    unsigned long total = 0, resident = 0;
    int read = fscanf(statm, "%lu %lu", &total, &resident);
    fclose(statm);
    return read == 2 ? (size_t)resident * (size_t)sysconf(_SC_PAGESIZE) : 0;
}

bool budget_memory_ok(tw_engine *e)
{
    return e->memory_limit == 0 || memory_resident() <= e->memory_limit + e->memory_lost;
}

/* What an aborted computation held is lost to the process, and expressions of one that ran out of memory stay. So that the session stays of use, the limit makes room for it, at
 * most once its own size in all. */
static void budget_start_memory(tw_engine *e)
{
    if (e->memory_limit == 0) return;
    size_t now = memory_resident();
    if (e->jumps != e->jumps_seen && now > e->memory_before) {
        e->memory_lost += now - e->memory_before;
        if (e->memory_lost > e->memory_limit) e->memory_lost = e->memory_limit;
    }
    e->jumps_seen = e->jumps;
    e->memory_before = now;
}

bool budget_ok(tw_engine *e)
{
    if (e->interrupted) {
        engine_fail(e, ERROR_INTERRUPT, "interrupted");
        return false;
    }
    if (++e->budget_ticks % 16 != 0 || (e->deadline == 0 && e->memory_limit == 0))
        return true;
    double now = budget_clock();
    if (e->deadline != 0 && now > e->deadline) {
        engine_fail(e, ERROR_TIME, "the time limit has passed");
        return false;
    }
    if (e->memory_limit != 0 && now - e->memory_checked > 0.02) {
        e->memory_checked = now;
        if (!budget_memory_ok(e)) {
            e->jumps_seen = e->jumps - 1; /* expressions stay: like a jump, this leaves the process larger */
            engine_fail(e, ERROR_MEMORY, "the memory limit of %zu MiB is exceeded", e->memory_limit >> 20);
            return false;
        }
    }
    return true;
}

void budget_start(tw_engine *e, double seconds)
{
    e->interrupted = 0;
    e->deadline = seconds > 0 ? budget_clock() + seconds : 0;
    e->budget_ticks = 15; /* so that the first question looks at the clock */
    e->memory_checked = 0;
    budget_start_memory(e);
}

void *engine_scratch(tw_engine *e, size_t count, size_t bytes_each)
{
    if (bytes_each && count > SIZE_MAX / bytes_each)
        edge_leave_memory();
    return arena_alloc(&e->scratch, count * bytes_each);
}

void engine_base_init(tw_engine *e)
{
    memset(e, 0, sizeof *e);
    arena_init(&e->arena);
    arena_init(&e->scratch);
    e->allocations_left = -1;
    flint_hook_install();
}

void engine_base_clear(tw_engine *e)
{
    engine_forgive(e);
    arena_clear(&e->scratch);
    arena_clear(&e->arena);
}
