/*
 * sweep.h: quantities over a range of anything that can be turned.
 */
#ifndef ANALYSES_SWEEP_H
#define ANALYSES_SWEEP_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"

/*
 * analyse_sweeps: sweeps [count] with their families, one thread a series at a time
 * (options->jobs), into the arena. No bit of a series depends on the others.
 *
 * Quantities that only an output analysis gives (compliance, resistance, ...) are found anew at
 * each point when they are shown. A point without a state is NAN in the table and told as an event,
 * never left out.
 *
 * tables  [count] out
 * done    out: so many tables may be shown
 *
 * Returns STATUS_OK, STATUS_STOPPED (tables hold what was done), STATUS_UNSOLVED (no point of a
 * series had a state) or STATUS_MEMORY.
 */
enum status analyse_sweeps(struct circuit *circuit, const struct sweep *sweeps, int count,
                           const struct analysis_options *options, struct arena *arena,
                           struct sweep_table *tables, int *done);

/*
 * sweep_loads: for a cell that says nothing of its own, the load voltage of each output over its
 * range, with the current; as many as the circuit has outputs, in the arena. NULL: no memory.
 */
struct sweep *sweep_loads(const struct circuit *circuit, struct arena *arena);

#endif
