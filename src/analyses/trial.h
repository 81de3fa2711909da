/*
 * trial.h: the same cell solved again with some parameters at other values.
 */
#ifndef ANALYSES_TRIAL_H
#define ANALYSES_TRIAL_H

#include "analyses/derivative.h"
#include "solve/variant.h"

/* A cell of its own: the one it was made from is not touched. */
struct trial {
    struct variant variant;
    struct operating_point point;
};

/*
 * trial_open: builds the cell with each parameter at its value and solves it, from the state of
 * `home` where that leads on.
 *
 * start  [n] where to begin; NULL: home->x
 *
 * Returns STATUS_OK (point is polished), STATUS_UNSOLVED, STATUS_STOPPED or STATUS_MEMORY. The
 * caller ends with trial_close in any case.
 */
enum status trial_open(struct trial *trial, const struct operating_point *home, const double *start,
                       const struct parameter_ref *parameters, const double *values, int count);
void trial_close(struct trial *trial);

#endif
