/*
 * quad.c: dense modified nodal equations of a cell in quadruple precision, solved by Newton.
 */
#include "support/quad.h"

#include <stdlib.h>
#include <string.h>

#include "support/quad_devices.h"

enum { NEWTON_STEPS = 200, HALVINGS = 60, LADDER_STEPS = 400 };

/* Relative residual that ends the search, and the most that rounding may leave where it cannot be
 * reached (a current that is a small difference of large charges, deep in the triode region). */
static const double GOAL = 1e-28, FLOOR = 1e-18;
/* Below this conductance (S) the last step is to none at all. */
static const double LEAST_HELP = 1e-24;
/* A or V: added to the scale of each equation, so that one in which nothing flows (an output at
 * 0 V) is not asked for more digits than there are. */
static const double LEAST_SCALE = 1e-11;
/* From zero no step moves a node by more than this (V): a few kT/q, which junctions can bear. */
static const double STEP_CAP = 0.1;

/* The equations at one point. */
struct equations {
    int n;
    quad *f;     /* [n] sums */
    quad *scale; /* [n] sums of magnitudes */
    quad *jac;   /* [n*n] row-major */
};

static bool equations_create(struct equations *e, int n)
{
    e->n = n;
    e->f = calloc((size_t)n, sizeof *e->f);
    e->scale = calloc((size_t)n, sizeof *e->scale);
    e->jac = calloc((size_t)n * (size_t)n, sizeof *e->jac);
    return e->f != NULL && e->scale != NULL && e->jac != NULL;
}

static void equations_free(struct equations *e)
{
    free(e->f);
    free(e->scale);
    free(e->jac);
}

/* The unknowns of one instance, each seeded with its own derivative. */
static void gather(const struct instance *instance, const quad *x, struct dual *local)
{
    for (int k = 0; k < instance->local_count; k++) {
        const int u = instance->local[k];
        local[k] = unknown(u < 0 ? 0 : x[u], k, instance->local_count);
    }
}

/* Equations of one instance: its terminals' nodes, then its branches. */
static void stamp(const struct quad_question *question, int index, const quad *x,
                  struct equations *e)
{
    const struct instance *instance = &question->circuit->instances[index];
    const int rows = instance->type->terminal_count + instance->type->branch_count;
    struct dual local[DUAL_LIMIT], f[DUAL_LIMIT];
    struct quad_device_state state;
    gather(instance, x, local);
    quad_evaluate(question, index, local, f, &state);
    for (int r = 0; r < rows; r++) {
        const int row = instance->local[r];
        if (row < 0) {
            continue;
        }
        e->f[row] += f[r].v;
        if (r < instance->type->terminal_count) {
            e->scale[row] += fabsq(f[r].v);
        }
        for (int k = 0; k < f[r].n; k++) {
            const int column = instance->local[k];
            if (column >= 0) {
                e->jac[row * e->n + column] += f[r].d[k];
                if (r >= instance->type->terminal_count) {
                    e->scale[row] += fabsq(f[r].d[k] * x[column]);
                }
            }
        }
    }
}

/* All equations; `help` is a conductance from every node to ground, 0 for the cell itself. */
static void assemble(const struct quad_question *question, quad help, const quad *x,
                     struct equations *e)
{
    memset(e->f, 0, (size_t)e->n * sizeof *e->f);
    memset(e->scale, 0, (size_t)e->n * sizeof *e->scale);
    memset(e->jac, 0, (size_t)e->n * (size_t)e->n * sizeof *e->jac);
    for (int k = 0; k < question->circuit->instance_count; k++) {
        stamp(question, k, x, e);
    }
    for (int k = 0; k < question->circuit->node_count - 1; k++) {
        e->f[k] += help * x[k];
        e->scale[k] += fabsq(help * x[k]);
        e->jac[k * e->n + k] += help;
    }
}

/* Largest |f|/scale; not a number when anything is. */
static quad relative_residual(const struct equations *e, const quad *scale)
{
    quad worst = 0;
    for (int k = 0; k < e->n; k++) {
        if (!quad_finite(e->f[k])) {
            return e->f[k] - e->f[k];
        }
        const quad r = e->f[k] == 0 ? 0 : fabsq(e->f[k]) / (scale[k] + (quad)LEAST_SCALE);
        worst = r > worst ? r : worst;
    }
    return worst;
}

