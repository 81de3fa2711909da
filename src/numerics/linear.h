/*
 * linear.h: sparse linear equations with one pattern and many values.
 *
 * Three steps: analyse once a pattern, factor once a matrix, solve many right sides. The solver
 * reuses the pivots of the last factorisation while they stay good (reciprocal pivot growth above
 * LINEAR_GROWTH_LIMIT) and factors anew when they do not. Only linear_klu.c knows the library.
 */
#ifndef NUMERICS_LINEAR_H
#define NUMERICS_LINEAR_H

#include "base/status.h"
#include "numerics/pattern.h"

/* Pivots chosen for other values may let entries grow by 1e8: the error of the factors is then
 * about 1e-8 of the matrix, so that a Newton step or a round of refinement still gains eight
 * digits. */
#define LINEAR_GROWTH_LIMIT 1e-8

enum linear_status {
    LINEAR_OK = 0,
    LINEAR_SINGULAR, /* linear_singular_column tells where */
    LINEAR_NOT_FINITE,
    LINEAR_MEMORY
};

struct linear_solver;

/* Analyses a pattern, which must outlive the solver. NULL when memory is short. */
struct linear_solver *linear_create(const struct pattern *pattern);
void linear_destroy(struct linear_solver *solver);

/* How many rows can be matched to a column; below n the matrix is singular whatever its values. */
int linear_structural_rank(const struct linear_solver *solver);

/* values: [nonzeros]. Allocates only when a full factorisation is needed (the first time and after
 * a failed growth check). */
enum linear_status linear_factor(struct linear_solver *solver, const double *values);

/* Drops the factors with their pivots: the next linear_factor chooses them anew, whatever came
 * before. */
void linear_forget(struct linear_solver *solver);

/* linear_pivots: pivot k of the factors in hand is the entry of row[k] and column[k], [n] out each.
 * False when nothing is factored. */
bool linear_pivots(const struct linear_solver *solver, int *row, int *column);

/* b: [n] in: right side; out: solution. Needs a factorisation that went well. */
void linear_solve(struct linear_solver *solver, double *b);
void linear_solve_transposed(struct linear_solver *solver, double *b);

/* The column that had no pivot in the last LINEAR_SINGULAR, or -1. */
int linear_singular_column(const struct linear_solver *solver);

/* Estimate of the condition number in the 1-norm of the last factored values (Hager and Higham);
 * INFINITY when it is not known. */
double linear_condition(struct linear_solver *solver, const double *values);

/* Sign of the determinant of the last factored matrix: -1, 1, or 0. */
int linear_determinant_sign(const struct linear_solver *solver);

/*
 * linear_refine: solves A y = b to extended precision with the double factors (iterative refinement
 * with residuals in long double; Moler 1967, Higham 2002 chapter 12).
 *
 * values  [nonzeros] of A in long double; the solver holds the factors of its double rounding
 * b       [n] right side, kept
 * y       [n] out
 * work    [2 * n] undefined on entry and exit: long double
 *
 * Returns the last relative correction: about condition * 1e-19 when it went well.
 */
long double linear_refine(struct linear_solver *solver, const struct pattern *pattern,
                          const long double *values, const long double *b, long double *y,
                          long double *work, bool transposed);

/* Full factorisations and refactorisations so far. */
void linear_counts(const struct linear_solver *solver, int *full, int *again);

#endif
