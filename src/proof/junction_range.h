/* junction_range.h: the limited exponential of devices/smooth.h over an interval. Private. */
#ifndef PROOF_JUNCTION_RANGE_H
#define PROOF_JUNCTION_RANGE_H

#include "interval/interval.h"

/* exp(u) - 1, straight above EXPONENT_LIMIT, and its slope. */
struct interval junction_expm1(struct interval u, struct interval *slope);

#endif
