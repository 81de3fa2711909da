/*
 * follow.c: following a state while one value moves, and where it ends.
 */
#include <math.h>
#include <string.h>

#include "solve/search.h"

/* A node further than this, V, from where the tangent led: the step is too long, or the state is
 * another. */
static const double surprise = 0.1;

struct turn {
    double furthest; /* largest parameter so far */
    bool turned;
};

static bool watch_turn(void *self, const struct trace_point *point)
{
    struct turn *turn = self;
    turn->turned = point->lambda < turn->furthest;
    turn->furthest = fmax(turn->furthest, point->lambda);
    return !turn->turned;
}

/* Whether the curve of states turns back before the knob is at its end: a fold, and where. Only
 * NEWTON_STOPPED and NEWTON_MEMORY of the answer mean anything. */
static enum newton_status find_turn(struct operating_point *p, double from, struct turn *turn)
{
    struct system *s = p->system;
    struct continuation_options options = search_walk_options(p);
    bool ended = false;
    *turn = (struct turn){.furthest = from};
    options.step_limit = 200;
    options.first_step = 0.02;
    s->embedding = EMBED_KNOB;
    const enum newton_status status =
        arclength_trace(&s->face, &options, from, 1, p->x, watch_turn, turn, &ended, &p->report);
    s->embedding = EMBED_NONE;
    s->lambda = 1;
    return status;
}

const char *operating_point_lost_text(const struct operating_point *point)
{
    return point->folds ? "the state folds back here: beyond, the cell rests in another one"
                        : "the state cannot be followed from here: it jumps";
}

/* The state is lost on the way: tells where, and looks for one at the end of the way. */
static enum status land(struct operating_point *p, int instance, int parameter, double from,
                        double to)
{
    struct system *s = p->system;
    const double reached = p->reached;
    struct turn turn;
    double *edge = arena_new_array(s->arena, double, s->n);
    if (edge == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(edge, p->x, (size_t)s->n * sizeof *edge);
    enum newton_status status = find_turn(p, reached, &turn);
    if (search_ends(status)) {
        return operating_point_status(status);
    }
    p->folds = turn.turned;
    p->lost_at = from + (p->folds ? turn.furthest : reached) * (to - from);
    memcpy(p->x, edge, (size_t)s->n * sizeof *edge);
    system_set(s, instance, parameter, to);
    status = search_settle(p, false);
    return status == NEWTON_CONVERGED || search_ends(status) ? operating_point_status(status)
                                                             : operating_point_find(p);
}

/* Where rounding keeps the steps from converging (a gain of 1e9) the polish may still get there. */
static bool is_near_start(const struct operating_point *p, const double *start)
{
    for (int k = 0; k < p->system->node_count; k++) {
        if (!(fabs(p->x[k] - start[k]) <= surprise)) {
            return false;
        }
    }
    return true;
}

enum status operating_point_move(struct operating_point *p, int instance, int parameter,
                                 double from, double to, bool *jumped)
{
    struct system *s = p->system;
    struct continuation_options options = search_walk_options(p);
    double *start = p->saved;
    memcpy(start, p->x, (size_t)s->n * sizeof *start);
    s->knob_instance = instance;
    s->knob_parameter = parameter;
    s->knob_from = from;
    s->knob_to = to;
    options.first_step = 1;
    options.surprise = surprise;
    enum newton_status status = search_walk(p, EMBED_KNOB, &options);
    system_set(s, instance, parameter, to);
    if (status == NEWTON_CONVERGED || search_ends(status)) {
        return operating_point_status(status);
    }
    if (!(p->reached > 0)) {
        memcpy(p->x, start, (size_t)s->n * sizeof *start);
        status = operating_point_newton(p);
        if (search_ends(status) || (status == NEWTON_CONVERGED && is_near_start(p, start))) {
            return operating_point_status(status);
        }
        memcpy(p->x, start, (size_t)s->n * sizeof *start);
    }
    enum status found = STATUS_UNSOLVED;
    if (jumped != NULL) {
        *jumped = true;
        found = land(p, instance, parameter, from, to);
    }
    if (found != STATUS_OK) {
        memcpy(p->x, start, (size_t)s->n * sizeof *start);
        system_set(s, instance, parameter, to);
    }
    return found;
}
