/*
 * output.h: everything about one output: current, resistance, curve, compliance, band,
 * sensitivities.
 */
#ifndef ANALYSES_OUTPUT_H
#define ANALYSES_OUTPUT_H

#include "analyses/result.h"
#include "solve/operating_point.h"

/* What the linearised equations give at the operating point: current, resistance, line, tempco,
 * sigma; the rest is NAN. False when memory is short. */
bool output_at_point(struct operating_point *home, int index, struct arena *arena,
                     struct output_result *result);

/*
 * analyse_output: measures output `index`.
 *
 * home    the polished operating point; on return the system stands there again
 * arena   owns what the result points to
 * result  out; what could not be found is NAN
 *
 * Returns STATUS_OK, STATUS_STOPPED (result holds what was done) or STATUS_MEMORY.
 */
enum status analyse_output(struct operating_point *home, int index, struct arena *arena,
                           struct output_result *result);

enum { EDGE_COMPLIANCE = 1, EDGE_LOW = 2, EDGE_HIGH = 4 };

/*
 * output_edges: the same without curve and flatness: compliance, low and high as far as they are
 * wanted (a sum of EDGE_..., not 0), and what output_at_point gives. A few times faster; nothing is
 * searched for beyond a lost state.
 */
enum status output_edges(struct operating_point *home, int index, unsigned wanted,
                         struct arena *arena, struct output_result *result);

#endif
