/*
 * two_terminal.c: pins and quantities of parts with an arrow from one node to another.
 */
#include "devices/two_terminal.h"

const struct terminal two_terminal_pins[TWO_TERMINAL_COUNT] = {
    {"a", "where the current enters", false, NULL},
    {"b", "where the current leaves", false, NULL},
};

const struct quantity_row two_terminal_quantities[TWO_QUANTITY_COUNT] = {
    [TWO_I] = {"i", UNIT_AMPERE, "current in the direction of the arrow"},
    [TWO_V] = {"v", UNIT_VOLT, "voltage along the arrow"},
    [TWO_POWER] = {"power", UNIT_WATT, "dissipated power"},
};

const uint32_t two_terminal_paths[TWO_TERMINAL_COUNT] = {1, 1};

unsigned two_terminal_describe(double current, const double *outer, double *q)
{
    q[TWO_I] = current;
    q[TWO_V] = outer[0] - outer[1];
    q[TWO_POWER] = q[TWO_V] * q[TWO_I];
    return REGION_NONE;
}
