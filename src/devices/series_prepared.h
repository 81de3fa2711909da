/*
 * series_prepared.h: private to series.c and series_current.c.
 */
#ifndef DEVICES_SERIES_PREPARED_H
#define DEVICES_SERIES_PREPARED_H

struct series_prepared {
    double resistance; /* ohm */
};

void series_evaluate(const void *prepared, const double *x, double *f, double *jac);
void series_evaluate_extended(const void *prepared, const long double *x, long double *f,
                              long double *jac);

#endif
