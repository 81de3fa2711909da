/*
 * linear_klu.c: the linear solver on KLU (Davis and Palamadai Natarajan 2010, ACM TOMS 37, 36).
 *
 * The only file that knows KLU. Works with SuiteSparse 5 (int indices) and 7 (int32_t, the same).
 * KLU works on P R^-1 A Q with a block triangular order, row scale R > 0 and pivots chosen inside
 * the diagonal blocks.
 */
#include "numerics/linear.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>

#include <klu.h>

#include "numerics/direct.h"

enum { SCALE_BY_ROW_MAXIMUM = 2 }; /* KLU's code for it */

struct linear_solver {
    const struct pattern *pattern; /* borrowed */
    klu_common common;
    klu_symbolic *symbolic; /* NULL only when n is 0: KLU refuses an empty matrix */
    klu_numeric *numeric;   /* NULL: nothing is factored */
    struct direct *direct;  /* the same pivots for a small system; NULL: KLU alone */
    int *mark;              /* [n] workspace of parity */
    int singular_column;    /* -1: none */
    int full, again;        /* factorisations with and without a new choice of pivots */
};

/* KLU takes pointers to plain double but only reads them; the way over an integer keeps
 * -Wcast-qual useful everywhere else. */
static double *readable(const double *values)
{
    return (double *)(uintptr_t)values; /* NOLINT(performance-no-int-to-ptr) */
}

struct linear_solver *linear_create(const struct pattern *pattern)
{
    struct linear_solver *solver = calloc(1, sizeof *solver);
    if (solver == NULL) {
        return NULL;
    }
    solver->pattern = pattern;
    solver->singular_column = -1;
    klu_defaults(&solver->common);
    solver->common.btf = 1;
    solver->common.scale = SCALE_BY_ROW_MAXIMUM;
    solver->common.halt_if_singular = 1;
    if (pattern->n == 0) {
        return solver;
    }
    solver->mark = calloc((size_t)pattern->n, sizeof *solver->mark);
    if (solver->mark != NULL) {
        solver->symbolic = klu_analyze(pattern->n, pattern->start, pattern->row, &solver->common);
    }
    if (solver->symbolic == NULL) {
        linear_destroy(solver);
        return NULL;
    }
    return solver;
}

void linear_destroy(struct linear_solver *solver)
{
    if (solver == NULL) {
        return;
    }
    linear_forget(solver);
    klu_free_symbolic(&solver->symbolic, &solver->common);
    free(solver->mark);
    free(solver);
}

int linear_structural_rank(const struct linear_solver *solver)
{
    return solver->symbolic != NULL ? solver->symbolic->structural_rank : 0;
}

/* Nothing is NaN or infinite: then every product with 0 is 0. */
static bool all_finite(const double *values, int count)
{
    double sum[4] = {0, 0, 0, 0};
    int i = 0;
    for (; i + 4 <= count; i += 4) {
        for (int k = 0; k < 4; k++) {
            sum[k] += values[i + k] * 0;
        }
    }
    for (; i < count; i++) {
        sum[0] += values[i] * 0;
    }
    return sum[0] + sum[1] + sum[2] + sum[3] == 0;
}

/* No pivot overflowed. KLU compares pivots with zero only, and its growth figure skips NaN. */
static bool pivots_finite(const struct linear_solver *solver)
{
    return all_finite((const double *)solver->numeric->Udiag, solver->pattern->n);
}

/* Factors with the pivots of last time. False: they are no longer good. */
static bool factor_again(struct linear_solver *solver, const double *values)
{
    if (solver->direct != NULL) {
        return direct_factor(solver->direct, values);
    }
    struct pattern p = *solver->pattern;
    klu_common *common = &solver->common;
    double *a = readable(values);
    return klu_refactor(p.start, p.row, a, solver->symbolic, solver->numeric, common) &&
           common->status == KLU_OK &&
           klu_rgrowth(p.start, p.row, a, solver->symbolic, solver->numeric, common) &&
           common->rgrowth >= LINEAR_GROWTH_LIMIT && pivots_finite(solver);
}

