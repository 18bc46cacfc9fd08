/* What `help` knows: one entry a word of the language, each with an example that runs. */
#ifndef TW_LANG_HELP_H
#define TW_LANG_HELP_H

#include <stdbool.h>
#include <stddef.h>

#include "lang/result.h"

typedef enum help_group {
    HELP_DECLARE, HELP_REQUEST, HELP_WRITE, HELP_RULE, HELP_MOVE, HELP_EXPRESSION, HELP_CONSTANT, HELP_METHOD, HELP_FORMAT,
    HELP_LABEL, HELP_CLAUSE, HELP_GROUPS
} help_group;

typedef struct help_entry {
    const char *word;
    help_group group;
    bool available;      /* false: this version reads it and answers that it cannot do it */
    const char *form;    /* how it is typed */
    const char *about;   /* what it does; lines of at most 76 characters */
    const char *example; /* statements that run by themselves; NULL: that of the word named in `see` */
    const char *see;     /* another word, or NULL */
} help_entry;

/* The table, and how many entries it has. A word may have several. */
const help_entry *help_table(size_t *count);

/* The first entry of this word, or NULL. */
const help_entry *help_find(const char *word);

/* A name a user can complete: calls take(host, word) for each word of the table. */
void help_each_word(void (*take)(void *host, const char *word), void *host);

/* Fills r with the list of all words, or with the entries of one word. False when there is no such word. */
bool help_answer(result *r, const char *word /* NULL or "": the list */);

#endif
