/*
 * tree.h: a bias distribution tree of any size, as text.
 */
#ifndef BENCH_TREE_H
#define BENCH_TREE_H

#include "base/buffer.h"

/*
 * tree_write: one reference transistor gives its gate voltage to `leaves` sinks (1 .. 999999), each
 * with a load resistor. Their currents return to gnd through a tree of wires: a trunk has ten taps
 * with a branch at each, a branch is a trunk again, and the last ones carry the sinks. A wire is
 * the wider the more sinks lie behind it.
 *
 * A leaf has 4 devices and 3 nodes, and there is a ninth of a wire with two points to each.
 */
void tree_write(struct buffer *out, int leaves);

#endif
