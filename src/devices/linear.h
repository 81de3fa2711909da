/*
 * linear.h: what resistor.c and source.c prepare and linear_current.c evaluates. Private to
 * devices/.
 */
#ifndef DEVICES_LINEAR_H
#define DEVICES_LINEAR_H

/* Row of the deviate of a resistor. */
enum { RESISTOR_VALUE };

/* Terminals of an arrow a -> b, then the branch current of a voltage source. */
enum { LINEAR_A, LINEAR_B, LINEAR_TERMINALS, LINEAR_BRANCH = LINEAR_TERMINALS };

struct linear_prepared {
    double value; /* ohm, A or V */
};

void resistor_evaluate(const void *prepared, const double *x, double *f, double *jac);
void resistor_evaluate_extended(const void *prepared, const long double *x, long double *f,
                                long double *jac);
void current_evaluate(const void *prepared, const double *x, double *f, double *jac);
void current_evaluate_extended(const void *prepared, const long double *x, long double *f,
                               long double *jac);
void voltage_evaluate(const void *prepared, const double *x, double *f, double *jac);
void voltage_evaluate_extended(const void *prepared, const long double *x, long double *f,
                               long double *jac);

#endif
