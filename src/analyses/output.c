/*
 * output.c: one output, swept around the operating point.
 *
 * The sweep walks from `at` to both ends. Each solved place carries its state, current and exact
 * slope, so that the distance between the curve and its chord is known (two cubic Hermite pieces)
 * and a segment is split until the straight line misses the curve by less than the tolerance.
 * Compliance and band edges are roots on a bracketed segment.
 */
#include "analyses/output.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/linearised.h"
#include "solve/measure.h"
#include "base/root.h"

enum { FIRST_SEGMENTS = 16, DEPTH_LIMIT = 24, EVENT_LIMIT = 20 };

/* Promised: 0.1 % of nominal or 1 % of the local value. Aimed at: half of it. */
static const double share_nominal = 0.5e-3, share_local = 0.5e-2;
/* Root finding in the load voltage, V: differences of edges between close cells are taken. */
static const double volts_tolerance = 1e-12;
/* How near to its end a state is followed, V: the promise for a compliance voltage. */
static const double volts_edge = 1e-5;

/* A difference of currents below this share is their rounding, no slope. */
static const double rounding_flatness = 1e-13;

struct place {
    double v, i, slope; /* current into the direction of `at`, positive there */
    double *x;
};

struct sweeper {
    struct operating_point *point;
    const struct output *output;
    struct arena *arena;
    struct output_result *result;
    int parameter, branch;
    double sign;     /* current in the direction at `at` = sign * branch current */
    double nominal;  /* A, positive */
    double from, to; /* of the curve; a sweep of the output itself may stand outside its range */
    double *rhs;     /* [n] */
    struct place *places; /* one direction, from `at` outwards */
    int count, capacity;
    struct place *spare; /* states for bisection */
    int *held;           /* transistors saturated at `at` */
    int held_count;
    bool edges_only; /* the curve itself is not wanted */
    unsigned wanted; /* edges: EDGE_... */
    enum status status;
};

/* --- places ---------------------------------------------------------------------------------- */

static bool keep_state(struct sweeper *w, struct place *place)
{
    const size_t n = (size_t)w->point->system->n;
    place->x = arena_new_array(w->arena, double, n);
    if (place->x == NULL) {
        w->status = STATUS_MEMORY;
        return false;
    }
    memcpy(place->x, w->point->x, n * sizeof *place->x);
    return true;
}

/* Current and slope at the state in point->x, whose factors the solver holds. */
static void read_place(struct sweeper *w, struct place *place)
{
    struct system *s = w->point->system;
    memset(w->rhs, 0, (size_t)s->n * sizeof *w->rhs);
    w->rhs[w->branch] = 1;
    linear_solve(s->solver, w->rhs);
    place->i = w->sign * w->point->x[w->branch] + 0.0; /* never a negative zero */
    place->slope = w->sign * w->rhs[w->branch];
}

/* The fold or jump is part of the answer, not a lost point. */
static void add_event(struct sweeper *w, double at, const char *text)
{
    struct output_result *r = w->result;
    if (r->event_count >= EVENT_LIMIT) {
        return;
    }
    if (r->events == NULL) {
        r->events = arena_new_array(w->arena, struct sweep_event, EVENT_LIMIT);
    }
    if (r->events == NULL) {
        w->status = STATUS_MEMORY;
        return;
    }
    r->events[r->event_count++] = (struct sweep_event){at, text};
}

/* The root at v that belongs to a near state; false when it cannot be followed there. */
static bool follow_to(struct sweeper *w, const struct place *near, double v, struct place *place)
{
    struct operating_point *p = w->point;
    memcpy(p->x, near->x, (size_t)p->system->n * sizeof *p->x);
    const enum status status =
        operating_point_move(p, w->output->instance, w->parameter, near->v, v, NULL);
    if (status != STATUS_OK) {
        w->status = status == STATUS_UNSOLVED ? w->status : status;
        return false;
    }
    place->v = v;
    read_place(w, place);
    return keep_state(w, place);
}

