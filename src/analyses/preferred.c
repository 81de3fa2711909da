/*
 * preferred.c: the E24 and E96 series of IEC 60063.
 */
#include <math.h>

#include "analyses/size.h"

/* E24 as standardised: eight values (27 to 47, and 82) differ from the rounded power of ten. */
static const double e24[] = {1.0, 1.1, 1.2, 1.3, 1.5, 1.6, 1.8, 2.0, 2.2, 2.4, 2.7, 3.0,
                             3.3, 3.6, 3.9, 4.3, 4.7, 5.1, 5.6, 6.2, 6.8, 7.5, 8.2, 9.1};

/* Nearer by ratio; a tie goes to the later one. */
static double nearer(double value, double best, double candidate)
{
    return fabs(log(candidate / value)) <= fabs(log(best / value)) * (1 + 1e-12) ? candidate : best;
}

/* 10^decade, exact where a double can be. */
static double scaled(double mantissa, int decade)
{
    return decade >= 0 ? mantissa * pow(10, decade) : mantissa / pow(10, -decade);
}

double preferred_e24(double value)
{
    const int decade = (int)floor(log10(value));
    double best = scaled(1, decade);
    for (int k = 0; k < 24; k++) {
        best = nearer(value, best, scaled(e24[k], decade));
    }
    return nearer(value, best, scaled(1, decade + 1));
}

double preferred_e96(double value)
{
    const int decade = (int)floor(log10(value));
    double best = scaled(1, decade);
    for (int k = 0; k <= 96; k++) {
        /* three digits: 100 10^(k/96), rounded, without exceptions */
        best = nearer(value, best, scaled(round(100 * pow(10, k / 96.0)), decade - 2));
    }
    return best;
}
