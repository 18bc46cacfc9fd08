/* Running texts: files, standard input, statements of the command line, lines of the prompt. */
#ifndef TW_LANG_RUN_H
#define TW_LANG_RUN_H

#include <stdbool.h>
#include <stdio.h>

#include "lang/session.h"

typedef struct run_options {
    bool parse_only, json, quiet, keep_going;
    long digits;           /* 0: the default */
    double time_limit;     /* seconds for each statement; 0: none */
    size_t memory_limit;   /* MiB; 0: none */
} run_options;

/* Exit statuses of the program. */
enum { EXIT_DONE = 0, EXIT_FAILED = 1, EXIT_USAGE = 2, EXIT_REFUTED = 3, EXIT_INTERRUPTED = 130 };

/* The files that `use` is running, innermost first. */
typedef struct use_frame {
    const char *path;
    struct use_frame *outer;
} use_frame;

typedef struct run {
    run_options options;
    session session;
    int status;            /* EXIT_DONE, EXIT_FAILED, EXIT_REFUTED or EXIT_INTERRUPTED so far */
    bool at_prompt;        /* a failed statement stops nothing */
    bool colour;           /* on standard error */
    size_t width;          /* where long results are wrapped */
    unsigned depth;        /* of `use` within `use` */
    use_frame *uses;
    text inner;            /* the last complaint within a used file */
} run;

/* Lines as they come, from a pipe or from the prompt: statements run as soon as they are complete. */
typedef struct feed {
    const char *name;
    text all;              /* everything so far: a complaint shows lines of it */
    size_t done;           /* bytes that have been run */
} feed;

/* False, with a message on standard error, when there is no memory for an engine. */
bool run_init(run *r, const run_options *options);
void run_clear(run *r);

/* Each of these is false when nothing more shall run: a failure without --keep-going, quit, an interrupt. */
bool run_file(run *r, const char *path);
bool run_words(run *r, const char *name, const char *words);
bool run_input(run *r, int fd);

void feed_init(feed *f, const char *name);
void feed_clear(feed *f);
/* Runs what has come, unless it waits for another line: then *wants_more and true. last: nothing more comes. */
bool run_feed(run *r, feed *f, bool last, bool *wants_more);

/* A complaint without a place in a source. */
void run_complain(run *r, error_kind kind, const char *file, const char *words);

#endif
