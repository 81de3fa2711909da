/*
 * lanes.h: mismatch samples solved side by side, one a lane of a vector.
 *
 * Newton steps from the own point, moved to first order, with the pivots chosen there, by the
 * convergence test of newton.h and one more step. A lane that asks for damping, for other pivots or
 * for too many steps is left to whoever solves one sample at a time. What comes out of a lane
 * depends on its sample alone, not on the samples beside it.
 */
#ifndef ANALYSES_LANES_H
#define ANALYSES_LANES_H

#include "analyses/mismatch.h"

enum { LANES_LIMIT = 8 };

struct lanes_engine;

/* One width of vector. */
struct lanes_kind {
    const char *name; /* "avx512" */
    int width;
    bool (*is_supported)(void); /* by this processor */

    /*
     * begin: prepares for samples of a system.
     *
     * system       with the values of the cell itself in force, its solver holding the factors
     * there home         [n] the own point home_values  [nonzeros] the Jacobian there
     *
     * NULL when memory is short (then *status is STATUS_MEMORY), or when the system is not for
     * lanes and the caller goes on without (STATUS_OK).
     */
    struct lanes_engine *(*begin)(struct system *system, const struct mismatch *mismatch,
                                  const double *home, const double *home_values,
                                  struct arena *arena, enum status *status);

    /*
     * solve: samples first to first + width - 1.
     *
     * Returns the lanes that were solved, bit by bit.
     */
    unsigned (*solve)(struct lanes_engine *engine, uint64_t seed, uint64_t first);

    /* Unknowns of a lane, [n] out. */
    void (*read)(const struct lanes_engine *engine, int lane, double *x);

    /* Puts what a lane has moved into the prepared blocks of the system (not among its values). */
    void (*stand_in)(const struct lanes_engine *engine, int lane);
};

/* The widest kind of at most `width` lanes (0: any) that this build has and this processor runs;
 * NULL: none. */
const struct lanes_kind *lanes_find(int width);

#endif
