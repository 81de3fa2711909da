/*
 * network_build.h: a system's equations as a network for the proofs.
 *
 * Voltage sources (rails, outputs, lead resistances of 0) join nodes into groups of one unknown;
 * their currents are not needed. A group with gnd is held. The group of an amplifier's output has
 * the amplifier's equation instead of its sum of currents.
 */
#ifndef ANALYSES_NETWORK_BUILD_H
#define ANALYSES_NETWORK_BUILD_H

#include "solve/system.h"
#include "proof/network.h"

struct network_map {
    struct network *network;
    int *group;             /* [node_count of the system] unknown of the network, -1: held */
    struct interval *shift; /* [node_count] of the node above its group, or above gnd */
    int *node;              /* [network node_count] a node with shift 0 */
    bool *driven;           /* [network node_count] by an amplifier */
    /* by network_range: */
    double low, high; /* V: where states are looked for */
    bool is_assumed;  /* a node could be pushed beyond any bound known: the range is a choice */
};

/* In the arena. False when memory is short. */
bool network_build(struct arena *arena, const struct system *system, struct network_map *map);

/* Between the unknowns of the system and those of the network. Branch currents are left alone. */
void network_from_system(const struct network_map *map, const double *x, double *nodes);
void network_to_system(const struct network_map *map, int node_count, const double *nodes,
                       double *x);

#endif
