/*
 * stages.h: what cells are composed of: primaries make currents, stages copy them.
 */
#ifndef GENERATOR_STAGES_H
#define GENERATOR_STAGES_H

#include "generator/draft.h"

/*
 * A current that waits for a stage: it flows between `node` and the rail opposite to `side`, so
 * that transistors of `side` can take it.
 */
struct branch {
    int node;
    enum side side;
    double current;
    double room; /* V that the node may be away from the rail of `side` */
    bool held;   /* the copy has no state when its load takes its headroom: it ends in an output */
};

enum { BRANCH_LIMIT = 4 };

/* Branches that a stage or a primary made. */
struct branches {
    struct branch list[BRANCH_LIMIT];
    int count;
};

/*
 * A random mirror that takes `in` and gives copies; `input` is the voltage at which it takes it (V
 * from its rail). False when no mirror fits into the room: nothing is written.
 */
bool stage_random(struct draft *d, const struct branch *in, struct branches *out, double *input);

/* A random primary; false when this technology or supply has no room for the one drawn: nothing is
 * written. */
bool primary_random(struct draft *d, struct branches *out);

void branches_add(const struct draft *d, struct branches *out, int node, enum side from,
                  double current, double least);

#endif
