/*
 * settle.h: a root by letting the system come to rest.
 */
#ifndef NUMERICS_SETTLE_H
#define NUMERICS_SETTLE_H

#include "numerics/newton.h"

/* Steps of the motion. */
enum { SETTLE_LIMIT = 150, SETTLE_PATIENT_LIMIT = 1000 };

/*
 * settle: pseudo-transient continuation from x, then Newton. options->step_limit caps each weighted
 * component of a step.
 *
 * inertia  [n] D, in the unit of F per unit of x and step: positive for unknowns whose diagonal is
 * in the pattern, 0 for unknowns that follow at once patient  smaller and many more steps: for the
 * last try x        [n] in: start. Out: as newton_solve work     [newton_work_size] undefined on
 * entry and exit; nothing is allocated here
 *
 * Returns as newton_solve, which judges the end.
 */
enum newton_status settle(const struct nonlinear_system *system, struct linear_solver *solver,
                          const struct newton_options *options, const double *inertia, bool patient,
                          double *x, double *work, struct newton_report *report);

#endif
