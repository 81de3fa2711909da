/*
 * explain.h: why a computed figure differs from the paper's: shares of the effects that lie between
 * the hand view and the full view.
 */
#ifndef ANALYSES_EXPLAIN_H
#define ANALYSES_EXPLAIN_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"

struct effect_share {
    const char *effect;   /* "body effect", ...; or what the paper says beside the square law */
    double share;         /* in the quantity's unit; all shares add up to the difference */
    const char *sentence; /* with this cell's own figures; NULL where the share does not matter */
};

struct explanation {
    const struct hand_line *hand;
    double paper;        /* what the `hand` line says */
    double hand_view;    /* under the square law alone; NAN: the cell has no state there */
    double computed;     /* in the full view */
    bool as_conductance; /* a resistance that may be unlimited: paper, hand_view, computed and the
                            shares are 1/R, S */
    struct effect_share *shares; /* [share_count] greatest first */
    int share_count;
    const char *trouble;    /* why there are no shares; NULL otherwise */
    const char *note;       /* where a subset of the effects has no state or the quantity no value
                               there: which, and over which orders the shares are taken; NULL: none */
    const char *first_with; /* effects that are on from the start, since without them there is no
                               way to the full view; they have no share. NULL: none */
};

/*
 * explain_hands: every `hand` line of a circuit, by Shapley value (1953): the mean over all orders
 * of what an effect adds when it is switched on. All 2^k subsets of the k effects that the cell has
 * are solved. Where some of them have no state, the mean is over the orders that pass none of
 * those.
 *
 * home    a polished point in the full view
 * result  gets explanations, one a hand line
 *
 * STATUS_OK (also where a line has trouble), STATUS_STOPPED (those that could not be made have
 * trouble) or STATUS_MEMORY.
 */
enum status explain_hands(struct operating_point *home, const struct analysis_options *options,
                          struct result *result);

/* Which effects the cell has: a bit is in the sum when switching it changes any device, alone or
 * with all others on. False when memory is short. */
bool explain_effects(struct system *system, unsigned *effects);

/* What stands behind a share. */
struct effect_case {
    int bit; /* of enum effect */
    const struct probe *probe;
    int instance;                 /* the device through which most of it goes */
    const double *with, *without; /* its quantities in the full view, and without this effect */
    double kelvin, measured_kelvin;
};

/* A sentence about it, in the arena; NULL when memory is short. */
const char *explain_sentence(const struct circuit *circuit, const struct effect_case *it,
                             struct arena *arena);

#endif
