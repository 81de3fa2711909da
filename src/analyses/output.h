/*
 * output.h: everything about one output: current, resistance, curve, compliance, band,
 * sensitivities.
 */
#ifndef ANALYSES_OUTPUT_H
#define ANALYSES_OUTPUT_H

#include "analyses/operating_point.h"

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

#endif
