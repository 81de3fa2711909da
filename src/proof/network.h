/*
 * network.h: a cell as the proofs see it: linear equations between voltages and element values.
 *
 *   row i:      sum coef_ij z_j + sum factor y_e + constant = 0
 *   element e:  y_e = f_e(arguments), each argument a shift plus or minus one variable
 *
 * Variables z: the free node voltages, then differences of two of them that elements look at. Each
 * difference has a row of its own. Knows no circuit: analyses/ builds it.
 */
#ifndef PROOF_NETWORK_H
#define PROOF_NETWORK_H

#include "base/arena.h"
#include "proof/element.h"

struct network_term {
    int index; /* variable, or variable_count + element */
    struct interval coefficient;
};

struct network_row {
    struct network_term *terms;
    int term_count, term_capacity;
    struct interval constant;
};

struct network {
    struct arena *arena;
    int node_count;     /* free node voltages: the unknowns */
    int variable_count; /* with the differences */
    int variable_capacity;
    struct network_row *rows; /* [variable_count] equations of the nodes, then of the differences */
    int (*pairs)[2];          /* [variable_count] of a difference: z[pair 0] - z[pair 1] */
    struct element *elements;
    int element_count, element_capacity;
    struct interval *start; /* [node_count] where states are looked for */
    int row_limit;          /* after network_finish: most terms of a row */
};

/* In `arena`; NULL when memory is short. start is filled in by the caller. */
struct network *network_create(struct arena *arena, int node_count);

/* All return false when memory is short. */
bool network_add(struct network *network, int row, int variable, struct interval coefficient);
void network_add_constant(struct network *network, int row, struct interval value);

/* A node voltage is an argument; -1 for one that is held (shift alone). */
struct argument network_node(int node, struct interval shift);
/* a - b; makes a new variable for a pair of free nodes that has none yet. */
bool network_difference(struct network *network, struct argument a, struct argument b,
                        struct argument *out);

/* Takes a copy; *index may be NULL. */
bool network_element(struct network *network, const struct element *element, int *index);

/* Ends the building. */
bool network_finish(struct network *network);

/* Ranges of the arguments of an element over z. */
void network_arguments(const struct element *element, const struct interval *z,
                       struct interval *arguments);

#endif
