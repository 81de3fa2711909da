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

#include "devices/smooth.h"

static void add_gate_junction(const struct jfet_prepared *p, const real *x, int end, real *f,
                              real *jac)
{
    real slope;
    real v = REAL(p->polarity) * (x[JFET_G] - x[end]);
    real current = REAL(p->polarity) * REAL(p->gate_current) *
                   limited_expm1(v / REAL(p->gate_thermal), &slope);
    real conductance = REAL(p->gate_current) * slope / REAL(p->gate_thermal);
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
    real polarity = REAL(p->polarity);
    truth forward = polarity * (x[JFET_D] - x[JFET_S]) >= REAL(0);
    real high = CHOOSE(forward, x[JFET_D], x[JFET_S]);
    real low = CHOOSE(forward, x[JFET_S], x[JFET_D]);
    real vds = polarity * (high - low);
    real v = polarity * (x[JFET_G] - low) - REAL(p->pinchoff);
    v = CHOOSE(v > REAL(0), v, REAL(0));
    real reach = CHOOSE(vds < v, vds, v); /* the part of vds that counts */
    real square = REAL(p->B) * reach * (2 * v - reach);
    real early = 1 + REAL(p->per_early) * vds;
    real gate = 2 * REAL(p->B) * reach * early;
    real by_high = 2 * REAL(p->B) * (v - reach) * early + square * REAL(p->per_early);
    real by_low = -(by_high + gate), into_drain = polarity * square * early;

    real *drain = jac + JFET_TERMINALS * JFET_D, *source = jac + JFET_TERMINALS * JFET_S;
    drain[JFET_D] = CHOOSE(forward, by_high, -by_low);
    drain[JFET_S] = CHOOSE(forward, by_low, -by_high);
    drain[JFET_G] = CHOOSE(forward, gate, -gate);
    f[JFET_D] = CHOOSE(forward, into_drain, -into_drain);
    f[JFET_S] = -f[JFET_D];
    f[JFET_G] = REAL(0);
    for (int k = 0; k < JFET_TERMINALS; k++) {
        source[k] = -drain[k];
        jac[JFET_TERMINALS * JFET_G + k] = REAL(0);
    }
    if (p->gate_current > 0) {
        add_gate_junction(p, x, JFET_S, f, jac);
        add_gate_junction(p, x, JFET_D, f, jac);
    }
}
