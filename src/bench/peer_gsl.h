/*
 * peer_gsl.h: the hybrid solver of GSL multiroots on a system of this program.
 */
#ifndef BENCH_PEER_GSL_H
#define BENCH_PEER_GSL_H

#include "solve/system.h"

struct peer_gsl;

/* As peer_kinsol_create. */
struct peer_gsl *peer_gsl_create(struct system *system, const double *scale, double tolerance);
void peer_gsl_destroy(struct peer_gsl *peer);

/* Solves from start [n] into x [n]. False: it gave up. */
bool peer_gsl_solve(struct peer_gsl *peer, const double *start, double *x);

#endif
