/*
 * settling.c: a cell let go from a start as if its nodes had capacitance.
 */
#include <math.h>
#include <string.h>

#include "solve/search.h"
#include "numerics/settle.h"

/*
 * Inertia of each node: what its currents would do in a step of 0.1 V. A node where little flows
 * at the start takes over what flows at the nodes beside it, two devices far; rails have none.
 */
static bool find_inertia(const struct operating_point *p, double *inertia)
{
    enum { SPREADS = 2 };
    struct system *s = p->system;
    const struct circuit *c = s->circuit;
    double *work = arena_new_array(s->arena, double, 2 * (size_t)s->n + (size_t)s->nonzeros);
    if (work == NULL || !s->face.evaluate(s, p->x, work, inertia, work + 2 * s->n)) {
        return work != NULL;
    }
    for (int k = 0; k < s->n; k++) {
        inertia[k] = k < s->node_count ? 10 * inertia[k] : 0;
    }
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        if (instance->type->fixes_voltage && instance->type->form == FORM_ARROW) {
            for (int l = 0; l < 2; l++) {
                if (instance->local[l] >= 0) {
                    inertia[instance->local[l]] = 0;
                }
            }
        }
    }
    for (int spread = 0; spread < SPREADS; spread++) {
        memcpy(work, inertia, (size_t)s->n * sizeof *work);
        for (int k = 0; k < c->instance_count; k++) {
            const struct instance *instance = &c->instances[k];
            double most = 0;
            for (int l = 0; l < instance->local_count; l++) {
                most = instance->local[l] >= 0 ? fmax(most, work[instance->local[l]]) : most;
            }
            for (int l = 0; l < instance->local_count; l++) {
                const int node = instance->local[l];
                if (node >= 0 && work[node] > 0) {
                    inertia[node] = fmax(inertia[node], most);
                }
            }
        }
    }
    return true;
}

/* Where Newton runs off, the cell is let go from the guess like one whose nodes have capacitance:
 * it comes to rest in a state that can be held. */
enum newton_status search_settle(struct operating_point *p, bool patient)
{
    struct system *s = p->system;
    struct newton_options options = search_newton_options(p);
    double *inertia = arena_new_array(s->arena, double, s->n);
    if (inertia == NULL || !find_inertia(p, inertia)) {
        return NEWTON_MEMORY;
    }
    options.step_limit = 0.5;
    return settle(&s->face, s->solver, &options, inertia, patient, p->x, s->work, &p->report);
}