/* The same by Newton alone: what lies beyond an edge is of no interest, and steps are halved. */
static bool step_to(struct sweeper *w, const struct place *near, double v, struct place *place)
{
    struct operating_point *p = w->point;
    memcpy(p->x, near->x, (size_t)p->system->n * sizeof *p->x);
    system_set(p->system, w->output->instance, w->parameter, v);
    const enum newton_status status = operating_point_newton(p);
    if (status != NEWTON_CONVERGED) {
        w->status = status == NEWTON_STOPPED  ? STATUS_STOPPED
                    : status == NEWTON_MEMORY ? STATUS_MEMORY
                                              : w->status;
        return false;
    }
    place->v = v;
    read_place(w, place);
    return keep_state(w, place);
}

/*
 * Solves at v from a near state. A root that cannot be followed is looked for in another way and
 * told as an event; false when there is none, or when the work is to end.
 */
static bool solve_at(struct sweeper *w, const struct place *near, double v, struct place *place)
{
    struct operating_point *p = w->point;
    bool jumped = false;
    if (w->edges_only) {
        return step_to(w, near, v, place);
    }
    memcpy(p->x, near->x, (size_t)p->system->n * sizeof *p->x);
    const enum status status =
        operating_point_move(p, w->output->instance, w->parameter, near->v, v, &jumped);
    if (status != STATUS_OK) {
        w->status = status == STATUS_UNSOLVED ? w->status : status;
        return false;
    }
    if (jumped) {
        add_event(w, p->lost_at, operating_point_lost_text(p));
        const enum status again = operating_point_status(operating_point_newton(p));
        if (again != STATUS_OK) {
            w->status = again == STATUS_UNSOLVED ? w->status : again;
            return false;
        }
    }
    place->v = v;
    read_place(w, place);
    return keep_state(w, place);
}

static bool add_place(struct sweeper *w, const struct place *place)
{
    struct place *list = arena_grow(w->arena, w->places, w->count, &w->capacity, sizeof *list);
    if (list == NULL) {
        w->status = STATUS_MEMORY;
        return false;
    }
    w->places = list;
    list[w->count++] = *place;
    return true;
}

/* --- the adaptive curve ---------------------------------------------------------------------- */

static double tolerance_at(const struct sweeper *w, double i)
{
    return fmax(share_nominal * w->nominal, share_local * fabs(i));
}

/* Bound on the distance between a cubic with these end slopes and its chord (4/27 is the extreme of
 * t (1-t)^2). */
static double chord_error(const struct place *a, const struct place *b)
{
    const double h = b->v - a->v, chord = (b->i - a->i) / h;
    return fabs(h) * (4.0 / 27) * (fabs(a->slope - chord) + fabs(b->slope - chord));
}

static double hermite_middle(const struct place *a, const struct place *b)
{
    return (a->i + b->i) / 2 + (b->v - a->v) * (a->slope - b->slope) / 8;
}

/* Adds all places after a up to b, whose state is known. */
static bool fill(struct sweeper *w, const struct place *a, const struct place *b, int depth)
{
    struct place middle;
    if (!solve_at(w, a, (a->v + b->v) / 2, &middle)) {
        add_event(w, (a->v + b->v) / 2, "no state was found at this load voltage");
        return w->status == STATUS_OK && add_place(w, b);
    }
    const double tolerance = tolerance_at(w, fmin(fabs(a->i), fabs(b->i)));
    const bool smooth = chord_error(a, &middle) <= tolerance &&
                        chord_error(&middle, b) <= tolerance &&
                        fabs(middle.i - hermite_middle(a, b)) <= 2 * tolerance;
    if (smooth) {
        return add_place(w, &middle) && add_place(w, b);
    }
    if (depth >= DEPTH_LIMIT) {
        add_event(w, middle.v, "the current jumps at this load voltage");
        return add_place(w, b);
    }
    return fill(w, a, &middle, depth + 1) && fill(w, &middle, b, depth + 1);
}