static void swap_rows(quad *a, quad *b, int n, int i, int j)
{
    for (int k = 0; k < n; k++) {
        const quad t = a[i * n + k];
        a[i * n + k] = a[j * n + k];
        a[j * n + k] = t;
    }
    const quad t = b[i];
    b[i] = b[j];
    b[j] = t;
}

/* Each row divided by its largest entry, so that volts and amperes may share a column. */
static bool equilibrate(quad *a, quad *b, int n)
{
    for (int i = 0; i < n; i++) {
        quad most = 0;
        for (int k = 0; k < n; k++) {
            most = fabsq(a[i * n + k]) > most ? fabsq(a[i * n + k]) : most;
        }
        if (!(most > 0)) {
            return false;
        }
        for (int k = 0; k < n; k++) {
            a[i * n + k] /= most;
        }
        b[i] /= most;
    }
    return true;
}

/* Solves A y = b in place by elimination with partial pivoting; A and b are used up. */
static bool eliminate(quad *a, quad *b, int n)
{
    if (!equilibrate(a, b, n)) {
        return false;
    }
    for (int p = 0; p < n; p++) {
        int best = p;
        for (int i = p + 1; i < n; i++) {
            best = fabsq(a[i * n + p]) > fabsq(a[best * n + p]) ? i : best;
        }
        if (!(fabsq(a[best * n + p]) > 0)) {
            return false;
        }
        if (best != p) {
            swap_rows(a, b, n, best, p);
        }
        for (int i = p + 1; i < n; i++) {
            const quad m = a[i * n + p] / a[p * n + p];
            if (m == 0) {
                continue;
            }
            for (int k = p; k < n; k++) {
                a[i * n + k] -= m * a[p * n + k];
            }
            b[i] -= m * b[p];
        }
    }
    for (int p = n - 1; p >= 0; p--) {
        for (int k = p + 1; k < n; k++) {
            b[p] -= a[p * n + k] * b[k];
        }
        b[p] /= a[p * n + p];
    }
    return true;
}

/* Share of a step that moves no node by more than the cap. */
static quad longest_trial(const struct quad_question *question, const quad *step)
{
    quad most = 0;
    for (int k = 0; k < question->circuit->node_count - 1; k++) {
        most = fabsq(step[k]) > most ? fabsq(step[k]) : most;
    }
    return most > STEP_CAP ? STEP_CAP / most : 1;
}

/* A step that is only kept short: what a search from zero takes. */
static bool capped_step(const struct quad_question *question, const quad *step, int n, quad *x)
{
    const quad t = longest_trial(question, step);
    for (int k = 0; k < n; k++) {
        x[k] += t * step[k];
    }
    return true;
}

/* One step from x, halved until the residual falls; false when no share of it lowers it. */
static bool halved_step(const struct quad_question *question, struct equations *e, const quad *step,
                        quad *x)
{
    quad trial[QUAD_UNKNOWN_LIMIT], scale[QUAD_UNKNOWN_LIMIT];
    memcpy(scale, e->scale, (size_t)e->n * sizeof *scale);
    const quad before = relative_residual(e, scale);
    quad t = 1;
    for (int h = 0; h < HALVINGS; h++, t /= 2) {
        for (int k = 0; k < e->n; k++) {
            trial[k] = x[k] + t * step[k];
        }
        assemble(question, 0, trial, e);
        if (relative_residual(e, scale) < before) {
            memcpy(x, trial, (size_t)e->n * sizeof *x);
            return true;
        }
    }
    return false;
}

/* Newton with one helping conductance; x in and out. */
static bool newton(const struct quad_question *question, quad help, bool is_cold,
                   struct equations *e, quad *x, struct quad_solution *solution)
{
    quad step[QUAD_UNKNOWN_LIMIT];
    for (int k = 0; k < NEWTON_STEPS; k++) {
        assemble(question, help, x, e);
        solution->residual = relative_residual(e, e->scale);
        if (solution->residual <= GOAL) {
            return true;
        }
        for (int i = 0; i < e->n; i++) {
            step[i] = -e->f[i];
        }
        solution->iterations++;
        if (!eliminate(e->jac, step, e->n) ||
            !(is_cold ? capped_step(question, step, e->n, x) : halved_step(question, e, step, x))) {
            break;
        }
    }
    return solution->residual <= FLOOR;
}

