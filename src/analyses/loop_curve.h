/*
 * loop_curve.h: a loop opened at one node: its voltage is held, and the current that the cell
 * drives into it is looked at. Where that push is 0 the closed loop rests.
 */
#ifndef ANALYSES_LOOP_CURVE_H
#define ANALYSES_LOOP_CURVE_H

#include "solve/operating_point.h"

struct held_loop;

/* In the arena; NULL when memory is short. */
struct held_loop *held_loop_create(struct arena *arena, struct system *system, int unknown);
void held_loop_free(struct held_loop *loop);

/*
 * held_loop_solve: the cell with the node held.
 *
 * x     [n] in: start; out: solution
 * push  out: A that the cell drives into the node, positive: the voltage would rise
 */
enum newton_status held_loop_solve(struct held_loop *loop, double volts, double *x, double *push);

struct loop_curve {
    double *v, *push; /* [count] */
    double *x;        /* [count * n] the solutions */
    int count;
};

/*
 * loop_curve_trace: from `from` to `to` in `points` steps, each from the last solution; points that
 * cannot be solved are left out.
 *
 * start  [n] a solution of the cell near from, or any start
 */
enum status loop_curve_trace(struct held_loop *loop, struct arena *arena, const double *start,
                             double from, double to, int points, struct loop_curve *curve);

#endif
