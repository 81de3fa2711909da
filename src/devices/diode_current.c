/*
 * diode_current.c: junction diode with breakdown.
 *
 *   I = I_S (exp(V/(n UT)) - 1) - I_Z exp(-(V_Z + V)/(n_Z UT))
 *
 * Shockley (1949) for the forward part; the exponential breakdown keeps the curve smooth. The
 * series resistance is a hidden resistor of the circuit.
 */
#include "devices/diode.h"

#include "devices/smooth.h"

void REAL_NAME(diode_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct diode_prepared *p = prepared;
    real v = x[DIODE_A] - x[DIODE_K];
    real slope;
    real current = REAL(p->saturation) * limited_expm1(v / REAL(p->thermal), &slope);
    real conductance = REAL(p->saturation) * slope / REAL(p->thermal);
    if (p->breakdown > 0) {
        real beyond = -(REAL(p->breakdown_voltage) + v) / REAL(p->breakdown_thermal);
        current -= REAL(p->breakdown) * limited_exp(beyond, &slope);
        conductance += REAL(p->breakdown) * slope / REAL(p->breakdown_thermal);
    }
    f[DIODE_A] = current;
    f[DIODE_K] = -current;
    jac[0] = jac[3] = conductance;
    jac[1] = jac[2] = -conductance;
}
