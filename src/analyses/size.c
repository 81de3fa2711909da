/*
 * size.c: what `choose` lines must be like, and the values that they ask for.
 */
#include <math.h>
#include <string.h>

#include "analyses/sizer.h"

/* --- what the lines must be like -------------------------------------------------------------- */

static bool is_same_knob(const struct knob *a, const struct knob *b)
{
    return a->kind == b->kind && a->instance == b->instance && a->parameter == b->parameter;
}

static bool is_same_probe(const struct probe *a, const struct probe *b)
{
    return a->kind == b->kind && a->index == b->index && a->quantity == b->quantity;
}

static bool check_lines(const struct circuit *c, struct diagnostics *diagnostics)
{
    bool good = true;
    if (c->choice_count == 0) {
        diagnostics_add(diagnostics, SPAN_NONE,
                        "such as choose RE from 5k to 500k so x.current = I",
                        "the cell has no `choose` line");
        return false;
    }
    for (int k = 0; k < c->choice_count; k++) {
        for (int b = 0; b < k; b++) {
            if (is_same_knob(&c->choices[k].knob, &c->choices[b].knob)) {
                diagnostics_add(diagnostics, c->choices[k].where, "one unknown can meet one target",
                                "over-determined: %s is chosen by two lines",
                                c->choices[k].knob.name);
                good = false;
            }
            if (is_same_probe(&c->choices[k].probe, &c->choices[b].probe)) {
                diagnostics_add(diagnostics, c->choices[k].where, "give one of them another target",
                                "under-determined: %s and %s are both chosen so that %s meets its "
                                "target",
                                c->choices[b].knob.name, c->choices[k].knob.name,
                                c->choices[k].probe.text);
                good = false;
            }
        }
    }
    return good;
}

/* Which unknown or target stood alone in every Jacobian. */
static bool check_influence(const struct sizer *z, struct diagnostics *diagnostics)
{
    bool good = true;
    for (int k = 0; k < z->n; k++) {
        if (!(z->column[k] > 1e-9)) {
            diagnostics_add(diagnostics, z->choices[k].where, "choose something that acts on them",
                            "under-determined: %s changes none of the targets",
                            z->choices[k].knob.name);
            good = false;
        }
        if (!(z->row[k] > 1e-9)) {
            diagnostics_add(diagnostics, z->choices[k].where, "choose something that acts on it",
                            "over-determined: nothing that is chosen changes %s",
                            z->choices[k].probe.text);
            good = false;
        }
    }
    return good;
}

/*
 * A target that follows from others moves with them whatever is chosen: its row of the Jacobian is
 * a combination of theirs (modified Gram-Schmidt; what is left of a row of length 1 below 1e-6 is
 * rounding). work: [n*n].
 */
static bool check_rank(const struct sizer *z, const struct place *place, double *work,
                       struct diagnostics *diagnostics)
{
    const int n = z->n;
    memcpy(work, place->jac, (size_t)n * (size_t)n * sizeof *work);
    for (int j = 0; j < n; j++) {
        double *row = work + j * n, before = 0, left = 0;
        for (int k = 0; k < n; k++) {
            before += row[k] * row[k];
        }
        for (int other = 0; other < j; other++) {
            const double *unit = work + other * n;
            double along = 0;
            for (int k = 0; k < n; k++) {
                along += row[k] * unit[k];
            }
            for (int k = 0; k < n; k++) {
                row[k] -= along * unit[k];
            }
        }
        for (int k = 0; k < n; k++) {
            left += row[k] * row[k];
        }
        if (!(left > 1e-12 * before)) {
            diagnostics_add(diagnostics, z->choices[j].where,
                            "give one target up, or choose something that parts them",
                            "over-determined: %s follows from the targets before it, whatever is "
                            "chosen",
                            z->choices[j].probe.text);
            return false;
        }
        for (int k = 0; k < n; k++) {
            row[k] /= sqrt(left);
        }
    }
    return true;
}

/* --- the whole -------------------------------------------------------------------------------- */