/*
 * There is a state at the last place and none at `bad`: goes on in halved steps to where it ends,
 * so that a loss of headroom or of the band in between is not missed. Roots are only followed here.
 */
static bool approach(struct sweeper *w, double bad)
{
    while (fabs(bad - w->places[w->count - 1].v) > volts_edge) {
        const struct place last = w->places[w->count - 1];
        const double v = (last.v + bad) / 2;
        struct place next;
        if (v == last.v || v == bad) {
            break;
        }
        if (follow_to(w, &last, v, &next)) {
            if (!fill(w, &last, &next, 0)) {
                return false;
            }
        } else if (w->status != STATUS_OK) {
            return false;
        } else {
            bad = v;
        }
    }
    add_event(w, w->places[w->count - 1].v, "no state was found beyond this load voltage");
    return w->status == STATUS_OK;
}

static bool walk(struct sweeper *w, const struct place *home, double end)
{
    bool is_lost = false;
    w->count = 0;
    if (!add_place(w, home)) {
        return false;
    }
    const double span = w->to - w->from;
    const int segments = (int)ceil(FIRST_SEGMENTS * fabs(end - home->v) / span);
    for (int k = 1; k <= segments; k++) {
        const struct place last = w->places[w->count - 1];
        const double v = k == segments ? end : home->v + (end - home->v) * k / segments;
        struct place next;
        if (!solve_at(w, &last, v, &next)) {
            if (w->status != STATUS_OK || (!is_lost && !approach(w, v))) {
                return false;
            }
            is_lost = true;
            continue;
        }
        is_lost = false;
        if (!fill(w, &last, &next, 0)) {
            return false;
        }
    }
    return true;
}

/* --- roots on the curve ---------------------------------------------------------------------- */

struct root_task {
    struct sweeper *sweeper;
    const struct place *near;
    double (*distance)(struct sweeper *w, const struct place *place);
};

/* The least headroom of the transistors that held at `at`; the device is remembered. */
static double headroom_left(struct sweeper *w, const struct place *place)
{
    double least = INFINITY;
    for (int k = 0; k < w->held_count; k++) {
        const double headroom = measure_headroom(w->point->system, w->held[k], place->x, NULL);
        if (!(headroom >= least)) {
            least = headroom;
            w->result->compliance_device = w->point->system->circuit->instances[w->held[k]].name;
        }
    }
    return least;
}

static double band_left(struct sweeper *w, const struct place *place)
{
    return w->output->within * w->nominal - fabs(place->i - w->nominal);
}

static double slope_left(struct sweeper *w, const struct place *place)
{
    (void)w;
    return place->slope;
}

static double distance_at(void *self, double v)
{
    struct root_task *task = self;
    struct place place;
    if (!solve_at(task->sweeper, task->near, v, &place)) {
        return NAN;
    }
    return task->distance(task->sweeper, &place);
}

/* First place outwards where distance() turns from positive to negative, as a root; NAN when it
 * does not. */
static double first_loss(struct sweeper *w,
                         double (*distance)(struct sweeper *, const struct place *))
{
    for (int k = 1; k < w->count; k++) {
        const double after = distance(w, &w->places[k]);
        if (after > 0) {
            continue;
        }
        struct root_task task = {w, &w->places[k - 1], distance};
        const double before = distance(w, &w->places[k - 1]);
        return root_bracketed(distance_at, &task, w->places[k - 1].v, before, w->places[k].v, after,
                              volts_tolerance);
    }
    return NAN;
}

/* --- what the curve says ---------------------------------------------------------------------- */

static bool list_held(struct sweeper *w)
{
    const struct system *s = w->point->system;
    w->held = arena_new_array(w->arena, int, s->circuit->instance_count);
    for (int k = 0; w->held != NULL && k < s->circuit->instance_count; k++) {
        unsigned region;
        if (s->circuit->instances[k].type->is_transistor) {
            const double headroom = measure_headroom(s, k, w->point->x, &region);
            if ((region & REGION_SATURATED) != 0 && headroom > 0) {
                w->held[w->held_count++] = k;
            }
        }
    }
    return w->held != NULL;
}

