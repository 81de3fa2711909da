/*
 * operating_point.h: the search for a resting state of a system, and moving along as a value
 * changes.
 */
#ifndef SOLVE_OPERATING_POINT_H
#define SOLVE_OPERATING_POINT_H

#include "base/status.h"
#include "solve/point.h"
#include "solve/system.h"

struct operating_point {
    struct system *system;
    double *x;            /* [n] last accepted point */
    long double *refined; /* [n] polished, after operating_point_polish */
    long double *values;  /* [nonzeros] Jacobian there; the system's solver holds its factors */
    long double *linear;  /* [4 n] workspace of linearised.c */
    double *saved;        /* [n] scratch of operating_point_move */
    struct solver_result solver;
    bool (*stopped)(void *self);
    void *stopped_self;
    int stalled_equation; /* of the last failure, -1 */
    int stalled_column;
    bool is_loose; /* stalled_column takes part in nothing */
    double best_residual;
    double *best;                /* [n] where it was */
    struct newton_report report; /* iterations add up over the whole search */
    double reached;              /* of the last walk along an embedding, 0..1 */
    double lost_at; /* of operating_point_move: where the state could not be followed */
    bool folds;     /* the curve of states turns back there */
};

/* Workspaces from the system's arena; stopped (NULL: never) is asked often, and true ends the work.
 * False when memory is short. */
bool operating_point_create(struct operating_point *point, struct system *system,
                            bool (*stopped)(void *self), void *stopped_self);

/*
 * operating_point_find: from cold: damped Newton from a guess that turns every diode-like device
 * on, then from one whose currents agree, then settling, then the steppings and continuations (the
 * ladder in operating_point.c); then the polish.
 *
 * Returns STATUS_OK (solver filled in), STATUS_UNSOLVED (trouble and advice say why),
 * STATUS_STOPPED, STATUS_MEMORY.
 */
enum status operating_point_find(struct operating_point *point);

/* Refines x to the end of long double and measures worst_residual. */
enum status operating_point_polish(struct operating_point *point);

/*
 * operating_point_move: changes one value of one instance from `from` (where x is a root) to `to`,
 * and follows the root in steps that are halved where it does not come to lie where the tangent
 * led.
 *
 * jumped  in: false. Out: true when the root could not be followed: it ends at point->lost_at, and
 *         the cell was let go from there to come to rest at `to` (or solved anew). NULL: it is only
 *         followed, else STATUS_UNSOLVED and x as it was
 */
enum status operating_point_move(struct operating_point *point, int instance, int parameter,
                                 double from, double to, bool *jumped);

/* What is said about a state that operating_point_move lost. */
const char *operating_point_lost_text(const struct operating_point *point);

/* Newton from the x at hand with the values in force, without any fallback. */
enum newton_status operating_point_newton(struct operating_point *point);

/* The same in the words of the layer: all that is not done, stopped or short of memory is unsolved.
 */
enum status operating_point_status(enum newton_status status);

/* A start for the search in which diode-like devices conduct, [n] out. False when memory is short.
 */
bool operating_point_guess(const struct system *system, double *x);

/* Moves the nodes of diode-like devices in the guess x to where their currents balance. False when
 * memory is short. */
bool operating_point_balance(const struct system *system, double *x);

#endif
