/*
 * sampling.h: mismatch samples of a cell, each a full solve.
 *
 * Sample k depends on the seed and k only: deviate d of it is number d of stream k. Any split into
 * blocks, threads or runs gives the same samples, bit by bit.
 */
#ifndef ANALYSES_SAMPLING_H
#define ANALYSES_SAMPLING_H

#include "analyses/mismatch.h"
#include "analyses/reading.h"

/* What to draw. */
struct sampling_plan {
    struct circuit *circuit;
    const struct analysis_options *options; /* view, seed, jobs, stopped, progress */
    const struct mismatch *mismatch;
    const double *home; /* [unknown_count] the own point, where each sample starts */
    long long first;    /* number of the first sample */
    int count;
};

/* What came out; row k is sample first + k. */
struct sample_rows {
    double *values;        /* [count * probe_count] NAN where there is none */
    unsigned char *met;    /* [count * requirement_count] 1: the requirement is met */
    unsigned char *states; /* [count] enum sample_state */
};

/*
 * sampling_run: fills all rows, which the caller has zeroed.
 *
 * Returns STATUS_OK, STATUS_STOPPED (rows of state SAMPLE_OPEN were not reached), STATUS_MEMORY.
 */
enum status sampling_run(const struct sampling_plan *plan, struct sample_rows *rows);

#endif
