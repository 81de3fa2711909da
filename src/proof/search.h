/*
 * search.h: every solution of a network in its start box, by branch and prune, with proof.
 */
#ifndef PROOF_SEARCH_H
#define PROOF_SEARCH_H

#include "base/status.h"
#include "proof/network.h"

struct search_options {
    long box_limit; /* boxes looked at; then the search gives up */
    /* Newton from nodes[node_count]; true and the rounded solution in nodes when it converged. */
    bool (*refine)(void *self, double *nodes);
    void *refine_self;
    bool (*stopped)(void *self); /* NULL: never */
    void *stopped_self;
    void (*progress)(void *self, const char *what, double share); /* NULL: none */
    void *progress_self;
};

struct search_state {
    double *centre;       /* [node_count] */
    struct interval *box; /* [node_count] holds exactly one solution */
    int determinant;      /* sign of that of the Jacobian */
};

struct search_result {
    struct search_state *states;
    int state_count, state_capacity;
    bool complete;         /* every box was discarded or holds exactly one state found */
    long boxes;            /* looked at */
    long undecided;        /* left over */
    struct interval *rest; /* [node_count] hull of what is left over */
};

struct search;

/* In the arena of the network; NULL when memory is short. */
struct search *search_create(const struct network *network, const struct search_options *options);

/*
 * search_add: a solution known beforehand (its rounding). True when it was certified, also when it
 * is one that is known already; *index is its number.
 */
bool search_add(struct search *search, const double *nodes, int *index);

/* STATUS_OK (look at `complete`), STATUS_STOPPED, STATUS_MEMORY. */
enum status search_run(struct search *search);

struct search_result *search_found(struct search *search);

#endif
