/*
 * series.h: a resistance in a lead of another device. It is written as a branch (v(a) - v(b) - R i
 * = 0), so that R may be 0 when an analysis leaves the effect out. Not a statement of the language.
 */
#ifndef DEVICES_SERIES_H
#define DEVICES_SERIES_H

#include "devices/device.h"

/* One parameter: the resistance in ohm at area and multiplicity of its device. */
extern const struct device_type device_series;

#endif
