/*
 * repair_internal.h: what repair.c and repair_everywhere.c share.
 */
#ifndef ANALYSES_REPAIR_INTERNAL_H
#define ANALYSES_REPAIR_INTERNAL_H

#include "analyses/derivative.h"
#include "analyses/repair.h"

/* A value that may be turned. */
struct candidate {
    struct parameter_ref parameter;
    struct knob knob; /* the same, as conditions name it */
    bool is_whole;    /* m: a count */
    bool is_varied;   /* a `vary` line sets it: no change of it stays over all conditions */
    double predicted; /* logarithm of the factor that the linearised cell asks for */
};

struct everywhere;

struct repairer {
    struct circuit *circuit;
    struct operating_point *home;
    const struct analysis_options *options;
    struct result *result;
    const struct requirement *requirement;
    struct probe probe;
    double value, aim;             /* of the quantity: now, wanted */
    double distance;               /* from the aim; over all conditions, of their extremes */
    struct everywhere *everywhere; /* NULL: at the cell's own conditions */
    int *first;                    /* [instance_count] of its own values among all */
    int value_count;
    struct candidate *candidates;
    int count;
    const struct candidate *tried;
    enum status status; /* STATUS_MEMORY or STATUS_STOPPED inside a search */
};

/* Where the quantity is to be brought: the middle of a band, a hundredth inside a limit. */
double repair_aim(const struct requirement *requirement, double value);

/* An `everywhere` requirement, of which the conditions are known: sets r->everywhere. */
enum status everywhere_open(struct repairer *r, int requirement, struct arena *arena);

/*
 * everywhere_distance: from the aim, of the greatest value (a limit from above), the least (from
 * below) or the middle of both (a band) over the conditions that were extreme so far.
 *
 * it  NULL: the cell as it is
 */
double everywhere_distance(struct repairer *r, const struct candidate *it, double to);

/* Whether the requirement holds at those conditions. */
bool everywhere_may_hold(struct repairer *r, const struct candidate *it, double to);

/*
 * everywhere_is_met: over all conditions; *breaks is an `everywhere` line that was met and is not
 * any more. Where it is not met, the extremes found are kept for the next try.
 */
bool everywhere_is_met(struct repairer *r, const struct candidate *it, double to,
                       const char **breaks);

#endif
