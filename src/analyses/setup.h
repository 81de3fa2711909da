/*
 * setup.h: a circuit and its system under conditions of their own, ready to be solved.
 */
#ifndef ANALYSES_SETUP_H
#define ANALYSES_SETUP_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"
#include "analyses/reading.h"
#include "analyses/spread_result.h"

struct setup {
    struct circuit *circuit; /* the base, or own_circuit */
    struct circuit *own_circuit;
    struct arena *arena; /* of the reading list */
    struct system *system;
    struct operating_point point;
    struct reading_list list;
};

/*
 * setup_open: under the conditions at[axis_count] along the axes.
 *
 * base     stays as it is; read by many threads at once
 * options  view; stopped
 *
 * Returns STATUS_OK, STATUS_MEMORY, or STATUS_UNSOLVED when the cell cannot be built there. The
 * setup is to be closed in any case.
 */
enum status setup_open(struct setup *setup, struct circuit *base, const struct condition_axis *axes,
                       int axis_count, const double *at, enum reading_scope scope,
                       const struct analysis_options *options);
void setup_close(struct setup *setup);

/*
 * setup_solve: Newton from a near state, else the search from cold; then the polish.
 *
 * near      [near_count] or NULL; of no use when its length is another
 * searched  out, may be NULL: the search from cold was needed
 */
enum status setup_solve(struct setup *setup, const double *near, int near_count, bool *searched);

#endif
