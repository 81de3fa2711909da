/*
 * contract.h: making a box smaller without losing a solution.
 *
 * A box is an interval for each variable and each element value of a network. Two ways:
 *
 *   propagation  each row and each element is solved for each of its terms, round after round
 *                (hull consistency: Benhamou, Goualard, Granvilliers and Puget, ICLP 1999);
 *   programs     every element lies between planes through opposite corners of its box (Araya,
 *                Trombettoni and Neveu, CPAIOR 2012), an exponential between its chord and
 * tangents; linear programs over rows and planes then bound each argument. What their multipliers
 * prove is worked out in intervals (Neumaier and Shcherbina 2004), so that no rounding in a program
 * can lose a solution.
 */
#ifndef PROOF_CONTRACT_H
#define PROOF_CONTRACT_H

#include "proof/network.h"

struct contractor;

/* Workspaces, in the arena of the network. NULL when memory is short. */
struct contractor *contractor_create(const struct network *network);

/* Length of a box. */
int contract_size(const struct network *network);

/* The box of the network's start; element values anything. */
void contract_start(const struct network *network, struct interval *box);

/* Both return false when the box surely holds no solution. */
bool contract_propagate(struct contractor *contractor, struct interval *box);
/* narrows: also bounds each argument, not only asks whether there is any solution. */
bool contract_program(struct contractor *contractor, struct interval *box, bool narrows);

/*
 * contract_branch: the variable to cut, by the doubt that the slopes leave in the voltages of the
 * nodes, and where. -1 when nothing can be cut any more.
 */
int contract_branch(struct contractor *contractor, const struct interval *box, double *at);

#endif
