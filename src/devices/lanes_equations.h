/*
 * lanes_equations.h: the equations of devices compiled for lanes (real.h); only with LANES.
 *
 * x, f, jac as in device.h, each entry a vector. `prepared` points to the block behind MOVED_LIMIT
 * vectors of the values that mismatch moves.
 */
#ifndef DEVICES_LANES_EQUATIONS_H
#define DEVICES_LANES_EQUATIONS_H

#include <stddef.h>

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

/* The equations of a device type, and which doubles of its prepared block they read through MOVED,
 * in that order. */
struct device_lanes {
    void (*single)(const void *prepared, const double *x, double *f, double *jac);
    lanes_evaluate *evaluate;
    int moved_count;
    size_t moved[MOVED_LIMIT]; /* offsets */
};

/* NULL: it has none (law, table), and each sample is evaluated by itself. */
struct device_type;
const struct device_lanes *REAL_NAME(device)(const struct device_type *type);

#endif
