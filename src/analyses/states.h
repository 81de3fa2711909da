/*
 * states.h: every resting state, the proof, and whether the cell starts; and the certificate of a
 * single point.
 */
#ifndef ANALYSES_STATES_H
#define ANALYSES_STATES_H

#include "analyses/analysis.h"
#include "solve/operating_point.h"

/* The proofs work on full matrices. */
enum { STATES_NODE_LIMIT = 250, STATES_PART_LIMIT = 2000 };

struct state_result {
    bool is_certified;
    bool can_hold;            /* the sign of the determinant does not forbid it */
    const double *x;          /* [unknown_count] */
    const double *half_width; /* [node_count - 1] of the box that holds it alone, V; 0 where held */
    double widest;            /* V, of half_width; NAN without a certificate */
    const double *outputs;    /* [output_count] current as in output_result */
    double power;             /* W of the cell */
};

/* The part of the search that stayed open. */
struct undecided_range {
    const char *node;
    double low, high; /* V */
};

/* A device of the start-up branch: without it the loop is not pushed, and it runs nearly the same.
 */
struct starter_result {
    const struct instance *instance;
    double push_without;  /* A: start-up push without the device */
    double start_current; /* A: its own main current where the push is least, off side */
    double run_current;   /* A: in the wanted state */
};

struct supply_result {
    const struct rail *rail;
    double lowest;      /* V: the wanted state holds down to here */
    const char *reason; /* what ends it */
};

enum startup { STARTUP_CERTAIN, STARTUP_AT_RISK };

struct states_result {
    struct state_result *states; /* [state_count] rising power */
    int state_count;
    bool is_complete;
    bool is_brief; /* by states_review: starters and supplies were not looked for */
    bool is_large; /* more than STATES_NODE_LIMIT unknown nodes: nothing was tried */
    long boxes, box_limit;
    double low, high; /* V: where states were looked for */
    bool is_assumed;  /* that range is a choice: see network_build.h */
    struct undecided_range *undecided;
    int undecided_count;
    long undecided_boxes;
    int wanted; /* the state that `point` finds */

    bool has_loop;
    bool loop_unsure;
    const char *loop_path;
    const char *probe; /* node where the loop is opened; NULL: none */
    int probe_unknown;
    const double *curve_v, *curve_push; /* [curve_count] */
    int curve_count;

    bool ramp_begins;  /* false: with all rails at 0 nothing sets the nodes, no line begins */
    double ramp_break; /* share of the supply where the line ended, NAN */
    int ramp_state;    /* where it lands, -1: none of them */
    double push;       /* A: start-up push; NAN: no loop, or no way */
    double push_at;    /* V of the probe there */
    double push_off;   /* V of the probe where the way begins */
    double push_bound; /* A */
    bool rests_off;    /* the wanted state is the off end of the loop: there is no way to push */
    enum startup startup;
    const char *reasons[6]; /* for "at risk" */
    int reason_count;
    struct starter_result *starters;
    int starter_count;
    struct supply_result *supplies;
    int supply_count;
};

/* Certificate of the solved point alone, into result->states. False when memory is short. */
bool states_certify(struct operating_point *point, struct result *result);

/*
 * states_review: for `review`: result->states where the structure has a loop that could hold more
 * than one state, by a search of few boxes and without start-up branch and lowest supply; a caution
 * where start-up is at risk. Nothing where there is no such loop, or the cell is too large.
 *
 * point  polished; stays so
 *
 * STATUS_OK, STATUS_STOPPED (result->states is NULL then) or STATUS_MEMORY.
 */
enum status states_review(struct operating_point *point, const struct analysis_options *options,
                          struct result *result);

#endif
