/*
 * jfet_current.c: junction field-effect transistor.
 *
 * Shichman and Hodges, IEEE J. Solid-State Circuits SC-3 (1968) 285: with v = VGS - VP,
 *
 *   saturated  ID = B v^2 (1 + VDS/VA)      triode  ID = B VDS (2 v - VDS)(1 + VDS/VA)
 *
 * The two meet with value and slope at VDS = v, and so does the current with 0 at v = 0. Drain and
 * source exchange when the drain is below.
 */
#include "devices/jfet.h"

#include <stdbool.h>

#include "devices/smooth.h"

static void add_gate_junction(const struct jfet_prepared *p, const real *x, int end, real *f,
                              real *jac)
{
    real slope;
    real v = (real)p->polarity * (x[JFET_G] - x[end]);
    real current = (real)p->polarity * (real)p->gate_current *
                   limited_expm1(v / (real)p->gate_thermal, &slope);
    real conductance = (real)p->gate_current * slope / (real)p->gate_thermal;
    f[JFET_G] += current;
    f[end] -= current;
    jac[JFET_TERMINALS * JFET_G + JFET_G] += conductance;
    jac[JFET_TERMINALS * JFET_G + end] -= conductance;
    jac[JFET_TERMINALS * end + JFET_G] -= conductance;
    jac[JFET_TERMINALS * end + end] += conductance;
}

void REAL_NAME(jfet_evaluate)(const void *prepared, const real *x, real *f, real *jac)
{
    const struct jfet_prepared *p = prepared;
    real polarity = p->polarity;
    bool forward = polarity * (x[JFET_D] - x[JFET_S]) >= 0;
    int high = forward ? JFET_D : JFET_S;
    int low = forward ? JFET_S : JFET_D;
    real vds = polarity * (x[high] - x[low]);
    real v = polarity * (x[JFET_G] - x[low]) - (real)p->pinchoff;
    v = v > 0 ? v : 0;
    real reach = vds < v ? vds : v; /* the part of vds that counts */
    real square = (real)p->B * reach * (2 * v - reach);
    real early = 1 + (real)p->per_early * vds;
    real gate = 2 * (real)p->B * reach * early;
    real drain = 2 * (real)p->B * (v - reach) * early + square * (real)p->per_early;

    for (int k = 0; k < JFET_TERMINALS; k++) {
        f[k] = 0;
        jac[JFET_TERMINALS * JFET_G + k] = 0;
    }
    f[high] = polarity * square * early;
    f[low] = -f[high];
    jac[JFET_TERMINALS * high + high] = drain;
    jac[JFET_TERMINALS * high + JFET_G] = gate;
    jac[JFET_TERMINALS * high + low] = -(drain + gate);
    jac[JFET_TERMINALS * low + high] = -drain;
    jac[JFET_TERMINALS * low + JFET_G] = -gate;
    jac[JFET_TERMINALS * low + low] = drain + gate;
    if (p->gate_current > 0) {
        add_gate_junction(p, x, JFET_S, f, jac);
        add_gate_junction(p, x, JFET_D, f, jac);
    }
}
