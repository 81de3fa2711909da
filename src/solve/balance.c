/*
 * balance.c: a second start for a cold search: nodes moved one after the other to where their own
 * currents balance while all else stands still (nonlinear Gauss-Seidel; Ortega and Rheinboldt 1970,
 * section 7.4), so that the current of one mirror sets the voltage of the next.
 */
#include <math.h>
#include <string.h>

#include "solve/operating_point.h"

enum { HALVINGS = 18, PASS_LIMIT = 8, CONTROL = 1, SOURCE = 2 };

/* Passes end when no node moves further, V. */
static const double at_rest = 5e-3;

struct guess {
    const struct system *system;
    double *x;
    double lowest, highest; /* rails */
};

/*
 * Nodes joined by leads (the series resistances of models) move as one. For each such group the
 * instances that touch it, so that its balance is evaluated without the rest of the cell.
 */
struct groups {
    int *of;    /* [node_count] the group's first node */
    int *start; /* [node_count + 1] into touching, by first node */
    int *touching;
    int *flags; /* [node_count] by first node: what touches it */
};

static int first_of(const int *of, int node)
{
    while (of[node] != node) {
        node = of[node];
    }
    return node;
}

static void join(int *of, int a, int b)
{
    a = first_of(of, a);
    b = first_of(of, b);
    of[a > b ? a : b] = a > b ? b : a;
}

static bool is_lead(const struct instance *instance)
{
    return instance->parent >= 0;
}

/* Counts (touching NULL) or lists the instances at each group, each once. */
static void list_touching(const struct guess *g, struct groups *it, int *fill)
{
    const struct circuit *c = g->system->circuit;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        for (int l = 0; l < instance->local_count && !is_lead(instance); l++) {
            const int node = instance->local[l];
            bool is_new = node >= 0 && node < g->system->node_count;
            for (int e = 0; e < l && is_new; e++) {
                const int earlier = instance->local[e];
                is_new = earlier < 0 || earlier >= g->system->node_count ||
                         it->of[earlier] != it->of[node];
            }
            if (is_new && it->touching != NULL) {
                it->touching[fill[it->of[node]]] = k;
            }
            fill[is_new ? it->of[node] : g->system->node_count] += is_new;
        }
    }
}

/* What touches a group. */
enum { HAS_DIODE = 1, HAS_SOURCE = 2, HAS_DRAIN_OR_GATE = 4, HAS_PART = 8, IS_HELD = 16 };

static void mark(const struct guess *g, const struct groups *it, const struct instance *instance)
{
    const int *local = instance->local;
    for (int l = 0; l < instance->local_count; l++) {
        if (local[l] < 0 || local[l] >= g->system->node_count) {
            continue;
        }
        int *flags = &it->flags[it->of[local[l]]];
        if (instance->type->is_transistor && l <= SOURCE) {
            *flags |= l == SOURCE ? HAS_SOURCE : HAS_DRAIN_OR_GATE;
            *flags |= l == CONTROL && local[0] >= 0 && it->of[local[0]] == it->of[local[l]]
                          ? HAS_DIODE
                          : 0;
        } else if (instance->type->fixes_voltage) {
            *flags |= IS_HELD;
        } else if (instance->type->terminal_count == 2) {
            *flags |= HAS_PART;
        }
    }
}

/* A group moves when a device there is its own load (a diode), or when it is the source of a
 * degenerated transistor. */
static bool moves(const struct groups *it, int group)
{
    const int flags = it->flags[group];
    const bool degenerated =
        (flags & (HAS_SOURCE | HAS_PART | HAS_DRAIN_OR_GATE)) == (HAS_SOURCE | HAS_PART);
    return it->of[group] == group && (flags & IS_HELD) == 0 &&
           ((flags & HAS_DIODE) != 0 || degenerated);
}