enum linear_status linear_factor(struct linear_solver *solver, const double *values)
{
    const struct pattern *p = solver->pattern;
    klu_common *common = &solver->common;
    solver->singular_column = -1;
    if (p->n == 0) {
        return LINEAR_OK;
    }
    if (!all_finite(values, p->start[p->n])) {
        linear_forget(solver);
        return LINEAR_NOT_FINITE;
    }
    if (solver->numeric != NULL) {
        if (factor_again(solver, values)) {
            solver->again++;
            return LINEAR_OK;
        }
        linear_forget(solver);
    }
    /* A singular matrix gives NULL here with a positive status, which is no success. */
    solver->numeric = klu_factor(p->start, p->row, readable(values), solver->symbolic, common);
    solver->full++;
    if (solver->numeric == NULL) {
        if (common->status != KLU_SINGULAR) {
            return LINEAR_MEMORY;
        }
        solver->singular_column = common->singular_col; /* in the numbering of the pattern */
        return LINEAR_SINGULAR;
    }
    if (!pivots_finite(solver)) {
        linear_forget(solver);
        return LINEAR_NOT_FINITE;
    }
    if (p->n <= DIRECT_LIMIT) { /* KLU's own factors serve until the next values */
        solver->direct = direct_create(solver, p, values);
        if (solver->direct == NULL) {
            linear_forget(solver);
            return LINEAR_MEMORY;
        }
    }
    return LINEAR_OK;
}

void linear_forget(struct linear_solver *solver)
{
    klu_free_numeric(&solver->numeric, &solver->common);
    direct_destroy(solver->direct);
    solver->direct = NULL;
}

bool linear_pivots(const struct linear_solver *solver, int *row, int *column)
{
    if (solver->numeric == NULL) {
        return false;
    }
    for (int k = 0; k < solver->pattern->n; k++) {
        row[k] = solver->numeric->Pnum[k];
        column[k] = solver->symbolic->Q[k];
    }
    return true;
}

void linear_solve(struct linear_solver *solver, double *b)
{
    if (direct_is_factored(solver->direct)) {
        direct_solve(solver->direct, b);
    } else if (solver->numeric != NULL) {
        klu_solve(solver->symbolic, solver->numeric, solver->pattern->n, 1, b, &solver->common);
    }
}

void linear_solve_transposed(struct linear_solver *solver, double *b)
{
    if (direct_is_factored(solver->direct)) {
        direct_solve_transposed(solver->direct, b);
    } else if (solver->numeric != NULL) {
        klu_tsolve(solver->symbolic, solver->numeric, solver->pattern->n, 1, b, &solver->common);
    }
}

int linear_singular_column(const struct linear_solver *solver)
{
    return solver->singular_column;
}

double linear_condition(struct linear_solver *solver, const double *values)
{
    if (solver->pattern->n == 0) {
        return 1;
    }
    struct pattern p = *solver->pattern;
    if (solver->numeric == NULL ||
        (direct_is_factored(solver->direct) &&
         !klu_refactor(p.start, p.row, readable(values), solver->symbolic, solver->numeric,
                       &solver->common)) ||
        !klu_condest(solver->pattern->start, readable(values), solver->symbolic, solver->numeric,
                     &solver->common)) {
        return INFINITY;
    }
    return solver->common.condest;
}

/* True for an odd permutation: n minus its number of cycles is odd. mark: [n], all 0 or all
 * `seen` - 1 on entry, all `seen` on exit. */
static bool is_odd(const int *permutation, int n, int *mark, int seen)
{
    int cycles = 0;
    for (int k = 0; k < n; k++) {
        if (mark[k] == seen) {
            continue;
        }
        cycles++;
        for (int j = k; mark[j] != seen; j = permutation[j]) {
            mark[j] = seen;
        }
    }
    return (n - cycles) % 2 != 0;
}

int linear_determinant_sign(const struct linear_solver *solver)
{
    int n = solver->pattern->n;
    if (n == 0) {
        return 1; /* the empty product */
    }
    if (solver->numeric == NULL) {
        return 0;
    }
    /* The scaled, permuted matrix is block triangular with blocks L U, L of unit diagonal. */
    const double *pivots = solver->numeric->Udiag;
    for (int k = 0; k < n; k++) {
        solver->mark[k] = 0;
    }
    bool negative = is_odd(solver->numeric->Pnum, n, solver->mark, 1) !=
                    is_odd(solver->symbolic->Q, n, solver->mark, 2);
    if (direct_is_factored(solver->direct)) {
        return negative != (direct_negative_pivots(solver->direct) % 2 != 0) ? -1 : 1;
    }
    for (int k = 0; k < n; k++) {
        negative = negative != (pivots[k] < 0);
    }
    return negative ? -1 : 1;
}

void linear_counts(const struct linear_solver *solver, int *full, int *again)
{
    *full = solver->full;
    *again = solver->again;
}
