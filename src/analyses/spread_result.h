/*
 * spread_result.h: what conditions and mismatch do to a cell, as plain data. NAN: does not apply.
 */
#ifndef ANALYSES_SPREAD_RESULT_H
#define ANALYSES_SPREAD_RESULT_H

#include <stdint.h>

#include "circuit/circuit.h"
#include "numerics/statistics.h"

/* --- conditions: the `vary` lines --------------------------------------------------------------
 */

/* One `vary` line. Along a process the value is the number of a corner, -1 the typical one. */
struct condition_axis {
    const struct knob *knob;
    double from, to;
    double own;         /* the cell's own value */
    const double *ends; /* [end_count] values of the combinations: ends and own */
    int end_count;
    int fine_first, fine_count; /* its fine sweep among the points; fine_count 0: none */
};

/* One set of conditions. */
struct condition_point {
    const double *at; /* [axis_count] */
    bool is_done;     /* false: the work was stopped before */
    bool is_solved;
    double *values;  /* [probe_count] */
    double *margins; /* [requirement_count] of the circuit; NAN: not asked, or without a value */
};

struct condition_range {
    double own, least, most;
    const double *least_at, *most_at; /* [axis_count]; NULL: no value anywhere */
};

/* The box method: (greatest - least)/|own value| over a fine sweep of one axis, by its length. */
struct condition_drift {
    int axis, probe;
    double share_per_unit; /* 1/K for the temperature, 1/V for a rail */
};

/* How far down a rail may go. */
struct supply_limit {
    int rail, probe;
    double within;      /* the band around the own value, a share */
    double least;       /* V; NAN: the band is left nowhere on the way down to 0 */
    const char *remark; /* NULL: the band is left there; else what happened */
};

struct conditions_result {
    struct condition_axis *axes;
    int axis_count;
    struct condition_point *points; /* combinations first, then the fine sweeps */
    int point_count, combination_count;
    int done_count; /* less than point_count: the work was stopped */
    int unsolved_count;
    const double *unsolved_at; /* the first of them */
    const struct probe *probes;
    int probe_count;
    struct condition_range *ranges; /* [probe_count] */
    struct condition_drift *drifts;
    int drift_count;
    struct supply_limit *supplies;
    int supply_count;
};

/* --- mismatch ----------------------------------------------------------------------------------
 */

/* Share of the linear variance of a quantity from one cause in one device. */
struct contributor {
    const struct instance *instance;
    const char *cause;
    double share;
    double slope; /* change of the quantity per standard deviation, signed */
};

/* Whether linear and sampled sigma differ by less than sampling explains at 99 %. */
enum agreement { AGREEMENT_UNKNOWN, AGREEMENT_HOLDS, AGREEMENT_FAILS };

struct spread_of_probe {
    const struct probe *probe;
    double own;
    double linear_sigma;              /* NAN: not available for this quantity */
    struct contributor *contributors; /* [contributor_count] greatest first */
    int contributor_count;
    struct statistics sampled; /* count 0: not sampled */
    int missing;               /* solved samples in which it has no value */
    struct histogram histogram;
    enum agreement agreement;
};

struct yield_result {
    int hits, count;         /* samples that meet it, of those done; one that failed does not */
    double share, low, high; /* Wilson interval, 95 % */
};

enum sample_state { SAMPLE_OPEN, SAMPLE_SOLVED, SAMPLE_SEARCHED, SAMPLE_FAILED };

struct mismatch_result {
    int deviate_count; /* 0: the cell has no mismatch coefficients */
    uint64_t seed;
    int wanted;                         /* samples asked for */
    int done, failed, searched;         /* searched: found from cold, not from the own point */
    struct spread_of_probe *quantities; /* [quantity_count] */
    int quantity_count;
    const double *values;              /* [wanted * quantity_count] row by row */
    const unsigned char *states;       /* [wanted] enum sample_state; NULL: not sampled */
    const unsigned char *met;          /* [wanted * requirement_count] of the circuit */
    const struct yield_result *yields; /* [requirement_count] of the circuit; NULL: not sampled */
};

#endif
