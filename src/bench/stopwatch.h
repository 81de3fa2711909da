/*
 * stopwatch.h: contenders timed in turns, so that what the machine does meanwhile meets all alike.
 */
#ifndef BENCH_STOPWATCH_H
#define BENCH_STOPWATCH_H

#include "bench/bench.h"

enum { CONTENDER_LIMIT = 6, REPEAT_LIMIT = 1001 };

struct contender {
    bool (*run)(void *self); /* once; false: it failed */
    void *self;
    double seconds;     /* out: median of one run */
    double least, most; /* out: of its repeats */
};

enum clock_kind {
    CLOCK_WORK, /* processor time of this process: of one thread, nearly untouched by others */
    CLOCK_WALL,
    CLOCK_CHILDREN /* processor time of the processes that were started and have ended */
};

/*
 * stopwatch_race: each contender once in turn, options->repeats times. A repeat runs a contender
 * so often that it lasts some milliseconds.
 *
 * ratios  [2] out: least and most of first over second in one repeat; NULL: not asked
 *
 * False when one failed.
 */
bool stopwatch_race(struct contender *contenders, int count, const struct bench_options *options,
                    enum clock_kind clock, double *ratios);

/* Seconds of a clock. */
double stopwatch_now(enum clock_kind clock);

/* Middle of values [count], which are sorted. */
double stopwatch_median(double *values, int count);

#endif
