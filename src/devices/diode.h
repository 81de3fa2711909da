/*
 * diode.h: what diode.c prepares and diode_current.c evaluates. Private to devices/.
 */
#ifndef DEVICES_DIODE_H
#define DEVICES_DIODE_H

enum { DIODE_A, DIODE_K, DIODE_TERMINALS };

struct diode_prepared {
    double saturation, thermal; /* A; n kT/q, V */
    double breakdown;           /* I_Z, A; 0: no breakdown */
    double breakdown_voltage;   /* V_Z, V */
    double breakdown_thermal;   /* n_Z kT/q, V */
};

void diode_evaluate(const void *prepared, const double *x, double *f, double *jac);
void diode_evaluate_extended(const void *prepared, const long double *x, long double *f,
                             long double *jac);

#endif
