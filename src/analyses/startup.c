/*
 * startup.c: will the cell start? The rails come up from 0 in small steps; the loop is opened at
 * its probe and pushed from its off end to the wanted state; the supply is lowered until that state
 * ends.
 */
#include <math.h>
#include <string.h>

#include "solve/measure.h"
#include "analyses/states_internal.h"
#include "numerics/continuation.h"

enum { WAY_POINTS = 120, WAY_COARSE = 40, STARTER_LIMIT = 16, SUPPLY_STEPS = 60, BISECTIONS = 14 };

/* A part of the start-up branch: the push falls to less than this share without it ... */
static const double push_share = 0.2;
/* ... and the probe moves by less than this share of itself in the running state. */
static const double running_share = 0.02;
/* What makes a device vanish: its multiplier times this, a resistor divided by it. */
static const double vanish = 1e-12;

static double probe_voltage(const struct states_work *w, const double *x)
{
    return x[w->loop.probe];
}

/* --- rails from 0 -------------------------------------------------------------------------------
 */

static enum status ramp_rails(struct states_work *w, struct states_result *found)
{
    struct system *s = w->system;
    struct operating_point *p = w->point;
    struct continuation_options options = continuation_default_options();
    struct newton_report report = {0};
    options.first_step = 0.01;
    options.least_step = 1e-12; /* a current source into devices that are off: a steep start */
    options.newton.stopped = w->options->stopped;
    options.newton.stopped_self = w->options->stopped_self;
    memset(p->x, 0, (size_t)s->n * sizeof *p->x);
    double reached = 0;
    s->embedding = EMBED_SOURCES;
    enum newton_status status =
        continuation_walk(&s->face, s->solver, &options, 0, 1, p->x, &reached, s->work, &report);
    found->ramp_begins = reached > 0;
    if (found->ramp_begins && status != NEWTON_CONVERGED && status != NEWTON_STOPPED &&
        status != NEWTON_MEMORY) {
        /* the line of states turns back: a real cell would jump. Where the line leads in the end:
         */
        bool ended = false;
        found->ramp_break = reached;
        memset(p->x, 0, (size_t)s->n * sizeof *p->x);
        options.step_limit = 4000;
        status = arclength_trace(&s->face, &options, 0, 1, p->x, NULL, NULL, &ended, &report);
    }
    s->embedding = EMBED_NONE;
    s->lambda = 1;
    if (status == NEWTON_STOPPED || status == NEWTON_MEMORY) {
        return status == NEWTON_STOPPED ? STATUS_STOPPED : STATUS_MEMORY;
    }
    if (status == NEWTON_CONVERGED) {
        memcpy(w->x, p->x, (size_t)s->n * sizeof *w->x);
        const enum status settled = states_settle(p, w->x);
        if (settled == STATUS_OK) {
            found->ramp_state = states_which(found, s, p->x);
        } else if (settled != STATUS_UNSOLVED) {
            return settled;
        }
    }
    return STATUS_OK;
}

/* --- the open loop ---------------------------------------------------------------------------- */

/* Rails and gnd: where a probe can lie. */
static void rail_span(const struct states_work *w, double *low, double *high)
{
    const struct circuit *c = w->system->circuit;
    *low = *high = 0;
    for (int k = 0; k < c->rail_count; k++) {
        *low = fmin(*low, w->wanted[c->rails[k].unknown]);
        *high = fmax(*high, w->wanted[c->rails[k].unknown]);
    }
    if (w->loop.probe >= 0) {
        *low = fmin(*low, probe_voltage(w, w->wanted));
        *high = fmax(*high, probe_voltage(w, w->wanted));
    }
}

/* From the wanted state down and up, so that it starts from a solution; joined in rising voltage.
 */
enum status startup_curve(struct states_work *w, int points, struct loop_curve *curve)
{
    struct loop_curve down, up;
    const size_t n = (size_t)w->system->n;
    double low, high;
    *curve = (struct loop_curve){0};
    if (w->loop.probe < 0) {
        return STATUS_OK;
    }
    rail_span(w, &low, &high);
    struct held_loop *loop = held_loop_create(w->arena, w->system, w->loop.probe);
    if (loop == NULL) {
        return STATUS_MEMORY;
    }
    const double from = probe_voltage(w, w->wanted);
    const double share = high > low ? (from - low) / (high - low) : 0.5;
    const int below = 2 + (int)(share * points), above = 2 + (int)((1 - share) * points);
    enum status status = loop_curve_trace(loop, w->arena, w->wanted, from, low, below, &down);
    if (status == STATUS_OK) {
        status = loop_curve_trace(loop, w->arena, w->wanted, from, high, above, &up);
    }
    held_loop_free(loop);
    if (status != STATUS_OK) {
        return status;
    }
    const int count = down.count + up.count;
    *curve = (struct loop_curve){.v = arena_new_array(w->arena, double, count),
                                 .push = arena_new_array(w->arena, double, count),
                                 .x = arena_new_array(w->arena, double, (size_t)count *n)};
    if (curve->v == NULL || curve->push == NULL || curve->x == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < count; k++) {
        const struct loop_curve *part = k < down.count ? &down : &up;
        const int at = k < down.count ? down.count - 1 - k : k - down.count;
        if (k == down.count) {
            continue; /* the wanted state stands in both */
        }
        curve->v[curve->count] = part->v[at];
        curve->push[curve->count] = part->push[at];
        memcpy(curve->x + (size_t)curve->count * n, part->x + (size_t)at * n, n * sizeof *curve->x);
        curve->count++;
    }
    return STATUS_OK;
}

