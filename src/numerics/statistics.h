/*
 * statistics.h: figures of a list of numbers. Values that are not finite must be left out before.
 */
#ifndef NUMERICS_STATISTICS_H
#define NUMERICS_STATISTICS_H

enum { HISTOGRAM_BIN_LIMIT = 40 };

struct statistics {
    int count;
    double mean;
    double sigma;       /* n - 1 in the denominator; NAN below two values */
    double sigma_error; /* standard error of sigma, also for distributions that are not normal */
    double least, most;
};

/* Two passes in long double (Chan, Golub and LeVeque 1983). The order of the values does not matter
 * beyond the rounding of long double. */
struct statistics statistics_of(const double *values, int count);

/* Equal bins from `from` to `to`. */
struct histogram {
    int bins;
    double from, to;
    int counts[HISTOGRAM_BIN_LIMIT];
};

/* Bins as wide as Scott (1979) has it, 3.49 sigma n^(-1/3), at most HISTOGRAM_BIN_LIMIT; one bin
 * when all values are equal. */
struct histogram histogram_of(const double *values, int count, const struct statistics *figures);

/* Score interval of a share at confidence 95 % (Wilson 1927). [0, 1] when n is 0. */
void wilson_interval(int hits, int n, double *low, double *high);

#endif
