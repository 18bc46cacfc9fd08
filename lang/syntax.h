/* The syntax tree: what a text says, before anybody asks what it means. One node type for expressions and conditions,
 * one for passes, one for statements; each node has its place in the source. Trees live in the arena of the syntax_text
 * that they were parsed into, and go with it. Brackets leave no node: the printer puts them back where they are needed.
 *
 * All names and texts are NUL-terminated UTF-8 (a NUL in a source is an error). A pointer documented as optional is
 * NULL when the words were not typed. */
#ifndef TW_LANG_SYNTAX_H
#define TW_LANG_SYNTAX_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "engine/base/arena.h"
#include "engine/base/text.h"
#include "lang/source.h"

/* How deep brackets, signs, exponents and integrals may nest in a text. Between two levels lie at most five nodes of
 * a tree, so a recursive walk over a parsed tree is at most five times as deep. */
enum { SYNTAX_DEPTH_LIMIT = 1000 };

/* A name where it stands. */
typedef struct syntax_name {
    const char *text;
    span at;
} syntax_name;

/* ---- expressions and conditions ---- */

typedef enum syntax_kind {
    SYNTAX_NUMBER,     /* 0.25 */
    SYNTAX_NAME,       /* s; also the constants pi, i, inf, euler_constant */
    SYNTAX_CALL,       /* f(x, y); also inf(theta) */
    SYNTAX_INDEXED,    /* c[n + 1], in `check recurrence` only */
    SYNTAX_SUM,        /* a + b - c, two or more terms */
    SYNTAX_PRODUCT,    /* a*b/c, two or more factors */
    SYNTAX_NEGATE,     /* -a */
    SYNTAX_POWER,      /* a^b */
    SYNTAX_FACTORIAL,  /* a! */
    SYNTAX_INTEGRAL,   /* integral from A to B of BODY dx */
    SYNTAX_CONTOUR,    /* integral along P to Q to R of BODY dz */
    SYNTAX_SUMMATION,  /* sum from k = A to B of BODY */
    SYNTAX_DERIVATIVE, /* derivative of f in x order n */
    SYNTAX_AT,         /* (f at x = 3, y = 2) */
    SYNTAX_PIECEWISE,  /* piecewise(x^2 when x < 1, 2 - x otherwise) */
    SYNTAX_ROOT,       /* root of r^3 - r - 1 in r near 1.3247 */
    /* conditions */
    SYNTAX_COMPARISON, /* 0 < p < 1 */
    SYNTAX_RANGE,      /* theta in (-pi/4, pi/4] */
    SYNTAX_DOMAIN,     /* n integer */
} syntax_kind;

typedef enum syntax_relation {
    COMPARE_LESS, COMPARE_LESS_EQUAL, COMPARE_GREATER, COMPARE_GREATER_EQUAL, COMPARE_EQUAL, COMPARE_NOT_EQUAL
} syntax_relation;

typedef enum syntax_domain { DOMAIN_INTEGER, DOMAIN_REAL, DOMAIN_COMPLEX } syntax_domain;

typedef struct syntax syntax;

/* NAME = VALUES after `at`: values (count >= 1), or a sweep (count 0 and from, to, with step or points).
 * In SYNTAX_AT and in moves there is exactly one value. */
typedef struct syntax_binding {
    syntax_name name;
    size_t count;
    syntax **values;   /* s = 3, 10, 30 */
    syntax *from, *to; /* s from 5 to 100 */
    syntax *step;      /* step 5; NULL when points is set */
    syntax *points;    /* in 50 points; NULL when step is set */
    bool log_scale;    /* on a log scale */
} syntax_binding;