/* From zero: a conductance from every node to ground, lowered by a factor that adapts. */
static bool from_zero(const struct quad_question *question, struct equations *e,
                      struct quad_solution *solution)
{
    quad trial[QUAD_UNKNOWN_LIMIT];
    quad help = 10, factor = 10;
    for (int k = 0; k < LADDER_STEPS; k++) {
        const quad next = help / factor > LEAST_HELP ? help / factor : 0;
        memcpy(trial, solution->x, sizeof trial);
        if (newton(question, next, true, e, trial, solution)) {
            memcpy(solution->x, trial, sizeof trial);
            if (next == 0) {
                return true;
            }
            help = next;
            factor = factor < 100 ? factor * factor : factor;
        } else {
            factor = sqrtq(factor);
        }
    }
    return false;
}

bool quad_solve(const struct quad_question *question, const double *start,
                const struct quad_solution *previous, struct quad_solution *solution)
{
    const int n = question->circuit->unknown_count;
    struct equations e = {0};
    quad x[QUAD_UNKNOWN_LIMIT] = {0};
    if (n > QUAD_UNKNOWN_LIMIT || !equations_create(&e, n)) {
        equations_free(&e);
        return false;
    }
    for (int k = 0; k < n; k++) {
        x[k] = previous != NULL ? previous->x[k] : start != NULL ? (quad)start[k] : 0;
    }
    solution->n = n;
    solution->iterations = 0;
    memcpy(solution->x, x, sizeof x);
    bool solved = false;
    if (start == NULL && previous == NULL) {
        solved = from_zero(question, &e, solution);
    } else if (!(solved = newton(question, 0, false, &e, solution->x, solution))) {
        memcpy(solution->x, x, sizeof x);
        solved = newton(question, 0, true, &e, solution->x, solution);
    }
    equations_free(&e);
    return solved;
}

/* Unknown of the branch current of a source. */
static int branch_of(const struct quad_question *question, int instance)
{
    const struct instance *source = &question->circuit->instances[instance];
    return source->local[source->type->terminal_count];
}

quad quad_output_current(const struct quad_question *question, const struct quad_solution *solution,
                         int output)
{
    /* the branch current runs into the source's first terminal, so it comes out of the cell */
    const int instance = question->circuit->outputs[output].instance;
    return -solution->x[branch_of(question, instance)];
}

bool quad_output_slope(const struct quad_question *question, const struct quad_solution *solution,
                       int output, int source, quad *slope)
{
    struct equations e = {0};
    quad b[QUAD_UNKNOWN_LIMIT] = {0};
    bool solved = equations_create(&e, solution->n);
    if (solved) {
        assemble(question, 0, solution->x, &e);
        b[branch_of(question, source)] = 1; /* d(v - V)/dV = -1, moved to the right */
        solved = eliminate(e.jac, b, e.n);
        *slope = -b[branch_of(question, question->circuit->outputs[output].instance)];
    }
    equations_free(&e);
    return solved;
}

static bool is_bipolar(const struct device_type *type)
{
    return strcmp(type->word, "npn") == 0 || strcmp(type->word, "pnp") == 0;
}

/* vce at the outer terminals (c, b, e) above the saturation voltage of the model. */
static quad bipolar_headroom(const struct instance *it, const struct quad_solution *solution)
{
    const int k = parameter_find(it->type->model_parameters, it->type->model_parameter_count,
                                 "saturation_voltage");
    const double limit =
        it->model != NULL ? it->model->values[k] : it->type->model_parameters[k].standard;
    const quad vc = it->outer[0] < 0 ? 0 : solution->x[it->outer[0]];
    const quad ve = it->outer[2] < 0 ? 0 : solution->x[it->outer[2]];
    return it->type->polarity * (vc - ve) - (quad)limit;
}

struct quad_device_state quad_device(const struct quad_question *question,
                                     const struct quad_solution *solution, int instance)
{
    const struct instance *it = &question->circuit->instances[instance];
    struct dual local[DUAL_LIMIT], f[DUAL_LIMIT];
    struct quad_device_state state;
    gather(it, solution->x, local);
    quad_evaluate(question, instance, local, f, &state);
    if (is_bipolar(it->type)) {
        state.headroom = bipolar_headroom(it, solution);
    }
    return state;
}