/*
 * The least push on the way from `off` to the wanted state, between the off end and the largest
 * push: nearer to the state it falls to nothing by nature. x[n] out: the cell there.
 */
static enum status least_push(struct states_work *w, const double *running, double off, int points,
                              double *push, double *at, double *x)
{
    struct held_loop *loop = held_loop_create(w->arena, w->system, w->loop.probe);
    struct loop_curve way;
    if (loop == NULL) {
        return STATUS_MEMORY;
    }
    const double from = running[w->loop.probe];
    const double upward = from > off ? 1 : -1;
    const enum status status = loop_curve_trace(loop, w->arena, running, from, off, points, &way);
    held_loop_free(loop);
    *push = *at = NAN;
    if (status != STATUS_OK || way.count < points / 2 || way.count == 0) {
        return status;
    }
    int peak = way.count - 1;
    for (int k = 0; k < way.count; k++) {
        peak = upward * way.push[k] > upward * way.push[peak] ? k : peak;
    }
    for (int k = peak; k < way.count; k++) {
        if (!(upward * way.push[k] >= *push)) {
            *push = upward * way.push[k];
            *at = way.v[k];
            memcpy(x, way.x + (size_t)k * (size_t)w->system->n, (size_t)w->system->n * sizeof *x);
        }
    }
    return STATUS_OK;
}

/*
 * +1 where the device is off when its terminal `t` is low, -1 where it is off when that is high, 0
 * where the terminal does not tell.
 */
static int off_vote(const struct instance *instance, int t)
{
    enum { CONTROL = 1, FOLLOWER = 2 }; /* gate or base, source or emitter of every transistor */
    const struct device_type *type = instance->type;
    if (type->is_transistor) {
        return t == CONTROL ? type->polarity : t == FOLLOWER ? -type->polarity : 0;
    }
    return type->typical != NULL && type->terminal_count == 2 ? 1 - 2 * t : 0; /* a diode */
}

/* The held voltage to which a resistor pulls the probe. */
static bool pulled_to(const struct states_work *w, double *volts)
{
    const struct circuit *c = w->system->circuit;
    const int *group = w->map.group;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int t = 0; t < 2 && instance->type->is_resistor; t++) {
            const int node = instance->local[t], other = instance->local[1 - t];
            if (node >= 0 && group[node] == group[w->loop.probe] &&
                (other < 0 || group[other] < 0)) {
                *volts = other < 0 ? 0 : w->wanted[other];
                return true;
            }
        }
    }
    return false;
}

/* The rail end where the devices at the probe are off; where they do not tell, that to which a
 * resistor pulls it, else the farther one. */
static double off_end(const struct states_work *w)
{
    const struct circuit *c = w->system->circuit;
    const int *group = w->map.group;
    double low, high;
    int sum = 0;
    rail_span(w, &low, &high);
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int t = 0; t < instance->type->terminal_count; t++) {
            const int node = instance->local[t];
            if (node >= 0 && group[node] == group[w->loop.probe]) {
                sum += off_vote(instance, t);
            }
        }
    }
    const double v = probe_voltage(w, w->wanted);
    double pulled;
    if (sum != 0) {
        return sum > 0 ? low : high;
    }
    return pulled_to(w, &pulled) ? pulled : v - low > high - v ? low : high;
}

/* --- the start-up branch ---------------------------------------------------------------------- */

/* The value that makes an instance vanish; -1: it has none. */
static int vanishing_value(const struct instance *instance, double own, double *value)
{
    const struct device_type *type = instance->type;
    int k = parameter_find(type->parameters, type->parameter_count, "m");
    *value = vanish;
    if (k < 0 && type->terminal_count == 2 && type->branch_count == 0 && !type->is_current_source &&
        type->extra_kind == EXTRA_NONE) {
        k = type->value_parameter;
        *value = own / vanish;
    }
    return k;
}

