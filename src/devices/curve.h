/*
 * curve.h: the measured curve of a `table` device: monotone C1 cubic through the points.
 */
#ifndef DEVICES_CURVE_H
#define DEVICES_CURVE_H

/* v[] strictly rising; i[] any; slope[] by curve_slopes. All [count], count >= 2. */
struct curve {
    const double *v, *i, *slope;
    int count;
};

/*
 * curve_slopes: slopes that keep the cubic monotone wherever the data are (Fritsch and Carlson
 * 1980). Outside the data the curve goes on straight.
 */
void curve_slopes(const double *v, const double *i, double *slope, int count);

/* The evaluate functions of the `table` device; the prepared block is a struct curve. */
void table_evaluate(const void *prepared, const double *x, double *f, double *jac);
void table_evaluate_extended(const void *prepared, const long double *x, long double *f,
                             long double *jac);

#endif
