/*
 * pattern.h: which entries of a sparse square matrix can be nonzero, in compressed columns.
 */
#ifndef NUMERICS_PATTERN_H
#define NUMERICS_PATTERN_H

#include "base/arena.h"

struct pattern {
    int n;
    int *start; /* [n + 1] where each column begins in row[] */
    int *row;   /* [start[n]] rows of each column, rising */
};

struct entry {
    int row, column;
};

/*
 * pattern_build: the union of entries.
 *
 * entries  [count] in any order, repeats allowed; not changed
 * slots    [count] out: index of each entry in row[] and in the value array
 *
 * Time linear in count + n. NULL when memory is short.
 */
struct pattern *pattern_build(struct arena *arena, int n, const struct entry *entries, int count,
                              int *slots);

#endif
