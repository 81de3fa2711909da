/*
 * system.h: a square nonlinear system F(x, lambda) = 0 as the solvers see it.
 */
#ifndef NUMERICS_SYSTEM_H
#define NUMERICS_SYSTEM_H

#include <stdbool.h>

#include "numerics/linear.h"

struct nonlinear_system {
    int n;
    const struct pattern *pattern;
    void *self;

    /*
     * evaluate: residual and derivatives.
     *
     * x       [n]
     * f       [n] out
     * scale   [n] out: sum of the magnitudes that meet in each equation, so that |f|/scale is
     * relative values  [nonzeros] out, in the order of the pattern
     *
     * False when something is not finite.
     */
    bool (*evaluate)(void *self, const double *x, double *f, double *scale, double *values);

    /* The same in long double; values may be NULL. NULL: there is no wider version. */
    bool (*evaluate_extended)(void *self, const long double *x, long double *f, long double *scale,
                              long double *values);

    /* Longest acceptable share of a step, 0 < t <= 1. NULL: 1. */
    double (*longest_step)(void *self, const double *x, const double *dx);

    /* Sets the continuation parameter; NULL: there is none. */
    void (*set_parameter)(void *self, double lambda);
    /* dF/dlambda at x and the parameter in force, [n] out. */
    void (*parameter_slope)(void *self, const double *x, double *slope);

    /* [n] weight of each unknown in the norm of a step: 1 for a voltage in V, 0 for an unknown that
     * enters linearly (a branch current) and is not to slow the search. NULL: all 1. */
    const double *weight;
};

#endif
