/*
 * supply.c: how far down a rail may go before a quantity leaves its band.
 */
#include <math.h>
#include <string.h>

#include "analyses/conditions.h"
#include "solve/measure.h"
#include "analyses/setup.h"
#include "base/root.h"

enum { SUPPLY_STEPS = 50 };

/* The band of what is no output. */
static const double standard_within = 0.01;
static const double volts_tolerance = 1e-5;

struct descent {
    struct setup *setup;
    int instance, parameter;
    double v;     /* rail voltage at `last` */
    double *last; /* [n] state there */
    const struct probe *probe;
    double own, within;
    enum status status;
};

/* Positive while the probe is inside its band. */
static double distance(const struct descent *d)
{
    const double value = measure_probe(d->setup->system, d->probe, d->setup->point.x);
    return d->within * fabs(d->own) - fabs(value - d->own);
}

/* The state at rail voltage v, followed from `last`. */
static bool follow(struct descent *d, double v, bool *jumped)
{
    struct operating_point *p = &d->setup->point;
    memcpy(p->x, d->last, (size_t)d->setup->system->n * sizeof *p->x);
    const enum status status = operating_point_move(p, d->instance, d->parameter, d->v, v, jumped);
    if (status != STATUS_OK && status != STATUS_UNSOLVED) {
        d->status = status;
    }
    return status == STATUS_OK;
}

static double distance_at(void *self, double v)
{
    struct descent *d = self;
    bool jumped = false;
    return follow(d, v, &jumped) ? distance(d) : NAN;
}

/* Currents of outputs and node voltages, but not of the rail itself. */
static bool applies(const struct conditions_result *r, int probe, const struct rail *rail)
{
    const struct probe *q = &r->probes[probe];
    const double own = r->ranges[probe].own;
    const bool kind = (q->kind == PROBE_NODE && q->index != rail->unknown) ||
                      (q->kind == PROBE_OUTPUT && q->quantity == OUTPUT_CURRENT);
    return kind && isfinite(own) && own != 0;
}

/* Walks one rail down for one probe. */
static void descend(struct descent *d, double from, struct supply_limit *limit)
{
    struct operating_point *p = &d->setup->point;
    const size_t n = (size_t)d->setup->system->n;
    d->v = from;
    limit->least = NAN;
    limit->remark = "holds all the way down";
    for (int k = 1; k <= SUPPLY_STEPS && d->status == STATUS_OK; k++) {
        const double v = from - from * k / SUPPLY_STEPS;
        bool jumped = false;
        if (!follow(d, v, &jumped)) {
            limit->least = d->v;
            limit->remark = "no operating point was found below";
            return;
        }
        const double after = distance(d);
        if (after > 0) {
            memcpy(d->last, p->x, n * sizeof *p->x);
            d->v = v;
            continue;
        }
        limit->remark = NULL;
        const double start = d->v;
        memcpy(p->x, d->last, n * sizeof *p->x);
        system_set(d->setup->system, d->instance, d->parameter, start);
        const double before = distance(d);
        const double root =
            root_bracketed(distance_at, d, start, before, v, after, volts_tolerance);
        limit->least = isnan(root) ? start : root;
        if (jumped) {
            limit->remark = "the state folds or jumps there";
        }
        return;
    }
}

static bool is_varied(const struct conditions_result *r, const struct rail *rail)
{
    for (int k = 0; k < r->axis_count; k++) {
        const struct knob *knob = r->axes[k].knob;
        if (knob->kind == KNOB_VALUE && knob->instance == rail->instance) {
            return true;
        }
    }
    return false;
}

static bool any_rail_varied(const struct conditions_result *r, const struct circuit *c)
{
    for (int k = 0; k < c->rail_count; k++) {
        if (is_varied(r, &c->rails[k])) {
            return true;
        }
    }
    return false;
}

static enum status one_rail(struct setup *setup, int rail, struct result *result)
{
    struct conditions_result *r = result->conditions;
    const struct circuit *c = setup->circuit;
    const struct rail *row = &c->rails[rail];
    const int parameter = c->instances[row->instance].type->value_parameter;
    const size_t n = (size_t)setup->system->n;
    const double from = setup->system->own[row->instance][parameter];
    double *home = arena_new_array(setup->arena, double, n);
    double *last = arena_new_array(setup->arena, double, n);
    if (home == NULL || last == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(home, setup->point.x, n * sizeof *home);
    struct descent d = {
        .setup = setup, .instance = row->instance, .parameter = parameter, .last = last};
    for (int q = 0; q < r->probe_count && d.status == STATUS_OK; q++) {
        if (!applies(r, q, row)) {
            continue;
        }
        struct supply_limit *limit = &r->supplies[r->supply_count];
        const struct probe *probe = &r->probes[q];
        *limit = (struct supply_limit){.rail = rail, .probe = q};
        limit->within =
            probe->kind == PROBE_OUTPUT ? c->outputs[probe->index].within : standard_within;
        d.probe = probe;
        d.own = r->ranges[q].own;
        d.within = limit->within;
        memcpy(last, home, n * sizeof *last);
        system_set(setup->system, d.instance, d.parameter, from);
        descend(&d, from, limit);
        r->supply_count += d.status == STATUS_OK;
    }
    system_set(setup->system, d.instance, d.parameter, from);
    memcpy(setup->point.x, home, n * sizeof *home);
    return d.status;
}

enum status conditions_supply(struct circuit *circuit, const struct analysis_options *options,
                              struct result *result)
{
    struct conditions_result *r = result->conditions;
    const size_t most = (size_t)circuit->rail_count * (size_t)r->probe_count;
    r->supplies = arena_new_array(result->arena, struct supply_limit, most);
    if (r->supplies == NULL) {
        return STATUS_MEMORY;
    }
    struct setup setup;
    enum status status = setup_open(&setup, circuit, NULL, 0, NULL, READING_ALL, options);
    if (status == STATUS_OK) {
        status = setup_solve(&setup, result->point.x, circuit->unknown_count, NULL);
    }
    const bool only_varied = any_rail_varied(r, circuit);
    for (int k = 0; status == STATUS_OK && k < circuit->rail_count; k++) {
        if (!only_varied || is_varied(r, &circuit->rails[k])) {
            status = one_rail(&setup, k, result);
        }
    }
    setup_close(&setup);
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}