/* What leaves the group through the devices there. */
static double balance(const struct guess *g, const struct groups *it, int group)
{
    const struct system *s = g->system;
    double sum = 0;
    for (int k = it->start[group]; k < it->start[group + 1]; k++) {
        const struct instance *instance = &s->circuit->instances[it->touching[k]];
        double local[DEVICE_LOCAL_LIMIT], part[DEVICE_LOCAL_LIMIT];
        double jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT];
        system_gather(instance, g->x, local);
        instance->type->evaluate(system_block(s, it->touching[k]), local, part, jac);
        for (int l = 0; l < instance->local_count; l++) {
            const int node = instance->local[l];
            sum += node >= 0 && node < s->node_count && it->of[node] == group ? part[l] : 0;
        }
    }
    return sum;
}

static void put_group(const struct guess *g, const struct groups *it, int group, double volts)
{
    for (int k = group; k < g->system->node_count; k++) {
        if (it->of[k] == group) {
            g->x[k] = volts;
        }
    }
}

/* Moves the group to where its currents balance while all else stands still (what leaves it grows
 * with its voltage); the distance. */
static double relax(const struct guess *g, const struct groups *it, int group)
{
    const double before = g->x[group];
    double low = g->lowest, high = g->highest;
    for (int k = 0; k < HALVINGS; k++) {
        const double middle = (low + high) / 2;
        put_group(g, it, group, middle);
        *(balance(g, it, group) > 0 ? &high : &low) = middle;
    }
    return fabs(g->x[group] - before);
}

static bool create_groups(const struct guess *g, struct arena *arena, struct groups *it)
{
    const int n = g->system->node_count;
    const struct circuit *c = g->system->circuit;
    it->of = arena_new_array(arena, int, n);
    it->start = arena_new_array(arena, int, n + 1);
    it->flags = arena_new_array(arena, int, n);
    int *fill = arena_new_array(arena, int, n + 1);
    if (it->of == NULL || it->start == NULL || it->flags == NULL || fill == NULL) {
        return false;
    }
    for (int k = 0; k < n; k++) {
        it->of[k] = k;
    }
    for (int k = 0; k < c->instance_count; k++) {
        const int *local = c->instances[k].local;
        if (is_lead(&c->instances[k]) && local[0] >= 0 && local[1] >= 0) {
            join(it->of, local[0], local[1]);
        }
    }
    for (int k = 0; k < n; k++) {
        it->of[k] = first_of(it->of, k);
    }
    it->touching = NULL;
    list_touching(g, it, fill);
    for (int k = 0; k < n; k++) {
        it->start[k + 1] = it->start[k] + fill[k];
        fill[k] = it->start[k];
    }
    it->touching = arena_new_array(arena, int, it->start[n]);
    if (it->touching == NULL) {
        return false;
    }
    list_touching(g, it, fill);
    for (int k = 0; k < c->instance_count; k++) {
        if (!is_lead(&c->instances[k])) {
            mark(g, it, &c->instances[k]);
        }
    }
    return true;
}

/* False when memory is short. */
static bool relax_all(const struct guess *g)
{
    struct groups it;
    struct arena *arena = arena_create();
    const bool good = arena != NULL && create_groups(g, arena, &it);
    if (good) {
        double moved = INFINITY;
        for (int pass = 0; pass < PASS_LIMIT && moved > at_rest; pass++) {
            moved = 0;
            for (int k = 0; k < g->system->node_count; k++) {
                const int node = pass % 2 == 0 ? k : g->system->node_count - 1 - k;
                moved = moves(&it, node) ? fmax(moved, relax(g, &it, node)) : moved;
            }
        }
    }
    arena_destroy(arena);
    return good;
}

bool operating_point_balance(const struct system *system, double *x)
{
    const struct circuit *c = system->circuit;
    struct guess g = {.system = system, .x = x};
    for (int k = 0; k < c->instance_count; k++) {
        const struct device_type *type = c->instances[k].type;
        if (type->fixes_voltage && type->form == FORM_ARROW) {
            g.lowest = fmin(g.lowest, system->own[k][type->value_parameter]);
            g.highest = fmax(g.highest, system->own[k][type->value_parameter]);
        }
    }
    return relax_all(&g);
}
