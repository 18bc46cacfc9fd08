/* All words of the language in one table: what completion offers, help explains and `did you mean` knows. The
 * functions' names come from the engine's table. */
#ifndef TW_LANG_WORDS_H
#define TW_LANG_WORDS_H

#include <stdbool.h>
#include <stddef.h>

typedef enum word_class {
    WORD_NONE,       /* not a word of the language */
    WORD_STATEMENT,  /* opens a statement: expand */
    WORD_MOVE,       /* opens a move within a derivation: substitute */
    WORD_EXPRESSION, /* opens an expression: integral */
    WORD_FUNCTION,   /* exp; before a bracket only */
    WORD_CONSTANT,   /* pi */
    WORD_LINK,       /* joins the parts of a sentence: from, of */
    WORD_MINOR,      /* any other word that the grammar expects somewhere: terms, digits, json */
} word_class;

/* The class of a word. One that has two classes (`rewrite`) is found under the first in the order above. */
word_class word_find(const char *word);

/* May nobody define, bind or declare this name? The constants and the words that open a statement or an expression. */
bool word_is_reserved(const char *word);

/* The words by class, for completion: *word_class_of (may be NULL) is set. NULL past the end. */
const char *word_at(size_t k, word_class *word_class_of);

#endif
