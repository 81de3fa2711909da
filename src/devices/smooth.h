/*
 * smooth.h: the smooth limits that device equations share, for the number type of real.h.
 */
#ifndef DEVICES_SMOOTH_H
#define DEVICES_SMOOTH_H

#include "devices/real.h"

/* Exponents above this are continued by the tangent. e^80 times a femtoampere is 5e19 A: no
 * operating point lies there, and a tangent from there stays finite for any voltage that a search
 * may try. The same number for all types, so that all are the same function. */
#define EXPONENT_LIMIT 80

/* exp(u) with its slope, straight above EXPONENT_LIMIT (C1). */
static inline real limited_exp(real u, real *slope)
{
    real within = CHOOSE(u < REAL(EXPONENT_LIMIT), u, REAL(EXPONENT_LIMIT));
    *slope = exp(within);
    return *slope * (1 + (u - within));
}

/* exp(u) - 1, exact near 0; the slope is that of exp(u). */
static inline real limited_expm1(real u, real *slope)
{
    real within = CHOOSE(u < REAL(EXPONENT_LIMIT), u, REAL(EXPONENT_LIMIT));
    real value = expm1_and_exp(within, slope);
    return value + *slope * (u - within);
}

/* S(x, e) = (x + sqrt(x^2 + 4 e^2))/2, a smooth max(x, 0), without cancellation at negative x;
 * slope = S/sqrt(...). */
static inline real smooth_positive(real x, real e, real *slope)
{
    real root = sqrt(x * x + 4 * e * e);
    real wide = fabs(x) + root;
    real value = CHOOSE(x > REAL(0), wide / 2, 2 * e * e / wide);
    *slope = value / root;
    return value;
}

/* x itself down to `least`, below it least^2/(2 least - x): positive and C1. Unlike S it leaves
 * ordinary values untouched to the last digit. */
static inline real floor_positive(real x, real least, real *slope)
{
    real value = least * least / (2 * least - x);
    *slope = CHOOSE(x >= least, REAL(1), value / (2 * least - x));
    return CHOOSE(x >= least, x, value);
}

#endif
