/*
 * stopwatch.c: contenders in turns; medians.
 */
#include "bench/stopwatch.h"

#include <math.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <time.h>

/* A repeat lasts this long at least, s. */
static const double repeat_length = 5e-3, quick_length = 1e-4;
enum { LOOP_LIMIT = 1 << 20 };

double stopwatch_now(enum clock_kind clock)
{
    if (clock == CLOCK_CHILDREN) {
        struct rusage used = {.ru_maxrss = 0};
        getrusage(RUSAGE_CHILDREN, &used);
        return (double)(used.ru_utime.tv_sec + used.ru_stime.tv_sec) +
               1e-6 * (double)(used.ru_utime.tv_usec + used.ru_stime.tv_usec);
    }
    struct timespec t;
    clock_gettime(clock == CLOCK_WORK ? CLOCK_PROCESS_CPUTIME_ID : CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static int compare(const void *a, const void *b)
{
    const double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

double stopwatch_median(double *values, int count)
{
    qsort(values, (size_t)count, sizeof *values, compare);
    return (values[(count - 1) / 2] + values[count / 2]) / 2;
}

/* Seconds of one run, over `loops` of them; NAN when it failed. */
static double time_loops(const struct contender *c, int loops, enum clock_kind clock)
{
    const double begin = stopwatch_now(clock);
    for (int k = 0; k < loops; k++) {
        if (!c->run(c->self)) {
            return NAN;
        }
    }
    return (stopwatch_now(clock) - begin) / loops;
}

/* How many runs last long enough; the first runs also warm the caches. 0: it failed. */
static int find_loops(const struct contender *c, double length, enum clock_kind clock)
{
    for (int loops = 1; loops < LOOP_LIMIT; loops *= 2) {
        const double seconds = time_loops(c, loops, clock);
        if (!(seconds >= 0)) {
            return 0;
        }
        if (seconds * loops >= length) {
            return loops;
        }
    }
    return LOOP_LIMIT;
}

bool stopwatch_race(struct contender *contenders, int count, const struct bench_options *options,
                    enum clock_kind clock, double *ratios)
{
    static double times[CONTENDER_LIMIT][REPEAT_LIMIT]; /* one race at a time */
    const int repeats = options->repeats;
    int loops[CONTENDER_LIMIT];
    for (int k = 0; k < count; k++) {
        loops[k] = find_loops(&contenders[k], options->quick ? quick_length : repeat_length, clock);
        if (loops[k] == 0) {
            return false;
        }
    }
    double least = INFINITY, most = 0;
    for (int r = 0; r < repeats; r++) {
        for (int k = 0; k < count; k++) {
            times[k][r] = time_loops(&contenders[k], loops[k], clock);
            if (isnan(times[k][r])) {
                return false;
            }
        }
        const double ratio = count > 1 ? times[0][r] / times[1][r] : 1;
        least = fmin(least, ratio);
        most = fmax(most, ratio);
    }
    for (int k = 0; k < count; k++) {
        contenders[k].seconds = stopwatch_median(times[k], repeats);
        contenders[k].least = times[k][0];
        contenders[k].most = times[k][repeats - 1];
    }
    if (ratios != NULL) {
        ratios[0] = least;
        ratios[1] = most;
    }
    return true;
}