static double main_current(const struct states_work *w, int instance, const double *x,
                           long double *wide)
{
    const struct device_type *type = w->system->circuit->instances[instance].type;
    double q[32];
    for (int k = 0; k < w->system->n; k++) {
        wide[k] = x[k];
    }
    if (type->quantity_current < 0) {
        return NAN;
    }
    measure_device(w->system, instance, wide, q);
    return fabs(q[type->quantity_current]);
}

/* Without one device: does the cell still run where it ran, and how strong is the push then? */
static enum status try_without(struct states_work *w, struct states_result *found, int k,
                               const double *start)
{
    struct system *s = w->system;
    const struct instance *instance = &s->circuit->instances[k];
    double value, push = NAN, at;
    const int parameter = vanishing_value(instance, 0, &value);
    long double *wide = arena_new_array(w->arena, long double, s->n);
    double *x = arena_new_array(w->arena, double, s->n);
    if (parameter < 0) {
        return STATUS_OK;
    }
    if (x == NULL || wide == NULL) {
        return STATUS_MEMORY;
    }
    const double own = s->own[k][parameter];
    vanishing_value(instance, own, &value);
    system_set(s, k, parameter, value);
    enum status status = states_settle(w->point, w->wanted);
    const double moved = fabs(probe_voltage(w, w->point->x) - probe_voltage(w, w->wanted));
    bool runs = status == STATUS_OK &&
                moved < running_share * (0.1 + fabs(found->push_off - probe_voltage(w, w->wanted)));
    if (runs) {
        memcpy(w->x, w->point->x, (size_t)s->n * sizeof *x);
        status = least_push(w, w->x, found->push_off, WAY_COARSE, &push, &at, x);
    }
    system_set(s, k, parameter, own);
    if (status == STATUS_UNSOLVED) {
        return STATUS_OK;
    }
    if (status == STATUS_OK && runs && push < push_share * found->push &&
        found->starter_count < STARTER_LIMIT) {
        found->starters[found->starter_count++] = (struct starter_result){
            instance, push, main_current(w, k, start, wide), main_current(w, k, w->wanted, wide)};
    }
    return status;
}

static enum status find_starters(struct states_work *w, struct states_result *found,
                                 const double *start)
{
    const struct circuit *c = w->system->circuit;
    found->starters = arena_new_array(w->arena, struct starter_result, STARTER_LIMIT);
    if (found->starters == NULL) {
        return STATUS_MEMORY;
    }
    enum status status = STATUS_OK;
    for (int k = 0; k < c->instance_count && status == STATUS_OK && found->push > 0; k++) {
        if (!c->instances[k].is_hidden) {
            status = try_without(w, found, k, start);
        }
    }
    return status;
}

/* The push of the loop out of its off end; none where the wanted state is that end. */
static enum status judge_push(struct states_work *w, struct states_result *found)
{
    double *x = arena_new_array(w->arena, double, w->system->n);
    if (x == NULL) {
        return STATUS_MEMORY;
    }
    if (w->loop.probe < 0) {
        return STATUS_OK;
    }
    found->push_off = off_end(w);
    found->rests_off = fabs(probe_voltage(w, w->wanted) - found->push_off) < 1e-3;
    if (found->rests_off) {
        return STATUS_OK;
    }
    enum status status =
        least_push(w, w->wanted, found->push_off, WAY_POINTS, &found->push, &found->push_at, x);
    return status == STATUS_OK && isfinite(found->push) && !w->is_brief ? find_starters(w, found, x)
                                                                        : status;
}

/* --- the lowest supply ------------------------------------------------------------------------ */

/* The output that has left its band at x, or NULL. */
static const struct output *lost_output(const struct states_work *w, const double *x)
{
    const struct circuit *c = w->system->circuit;
    for (int k = 0; k < c->output_count; k++) {
        const int branch = system_branch(&c->instances[c->outputs[k].instance]);
        if (!(fabs(x[branch] - w->wanted[branch]) <=
              c->outputs[k].within * fabs(w->wanted[branch]))) {
            return &c->outputs[k];
        }
    }
    return NULL;
}

/* Newton at another supply from x; true when the state is there and in its band. */
static bool holds_at(struct states_work *w, int instance, int parameter, double volts, double *x,
                     const char **reason)
{
    const size_t size = (size_t)w->system->n * sizeof *x;
    system_set(w->system, instance, parameter, volts);
    memcpy(w->point->x, x, size);
    const enum newton_status status = operating_point_newton(w->point);
    if (status != NEWTON_CONVERGED) {
        w->broken = status == NEWTON_MEMORY    ? STATUS_MEMORY
                    : status == NEWTON_STOPPED ? STATUS_STOPPED
                                               : w->broken;
        *reason = "the state ends";
        return false;
    }
    const struct output *lost = lost_output(w, w->point->x);
    if (lost != NULL) {
        *reason =
            arena_format(w->arena, "%s leaves its %g %% band", lost->name, 100 * lost->within);
        return false;
    }
    memcpy(x, w->point->x, size);
    return true;
}

