/*
 * loops.h: feedback loops of a circuit, from its structure alone.
 *
 * A graph of the nodes (nodes joined by voltage sources are one): an edge where the voltage of one
 * moves the current into the other, with the sign of what it does there. A loop could hold more
 * than one state if its signs multiply to plus and two transistors, an amplifier or a law give it
 * gain (for bipolar circuits Nielsen and Willson, Proc. IEEE 68 (1980) 196: two transistors in
 * feedback).
 */
#ifndef ANALYSES_LOOPS_H
#define ANALYSES_LOOPS_H

#include "analyses/network_build.h"

struct loop {
    bool found;
    bool unsure;      /* the search of the graph was cut short */
    const char *path; /* "nb -> pb -> nb" */
    int probe;        /* unknown: the node that lies on most such loops, driven by no amplifier;
                         -1: none */
    int *nodes;       /* [node_count] unknowns on the loop shown */
    int node_count;
};

/* Texts and lists in the arena. False when memory is short. */
bool loops_find(struct arena *arena, const struct system *system, const struct network_map *map,
                struct loop *loop);

#endif
