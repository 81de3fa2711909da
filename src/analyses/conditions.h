/*
 * conditions.h: a cell over its `vary` lines.
 */
#ifndef ANALYSES_CONDITIONS_H
#define ANALYSES_CONDITIONS_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"
#include "analyses/spread_result.h"

enum { CONDITION_POINT_LIMIT = 50000 };

/*
 * analyse_conditions: solves all combinations of ends and own values, every corner, and a fine
 * sweep along each axis; judges the `everywhere` requirements of the result, and the verdict anew.
 *
 * home     the solved own point of the circuit
 * result   review of the circuit; gets `conditions`
 *
 * Returns STATUS_OK, STATUS_STOPPED (`conditions` has the points done until then, and the
 * requirements are judged by them as far as they can be), STATUS_MEMORY, or STATUS_INPUT after a
 * message in the cell's diagnostics when there are more combinations than CONDITION_POINT_LIMIT.
 */
enum status analyse_conditions(struct circuit *circuit, const struct operating_point *home,
                               const struct analysis_options *options, struct result *result);

/* Box drifts along the axes, from the fine sweeps. False when memory is short. */
bool conditions_drift(struct result *result);

/* The fine sweeps as sweep tables of the result. False when memory is short. */
bool conditions_sweeps(struct result *result);

/* The lowest rail voltages at which what is read still holds: of the varied rails, or of all. */
enum status conditions_supply(struct circuit *circuit, const struct analysis_options *options,
                              struct result *result);

/* Along a process: the value of the typical corner. */
#define CONDITION_TYPICAL (-1.0)

#endif
