/*
 * near.c: the name that a mistyped name most likely meant.
 *
 * Distance in its restricted form: insertion, deletion, substitution, exchange of two neighbours
 * (Damerau 1964; Levenshtein 1966; recurrence as in Boytsov 2011, section 2.2).
 */
#include "base/diagnostic.h"

#include <string.h>

enum { LONGEST = 120, HALF = 1, WHOLE = 2 }; /* costs are counted in halves */

static char lower(char c)
{
    return c >= 'A' && c <= 'Z' ? (char)(c - 'A' + 'a') : c;
}

static int substitution(char a, char b)
{
    return a == b ? 0 : lower(a) == lower(b) ? HALF : WHOLE;
}

static int least(int a, int b)
{
    return a < b ? a : b;
}

/* Distance in halves of a[m] and b[n], both at most LONGEST bytes. */
static int distance(const char *a, int m, const char *b, int n)
{
    int rows[3][LONGEST + 1];
    int *before = rows[0], *last = rows[1], *row = rows[2];
    for (int j = 0; j <= n; j++) {
        last[j] = WHOLE * j;
        before[j] = 0;
    }
    for (int i = 1; i <= m; i++) {
        row[0] = WHOLE * i;
        for (int j = 1; j <= n; j++) {
            int cost = last[j - 1] + substitution(a[i - 1], b[j - 1]);
            cost = least(cost, least(last[j], row[j - 1]) + WHOLE);
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1]) {
                cost = least(cost, before[j - 2] + WHOLE);
            }
            row[j] = cost;
        }
        int *free_row = before;
        before = last;
        last = row;
        row = free_row;
    }
    return last[n];
}

/* Whether two names differ only in case. */
static bool same_letters(const char *a, const char *b)
{
    while (*a != '\0' && lower(*a) == lower(*b)) {
        a++;
        b++;
    }
    return *a == *b;
}

const char *near_name(const char *wanted, const char *const *candidates, int count)
{
    size_t length = strlen(wanted);
    if (length == 0 || length > LONGEST) {
        return NULL;
    }
    int m = (int)length;
    int limit = m < 3 ? WHOLE : WHOLE * m / 3;
    if (m == 1) {
        limit = HALF; /* another single letter is not near */
    }
    for (int k = 0; k < count; k++) {
        if (strcmp(wanted, candidates[k]) != 0 && same_letters(wanted, candidates[k])) {
            return candidates[k];
        }
    }
    const char *best = NULL;
    for (int k = 0; k < count; k++) {
        size_t other = strlen(candidates[k]);
        int n = other > LONGEST ? LONGEST + 1 : (int)other;
        if (n == 0 || n > LONGEST || WHOLE * (n > m ? n - m : m - n) > limit) {
            continue;
        }
        int found = distance(wanted, m, candidates[k], n);
        if (found <= limit) {
            best = candidates[k];
            limit = found - 1; /* only a nearer one replaces it: the first of equals stays */
        }
    }
    return best;
}

const char *hint_near(struct arena *arena, const char *wanted, const char *const *candidates,
                      int count, const char *otherwise)
{
    const char *near = near_name(wanted, candidates, count);
    return near == NULL ? otherwise : arena_format(arena, "did you mean '%s'?", near);
}

static bool listed_before(const char *const *names, int index)
{
    for (int k = 0; k < index; k++) {
        if (strcmp(names[k], names[index]) == 0) {
            return true;
        }
    }
    return false;
}

const char *hint_list(struct arena *arena, const char *before, const char *const *names, int count,
                      const char *otherwise)
{
    const char *text = NULL;
    int shown = 0;
    for (int k = 0; k < count && shown < HINT_LIST_LIMIT; k++) {
        if (!listed_before(names, k)) {
            text = shown == 0 ? arena_format(arena, "%s%s", before, names[k])
                              : arena_format(arena, "%s, %s", text, names[k]);
            shown++;
            if (text == NULL) {
                return NULL;
            }
        }
    }
    return shown == 0 ? otherwise : text;
}
