/* Breaking lines. The one idea: every place where a line may break has a rank, the brackets that are open there, and the best
 * place is the last one of the lowest rank in the second half of the room. Knows the signs of the language, not its grammar. */
#include "lang/wrap.h"

#include <string.h>

enum { INDENT = 4, RANK_NONE = 1 << 20 };

/* A walk along the line. */
typedef struct breaks {
    const char *line;
    int depth;
    bool prose;
} breaks;

static bool ends_with_of(const char *line, const char *blank)
{
    return blank - line >= 3 && strncmp(blank - 3, " of", 3) == 0;
}

/* How bad it is to break behind the character at p, depth being that behind it; RANK_NONE where the line cannot break. */
static int rank_behind(const breaks *b, const char *p)
{
    if (b->prose) return *p == ' ' && p > b->line && p[-1] != ' ' ? 2 * b->depth : RANK_NONE;
    if (*p == '*') return 2 * b->depth + 1;
    if (*p != ' ' || p == b->line) return RANK_NONE;
    if (p[1] != ' ' && p[-1] == ' ' && b->depth == 0 && p[1] != '\0') return 0; /* a remark follows */
    if (strchr("+-,", p[-1])) return 2 * b->depth;
    return strchr("=~<>", p[-1]) || ends_with_of(b->line, p) ? 2 * b->depth + 1 : RANK_NONE;
}

static void step(breaks *b, char c)
{
    if (c == '(' || c == '[') b->depth++;
    if (c == ')' || c == ']') b->depth--;
}

/* The place behind which to break, from `from` on, with `room` bytes; NULL: nowhere. */
static const char *find_break(breaks b, const char *from, size_t room)
{
    const char *best = NULL;
    int best_rank = RANK_NONE;
    size_t length = 0; /* without blanks at its end */
    for (const char *p = from; *p; p++) {
        if (*p != ' ') length = (size_t)(p - from) + 1;
        step(&b, *p);
        int rank = rank_behind(&b, p);
        if (rank >= RANK_NONE) continue;
        if (length > room) return best ? best : p; /* rather too long than broken elsewhere */
        bool late = length > room / 2;
        if (!best || (late && (rank <= best_rank || (size_t)(best - from) < room / 2))) {
            best = p;
            best_rank = rank;
        }
    }
    return best;
}

void wrap_line(text *out, const char *line, size_t width, bool prose)
{
    size_t blanks = strspn(line, " ") + INDENT, room = width;
    if (blanks > width / 2) blanks = width / 2;
    breaks b = {line, 0, prose};
    const char *from = line + strspn(line, " ");
    text_add_bytes(out, line, (size_t)(from - line));
    room -= (size_t)(from - line) < width / 2 ? (size_t)(from - line) : width / 2;
    while (strlen(from) > room) {
        const char *at = find_break(b, from, room);
        if (!at || at[1] == '\0') break;
        size_t length = (size_t)(at - from) + 1;
        for (const char *p = from; p <= at; p++) step(&b, *p);
        while (length > 0 && from[length - 1] == ' ') length--;
        text_add_bytes(out, from, length);
        text_add_char(out, '\n');
        for (size_t k = 0; k < blanks; k++) text_add_char(out, ' ');
        from = at + 1;
        while (*from == ' ') from++;
        room = width - blanks;
    }
    text_add(out, from);
}
