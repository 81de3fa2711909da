/*
 * refine.c: iterative refinement to extended precision (Moler 1967; Higham 2002, chapter 12).
 *
 * Each round solves for the residual of the last answer, computed in long double. The error
 * shrinks by about condition * 1e-16 a round, down to what long double holds.
 */
#include "numerics/linear.h"

#include <math.h>

enum { ROUND_LIMIT = 20 };

/* residual = b - A y, or b - A' y. */
static void take_residual(const struct pattern *p, const long double *values, const long double *b,
                          const long double *y, long double *residual, bool transposed)
{
    for (int i = 0; i < p->n; i++) {
        residual[i] = b[i];
    }
    for (int column = 0; column < p->n; column++) {
        for (int k = p->start[column]; k < p->start[column + 1]; k++) {
            if (transposed) {
                residual[column] -= values[k] * y[p->row[k]];
            } else {
                residual[p->row[k]] -= values[k] * y[column];
            }
        }
    }
}

/* How large a correction is: against the largest unknown, and the worst against its own unknown. */
struct correction {
    long double overall, own;
};

static struct correction measure(const double *d, const long double *y, int n)
{
    long double largest_d = 0;
    long double largest_y = 0;
    struct correction c = {0, 0};
    for (int i = 0; i < n; i++) {
        long double size = fabsl((long double)d[i]);
        long double whole = fabsl(y[i]);
        if (!isfinite(size)) {
            return (struct correction){INFINITY, INFINITY};
        }
        largest_d = fmaxl(largest_d, size);
        largest_y = fmaxl(largest_y, whole);
        c.own = fmaxl(c.own, size > 0 ? fminl(size / whole, 1) : 0);
    }
    c.overall = largest_d > 0 ? largest_d / largest_y : 0;
    return c;
}

long double linear_refine(struct linear_solver *solver, const struct pattern *pattern,
                          const long double *values, const long double *b, long double *y,
                          long double *work, bool transposed)
{
    int n = pattern->n;
    long double *residual = work;
    double *d = (double *)(void *)(work + n); /* n doubles in the room of n long doubles */
    struct correction last = {INFINITY, INFINITY};
    for (int i = 0; i < n; i++) {
        y[i] = 0;
    }
    /* Round 0 solves from y = 0. A round must halve one of the two measures to be followed by
     * another; one that makes the answer worse is left out. */
    for (int round = 0; round <= ROUND_LIMIT; round++) {
        take_residual(pattern, values, b, y, residual, transposed);
        for (int i = 0; i < n; i++) {
            d[i] = (double)residual[i];
        }
        if (transposed) {
            linear_solve_transposed(solver, d);
        } else {
            linear_solve(solver, d);
        }
        struct correction now = measure(d, y, n);
        if (round > 1 && !(now.overall <= last.overall)) {
            return fminl(now.overall, last.overall);
        }
        for (int i = 0; i < n; i++) {
            y[i] += (long double)d[i];
        }
        bool falling = now.overall <= last.overall / 2 || now.own <= last.own / 2;
        if (round > 0) {
            last = now;
        }
        if (round > 0 && (now.overall == 0 || (round > 1 && !falling))) {
            break;
        }
    }
    return last.overall;
}
