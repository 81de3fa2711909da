/*
 * continuation.h: following a root while a parameter moves.
 */
#ifndef NUMERICS_CONTINUATION_H
#define NUMERICS_CONTINUATION_H

#include "numerics/newton.h"

struct continuation_options {
    struct newton_options newton;
    double first_step; /* share of |to - from| */
    double least_step; /* share; below it the walk gives up */
    int step_limit;    /* accepted and rejected steps together */
    double surprise;   /* continuation_walk: a root further than this (weighted) from where the
                          tangent led is taken for another branch; INFINITY: any root will do */
};

struct continuation_options continuation_default_options(void);

/*
 * continuation_walk: natural-parameter continuation with tangent predictor and adaptive step.
 *
 * x        [n] in: root or a start near the root at `from`; out: root at *reached
 * reached  out: last parameter with a root
 *
 * NEWTON_CONVERGED only when `to` was reached and solved.
 */
enum newton_status continuation_walk(const struct nonlinear_system *system,
                                     struct linear_solver *solver,
                                     const struct continuation_options *options, double from,
                                     double to, double *x, double *reached, double *work,
                                     struct newton_report *report);
size_t continuation_walk_work_size(const struct nonlinear_system *system);

/*
 * arclength_trace: pseudo-arclength continuation (Keller 1977), which passes folds.
 *
 * from, to  the trace starts at lambda = from, heading towards `to`
 * visit     called at every accepted point (lambda may turn round); return false to end the trace
 * there. May be NULL. det_sign: sign of det dF/dx x         [n] in: root at `from`; out: the first
 * root found at lambda = to, or the last point
 *
 * Allocates its bordered system at the start, nothing in its loop. NEWTON_CONVERGED when lambda =
 * to was reached (crossings are refined to it by Newton) or visit ended the trace at its wish with
 * *ended = true.
 */
struct trace_point {
    const double *x;
    double lambda;
    double arc; /* length so far */
    int det_sign;
    bool at_target; /* this point is a refined root at lambda = to */
};

enum newton_status arclength_trace(const struct nonlinear_system *system,
                                   const struct continuation_options *options, double from,
                                   double to, double *x,
                                   bool (*visit)(void *self, const struct trace_point *point),
                                   void *visit_self, bool *ended, struct newton_report *report);

#endif
