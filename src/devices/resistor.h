/*
 * resistor.h: the value of a resistor at the conditions of an analysis.
 */
#ifndef DEVICES_RESISTOR_H
#define DEVICES_RESISTOR_H

#include "devices/device.h"

/*
 * resistor_at: ohms of a resistor with all of its scales.
 *
 *   R (1 + shift) factor (1 + tempco (T - T0) + tempco2 (T - T0)^2)
 *
 * As the parameters say, even when they make it zero or negative: the circuit layer refuses that.
 * Evaluation keeps at least a millionth of `resistance`.
 */
double resistor_at(const struct device_values *values, const struct device_conditions *conditions);

#endif
