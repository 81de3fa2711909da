/*
 * least_squares.h: bounded nonlinear least squares with standard errors and correlations. Knows no
 * device.
 */
#ifndef CALIBRATE_LEAST_SQUARES_H
#define CALIBRATE_LEAST_SQUARES_H

#include <stdbool.h>

#include "base/arena.h"
#include "base/status.h"

/* Most free parameters of one fit. */
enum { LEAST_SQUARES_LIMIT = 96 };

/* One free parameter: it stays between its bounds, both finite. */
struct bounded {
    double least, most;
    bool logarithmic; /* searched on a logarithmic scale; least > 0 */
};

struct least_squares_problem {
    int parameter_count, residual_count;
    const struct bounded *bounds; /* [parameter_count] */
    double least_fall; /* of the sum of squares, relative; less ends the search; 0: 1e-10 */
    /*
     * residuals  [residual_count] out; NULL: not wanted
     * jacobian   [residual_count * parameter_count] out, column by column:
     *            jacobian[k + residual_count * j] = d residual k/d parameter j; NULL: not wanted
     */
    void (*evaluate)(void *self, const double *parameters, double *residuals, double *jacobian);
    bool (*stopped)(void *self); /* asked once an evaluation; NULL: never */
    void *self;
};

/* All arrays belong to the arena of the call. */
struct least_squares_answer {
    double sum;          /* of the squared residuals */
    double reduced;      /* sum over residuals minus free parameters */
    int evaluations;     /* of residuals and of derivatives */
    int rank;            /* of the Jacobian with scaled columns, without parameters at a bound */
    bool *at_bound;      /* [parameter_count] */
    double *standard;    /* [parameter_count] standard errors; NAN at a bound, infinite where the
                            data tell nothing */
    double *correlation; /* [parameter_count^2] */
    const char *ended;   /* why the search ended, in words */
};

/*
 * least_squares_solve: the least sum of squares near a start.
 *
 * problem     at least as many residuals as parameters, at most LEAST_SQUARES_LIMIT parameters
 * parameters  [parameter_count] in: the start, moved inside the bounds; out: the answer
 *
 * Returns STATUS_OK, STATUS_MEMORY, or STATUS_STOPPED (parameters: the best so far). Method:
 * Levenberg (1944) and Marquardt (1963) in the form of More (1978), by cminpack; a parameter p
 * between bounds is the sine of a free angle (James and Roos, Comput. Phys. Comm. 10 (1975) 343,
 * section 3.2). Same input, same bits.
 */
enum status least_squares_solve(struct arena *arena, const struct least_squares_problem *problem,
                                double *parameters, struct least_squares_answer *answer);

#endif
