/*
 * replay.h: the elimination of one sparse matrix as a plain list of steps, with pivots chosen once,
 * to be carried out on many matrices side by side.
 *
 * The factors stand in the array of the values: first the entries of the pattern, then the places
 * that only the elimination fills.
 */
#ifndef NUMERICS_REPLAY_H
#define NUMERICS_REPLAY_H

#include "numerics/linear.h"

/* One pivot with what its elimination touches. */
struct replay_pivot {
    int row, column; /* equation and unknown */
    int place;       /* of the pivot among the values */
    int below_count; /* entries of its column that are eliminated */
    int right_count; /* entries of its row that remain */
};

struct replay {
    int n, size; /* size: values with the filled places */
    const struct replay_pivot *pivots;
    /* The lists of all pivots one after the other: */
    const int *below;        /* place of each entry eliminated */
    const int *below_row;    /* its equation */
    const double *largest;   /* the largest multiplier that is accepted there */
    const int *right;        /* place of each entry that remains */
    const int *right_column; /* its unknown */
    const int *target;       /* [below_count * right_count] of a pivot: where the product goes */
};

/* Above this many unknowns no list is made. */
enum { REPLAY_LIMIT = 400 };

/* A multiplier may exceed the ratio of its equations this often: ten times what KLU lets itself. */
#define REPLAY_GROWTH_LIMIT 1e4

/*
 * replay_make: from the pivots that the solver last chose.
 *
 * values  [nonzeros] of that factorisation, for the sizes of the equations
 *
 * A multiplier may grow to REPLAY_GROWTH_LIMIT times the ratio of its equations. NULL when memory
 * is short, nothing is factored or the system is too large.
 */
struct replay *replay_make(const struct linear_solver *solver, const struct pattern *pattern,
                           const double *values, struct arena *arena);

#endif
