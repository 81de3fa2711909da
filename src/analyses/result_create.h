/*
 * result_create.h: an empty result, as every command begins with.
 */
#ifndef ANALYSES_RESULT_CREATE_H
#define ANALYSES_RESULT_CREATE_H

#include "analyses/result.h"

/*
 * result_create: an unsolved result that borrows the circuit; owned by the caller (result_free of
 * analysis.h). Its temperature is the one that the figures hold at: the hand view stays at that of
 * the model values. NULL when memory is short.
 */
struct result *result_create(const struct circuit *circuit, enum view view, const char *command);

/* Copies how the point was found. Texts of the solver live in the system's arena: the result keeps
 * its own. Lost memory is told by the result's arena. */
void result_keep_solver(struct result *result, const struct solver_result *solver);

#endif
