/*
 * guess.c: where a cold search starts: rails at their value, and every node placed by the typical
 * voltage of a device that ties it to a node already placed. A self-biased cell is thereby started
 * in its running state, not in the one where no current flows.
 *
 * Two kinds of nodes are then moved to where their own currents balance, if that brings the whole
 * cell nearer to balance: the source of a follower or a degenerated device (else a self-biased loop
 * starts on the wrong side), and the gate of a switch that drains alone drive (a start-up device,
 * which is off in the running state).
 *
 * Nodes are placed breadth-first, in three passes of falling trust: devices that fix a voltage,
 * then diode-like devices (control terminal joined to an output terminal), then all other junctions
 * and gates, then resistors (equal potential). Linear in the number of devices for each wave.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/operating_point.h"

enum { WAVE_LIMIT = 64, ONE_BY_ONE_LIMIT = 1000, HALVINGS = 14, SUSPECT_LIMIT = 16 };

/* Terminals of every transistor: drain or collector, gate or base, source or emitter. */
enum { CONTROL = 1, SOURCE = 2 };

struct guess {
    const struct system *system;
    double *x;
    bool *known;            /* [node_count] */
    bool *fixed;            /* [node_count] held by a source */
    bool *suspect;          /* [node_count] a junction placed it, and it may lie far off */
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

/* Whether nothing but transistors' drains and gates touch a node. */
static bool is_driven_by_drains(const struct guess *g, int node)
{
    const struct circuit *c = g->system->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int l = 0; l < instance->local_count; l++) {
            if (instance->local[l] == node &&
                (!instance->type->is_transistor || l > CONTROL ||
                 instance->local[1 - CONTROL] == instance->local[CONTROL])) {
                return false;
            }
        }
    }
    return true;
}

/* `node` was just placed by the control path of a transistor. */
static void note_suspect(struct guess *g, const struct instance *instance, int node)
{
    const struct device_type *type = instance->type;
    if (!type->is_transistor || type->paths == NULL || type->paths[CONTROL] != 0) {
        return; /* a base or a gate junction ties well enough */
    }
    const int source = instance->local[SOURCE];
    const bool is_switch = node == instance->local[CONTROL] && (source < 0 || g->fixed[source]);
    g->suspect[node] =
        node == source || (is_switch && g->system->circuit->instance_count < ONE_BY_ONE_LIMIT &&
                           is_driven_by_drains(g, node));
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
        const int ends[2] = {instance->local[high], instance->local[low]};
        const bool high_known = is_known(g, ends[0]);
        const bool moved = (pass == PASS_DIODES ? diode : pass == PASS_JUNCTIONS) &&
                           tie(g, ends[0], ends[1], volts);
        if (moved && !diode) {
            note_suspect(g, instance, high_known ? ends[1] : ends[0]);
        }
        return moved;
    }
    return pass == PASS_RESISTORS && type->terminal_count == 2 && !type->is_current_source &&
           tie(g, instance->local[0], instance->local[1], 0);
}

/*
 * Resistors are the weakest evidence: one at a time, and the smallest first, so that a wire places
 * its node before a bias resistor does.
 */
static bool place_by_smallest(struct guess *g)
{
    const struct circuit *c = g->system->circuit;
    double least = INFINITY;
    int best = -1;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int p = instance->type->value_parameter;
        if (instance->type->is_resistor && p >= 0 && g->system->own[k][p] < least &&
            is_known(g, instance->local[0]) != is_known(g, instance->local[1])) {
            least = g->system->own[k][p];
            best = k;
        }
    }
    return best >= 0 && apply(g, PASS_RESISTORS, best);
}

/* Repeats a pass until it places nothing more; true when it placed anything. In a cell of ordinary
 * size the first resistor that places a node hands back to the better passes. */
static bool run_pass(struct guess *g, enum pass pass)
{
    const int count = g->system->circuit->instance_count;
    if (pass == PASS_RESISTORS && count < ONE_BY_ONE_LIMIT && place_by_smallest(g)) {
        return true;
    }
    bool any = false, moved = true;
    for (int wave = 0; moved && wave < WAVE_LIMIT; wave++) {
        moved = false;
        for (int k = 0; k < count; k++) {
            moved |= apply(g, pass, k);
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

/* --- nodes that may lie far off ------------------------------------------------------------- */

/* Imbalance of all nodes, each as a share of the currents there; and the signed one of one node. */
static double imbalance(const struct guess *g, double *work, int node, double *of_node)
{
    const struct system *s = g->system;
    double *f = work, *scale = f + s->n, *values = scale + s->n;
    if (!s->face.evaluate(s->face.self, g->x, f, scale, values)) {
        return INFINITY;
    }
    double sum = 0;
    for (int k = 0; k < s->node_count; k++) {
        sum += scale[k] > 0 ? fabs(f[k]) / scale[k] : 0;
    }
    *of_node = f[node];
    return sum;
}

/* Moves the node to where its currents balance while all others stand still; back when that is
 * worse. */
static void relax(const struct guess *g, double *work, int node)
{
    const double before = g->x[node];
    double low = g->lowest, high = g->highest, out = 0;
    const double standing = imbalance(g, work, node, &out);
    for (int k = 0; k < HALVINGS; k++) {
        g->x[node] = (low + high) / 2;
        imbalance(g, work, node, &out);
        if (out > 0) { /* more leaves the node than comes: it is too high */
            high = g->x[node];
        } else {
            low = g->x[node];
        }
    }
    if (!(imbalance(g, work, node, &out) < standing)) {
        g->x[node] = before;
    }
}

/* False when memory is short. */
static bool relax_suspects(const struct guess *g)
{
    const struct system *s = g->system;
    double *work = calloc(2 * (size_t)s->n + (size_t)s->nonzeros + 1, sizeof *work);
    int count = 0;
    if (work == NULL) {
        return false;
    }
    for (int k = 0; k < s->node_count && count < SUSPECT_LIMIT; k++) {
        if (g->suspect[k]) {
            relax(g, work, k);
            count++;
        }
    }
    free(work);
    return true;
}

bool operating_point_guess(const struct system *system, double *x)
{
    struct guess g = {.system = system, .x = x};
    memset(x, 0, (size_t)system->n * sizeof *x);
    g.known = calloc(3 * (size_t)system->node_count + 1, sizeof *g.known);
    if (g.known == NULL) {
        return false;
    }
    g.fixed = g.known + system->node_count;
    g.suspect = g.fixed + system->node_count;
    find_span(&g);
    run_pass(&g, PASS_SOURCES);
    memcpy(g.fixed, g.known, (size_t)system->node_count * sizeof *g.fixed);
    for (enum pass pass = PASS_DIODES; pass < PASS_COUNT;) {
        /* Whatever a later pass placed may let an earlier, better one go on. */
        pass = run_pass(&g, pass) && pass != PASS_DIODES ? PASS_DIODES : pass + 1;
    }
    for (int k = 0; k < system->node_count; k++) {
        if (!g.known[k]) {
            x[k] = (g.lowest + g.highest) / 2;
        }
    }
    const bool is_small = system->circuit->instance_count < ONE_BY_ONE_LIMIT;
    const bool good = !is_small || relax_suspects(&g);
    free(g.known);
    return good;
}
