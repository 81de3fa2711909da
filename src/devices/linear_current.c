/*
 * linear_current.c: resistor, current source and voltage source.
 */
#include "devices/linear.h"

#include "devices/real.h"

void REAL_NAME(resistor_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct linear_prepared *p = prepared;
    real value = MOVED(p, RESISTOR_VALUE, value);
    f[LINEAR_A] = (x[LINEAR_A] - x[LINEAR_B]) / value;
    f[LINEAR_B] = -f[LINEAR_A];
    jac[0] = jac[3] = 1 / value;
    jac[1] = jac[2] = -jac[0];
}

/* Drives its current from a to b: node a loses it, node b gains it. */
void REAL_NAME(current_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct linear_prepared *p = prepared;
    (void)x;
    f[LINEAR_A] = REAL(p->value);
    f[LINEAR_B] = -f[LINEAR_A];
    for (int k = 0; k < LINEAR_TERMINALS * LINEAR_TERMINALS; k++) {
        jac[k] = REAL(0);
    }
}

/* Node a is `value` above node b; the branch current flows into the source at a. */
void REAL_NAME(voltage_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct linear_prepared *p = prepared;
    enum { N = LINEAR_TERMINALS + 1 };
    for (int k = 0; k < N * N; k++) {
        jac[k] = REAL(0);
    }
    f[LINEAR_A] = x[LINEAR_BRANCH];
    f[LINEAR_B] = -x[LINEAR_BRANCH];
    f[LINEAR_BRANCH] = (x[LINEAR_A] - x[LINEAR_B]) - REAL(p->value);
    jac[N * LINEAR_A + LINEAR_BRANCH] = REAL(1);
    jac[N * LINEAR_B + LINEAR_BRANCH] = REAL(-1);
    jac[N * LINEAR_BRANCH + LINEAR_A] = REAL(1);
    jac[N * LINEAR_BRANCH + LINEAR_B] = REAL(-1);
}