struct syntax {
    uint8_t kind; /* syntax_kind */
    span at;
    union {
        const char *number; /* as typed: digits, perhaps a point and an exponent */
        const char *name;
        struct {
            syntax_name name;
            size_t count;
            syntax **arguments;
        } call;
        struct {
            const char *name;
            syntax *index;
        } indexed;
        struct {
            size_t count;
            char *signs;    /* '+' or '-' before each term, '*' or '/' before each factor; the first is '+', '*' */
            syntax **parts;
        } list;             /* SYNTAX_SUM, SYNTAX_PRODUCT */
        syntax *operand;    /* SYNTAX_NEGATE, SYNTAX_FACTORIAL */
        struct {
            syntax *base, *exponent;
        } power;
        struct {
            syntax_name variable;
            syntax *from, *to, *body;
        } *binder;          /* SYNTAX_INTEGRAL, SYNTAX_SUMMATION */
        struct {
            syntax_name variable;
            size_t count;
            syntax **points;
            syntax *body;
        } *contour;
        struct {
            syntax *of;
            syntax_name in;
            syntax *order;  /* optional */
        } *derivative;
        struct {
            syntax *body;
            size_t count;
            syntax_binding *bindings;
        } substitution;     /* SYNTAX_AT */
        struct {
            size_t count;   /* >= 1 */
            syntax **values, **conditions;
            syntax *otherwise;
        } *piecewise;
        struct {
            syntax *of;
            syntax_name in;
            syntax *near;
        } *root;
        struct {
            size_t count;   /* relations; one more operands */
            uint8_t *relations; /* syntax_relation */
            syntax **operands;
        } comparison;
        struct {
            syntax *value, *from, *to;
            bool with_from, with_to; /* the end belongs to the range: [ or ] */
        } *range;
        struct {
            syntax *value;
            syntax_domain domain;
        } domain;
    } as;
};

/* ---- passes ---- */

typedef enum pass_kind { PASS_NAME, PASS_REPEAT, PASS_EVERYWHERE, PASS_ONCE, PASS_THEN, PASS_OR } pass_kind;

typedef struct syntax_pass syntax_pass;
struct syntax_pass {
    uint8_t kind;        /* pass_kind */
    span at;
    const char *name;    /* PASS_NAME */
    size_t count;        /* PASS_THEN, PASS_OR: two or more; PASS_REPEAT, EVERYWHERE, ONCE: one */
    syntax_pass **parts;
};

/* ---- statements ---- */

/* One row a kind of statement: identifier, the words that open it. */
#define STATEMENT_KINDS(X)                                                                                            \
    X(LARGE, "large")                                                                                                 \
    X(SMALL, "small")                                                                                                 \
    X(GIVEN, "given")                                                                                                 \
    X(GRANT, "grant")                                                                                                 \
    X(LET, "let")                                                                                                     \
    X(USE, "use")                                                                                                     \
    X(RULE, "rule")                                                                                                   \
    X(PASS, "pass")                                                                                                   \
    X(CHECK_RULE, "check rule")                                                                                       \
    X(CHECK_FILE, "check")                                                                                            \
    X(CHECK_RECURRENCE, "check recurrence")                                                                           \
    X(REWRITE, "rewrite")                                                                                             \
    X(WHY_NOT, "why not")                                                                                             \
    X(DERIVE, "derive")                                                                                               \
    X(MOVE, "")              /* a line between derive and done; its words are those of MOVE_KINDS */                  \
    X(DONE, "done")                                                                                                   \
    X(UNDO, "undo")                                                                                                   \
    X(REPLAY, "replay")                                                                                               \
    X(EXPAND, "expand")                                                                                               \
    X(STEPS, "steps")                                                                                                 \
    X(COEFFICIENTS, "coefficients of")                                                                                \
    X(RECURRENCE, "recurrence of")                                                                                    \
    X(GROWTH, "growth of")                                                                                            \
    X(REMAINDER, "remainder of")                                                                                      \
    X(EVALUATE, "evaluate")                                                                                           \
    X(COMPARE, "compare")                                                                                             \
    X(PLAN, "plan")                                                                                                   \
    X(PLOT, "plot")                                                                                                   \
    X(WRITE, "write")                                                                                                 \
    X(SHOW, "show")                                                                                                   \
    X(DROP, "drop")                                                                                                   \
    X(HELP, "help")                                                                                                   \
    X(QUIT, "quit")                                                                                                   \
    X(EXPANSION_OF, "expansion of") /* after `let NAME =` only */                                                     \
    X(RULE_FROM, "rule from")       /* after `let NAME =` only */

