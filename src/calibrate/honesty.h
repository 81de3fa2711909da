/* honesty.h: what a user must know about the data behind a fit. Private to calibrate/. */
#ifndef CALIBRATE_HONESTY_H
#define CALIBRATE_HONESTY_H

#include "calibrate/calibrate.h"

/* Adds the remarks about noise, body voltages, temperatures and limits; false when memory is
 * short. */
bool honesty_remarks(struct calibration *calibration);

#endif
