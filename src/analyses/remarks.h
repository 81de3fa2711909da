/*
 * remarks.h: cautions about a solved cell, each with this cell's own figures.
 */
#ifndef ANALYSES_REMARKS_H
#define ANALYSES_REMARKS_H

#include "analyses/result.h"
#include "solve/operating_point.h"

/* Adds all cautions to result->cautions, those of the circuit first. False when memory is short. */
bool remarks_add(const struct operating_point *point, struct result *result);

#endif
