/*
 * root.h: a root of one function of one variable on a bracket.
 */
#ifndef BASE_ROOT_H
#define BASE_ROOT_H

/*
 * root_bracketed: the root between a and b, whose values fa and fb have different signs (or are 0).
 *
 * tolerance  largest error of the root, in units of a
 *
 * Returns NAN when the signs agree or the function gives NAN. Method: Chandrupatla 1997 (inverse
 * quadratic interpolation with bisection where it is not safe), at most 200 calls.
 */
double root_bracketed(double (*function)(void *self, double x), void *self, double a, double fa,
                      double b, double fb, double tolerance);

#endif
