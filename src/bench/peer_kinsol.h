/*
 * peer_kinsol.h: SUNDIALS KINSOL with its KLU adapter on a system of this program.
 */
#ifndef BENCH_PEER_KINSOL_H
#define BENCH_PEER_KINSOL_H

#include "solve/system.h"

struct peer_kinsol;

/*
 * peer_kinsol_create: all that can be made ready before a solve.
 *
 * scale      [n] magnitude of each equation: the solve ends when |f|/scale is below the tolerance
 * tolerance  1
 * searching  with KINSOL's line search; false: plain Newton steps
 *
 * NULL when something fails. Borrows the system.
 */
struct peer_kinsol *peer_kinsol_create(struct system *system, const double *scale, double tolerance,
                                       bool searching);
void peer_kinsol_destroy(struct peer_kinsol *peer);

/* Solves from start [n] into x [n]. False: KINSOL gave up. */
bool peer_kinsol_solve(struct peer_kinsol *peer, const double *start, double *x);

/* Of the last solve. */
int peer_kinsol_iterations(const struct peer_kinsol *peer);

#endif
