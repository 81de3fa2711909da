/*
 * statistics.c: mean, spread, histogram and the interval of a share.
 */
#include "numerics/statistics.h"

#include <math.h>

struct statistics statistics_of(const double *values, int count)
{
    struct statistics s = {.count = count,
                           .mean = NAN,
                           .sigma = NAN,
                           .sigma_error = NAN,
                           .least = INFINITY,
                           .most = -INFINITY};
    long double sum = 0;
    for (int k = 0; k < count; k++) {
        sum += values[k];
        s.least = fmin(s.least, values[k]);
        s.most = fmax(s.most, values[k]);
    }
    if (count == 0) {
        s.least = s.most = NAN;
        return s;
    }
    const long double mean = sum / count;
    long double first = 0, second = 0, fourth = 0;
    for (int k = 0; k < count; k++) {
        const long double d = values[k] - mean, square = d * d;
        first += d;
        second += square;
        fourth += square * square;
    }
    s.mean = (double)(mean + first / count);
    if (count < 2) {
        return s;
    }
    /* what the rounding of the mean leaves is taken out again */
    const long double variance = (second - first * first / count) / (count - 1);
    s.sigma = (double)sqrtl(variance);
    /* Var(s^2) = (m4 - s^4 (n - 3)/(n - 1))/n, and Var(s) = Var(s^2)/(4 s^2) to first order:
     * Mood, Graybill and Boes (1974), section VI.2. */
    const long double moment = fourth / count;
    const long double uncertain =
        (moment - variance * variance * (count - 3) / (count - 1)) / count;
    s.sigma_error = variance > 0 ? (double)(sqrtl(fmaxl(uncertain, 0)) / (2 * sqrtl(variance))) : 0;
    return s;
}

struct histogram histogram_of(const double *values, int count, const struct statistics *s)
{
    struct histogram h = {.bins = 1, .from = s->least, .to = s->most};
    const double span = s->most - s->least;
    if (count >= 2 && span > 0) {
        const double width = 3.49 * s->sigma / cbrt(count);
        const double wanted = ceil(span / width);
        h.bins = wanted >= 1 && wanted <= HISTOGRAM_BIN_LIMIT ? (int)wanted : HISTOGRAM_BIN_LIMIT;
    }
    for (int k = 0; k < count; k++) {
        const double place = span > 0 ? (values[k] - h.from) / span * h.bins : 0;
        const int bin = place < h.bins ? (int)place : h.bins - 1;
        h.counts[bin]++;
    }
    return h;
}

/* Wilson, J. Am. Stat. Assoc. 22 (1927) 209-212. */
void wilson_interval(int hits, int n, double *low, double *high)
{
    static const double z = 1.959963984540054; /* normal quantile of 0.975 */
    if (n <= 0) {
        *low = 0;
        *high = 1;
        return;
    }
    const double p = (double)hits / n, zz = z * z / n;
    const double centre = (p + zz / 2) / (1 + zz);
    const double half = z / (1 + zz) * sqrt(p * (1 - p) / n + zz / (4 * n));
    *low = hits == 0 ? 0 : centre - half;
    *high = hits == n ? 1 : centre + half;
}
