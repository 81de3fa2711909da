/*
 * opamp_current.c: amplifier of finite gain whose output saturates smoothly at its limits.
 *
 *   v(out) = mid + half tanh(gain (v(plus) - v(minus) + offset)/half)
 *
 * The branch current flows into `out`; inputs and limits carry none.
 */
#include "devices/opamp.h"

#include "devices/smooth.h"

/* Limits nearer than twice this, or crossed, are kept apart by floor_positive. */
#define HALF_LEAST (REAL(0.001L))

void REAL_NAME(opamp_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct opamp_prepared *p = prepared;
    real high = p->high_node ? x[OPAMP_HIGH] : REAL(p->high);
    real low = p->low_node ? x[OPAMP_LOW] : REAL(p->low);
    real mid = (high + low) / 2;
    real half_slope;
    real half = floor_positive((high - low) / 2, HALF_LEAST, &half_slope);
    real input = REAL(p->gain) * (x[OPAMP_PLUS] - x[OPAMP_MINUS] + REAL(p->offset));
    real u = input / half;
    real swing = tanh(u);
    real near = exp(-fabs(u)); /* 1/cosh^2 without overflow and without cancellation */
    real gain = 2 * near / (1 + near * near);
    gain *= gain;
    /* d(half tanh(input/half))/d half; u gain goes to 0 before u grows large */
    real by_half = (swing - u * gain) * half_slope;

    for (int k = 0; k < OPAMP_UNKNOWNS * OPAMP_UNKNOWNS; k++) {
        jac[k] = REAL(0);
    }
    for (int k = 0; k < OPAMP_UNKNOWNS; k++) {
        f[k] = REAL(0);
    }
    f[OPAMP_OUT] = x[OPAMP_BRANCH];
    jac[OPAMP_UNKNOWNS * OPAMP_OUT + OPAMP_BRANCH] = REAL(1);
    f[OPAMP_BRANCH] = x[OPAMP_OUT] - (mid + half * swing);
    real *row = jac + OPAMP_UNKNOWNS * OPAMP_BRANCH;
    row[OPAMP_OUT] = REAL(1);
    row[OPAMP_PLUS] = -REAL(p->gain) * gain;
    row[OPAMP_MINUS] = REAL(p->gain) * gain;
    row[OPAMP_HIGH] = p->high_node ? -(1 + by_half) / 2 : REAL(0);
    row[OPAMP_LOW] = p->low_node ? -(1 - by_half) / 2 : REAL(0);
}