typedef enum statement_kind {
#define X(id, words) STATEMENT_##id,
    STATEMENT_KINDS(X)
#undef X
    STATEMENT_KIND_COUNT
} statement_kind;

#define MOVE_KINDS(X)                                                                                                 \
    X(SUBSTITUTE, "substitute")                                                                                       \
    X(PARTS, "parts integrating")                                                                                     \
    X(REPEAT_PARTS, "repeat parts")                                                                                   \
    X(DIFFERENTIATE, "differentiate in")                                                                              \
    X(INTEGRATE_BACK, "integrate back in")                                                                            \
    X(SPLIT, "split at")                                                                                              \
    X(ROTATE, "rotate by")                                                                                            \
    X(EXPAND, "expand")                                                                                               \
    X(TERMWISE, "integrate termwise")                                                                                 \
    X(USE_RULE, "use rule")                                                                                           \
    X(REWRITE, "rewrite with")                                                                                        \
    X(SWAP, "swap")

typedef enum move_kind {
#define X(id, words) MOVE_##id,
    MOVE_KINDS(X)
#undef X
    MOVE_KIND_COUNT
} move_kind;

typedef struct statement statement;

/* NAME or FUNCTION(NAMES) in the brackets of a rule or of `let f(x) =`. */
typedef struct syntax_parameter {
    syntax_name name;
    size_t count;          /* of names; 0 for a plain variable */
    syntax_name *names;
} syntax_parameter;

typedef struct syntax_conditions {
    size_t count;
    syntax **list;
} syntax_conditions;

typedef struct syntax_bindings {
    size_t count;
    syntax_binding *list;
} syntax_bindings;

