/*
 * trouble.c: words for a search that found nothing, and for what limits one that did.
 */
#include <math.h>
#include <string.h>

#include "solve/search.h"

const char *trouble_name(const struct operating_point *p, int unknown)
{
    char text[200];
    circuit_unknown_name(p->system->circuit, unknown, text, sizeof text);
    const char *name = arena_copy(p->system->arena, text, strlen(text));
    return name == NULL ? "" : name;
}

/* Devices at a node, at most three, for the message. Without memory "": the arena
 * remembers. */
static const char *devices_at(const struct operating_point *p, int unknown)
{
    const struct circuit *c = p->system->circuit;
    struct arena *arena = p->system->arena;
    const char *text = "no device";
    int count = 0;
    for (int k = 0; k < c->instance_count && count < 3 && text != NULL; k++) {
        const struct instance *instance = &c->instances[k];
        bool touches = false;
        for (int l = 0; l < instance->local_count; l++) {
            touches |= instance->local[l] == unknown;
        }
        if (touches && !instance->is_hidden) {
            text =
                count == 0 ? instance->name : arena_format(arena, "%s, %s", text, instance->name);
            count++;
        }
    }
    return text == NULL ? "" : text;
}

/* Current of an instance into a node at the best point found, A. */
static double current_into(const struct operating_point *p, int k, int node)
{
    const struct instance *instance = &p->system->circuit->instances[k];
    double local[DEVICE_LOCAL_LIMIT], part[DEVICE_LOCAL_LIMIT];
    double jac[DEVICE_LOCAL_LIMIT * DEVICE_LOCAL_LIMIT], sum = 0;
    system_gather(instance, p->best, local);
    instance->type->evaluate(system_block(p->system, k), local, part, jac);
    for (int l = 0; l < instance->local_count; l++) {
        sum -= instance->local[l] == node ? part[l] : 0;
    }
    return sum;
}

/* ": I1 brings 1e-05 A, M1 takes 2.5e-06 A", at most four; "" for what is no node. */
static const char *currents_at(const struct operating_point *p, int node)
{
    enum { SHOWN = 4 };
    const struct circuit *c = p->system->circuit;
    struct arena *arena = p->system->arena;
    const char *text = "";
    int count = 0;
    const bool is_node = node >= 0 && node < p->system->node_count && isfinite(p->best_residual);
    for (int k = 0; is_node && k < c->instance_count && count < SHOWN && text != NULL; k++) {
        const double current = current_into(p, k, node);
        if (!c->instances[k].is_hidden && fabs(current) > 0) {
            text =
                arena_format(arena, "%s%s %s %s %.3g A", text, count == 0 ? ":" : ",",
                             c->instances[k].name, current > 0 ? "brings" : "takes", fabs(current));
            count++;
        }
    }
    return text == NULL ? "" : text;
}

void trouble_tell(struct operating_point *p)
{
    struct arena *arena = p->system->arena;
    struct solver_result *solver = &p->solver;
    const int where = p->stalled_equation >= 0 ? p->stalled_equation : p->stalled_column;
    solver->converged = false;
    solver->method = "none";
    solver->iterations = p->report.iterations;
    solver->worst_residual = p->best_residual;
    solver->worst_name = where < 0 ? "" : trouble_name(p, where);
    const char *devices = where < 0 ? "" : devices_at(p, where);
    /* Balanced and singular: any voltage would do. */
    const bool open = p->best_residual < 1e-9 || !(p->best_residual < 1e-3);
    if (p->stalled_column >= 0 && open) {
        solver->trouble =
            arena_format(arena,
                         "nothing sets the %s: every device there (%s) is off or holds its current "
                         "whatever the voltage",
                         trouble_name(p, p->stalled_column), devices_at(p, p->stalled_column));
        solver->advice = "look for a gate or a node held by nothing, for two current sources that "
                         "face each other, or for a transistor that is off in this view";
        return;
    }
    solver->trouble = arena_format(
        arena,
        "no operating point was found: the search stalled at %s (%s); the currents there "
        "miss balance by %.3g of their sum%s",
        solver->worst_name, devices, p->best_residual, currents_at(p, where));
    solver->advice =
        "check that currents set against each other can agree, that every device has a "
        "path for its current, and the values of the devices named";
}

/* A residual above 1e-12 after the polish: rounding, and how badly the equations carry it on. False
 * when memory is short. */
bool trouble_tell_limit(struct operating_point *p)
{
    struct system *s = p->system;
    double *values = arena_new_array(s->arena, double, s->nonzeros);
    if (values == NULL) {
        return false;
    }
    for (int k = 0; k < s->nonzeros; k++) {
        values[k] = (double)p->values[k];
    }
    const double condition = linear_condition(s->solver, values);
    p->solver.limited_by = arena_format(
        s->arena, "rounding at %s: the equations have a condition number of about %.1e",
        p->solver.worst_name, condition);
    return p->solver.limited_by != NULL;
}
