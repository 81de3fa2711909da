/* loop_curve.c: the equations of a cell with one of them replaced by a held voltage. */
#include "analyses/loop_curve.h"

#include <math.h>
#include <string.h>

enum { HALVINGS = 6 };

struct held_loop {
    struct system *system;
    int unknown;
    double volts, push;
    struct nonlinear_system face;
    struct linear_solver *solver;
    double *work, *trial;
};

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    struct held_loop *h = self;
    struct system *s = h->system;
    if (!s->face.evaluate(s, x, f, scale, values)) {
        return false;
    }
    h->push = -f[h->unknown];
    f[h->unknown] = x[h->unknown] - h->volts;
    scale[h->unknown] = 1;
    const struct pattern *pattern = s->face.pattern;
    for (int column = 0; column < s->n; column++) {
        for (int k = pattern->start[column]; k < pattern->start[column + 1]; k++) {
            if (pattern->row[k] == h->unknown) {
                values[k] = column == h->unknown ? 1 : 0;
            }
        }
    }
    return true;
}

static double longest_step(void *self, const double *x, const double *dx)
{
    struct held_loop *h = self;
    return h->system->face.longest_step(h->system, x, dx);
}

struct held_loop *held_loop_create(struct arena *arena, struct system *system, int unknown)
{
    struct held_loop *h = arena_new(arena, struct held_loop);
    if (h == NULL) {
        return NULL;
    }
    h->system = system;
    h->unknown = unknown;
    h->face = (struct nonlinear_system){.n = system->n,
                                        .pattern = system->face.pattern,
                                        .self = h,
                                        .evaluate = evaluate,
                                        .longest_step = longest_step,
                                        .weight = system->weight};
    h->work = arena_new_array(arena, double, newton_work_size(&h->face));
    h->trial = arena_new_array(arena, double, system->n);
    h->solver = linear_create(h->face.pattern);
    if (h->work == NULL || h->trial == NULL || h->solver == NULL) {
        held_loop_free(h);
        return NULL;
    }
    return h;
}

void held_loop_free(struct held_loop *h)
{
    if (h != NULL) {
        linear_destroy(h->solver);
        h->solver = NULL;
    }
}

enum newton_status held_loop_solve(struct held_loop *h, double volts, double *x, double *push)
{
    struct newton_report report = {0};
    const struct newton_options options = newton_default_options();
    h->volts = volts;
    const enum newton_status status =
        newton_solve(&h->face, h->solver, &options, x, h->work, &report);
    *push = h->push; /* of the last evaluation: that of the accepted point */
    return status;
}

/* From the solution x at `from` to one at `to`, in smaller steps where it must be. */
static enum newton_status follow(struct held_loop *h, double from, double to, double *x,
                                 double *push)
{
    const size_t size = (size_t)h->system->n * sizeof *x;
    for (int k = 0; k <= HALVINGS; k++) {
        const int steps = 1 << k;
        enum newton_status status = NEWTON_CONVERGED;
        memcpy(h->trial, x, size);
        for (int i = 1; i <= steps && status == NEWTON_CONVERGED; i++) {
            status = held_loop_solve(h, from + (to - from) * i / steps, h->trial, push);
        }
        if (status == NEWTON_CONVERGED || status == NEWTON_MEMORY) {
            memcpy(x, h->trial, size);
            return status;
        }
    }
    return NEWTON_STALLED;
}

enum status loop_curve_trace(struct held_loop *h, struct arena *arena, const double *start,
                             double from, double to, int points, struct loop_curve *curve)
{
    const size_t n = (size_t)h->system->n;
    *curve = (struct loop_curve){.v = arena_new_array(arena, double, points + 1),
                                 .push = arena_new_array(arena, double, points + 1),
                                 .x = arena_new_array(arena, double, (size_t)(points + 1) * n)};
    double *x = arena_new_array(arena, double, n);
    if (curve->v == NULL || curve->push == NULL || curve->x == NULL || x == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(x, start, n * sizeof *x);
    double at = start[h->unknown];
    for (int k = 0; k <= points; k++) {
        const double volts = k == points ? to : from + (to - from) * k / points;
        double push = NAN;
        const enum newton_status status = follow(h, at, volts, x, &push);
        if (status == NEWTON_MEMORY) {
            return STATUS_MEMORY;
        }
        if (status == NEWTON_CONVERGED) {
            curve->v[curve->count] = volts;
            curve->push[curve->count] = push;
            memcpy(curve->x + (size_t)curve->count * n, x, n * sizeof *x);
            curve->count++;
            at = volts;
        }
    }
    return STATUS_OK;
}
