/* From a source to its syntax tree. Knows the grammar and no mathematics: names are not resolved here. */
#ifndef TW_LANG_PARSE_H
#define TW_LANG_PARSE_H

#include "lang/syntax.h"

/* Parses a whole text into *out (freshly initialised). Statements with an error are left out and their errors listed;
 * the statements after them are still read. Runs in time and memory proportional to the text. s->length is at most
 * SOURCE_LENGTH_LIMIT. */
void parse_text(source *s, syntax_text *out);

/* For a prompt that reads line by line: does this text, all lines so far with their line ends, need another line? A
 * line goes on while a bracket is open or after a word that can't end a statement; a rule until an empty line. */
bool parse_wants_more(const char *bytes, size_t length);

/* Parses one expression or condition that fills the whole text, in the same manner; NULL with errors in *out. */
syntax *parse_expression_text(source *s, syntax_text *out);

#endif
