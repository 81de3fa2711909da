/* input.h: the request and its files to devices with readings. Private to calibrate/. */
#ifndef CALIBRATE_INPUT_H
#define CALIBRATE_INPUT_H

#include "calibrate/calibrate.h"

/*
 * input_read: reads options, list and files into calibration->devices, with sweeps.
 *
 * All that is wrong is told in one run. Returns STATUS_OK, STATUS_INPUT or STATUS_MEMORY.
 */
enum status input_read(const struct calibration_request *request, struct calibration *calibration);

#endif