static bool sizer_open(struct sizer *z, struct operating_point *home,
                       const struct analysis_options *options, struct arena *arena)
{
    const struct circuit *c = home->system->circuit;
    const int n = c->choice_count;
    *z = (struct sizer){
        .home = home, .options = options, .arena = arena, .choices = c->choices, .n = n};
    z->refs = arena_new_array(arena, struct parameter_ref, n);
    z->probes = arena_new_array(arena, struct probe, n);
    z->from = arena_new_array(arena, double, n);
    z->to = arena_new_array(arena, double, n);
    z->goal = arena_new_array(arena, double, n);
    z->state = arena_new_array(arena, double, home->system->n);
    z->column = arena_new_array(arena, double, n);
    z->row = arena_new_array(arena, double, n);
    if (z->refs == NULL || z->probes == NULL || z->from == NULL || z->to == NULL ||
        z->goal == NULL || z->state == NULL || z->column == NULL || z->row == NULL) {
        return false;
    }
    for (int k = 0; k < n; k++) {
        z->refs[k] = derivative_knob(home->system, &c->choices[k].knob);
        z->probes[k] = c->choices[k].probe;
        z->from[k] = sizer_to_t(&c->choices[k], c->choices[k].from);
        z->to[k] = sizer_to_t(&c->choices[k], c->choices[k].to);
    }
    sizer_set_goals(z, NULL, 1);
    return true;
}

static enum bound bound_of(const struct sizer *z, const struct place *place, int k)
{
    const double near = 1e-9 * (z->to[k] - z->from[k]);
    return place->t[k] <= z->from[k] + near ? BOUND_FROM
           : place->t[k] >= z->to[k] - near ? BOUND_TO
                                            : BOUND_NONE;
}

static enum status keep_result(struct sizer *z, const struct place *best, struct arena *arena,
                               struct size_result *size)
{
    size->list = arena_new_array(arena, struct chosen, z->n);
    if (size->list == NULL) {
        return STATUS_MEMORY;
    }
    size->count = z->n;
    size->solved = sizer_is_met(z, best);
    size->evaluations = z->evaluations;
    for (int k = 0; k < z->n; k++) {
        size->list[k] = (struct chosen){.choice = &z->choices[k],
                                        .before = z->refs[k].value,
                                        .value = sizer_from_t(&z->choices[k], best->t[k]),
                                        .reached = best->q[k],
                                        .bound = bound_of(z, best, k)};
    }
    return STATUS_OK;
}

static enum status find(struct sizer *z, struct result *result, struct size_result *size)
{
    struct diagnostics *diagnostics = &z->home->system->circuit->cell->diagnostics;
    struct place best;
    double *work = arena_new_array(z->arena, double, z->n * z->n);
    if (work == NULL || !sizer_place_create(z, &best)) {
        return STATUS_MEMORY;
    }
    enum status status = sizer_search(z, &best, &size->method);
    if (status != STATUS_OK) {
        return status;
    }
    if (!isfinite(best.cost)) {
        return STATUS_UNSOLVED;
    }
    if (!check_influence(z, diagnostics) || !check_rank(z, &best, work, diagnostics)) {
        return STATUS_INPUT;
    }
    status = keep_result(z, &best, result->arena, size);
    if (status == STATUS_OK && size->solved) {
        status = sizer_round(z, result->arena, size);
        size->evaluations = z->evaluations + size->rounding_count;
    }
    return status;
}

enum status size_find(struct operating_point *home, const struct analysis_options *options,
                      double grid, struct result *result)
{
    const struct circuit *c = home->system->circuit;
    if (!check_lines(c, &c->cell->diagnostics)) {
        return STATUS_INPUT;
    }
    struct arena *arena = arena_create();
    struct size_result *size = arena_new(result->arena, struct size_result);
    struct sizer sizer;
    enum status status = arena == NULL || size == NULL ? STATUS_MEMORY : STATUS_OK;
    if (status == STATUS_OK) {
        size->grid = grid;
        status =
            sizer_open(&sizer, home, options, arena) ? find(&sizer, result, size) : STATUS_MEMORY;
    }
    if (status == STATUS_OK) {
        result->size = size;
    }
    arena_destroy(arena);
    return status;
}
