/*
 * mismatch.h: the random deviates of all devices of a cell, and what they do to first order.
 */
#ifndef ANALYSES_MISMATCH_H
#define ANALYSES_MISMATCH_H

#include "solve/operating_point.h"
#include "analyses/spread_result.h"

/* One independent deviate that is added to a hidden value: normal, or even (a tolerance). */
struct mismatch_row {
    int instance;
    const struct deviate *deviate;
    double sigma;
    bool is_even;
};

struct mismatch {
    struct mismatch_row *rows; /* in the order of the cell */
    int count;
};

/* All deviates of a system whose sigma is above 0. False when memory is short. */
bool mismatch_list(const struct system *system, struct arena *arena, struct mismatch *mismatch);

/* An even number of sigma 1 from a standard normal one. */
double mismatch_even(double z);

/* Sets the hidden values from standard normal numbers, one a row. */
void mismatch_apply(struct system *system, const struct mismatch *mismatch, const double *deviates);

/*
 * mismatch_slopes: change of a quantity per standard deviation of each row, at the polished point;
 * for most quantities by one adjoint solve (quantity.h).
 *
 * slopes  [count] out
 *
 * Returns STATUS_OK, STATUS_UNSOLVED for a quantity without a derivative, STATUS_STOPPED or
 * STATUS_MEMORY.
 */
enum status mismatch_slopes(struct operating_point *point, const struct mismatch *mismatch,
                            const struct probe *probe, double *slopes);

#endif
