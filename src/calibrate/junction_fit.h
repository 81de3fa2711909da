/*
 * junction_fit.h: fits of diodes and bipolar transistors, and of resistors. Private to calibrate/.
 */
#ifndef CALIBRATE_JUNCTION_FIT_H
#define CALIBRATE_JUNCTION_FIT_H

#include "calibrate/fitting.h"

/*
 * junction_fit: one diode or bipolar model over one device.
 *
 * fit  in: name, type; out: the rest
 *
 * Returns STATUS_OK, STATUS_MEMORY or STATUS_STOPPED. Derivatives are fourth-order differences of
 * currents solved in extended precision, good to about 1e-9.
 */
enum status junction_fit(struct calibration *calibration, const struct calibration_request *request,
                         int device, struct fit *fit);

/* Errors of model values on a diode or bipolar transistor. */
void junction_compare(const struct calibration *calibration, const struct calibrated_device *device,
                      const double *model, struct device_figures *figures);

/* Resistance and, with several temperatures, its coefficients. */
enum status resistor_fit(struct calibration *calibration, int device, struct fitted_resistor *it);

#endif