/* The conducting transistor at the output that is out of headroom already, when none there holds;
 * or NULL. */
static const char *lost_at_start(const struct sweeper *w, const struct place *home)
{
    const struct system *s = w->point->system;
    const char *lost = NULL;
    for (int k = 0; k < s->circuit->instance_count; k++) {
        const struct instance *instance = &s->circuit->instances[k];
        if (!instance->type->is_transistor || instance->outer[0] != w->output->unknown) {
            continue;
        }
        unsigned region;
        const double headroom = measure_headroom(s, k, home->x, &region);
        if ((region & REGION_SATURATED) != 0 && headroom > 0) {
            return NULL;
        }
        lost = (region & REGION_OFF) != 0 ? lost : instance->name;
    }
    return lost;
}

/* Where the band is left on the way to `end`, or where the state itself ends; NAN: nowhere. */
static double band_edge(struct sweeper *w, double end)
{
    const double edge = first_loss(w, band_left);
    const double reached = w->places[w->count - 1].v;
    return isnan(edge) && reached != end ? reached : edge;
}

/* Compliance lies towards ground for a sink, towards the supply for a source. */
static void find_compliance(struct sweeper *w)
{
    struct output_result *r = w->result;
    r->unheld_device = lost_at_start(w, &w->places[0]);
    if (w->held_count == 0 || r->unheld_device != NULL) {
        return;
    }
    r->compliance = first_loss(w, headroom_left);
    if (isnan(r->compliance)) {
        r->compliance_beyond = w->places[w->count - 1].v == (r->is_sink ? w->from : w->to);
        r->compliance_device = NULL;
        return;
    }
    /* The device is the one whose headroom is least just there. */
    struct root_task task = {w, &w->places[0], headroom_left};
    for (int k = 0; k < w->count; k++) {
        if (fabs(w->places[k].v - r->compliance) < fabs(task.near->v - r->compliance)) {
            task.near = &w->places[k];
        }
    }
    distance_at(&task, r->compliance);
}

/* Largest and smallest current between compliance and the far end. Extremes inside are roots of the
 * slope. */
struct extremes {
    double least, most;
};

static void include(struct extremes *e, double i)
{
    e->least = fmin(e->least, i);
    e->most = fmax(e->most, i);
}

static void scan_extremes(struct sweeper *w, double limit, struct extremes *e)
{
    const double side = w->count > 1 ? w->places[1].v - w->places[0].v : 0;
    for (int k = 0; k < w->count; k++) {
        const struct place *place = &w->places[k];
        if (!isnan(limit) && (place->v - limit) * side > 0) {
            struct place edge;
            if (solve_at(w, &w->places[k - 1], limit, &edge)) {
                include(e, edge.i);
            }
            return;
        }
        include(e, place->i);
        if (k > 0 && place->slope * w->places[k - 1].slope < 0) {
            struct root_task task = {w, &w->places[k - 1], slope_left};
            const double v = root_bracketed(distance_at, &task, w->places[k - 1].v,
                                            w->places[k - 1].slope, place->v, place->slope, 1e-6);
            struct place top;
            if (isfinite(v) && (isnan(limit) || (v - limit) * side <= 0) &&
                solve_at(w, &w->places[k - 1], v, &top)) {
                include(e, top.i);
            }
        }
    }
}

/* --- small changes ---------------------------------------------------------------------------- */

