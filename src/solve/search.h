/*
 * search.h: what the searches for a state share; for operating_point.c and the files beside it.
 */
#ifndef SOLVE_SEARCH_H
#define SOLVE_SEARCH_H

#include "solve/operating_point.h"
#include "numerics/continuation.h"

/* Stopped or short of memory: no other search may be tried. */
bool search_ends(enum newton_status status);

/* The standard options with the caller's way to stop. */
struct newton_options search_newton_options(const struct operating_point *point);
struct continuation_options search_walk_options(const struct operating_point *point);

/* Follows an embedding from 0 to 1; point->reached tells how far, point->x is the root there. */
enum newton_status search_walk(struct operating_point *point, enum embedding embedding,
                               const struct continuation_options *options);

/* settle (numerics/settle.h) from point->x. */
enum newton_status search_settle(struct operating_point *point, bool patient);

/* Name of an unknown in the system's arena; "" when memory is short (the arena remembers). */
const char *trouble_name(const struct operating_point *point, int unknown);

/* Fills in point->solver for a search that found nothing: where, what, what to look at. */
void trouble_tell(struct operating_point *point);

/* A residual above 1e-12 after the polish: what limits it. False when memory is short. */
bool trouble_tell_limit(struct operating_point *point);

#endif
