/*
 * guess.c: where a cold search starts: rails at their value, and every node placed by the typical
 * voltage of a device that ties it to a node already placed. A self-biased cell is thereby started
 * in its running state, not in the one where no current flows.
 *
 * Nodes are placed breadth-first, in three passes of falling trust: devices that fix a voltage,
 * then diode-like devices (control terminal joined to an output terminal), then all other junctions
 * and gates, then resistors (equal potential). Linear in the number of devices for each wave.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/operating_point.h"

enum { WAVE_LIMIT = 64, ONE_BY_ONE_LIMIT = 1000 };

struct guess {
    const struct system *system;
    double *x;
    bool *known;            /* [node_count] */
    double lowest, highest; /* rails */
};

static bool is_known(const struct guess *g, int unknown)
{
    return unknown < 0 || g->known[unknown];
}

static double at(const struct guess *g, int unknown)
{
    return unknown < 0 ? 0 : g->x[unknown];
}

static bool place(struct guess *g, int unknown, double volts)
{
    if (is_known(g, unknown)) {
        return false;
    }
    g->x[unknown] = fmin(fmax(volts, g->lowest), g->highest);
    g->known[unknown] = true;
    return true;
}

/* Places one end of a pair by the other; high is `volts` above low. */
static bool tie(struct guess *g, int high, int low, double volts)
{
    if (is_known(g, low)) {
        return place(g, high, at(g, low) + volts);
    }
    return is_known(g, high) && place(g, low, at(g, high) - volts);
}

/* Whether the control terminal `high` or `low` of the pair is joined to a third terminal: a diode.
 */
static bool is_diode_like(const struct instance *instance, int high, int low)
{
    if (instance->type->terminal_count == 2) {
        return true;
    }
    for (int t = 0; t < instance->type->terminal_count; t++) {
        if (t != high && t != low &&
            (instance->outer[t] == instance->outer[high] ||
             instance->outer[t] == instance->outer[low]) &&
            strcmp(instance->type->terminals[t].name, "b") != 0) {
            return true;
        }
    }
    return false;
}

enum pass { PASS_SOURCES, PASS_DIODES, PASS_JUNCTIONS, PASS_RESISTORS, PASS_COUNT };

static bool apply(struct guess *g, enum pass pass, int k)
{
    const struct instance *instance = &g->system->circuit->instances[k];
    const struct device_type *type = instance->type;
    const void *block = system_block(g->system, k);
    if (type->fixes_voltage && type->form == FORM_ARROW) {
        return pass == PASS_SOURCES && tie(g, instance->local[0], instance->local[1],
                                           g->system->own[k][type->value_parameter]);
    }
    if (instance->parent >= 0) { /* a lead: both ends at one potential, whatever the pass */
        return tie(g, instance->local[0], instance->local[1], 0);
    }
    int high, low;
    double volts;
    if (type->typical != NULL && type->typical(block, &high, &low, &volts)) {
        const bool diode = is_diode_like(instance, high, low);
        return (pass == PASS_DIODES ? diode : pass == PASS_JUNCTIONS) &&
               tie(g, instance->local[high], instance->local[low], volts);
    }
    return pass == PASS_RESISTORS && type->terminal_count == 2 && !type->is_current_source &&
           tie(g, instance->local[0], instance->local[1], 0);
}

/*
 * Repeats a pass until it places nothing more; true when it placed anything. Resistors are the
 * weakest evidence: in a cell of ordinary size the first one that places a node hands back to the
 * better passes.
 */
static bool run_pass(struct guess *g, enum pass pass)
{
    const int count = g->system->circuit->instance_count;
    const bool one_by_one = pass == PASS_RESISTORS && count < ONE_BY_ONE_LIMIT;
    bool any = false, moved = true;
    for (int wave = 0; moved && wave < WAVE_LIMIT; wave++) {
        moved = false;
        for (int k = 0; k < count; k++) {
            moved |= apply(g, pass, k);
            if (moved && one_by_one) {
                return true;
            }
        }
        any |= moved;
    }
    return any;
}

static void find_span(struct guess *g)
{
    const struct circuit *c = g->system->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        const struct device_type *type = c->instances[k].type;
        if (type->fixes_voltage && type->form == FORM_ARROW) {
            const double volts = g->system->own[k][type->value_parameter];
            g->lowest = fmin(g->lowest, volts);
            g->highest = fmax(g->highest, volts);
        }
    }
}

bool operating_point_guess(const struct system *system, double *x)
{
    struct guess g = {.system = system, .x = x};
    memset(x, 0, (size_t)system->n * sizeof *x);
    g.known = calloc((size_t)system->node_count + 1, sizeof *g.known);
    if (g.known == NULL) {
        return false;
    }
    find_span(&g);
    run_pass(&g, PASS_SOURCES);
    for (enum pass pass = PASS_DIODES; pass < PASS_COUNT;) {
        /* Whatever a later pass placed may let an earlier, better one go on. */
        pass = run_pass(&g, pass) && pass != PASS_DIODES ? PASS_DIODES : pass + 1;
    }
    for (int k = 0; k < system->node_count; k++) {
        if (!g.known[k]) {
            x[k] = (g.lowest + g.highest) / 2;
        }
    }
    free(g.known);
    return true;
}