static bool find_derivatives(struct operating_point *home, int branch, double sign,
                             struct arena *arena, struct output_result *r)
{
    const struct circuit *c = home->system->circuit;
    const long double g = linearised_conductance(home, branch);
    r->resistance = (double)(1 / g);
    /* What is lost in the rounding of extended precision, or beyond 1e18 ohm, is no figure. */
    r->resistance_unlimited = !(fabsl(g) > 1e-18L);
    if (r->resistance_unlimited) {
        r->resistance = NAN;
    }
    double *line = arena_new_array(arena, double, c->rail_count);
    if (line == NULL) {
        return false;
    }
    for (int k = 0; k < c->rail_count; k++) {
        const int driver = system_branch(&c->instances[c->rails[k].instance]);
        line[k] = sign * (double)linearised_transfer(home, branch, driver) / r->current + 0.0;
    }
    r->line = line;
    long double per_kelvin;
    if (!linearised_temperature(home, branch, &per_kelvin)) {
        return false;
    }
    r->tempco = sign * (double)per_kelvin / r->current;
    r->sigma = linearised_sigma(home, branch) / r->current;
    return true;
}

/* --- the whole -------------------------------------------------------------------------------- */

static bool make_curve(struct sweeper *w, const struct place *down, int down_count)
{
    struct curve_points *curve = &w->result->curve;
    const int count = down_count + w->count - 1;
    double *v = arena_new_array(w->arena, double, count);
    double *i = arena_new_array(w->arena, double, count);
    if (v == NULL || i == NULL) {
        return false;
    }
    int used = 0;
    for (int k = down_count - 1; k > 0; k--, used++) {
        v[used] = down[k].v;
        i[used] = down[k].i;
    }
    for (int k = 0; k < w->count; k++, used++) {
        v[used] = w->places[k].v;
        i[used] = w->places[k].i;
    }
    *curve = (struct curve_points){v, i, used};
    return true;
}

static void sweep_both(struct sweeper *w, const struct place *home)
{
    struct output_result *r = w->result;
    struct extremes e = {home->i, home->i};
    if (!walk(w, home, w->from)) {
        return;
    }
    r->low = band_edge(w, w->from);
    if (r->is_sink) {
        find_compliance(w);
    }
    struct place *down = w->places;
    const int down_count = w->count;
    w->places = NULL;
    w->count = w->capacity = 0;
    if (!walk(w, home, w->to)) {
        return;
    }
    r->high = band_edge(w, w->to);
    if (!r->is_sink) {
        find_compliance(w);
    }
    scan_extremes(w, r->is_sink ? NAN : r->compliance, &e);
    const struct sweeper up = *w;
    w->places = down;
    w->count = down_count;
    scan_extremes(w, r->is_sink ? r->compliance : NAN, &e);
    w->places = up.places;
    w->count = up.count;
    const double flatness = (e.most - e.least) / w->nominal;
    r->flatness = flatness > rounding_flatness ? flatness : 0;
    if (!make_curve(w, down, down_count)) {
        w->status = STATUS_MEMORY;
    }
}

/* The point as it was before the sweep. */
static void return_home(struct sweeper *w, const struct place *start)
{
    struct operating_point *home = w->point;
    system_set(home->system, w->output->instance, w->parameter, start->v);
    memcpy(home->x, start->x, (size_t)home->system->n * sizeof *home->x);
    const enum status back = operating_point_status(operating_point_newton(home));
    if (w->status == STATUS_OK && back != STATUS_UNSOLVED) {
        w->status = back;
    }
}

bool output_at_point(struct operating_point *home, int index, struct arena *arena,
                     struct output_result *r)
{
    const struct system *s = home->system;
    const struct output *output = &s->circuit->outputs[index];
    const int branch = system_branch(&s->circuit->instances[output->instance]);
    const double i = (double)home->refined[branch];
    *r = (struct output_result){.output = output,
                                .is_sink = i <= 0,
                                .current = fabs(i),
                                .compliance = NAN,
                                .low = NAN,
                                .high = NAN,
                                .flatness = NAN,
                                .tempco = NAN,
                                .sigma = NAN};
    return find_derivatives(home, branch, i <= 0 ? -1 : 1, arena, r);
}

/* Outwards in the same steps without filling in, until the band is left and the headroom lost; a
 * step that fails is halved until the end of the state is near. */
