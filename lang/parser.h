/* What the files of the parser share; nobody else includes it. Recursive descent with one token of lookahead. A
 * function that parses something returns NULL (or false) once the statement has failed, and the first error of a
 * statement is the only one that is kept. Line ends are tokens; they are passed over within brackets and after
 * anything that cannot end a statement. */
#ifndef TW_LANG_PARSER_H
#define TW_LANG_PARSER_H

#include "lang/lexer.h"
#include "lang/syntax.h"
#include "lang/words.h"

/* A distinct name of the text, looked up once. */
typedef struct name_entry {
    const char *text;         /* in the arena; "pi" for the sign of it */
    uint32_t hash;
    word_class is;
    bool reserved;
    const char *differential; /* "x" when the name is dx: it may close an integral */
} name_entry;

/* A list under construction: an item, and its sign in a sum or product. */
typedef struct pending {
    void *item;
    char sign;
} pending;

typedef struct parser {
    source *source;
    syntax_text *out;
    lexer lexer;
    token token;             /* the next one, not yet consumed */
    const name_entry *name;  /* when it is a name */
    bool starts_line;        /* it is the first on its line */
    token last;              /* the one consumed last */
    uint32_t operand_end;    /* where the last expression ended */
    bool last_goes_on;       /* it cannot end a statement */
    unsigned open;           /* brackets that are open: within them line ends do not count */
    unsigned depth;          /* of operands within operands */
    bool failed;             /* the current statement has an error */
    bool at_end;             /* ... because the text ends too early */
    bool rule_may_go_on;     /* the text ends after a rule that lacks a clause */
    bool indexed;            /* c[n] is read */
    const char *need;        /* what a missing operand is called: "`from` needs a lower limit here" */
    const char *closer;      /* the word that ends the operand, "" when unknown */
    name_entry *names;       /* hash table, open addressing; in the arena, like the pending items */
    size_t name_count, name_room;
    pending *pending;
    size_t pending_count, pending_room;
} parser;

/* ---- parse.c: tokens, names, errors ---- */
void *parser_alloc(parser *p, size_t bytes); /* zeroed, in the arena */
void parser_advance(parser *p);
void parser_go_on(parser *p);       /* over a token that cannot end a statement */
void parser_skip_lines(parser *p);
bool parser_at(const parser *p, token_kind k);
bool parser_at_word(const parser *p, const char *word);
bool parser_at_line_end(const parser *p);
token parser_peek(const parser *p); /* the token after the next one */
bool parser_peek_word(const parser *p, const char *word);
span parser_span(const parser *p, uint32_t from); /* from there to the end of the last token */
bool parser_enter(parser *p);       /* false, with the error, when nested too deep */

/* Each sets the statement's error unless it has one, and returns false. */
bool parser_fail(parser *p, span at, const char *format, ...) __attribute__((format(printf, 3, 4)));
bool parser_fail_here(parser *p, const char *format, ...) __attribute__((format(printf, 2, 3)));
bool parser_expected(parser *p, const char *what); /* expected WHAT, found the next token */
/* The next token, a name, is none of the words offered so far: adds what was meant. words: NULL-terminated. */
bool parser_expected_one_of(parser *p, const char *what, const char *const *words);

bool parser_fail_reserved(parser *p, const char *name); /* at the name, which nobody may define */

bool parser_take_word(parser *p, const char *word);                     /* consumes it if it is there */
bool parser_expect_word(parser *p, const char *word, const char *what); /* `what` as in parser_expected */
bool parser_expect_sign(parser *p, token_kind k, const char *what);     /* a sign that cannot end a statement */
bool parser_open(parser *p, token *bracket);                            /* consumes the bracket that is there */
bool parser_close(parser *p, token bracket, token_kind k);

bool parser_name(parser *p, syntax_name *out, const char *what);        /* any name */
bool parser_new_name(parser *p, syntax_name *out, const char *what);    /* one that may be defined, bound or declared */
const char *parser_text(parser *p, const char *what);                   /* a quoted text, without quotes and escapes */

void parser_push(parser *p, void *item, char sign);
/* The items above `base` as an array in the arena; their signs into *signs unless that is NULL. */
void *parser_pop(parser *p, size_t base, char **signs);
/* The same for things held by value: item k is copied from its address. */
void *parser_pop_values(parser *p, size_t base, size_t bytes);

/* ---- parse_expression.c ---- */
/* need: as in struct parser; closer: the word that is expected after it, or "". */
syntax *parse_sum(parser *p, const char *need, const char *closer);
syntax *parse_product(parser *p, const char *need, const char *closer);
syntax *parse_condition(parser *p, const char *need);
bool parse_conditions(parser *p, syntax_conditions *out, const char *need);
/* NAME = VALUE, ...; single: one value each and no sweeps (a substitution). */
bool parse_bindings(parser *p, syntax_bindings *out, bool single);

/* ---- parse_pass.c ---- */
syntax_pass *parse_pass(parser *p);

/* ---- parse_statement.c: declarations, rules; parse_request.c: requests; parse_move.c: derivations ---- */
/* Each is called at the statement's opening word and returns false after an error. */
typedef bool statement_parser(parser *p, statement *out);

statement *parse_statement(parser *p);
/* A request after `let NAME =`; NULL without an error when none begins here. */
statement *parse_kept_request(parser *p);

statement_parser parse_check, parse_rewrite, parse_why, parse_replay, parse_expand, parse_coefficients;
statement_parser parse_recurrence, parse_growth, parse_remainder, parse_evaluate, parse_compare, parse_plan;
statement_parser parse_plot, parse_write, parse_show, parse_drop, parse_help, parse_quit;
statement_parser parse_derive, parse_done, parse_undo, parse_steps, parse_move;
/* The rest of `use rule NAME` and `rewrite with PASS`, at `rule` and `with`. */
bool parse_use_rule_move(parser *p, statement *out);
bool parse_rewrite_move(parser *p, statement *out);
bool parse_expand_move(parser *p, statement *out, syntax *factor);

#endif
