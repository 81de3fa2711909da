/*
 * mos_gradient.h: the drain current of a MOS transistor with its derivatives in the constants of
 * the prepared block, for fits to measured curves.
 */
#ifndef DEVICES_MOS_GRADIENT_H
#define DEVICES_MOS_GRADIENT_H

/* The constants of a prepared transistor that its drain current depends on. */
enum mos_constant {
    MOS_U,
    MOS_VT,
    MOS_BODY,
    MOS_PHI,
    MOS_SIGMA,
    MOS_DIBL_BODY,
    MOS_BETA,
    MOS_LAM,
    MOS_KNEE,
    MOS_BULK_MOBILITY,
    MOS_GATE_MOBILITY,
    MOS_INVERSE_EARLY,
    MOS_EARLY_ONSET,
    MOS_CONSTANTS
};

/* Their values in a prepared block of type nmos or pmos. */
void mos_constants(const void *prepared, double *constants);

/*
 * mos_gradient: current and derivatives of a transistor with a model, all inversion levels.
 *
 * prepared  block of type nmos or pmos, prepared with EFFECT_INVERSION
 * vgs, vds, vsb   V, positive in normal operation for both polarities; vds >= 0
 * gradient  [MOS_CONSTANTS] out: d current/d constant; 0 for MOS_BODY
 *           where that is 0
 *
 * Returns the current, positive in normal operation, without the body junctions. The derivatives
 * are exact: forward differentiation of the same equations as mos_current.c. Tests:
 * tests/devices/mos_gradient_test.c holds both together.
 */
double mos_gradient(const void *prepared, double vgs, double vds, double vsb, double *gradient);

#endif
