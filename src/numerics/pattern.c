/*
 * pattern.c: entries in any order to compressed columns, by two bucket sorts.
 *
 * Sorting by row and then, stably, by column leaves the entries in column order with rising rows
 * (a radix sort with the row as the low digit), so that repeats stand side by side.
 */
#include "numerics/pattern.h"

#include <assert.h>

/* Sorts the indices `from` into `to` by one key of their entry; stable. bucket: [n + 1] workspace.
 */
static void sort_by(const struct entry *entries, int count, int n, bool by_column, const int *from,
                    int *to, int *bucket)
{
    for (int k = 0; k <= n; k++) {
        bucket[k] = 0;
    }
    for (int i = 0; i < count; i++) {
        int key = by_column ? entries[i].column : entries[i].row;
        assert(key >= 0 && key < n);
        bucket[key + 1]++;
    }
    for (int k = 0; k < n; k++) {
        bucket[k + 1] += bucket[k];
    }
    for (int i = 0; i < count; i++) {
        int index = from != NULL ? from[i] : i;
        int key = by_column ? entries[index].column : entries[index].row;
        to[bucket[key]++] = index;
    }
}

/* Walks the sorted entries, gives each a slot and, when row is not NULL, writes the pattern.
 * Returns the number of different entries. */
static int merge_repeats(const struct entry *entries, const int *sorted, int count, int *slots,
                         struct pattern *pattern)
{
    int used = 0;
    for (int i = 0; i < count; i++) {
        struct entry e = entries[sorted[i]];
        if (i > 0) {
            struct entry last = entries[sorted[i - 1]];
            used += (e.row != last.row || e.column != last.column) ? 1 : 0;
        }
        slots[sorted[i]] = used;
        if (pattern != NULL) {
            pattern->row[used] = e.row;
            pattern->start[e.column + 1] = used + 1;
        }
    }
    return count > 0 ? used + 1 : 0;
}

struct pattern *pattern_build(struct arena *arena, int n, const struct entry *entries, int count,
                              int *slots)
{
    struct arena *scratch = arena_create();
    if (scratch == NULL) {
        return NULL;
    }
    struct pattern *pattern = arena_new(arena, struct pattern);
    int *by_row = arena_new_array(scratch, int, count);
    int *sorted = arena_new_array(scratch, int, count);
    int *bucket = arena_new_array(scratch, int, n + 1);
    if (pattern == NULL || by_row == NULL || sorted == NULL || bucket == NULL) {
        arena_destroy(scratch);
        return NULL;
    }
    sort_by(entries, count, n, false, NULL, by_row, bucket);
    sort_by(entries, count, n, true, by_row, sorted, bucket);

    int nonzeros = merge_repeats(entries, sorted, count, slots, NULL);
    pattern->n = n;
    pattern->start = arena_new_array(arena, int, n + 1);
    pattern->row = arena_new_array(arena, int, nonzeros);
    bool complete = pattern->start != NULL && pattern->row != NULL;
    if (complete) {
        merge_repeats(entries, sorted, count, slots, pattern);
        /* A column without entries ends where the one before it ends. */
        for (int k = 0; k < n; k++) {
            if (pattern->start[k + 1] < pattern->start[k]) {
                pattern->start[k + 1] = pattern->start[k];
            }
        }
    }
    arena_destroy(scratch);
    return complete ? pattern : NULL;
}
