/* screen.h: readings that contradict their neighbours. Private to calibrate/. */
#ifndef CALIBRATE_SCREEN_H
#define CALIBRATE_SCREEN_H

#include "calibrate/calibrate.h"

/*
 * screen_transistor: finds drain sweeps that contradict the gate sweeps of the same bias, and
 * single readings that stand out of their sweep; adds a remark for each, and leaves the rows out
 * when the calibration is robust. False when memory is short.
 */
bool screen_transistor(struct calibration *calibration, int device);

/* Single readings that stand out of their sweep, for any device: column is the current. */
bool screen_readings(struct calibration *calibration, int device, enum column column);

/* Adds a remark; false when memory is short. device -1: about none. */
bool calibration_remark(struct calibration *calibration, const char *code, int device,
                        const char *format, ...) __attribute__((format(printf, 4, 5)));

#endif