static bool walk_edges(struct sweeper *w, const struct place *home, double end, bool wants_band,
                       bool wants_compliance)
{
    const double first = (w->to - w->from) / FIRST_SEGMENTS;
    const double side = end < home->v ? -1 : 1;
    double step = first;
    w->count = 0;
    if (!add_place(w, home)) {
        return false;
    }
    while ((end - w->places[w->count - 1].v) * side > 1e-12 && step > volts_edge) {
        const struct place last = w->places[w->count - 1];
        const double left = fabs(end - last.v);
        struct place next;
        if (solve_at(w, &last, step < left ? last.v + side * step : end, &next)) {
            step = fmin(2 * step, first);
            if (!add_place(w, &next)) {
                return false;
            }
            if ((!wants_band || band_left(w, &next) < 0) &&
                !(wants_compliance && headroom_left(w, &next) > 0)) {
                return true;
            }
        } else if (w->status != STATUS_OK) {
            return false;
        } else {
            step /= 2;
        }
    }
    return true;
}

/* The edges on one side of home; nothing is done for those that are not wanted. */
static void edges_beside(struct sweeper *w, const struct place *home, double end, unsigned band_bit,
                         double *band, bool towards_compliance)
{
    const bool wants_band = (w->wanted & band_bit) != 0;
    const bool wants_compliance = towards_compliance && (w->wanted & EDGE_COMPLIANCE) != 0;
    if (!wants_band && !wants_compliance) {
        return;
    }
    w->places = NULL;
    w->count = w->capacity = 0;
    if (walk_edges(w, home, end, wants_band, wants_compliance)) {
        *band = wants_band ? first_loss(w, band_left) : NAN;
        if (wants_compliance) {
            find_compliance(w);
        }
    }
}

static void sweep_edges(struct sweeper *w, const struct place *home)
{
    struct output_result *r = w->result;
    edges_beside(w, home, w->from, EDGE_LOW, &r->low, r->is_sink);
    if (w->status == STATUS_OK) {
        edges_beside(w, home, w->to, EDGE_HIGH, &r->high, !r->is_sink);
    }
}

/* wanted: edges alone; 0: the whole curve. */
static enum status sweep_output(struct operating_point *home, int index, struct arena *arena,
                                unsigned wanted, struct output_result *r)
{
    struct system *s = home->system;
    const struct output *output = &s->circuit->outputs[index];
    struct arena *scratch = arena_create();
    if (scratch == NULL) {
        return STATUS_MEMORY;
    }
    const int branch = system_branch(&s->circuit->instances[output->instance]);
    const double i = (double)home->refined[branch];
    const int parameter = s->circuit->instances[output->instance].type->value_parameter;
    const double at = s->own[output->instance][parameter]; /* output->at, unless it is swept */
    struct sweeper w = {.point = home,
                        .output = output,
                        .arena = arena,
                        .result = r,
                        .parameter = parameter,
                        .branch = branch,
                        .sign = i <= 0 ? -1 : 1,
                        .nominal = fabs(i),
                        .from = fmin(output->from, at),
                        .to = fmax(output->to, at),
                        .edges_only = wanted != 0,
                        .wanted = wanted};
    w.rhs = arena_new_array(scratch, double, s->n);
    const bool good = w.rhs != NULL && output_at_point(home, index, arena, r) && list_held(&w);
    struct place start = {.v = at};
    if (good) {
        read_place(&w, &start);
        if (keep_state(&w, &start)) {
            if (w.edges_only) {
                sweep_edges(&w, &start);
            } else {
                sweep_both(&w, &start);
            }
            return_home(&w, &start);
        }
    }
    arena_destroy(scratch);
    return good ? w.status : STATUS_MEMORY;
}

enum status analyse_output(struct operating_point *home, int index, struct arena *arena,
                           struct output_result *r)
{
    return sweep_output(home, index, arena, 0, r);
}

enum status output_edges(struct operating_point *home, int index, unsigned wanted,
                         struct arena *arena, struct output_result *r)
{
    return sweep_output(home, index, arena, wanted, r);
}