struct statement {
    uint8_t kind; /* statement_kind */
    span at;      /* the statement without its line end */
    union {
        struct {
            syntax_name name;
            bool integer;   /* large n integer */
            syntax *sector; /* optional: arg(s) in (...), a SYNTAX_RANGE; not after small */
        } large;            /* LARGE and SMALL */
        syntax_conditions given; /* GIVEN and GRANT */
        struct {
            syntax_name name;
            bool is_function;
            size_t count;   /* of parameters */
            syntax_name *parameters;
            syntax *value;      /* an expression, or NULL */
            statement *request; /* or what a request gives, or NULL */
        } let;
        struct {
            syntax_name name; /* text NULL when file is set */
            const char *file; /* optional */
        } use;
        struct {
            syntax_name name;
            size_t count;
            syntax_parameter *parameters; /* pattern variables and pattern functions */
            syntax *pattern, *becomes;
            syntax_conditions when;
            const char *because;          /* optional */
        } *rule;
        struct {
            syntax_name name;
            syntax_pass *value;
        } pass;
        syntax_name name;  /* CHECK_RULE, WHY_NOT, SHOW, DROP; DONE (`as NAME`, text NULL without) */
        const char *file;  /* CHECK_FILE */
        struct {
            syntax *left, *right; /* optional, both or none: c[n+1] = ...; the only place of SYNTAX_INDEXED */
            syntax *of;
        } check_recurrence;
        struct {
            syntax *value;
            syntax_pass *with;
        } rewrite;
        syntax *subject;   /* DERIVE, RECURRENCE, GROWTH, EXPANSION_OF, RULE_FROM; STEPS (NULL: of the open derivation) */
        struct {
            uint8_t kind;     /* move_kind */
            syntax *integral; /* optional: in integral K */
            union {
                struct {
                    syntax_name name;     /* VAR = EXPR */
                    syntax *value;
                    syntax_name new_name; /* with NEW = INVERSE; text NULL without */
                    syntax *inverse;
                } substitute;
                syntax *factor;           /* PARTS: integrating FACTOR */
                syntax *times;            /* REPEAT_PARTS: N times */
                struct {
                    syntax_name in;
                    syntax *from;         /* INTEGRATE_BACK only */
                } parameter;              /* DIFFERENTIATE, INTEGRATE_BACK */
                syntax *place;            /* SPLIT: at POINT; ROTATE: by ANGLE */
                struct {
                    syntax *factor, *around, *terms;
                } expand;
                syntax_name rule;         /* USE_RULE */
                syntax_pass *with;        /* REWRITE */
            } as;
        } *move;
        struct {
            syntax *derivation, *on;
        } replay;
        struct {
            syntax *subject, *terms; /* expand SUBJECT to TERMS terms */
            syntax_name by, as;      /* text NULL when not typed */
        } *expand;
        struct {
            syntax *of, *from, *to;  /* from, to: optional, both or none */
        } coefficients;
        struct {
            syntax *of, *terms;      /* with TERMS terms: optional */
        } remainder;
        struct {
            syntax *subject;
            syntax_bindings at;      /* count 0: no `at` with bindings */
            const char *points_file; /* optional: at points of "file" */
            syntax *digits, *terms;  /* optional: to DIGITS digits, with TERMS terms */
            bool all_contributions;
            const char *to_file;     /* optional: to "file" */
        } *evaluate;
        struct {
            syntax *subject;
            syntax_bindings at;
        } compare;
        struct {
            syntax *subject, *error; /* for relative error ERROR */
            syntax_name over;        /* over NAME from FROM to TO; text NULL without */
            syntax *from, *to;
        } *plan;
        struct {
            bool terms;              /* plot terms of, else plot error of */
            syntax *of;
            syntax_bindings at;
            const char *to_file;
        } *plot;
        struct {
            syntax *subject;
            syntax_name format;
            const char *to_file;
        } write;
        const char *help;            /* the rest of the line, trimmed; "" when nothing follows */
    } as;
};

/* ---- a parsed text ---- */

typedef struct syntax_error {
    span at;
    char *words;
} syntax_error;

/* How many errors of one text are kept; the last one then says that more follow. */
enum { SYNTAX_ERROR_LIMIT = 200 };

typedef struct syntax_text {
    arena arena;             /* trees, names and words of errors */
    size_t count, room;
    statement **statements;  /* those without error, in order */
    size_t error_count, error_room;
    syntax_error *errors;    /* by place */
    bool wants_more;         /* the text ends where its last statement can't end, or with a rule that may go on */
    text words;              /* private: where messages are put together */
    bool rule_is_open;       /* wants_more because of such a rule only: an empty line ends it */
} syntax_text;

void syntax_text_init(syntax_text *t);
void syntax_text_clear(syntax_text *t);

/* ---- questions (never fail) ---- */

bool syntax_equal(const syntax *a, const syntax *b); /* places aside; NULL equals NULL only */
bool syntax_pass_equal(const syntax_pass *a, const syntax_pass *b);
bool statement_equal(const statement *a, const statement *b);

/* The words that open a statement ("check recurrence"); of a move its own ("split at"). */
const char *statement_words(const statement *s);
const char *move_words(move_kind kind);
/* May `let NAME =` keep what this request gives? */
bool statement_gives_value(statement_kind kind);
bool syntax_is_condition(const syntax *a);

/* ---- printing: what is printed parses back to an equal tree; ASCII but for names and texts ---- */

void syntax_print(text *out, const syntax *a);
void syntax_pass_print(text *out, const syntax_pass *a);
/* Without a line end at its close; a rule takes several lines. */
void statement_print(text *out, const statement *s);

#endif
