/*
 * newton.h: damped Newton steps to a root.
 */
#ifndef NUMERICS_NEWTON_H
#define NUMERICS_NEWTON_H

#include "numerics/system.h"

enum newton_status {
    NEWTON_CONVERGED = 0,
    NEWTON_STALLED,  /* the step became tiny while the residual did not */
    NEWTON_SINGULAR, /* report->column has no pivot */
    NEWTON_NOT_FINITE,
    NEWTON_LIMIT, /* too many iterations */
    NEWTON_MEMORY,
    NEWTON_STOPPED
};

const char *newton_status_text(enum newton_status status);

struct newton_options {
    double tolerance;      /* largest |f|/scale, 1 */
    double step_tolerance; /* largest weighted step, in units of x, relative to 1 + |x| */
    int iteration_limit;
    double step_limit; /* longest weighted step component of one iteration; INFINITY: none */
    bool (*stopped)(void *self); /* asked once an iteration; NULL: never */
    void *stopped_self;
};

/* tolerance 1e-10, step tolerance 1e-9, 100 iterations, no step limit. */
struct newton_options newton_default_options(void);

struct newton_report {
    int iterations;  /* all Newton iterations so far; the caller zeroes it, calls add up */
    double residual; /* last largest |f|/scale */
    double step;     /* last weighted step */
    int equation;    /* where the residual is largest */
    int column;      /* unknown without a pivot, -1 */
};

/* Length of the work array of doubles. */
size_t newton_work_size(const struct nonlinear_system *system);

/*
 * newton_solve: finds x with F(x) = 0.
 *
 * x       [n] in: start. Out: the last accepted point, also on failure
 * work    [newton_work_size] undefined on entry and exit; nothing is allocated here
 *         (the linear solver allocates when it must factor anew)
 * report  in and out
 *
 * Converged means: residual and step both pass in the same iteration; NaN passes nothing. A tiny
 * step alone is NEWTON_STALLED. On success the solver holds the factors of the last Jacobian.
 * Method: natural monotonicity test with adaptive damping (Deuflhard 2004, algorithm NLEQ-ERR), our
 * junction limit on the first trial; see docs/numerics.md.
 */
enum newton_status newton_solve(const struct nonlinear_system *system, struct linear_solver *solver,
                                const struct newton_options *options, double *x, double *work,
                                struct newton_report *report);

/* The last Newton step of newton_solve, [n] in its work array: after NEWTON_CONVERGED the one below
 * the step tolerance, which has not been taken. */
const double *newton_last_step(const struct nonlinear_system *system, const double *work);

/* Length of the work array of long doubles of newton_polish. */
size_t newton_polish_work_size(const struct nonlinear_system *system);

/*
 * newton_polish: takes a converged point on to the end of long double: residuals in extended
 * precision, steps by double factors, until the residual stops falling.
 *
 * x       [n] in: the root in double (widened); out: refined
 * values  [nonzeros] out: Jacobian at x in long double, for linear_refine; the solver then holds
 *         its factors
 * worst   out: largest |f|/scale at x; equation: where
 */
enum newton_status newton_polish(const struct nonlinear_system *system,
                                 struct linear_solver *solver, long double *x, long double *values,
                                 long double *work, double *worst, int *equation);

#endif
