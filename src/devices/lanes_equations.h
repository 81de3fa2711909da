/*
 * lanes_equations.h: the equations of devices compiled for lanes (real.h); only with LANES.
 *
 * x, f, jac as in device.h, each entry a vector. `prepared` points to the block behind MOVED_LIMIT
 * vectors of the values that mismatch moves.
 */
#ifndef DEVICES_LANES_EQUATIONS_H
#define DEVICES_LANES_EQUATIONS_H

typedef void lanes_evaluate(const void *prepared, const real *x, real *f, real *jac);

lanes_evaluate REAL_NAME(mos_evaluate);
lanes_evaluate REAL_NAME(diode_evaluate);
lanes_evaluate REAL_NAME(bipolar_evaluate);
lanes_evaluate REAL_NAME(jfet_evaluate);
lanes_evaluate REAL_NAME(resistor_evaluate);
lanes_evaluate REAL_NAME(current_evaluate);
lanes_evaluate REAL_NAME(voltage_evaluate);
lanes_evaluate REAL_NAME(opamp_evaluate);
lanes_evaluate REAL_NAME(series_evaluate);

/* The lanes of a device type; NULL: it has none (law, table), and each sample is evaluated by
 * itself. */
struct device_type;
lanes_evaluate *REAL_NAME(device)(const struct device_type *type);

#endif
