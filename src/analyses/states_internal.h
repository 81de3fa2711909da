/*
 * states_internal.h: what states.c and startup.c share.
 */
#ifndef ANALYSES_STATES_INTERNAL_H
#define ANALYSES_STATES_INTERNAL_H

#include "analyses/analysis.h"
#include "analyses/loop_curve.h"
#include "analyses/loops.h"
#include "analyses/network_build.h"
#include "analyses/states.h"
#include "proof/search.h"

struct states_work {
    struct operating_point *point; /* scratch: x, refined and factors change */
    struct system *system;
    struct arena *arena; /* of the result */
    const struct analysis_options *options;
    struct network_map map;
    bool is_large; /* beyond the limits of states.h: map is empty */
    bool is_brief; /* for a review */
    struct search *search;
    struct loop loop;
    enum status broken;   /* STATUS_MEMORY or STATUS_STOPPED inside a search for states */
    const double *wanted; /* [n] the wanted state */
    double *nodes;        /* [network node_count] scratch */
    double *x;            /* [n] scratch */
};

/* Rails from 0; the loop's push; the lowest supply. Fills its part of `found`, reasons too. */
enum status startup_judge(struct states_work *work, struct states_result *found);

/* The whole curve of the loop at its probe; *curve empty when there is no probe. */
enum status startup_curve(struct states_work *work, int points, struct loop_curve *curve);

/* Newton and polish from x[n] without any fallback; the point then holds the state. */
enum status states_settle(struct operating_point *point, const double *x);

/* Which state x is, -1: none; the nearest by node voltages within a millivolt. */
int states_which(const struct states_result *found, const struct system *system, const double *x);

#endif
