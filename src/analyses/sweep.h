/*
 * sweep.h: quantities over a range of anything that can be turned.
 */
#ifndef ANALYSES_SWEEP_H
#define ANALYSES_SWEEP_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"

/*
 * analyse_sweep: one sweep, with its family, into the arena.
 *
 * Quantities that only an output analysis gives (compliance, resistance, ...) are found anew at
 * each point when they are shown. A point without a state is NAN in the table and told as an event,
 * never left out.
 *
 * Returns STATUS_OK, STATUS_STOPPED (table holds what was done), STATUS_UNSOLVED (no point had a
 * state) or STATUS_MEMORY.
 */
enum status analyse_sweep(struct circuit *circuit, const struct sweep *sweep,
                          const struct analysis_options *options, struct arena *arena,
                          struct sweep_table *table);

/*
 * sweep_loads: for a cell that says nothing of its own, the load voltage of each output over its
 * range, with the current; as many as the circuit has outputs, in the arena. NULL: no memory.
 */
struct sweep *sweep_loads(const struct circuit *circuit, struct arena *arena);

#endif
