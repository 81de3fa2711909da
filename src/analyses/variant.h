/*
 * variant.h: the same cell with some things turned: a value, a named value, the temperature.
 *
 * Values of parts are turned in the system; a let or the temperature changes many values at once,
 * so the circuit is built anew. Values that were turned in the base stay as they are.
 */
#ifndef ANALYSES_VARIANT_H
#define ANALYSES_VARIANT_H

#include "analyses/system.h"

struct setting {
    const struct knob *knob;
    double value;
};

struct variant {
    struct circuit *own_circuit; /* NULL: the base's circuit serves */
    struct system *system;       /* NULL after a failure */
};

/*
 * variant_open: a system like `base` with the settings in force.
 *
 * Returns STATUS_OK, STATUS_UNSOLVED (the cell cannot be built with these values, or gets another
 * structure) or STATUS_MEMORY. The caller ends with variant_close in any case.
 */
enum status variant_open(struct variant *variant, const struct system *base,
                         const struct setting *settings, int count);
void variant_close(struct variant *variant);

/* The value in force of a knob that is no process corner. */
double knob_value(const struct system *system, const struct knob *knob);

#endif
