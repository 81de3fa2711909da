/*
 * variant.h: the same cell with some things turned: a value, a named value, the temperature.
 *
 * Values of parts are turned in the system; a let or the temperature changes many values at once,
 * so the circuit is built anew. Values that were turned in the base stay as they are.
 */
#ifndef SOLVE_VARIANT_H
#define SOLVE_VARIANT_H

#include "solve/system.h"

struct setting {
    const struct knob *knob; /* named as in the circuit that is varied */
    double value;            /* a corner: its index, -1 for none */
};

/*
 * variant_build: the circuit with the settings in force.
 *
 * base  stays as it is; may be read by many threads at once
 * own   out: owned by the caller (circuit_free); NULL when no setting needs another circuit
 *
 * Returns STATUS_OK, STATUS_UNSOLVED (the cell cannot be built with these values) or STATUS_MEMORY.
 */
enum status variant_build(const struct circuit *base, const struct setting *settings, int count,
                          struct circuit **own);

/*
 * variant_turn: turns values of parts in a system of `base` or of a circuit built from it, which
 * may count its parts otherwise: names are looked up in it.
 *
 * Returns STATUS_OK, STATUS_UNSOLVED (a part is not there any more) or STATUS_MEMORY.
 */
enum status variant_turn(struct system *system, const struct circuit *base,
                         const struct setting *settings, int count);

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
