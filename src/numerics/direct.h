/*
 * direct.h: factors and solutions of a small matrix by the list of its steps (replay.h): what KLU
 * does for the same pivots, without what KLU needs for large systems.
 */
#ifndef NUMERICS_DIRECT_H
#define NUMERICS_DIRECT_H

#include "numerics/linear.h"

/* Systems with more unknowns are left to KLU. */
enum { DIRECT_LIMIT = 48 };

struct direct;

/* The list for the pivots that the solver has just chosen for `values`; NULL when memory is short
 * or the system is too large. Owned by the caller (direct_destroy, which takes NULL). */
struct direct *direct_create(const struct linear_solver *solver, const struct pattern *pattern,
                             const double *values);
void direct_destroy(struct direct *direct);

/* False: the pivots are no longer good for these values, or a value is not finite; nothing is then
 * factored. */
bool direct_factor(struct direct *direct, const double *values);

/* Whether factors are at hand: after a direct_factor that went well. */
bool direct_is_factored(const struct direct *direct);

/* b: [n] in: right side; out: solution. */
void direct_solve(struct direct *direct, double *b);
void direct_solve_transposed(struct direct *direct, double *b);

/* How many pivots are negative. */
int direct_negative_pivots(const struct direct *direct);

#endif