static enum status lower_rail(struct states_work *w, struct states_result *found, int k)
{
    const struct rail *rail = &w->system->circuit->rails[k];
    const struct instance *instance = &w->system->circuit->instances[rail->instance];
    const int parameter = instance->type->value_parameter;
    double *x = arena_new_array(w->arena, double, w->system->n);
    if (x == NULL) {
        return STATUS_MEMORY;
    }
    const double full = rail->volts;
    const char *reason = NULL;
    double good = full, bad = NAN;
    memcpy(x, w->wanted, (size_t)w->system->n * sizeof *x);
    for (int step = 1; step <= SUPPLY_STEPS && !isfinite(bad); step++) {
        const double volts = full * (1 - (double)step / SUPPLY_STEPS);
        if (holds_at(w, rail->instance, parameter, volts, x, &reason)) {
            good = volts;
        } else {
            bad = volts;
        }
    }
    for (int step = 0; step < BISECTIONS && isfinite(bad); step++) {
        const double volts = (good + bad) / 2;
        *(holds_at(w, rail->instance, parameter, volts, x, &reason) ? &good : &bad) = volts;
    }
    system_set(w->system, rail->instance, parameter, full);
    found->supplies[found->supply_count++] =
        (struct supply_result){rail, good, isfinite(bad) ? reason : NULL};
    return w->broken;
}

static enum status lower_supplies(struct states_work *w, struct states_result *found)
{
    const struct circuit *c = w->system->circuit;
    found->supplies = arena_new_array(w->arena, struct supply_result, c->rail_count);
    enum status status = found->supplies == NULL ? STATUS_MEMORY : STATUS_OK;
    for (int k = 0; k < c->rail_count && c->output_count > 0 && status == STATUS_OK; k++) {
        const double i = -w->wanted[system_branch(&c->instances[c->rails[k].instance])];
        if (i * c->rails[k].volts > 0) { /* it delivers power */
            status = lower_rail(w, found, k);
        }
    }
    return status;
}

/* --- the verdict ------------------------------------------------------------------------------ */

static void give_reason(struct states_result *found, const char *text)
{
    if (text != NULL && found->reason_count < (int)(sizeof found->reasons / sizeof(char *))) {
        found->reasons[found->reason_count++] = text;
    }
}

static void judge(struct states_work *w, struct states_result *found)
{
    int others = 0;
    for (int k = 0; k < found->state_count; k++) {
        others += k != found->wanted && found->states[k].can_hold;
    }
    if (others > 0) {
        give_reason(found, arena_format(w->arena, "%d other state%s can hold it", others,
                                        others == 1 ? "" : "s"));
    }
    if (!found->is_complete) {
        give_reason(found, "it is not proved that there are no further states");
    }
    if (found->wanted < found->state_count && !found->states[found->wanted].can_hold) {
        give_reason(found, "the wanted state itself cannot be held");
    }
    if (!found->ramp_begins) {
        give_reason(found, "a rise of the rails cannot be followed from 0, where nothing conducts");
    } else if (isfinite(found->ramp_break)) {
        give_reason(found,
                    arena_format(w->arena, "the line of states breaks off at %.3g %% of the supply",
                                 100 * found->ramp_break));
    } else if (found->ramp_state != found->wanted) {
        give_reason(found, "a slow rise of the rails does not end in the wanted state");
    }
    if (found->has_loop && isfinite(found->push) && !(found->push >= found->push_bound)) {
        char push[24], bound[24];
        number_show(found->push, 3, "A", push, sizeof push);
        number_show(found->push_bound, 3, "A", bound, sizeof bound);
        give_reason(found, arena_format(w->arena,
                                        "the loop is pushed upward by %s only, below %s: leakage "
                                        "or time may keep it off",
                                        push, bound));
    }
    found->startup = found->reason_count > 0 ? STARTUP_AT_RISK : STARTUP_CERTAIN;
}

enum status startup_judge(struct states_work *w, struct states_result *found)
{
    enum status status = ramp_rails(w, found);
    if (status == STATUS_OK && found->has_loop) {
        status = judge_push(w, found);
    }
    if (status == STATUS_OK && !w->is_brief) {
        status = lower_supplies(w, found);
    }
    if (status == STATUS_OK) {
        judge(w, found);
    }
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}
