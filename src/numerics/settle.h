/*
 * settle.h: a root by letting the system come to rest.
 */
#ifndef NUMERICS_SETTLE_H
#define NUMERICS_SETTLE_H

#include "numerics/newton.h"

/*
 * settle: pseudo-transient continuation from x, then Newton.
 *
 * inertia  [n] D, in the unit of F per unit of x and step: positive for unknowns whose diagonal is in
 *          the pattern, 0 for unknowns that follow at once
 * x        [n] in: start. Out: as newton_solve
 * work     [newton_work_size] undefined on entry and exit; nothing is allocated here
 *
 * Returns as newton_solve, which judges the end.
 */
enum newton_status settle(const struct nonlinear_system *system, struct linear_solver *solver,
                          const struct newton_options *options, const double *inertia, double *x,
                          double *work, struct newton_report *report);

#endif
