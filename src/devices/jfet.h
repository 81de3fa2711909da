/*
 * jfet.h: what jfet.c prepares and jfet_current.c evaluates. Private to devices/.
 */
#ifndef DEVICES_JFET_H
#define DEVICES_JFET_H

enum { JFET_D, JFET_G, JFET_S, JFET_TERMINALS };

struct jfet_prepared {
    double polarity;     /* +1 n-channel, -1 p-channel */
    double B;            /* IDSS/VP^2, A/V^2 */
    double pinchoff;     /* VP as an n-channel device has it, negative, V */
    double per_early;    /* 1/V; 0 off */
    double gate_current; /* saturation current of each gate junction, A; 0 off */
    double gate_thermal; /* emission kT/q, V */
};

void jfet_evaluate(const void *prepared, const double *x, double *f, double *jac);
void jfet_evaluate_extended(const void *prepared, const long double *x, long double *f,
                            long double *jac);

#endif
