/*
 * two_terminal.h: what parts with an arrow from one node to another have in common.
 */
#ifndef DEVICES_TWO_TERMINAL_H
#define DEVICES_TWO_TERMINAL_H

#include "devices/types.h"

enum { TWO_TERMINAL_COUNT = 2, TWO_I = 0, TWO_V, TWO_POWER, TWO_QUANTITY_COUNT };

extern const struct terminal two_terminal_pins[TWO_TERMINAL_COUNT];
extern const struct quantity_row two_terminal_quantities[TWO_QUANTITY_COUNT];
extern const uint32_t two_terminal_paths[TWO_TERMINAL_COUNT];

/* Fills q for a current (A) in the direction of the arrow and the voltages of both nodes. */
unsigned two_terminal_describe(double current, const double *outer, double *q);

#define TWO_TERMINAL_TABLE                                                                         \
    .form = FORM_ARROW, .terminals = two_terminal_pins, .terminal_count = TWO_TERMINAL_COUNT,      \
    .quantities = two_terminal_quantities, .quantity_count = TWO_QUANTITY_COUNT,                   \
    .quantity_current = TWO_I, .quantity_headroom = -1, .quantity_power = TWO_POWER,               \
    .paths = two_terminal_paths

#endif
