/*
 * quad_devices.h: the device equations of the reference.
 */
#ifndef SUPPORT_QUAD_DEVICES_H
#define SUPPORT_QUAD_DEVICES_H

#include "support/quad.h"

/*
 * quad_evaluate: currents into the terminals, then errors of the branch equations.
 *
 * x      [local_count] seeded unknowns
 * f      [local_count] out; only the terminals and branches are set
 * state  out: what a report would show of the inner device
 */
void quad_evaluate(const struct quad_question *question, int instance, const struct dual *x,
                   struct dual *f, struct quad_device_state *state);

#endif
