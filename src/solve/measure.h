/*
 * measure.h: quantities of a solved point.
 */
#ifndef SOLVE_MEASURE_H
#define SOLVE_MEASURE_H

#include "solve/operating_point.h"

/*
 * measure_device: quantities of one instance at a refined point.
 *
 * x  [n] in long double: differences of close voltages keep their digits
 * q  [quantity_count] out
 *
 * Returns the region.
 */
unsigned measure_device(const struct system *system, int instance, const long double *x, double *q);

/* One of them. */
double measure_device_quantity(const struct system *system, int instance, int quantity,
                               const long double *x);

/* Headroom of a transistor at a point in double, V; NAN when it has none. *region may be NULL. */
double measure_headroom(const struct system *system, int instance, const double *x,
                        unsigned *region);

/* The transistor with the least headroom, -1 when there is none; and what an instance delivers to
 * the power of the cell, W, NAN when it does not count. */
int measure_tightest(const struct system *system, const double *x);
double measure_delivered(const struct system *system, int instance, const double *x);

/* All of a point, into the arena. False when memory is short. */
bool measure_point(const struct operating_point *point, struct arena *arena,
                   struct point_result *result);

/* A quantity of node, rail, device, all or cell at a point in double; NAN for outputs. */
double measure_probe(const struct system *system, const struct probe *probe, const double *x);

#endif
