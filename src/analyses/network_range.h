/*
 * network_range.h: where the voltages of all nodes of a cell surely lie.
 *
 * Take a voltage T above all rails and the nodes above it together. Their sum of currents says that
 * what leaves them through the devices is what sources push in, at most the push D. No device of
 * this program but current sources, laws and tables passes current from a lower to a higher
 * terminal (no gain: Willson, Bell System Technical Journal 54 (1975) 1479), so that each device
 * across T carries D at most: a resistor with one end held stands D R at most above it, a junction
 * kT/q ln(1 + D/IS), a channel what its equations say. Without a push no node lies above the rails.
 * A law or a table pushes by what it carries against its own voltage, within the bounds known so
 * far; the whole is repeated until nothing moves.
 *
 * Levels T inside a group of nodes that voltage sources join cut nothing: they count as spread.
 */
#ifndef ANALYSES_NETWORK_RANGE_H
#define ANALYSES_NETWORK_RANGE_H

#include "analyses/network_build.h"

/* V: states with a node beyond are not looked for, and are none of a bias cell. */
#define NETWORK_REACH 1e6

/*
 * network_range: the start box of the network, and low, high and is_assumed of the map. Where a
 * bound cannot be had, the box is a wide choice and is_assumed says so.
 *
 * False when memory is short.
 */
bool network_range(struct arena *arena, const struct system *system, struct network_map *map);

#endif
