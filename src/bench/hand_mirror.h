/*
 * hand_mirror.h: the mirror of the row `point`, solved by a program written for it alone.
 */
#ifndef BENCH_HAND_MIRROR_H
#define BENCH_HAND_MIRROR_H

#include <stdbool.h>

/* Nodes: ref, s1, s2, out. */
enum { HAND_N = 4 };

struct hand_mirror {
    const void *m1, *m2, *m3, *m4;  /* prepared transistors */
    double supply, reference, load; /* V, A, S */
    double tolerance;               /* of a sum of currents relative to what meets in it */
    int iterations;                 /* out */
};

/* Newton from x [HAND_N], to the root. False: it did not get there. */
bool hand_mirror_solve(struct hand_mirror *mirror, double *x);

#endif
