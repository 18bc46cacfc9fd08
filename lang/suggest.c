/* Distance of two names: letters left out, added, mistaken or swapped with their neighbour, counted in halves so that
 * a letter in the wrong case costs less (Damerau's distance, the variant in which no place is edited twice). It works
 * on bytes; a mistaken letter outside ASCII may count twice. Knows no list of words: the caller offers them. */
#include "lang/suggest.h"

#include <ctype.h>
#include <string.h>

enum { LONGEST = 40 }; /* longer names are not compared */

void suggestion_init(suggestion *s, const char *wrong)
{
    s->wrong = wrong;
    s->best = NULL;
    size_t letters = strlen(wrong);
    s->distance = letters < 3 ? 2 : 2 * (letters / 3) + 1; /* below this a name is near */
}

static size_t least(size_t a, size_t b)
{
    return a < b ? a : b;
}

static size_t letter_cost(char a, char b)
{
    if (a == b)
        return 0;
    return tolower((unsigned char)a) == tolower((unsigned char)b) ? 1 : 2;
}

static size_t name_distance(const char *a, size_t m, const char *b, size_t n)
{
    size_t rows[3][LONGEST + 1], *before = rows[0], *above = rows[1], *row = rows[2];
    for (size_t j = 0; j <= n; j++)
        above[j] = 2 * j;
    for (size_t i = 1; i <= m; i++) {
        row[0] = 2 * i;
        for (size_t j = 1; j <= n; j++) {
            row[j] = least(above[j - 1] + letter_cost(a[i - 1], b[j - 1]), least(above[j], row[j - 1]) + 2);
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1] && a[i - 1] != b[j - 1])
                row[j] = least(row[j], before[j - 2] + 2);
        }
        size_t *free_row = before;
        before = above;
        above = row;
        row = free_row;
    }
    return above[n];
}

void suggestion_offer(suggestion *s, const char *name)
{
    size_t m = strlen(s->wrong), n = strlen(name);
    if (m == 0 || m > LONGEST || n > LONGEST)
        return;
    size_t d = name_distance(s->wrong, m, name, n);
    if (d > 0 && d < s->distance) {
        s->distance = d;
        s->best = name;
    }
}
