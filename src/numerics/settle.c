/*
 * settle.c: pseudo-transient continuation (Kelley and Keyes 1998, SIAM J. Numer. Anal. 35,
 * 508-523).
 *
 * The root is where the made-up motion D dx/dt = -F(x) comes to rest. Each step is one linearly
 * implicit Euler step
 *
 *     (D/h + J(x)) dx = -F(x)
 *
 * and h grows as the residual falls (switched evolution relaxation, their section 2), so that the
 * method ends as Newton's. D is positive where F has inertia: a Jacobian that does not determine an
 * unknown on the way does no harm, and the path keeps to roots that the motion can rest in.
 */
#include "numerics/settle.h"

#include <math.h>

/* Growth and shrinking of h in one step. */
static const double most_growth = 3, least_growth = 0.5;
/* Growth of a patient motion. */
static const double patient_growth = 1.4;
/* From here on the step is Newton's to six digits. */
static const double newton_from = 1e6;

/* Below this speed, in units of x a step, Newton ends it. */
static const double at_rest = 1e-9;

struct motion {
    const struct nonlinear_system *system;
    struct linear_solver *solver;
    const double *inertia;
    double *x, *f, *scale, *dx, *values;
};

/* Largest |F| against the inertia there: the speed of the motion. Equations without inertia follow
 * at once and do not count. */
static double speed_of(const struct motion *m)
{
    double largest = 0;
    for (int k = 0; k < m->system->n; k++) {
        if (m->inertia[k] > 0) {
            const double speed = fabs(m->f[k]) / m->inertia[k];
            largest = speed <= largest ? largest : speed;
        }
    }
    return largest;
}

static bool evaluate_at(struct motion *m)
{
    return m->system->evaluate(m->system->self, m->x, m->f, m->scale, m->values);
}

static enum newton_status step(struct motion *m, double h, const struct newton_options *options)
{
    const struct nonlinear_system *s = m->system;
    for (int k = 0; k < s->n; k++) {
        for (int p = s->pattern->start[k]; m->inertia[k] > 0 && p < s->pattern->start[k + 1]; p++) {
            m->values[p] += s->pattern->row[p] == k ? m->inertia[k] / h : 0;
        }
        m->dx[k] = -m->f[k];
    }
    const enum linear_status factored = linear_factor(m->solver, m->values);
    if (factored != LINEAR_OK) {
        return factored == LINEAR_MEMORY     ? NEWTON_MEMORY
               : factored == LINEAR_SINGULAR ? NEWTON_SINGULAR
                                             : NEWTON_NOT_FINITE;
    }
    linear_solve(m->solver, m->dx);
    for (int k = 0; k < s->n; k++) {
        const double w = s->weight != NULL ? s->weight[k] : 1;
        if (!isfinite(m->dx[k])) {
            return NEWTON_NOT_FINITE;
        }
        if (w * fabs(m->dx[k]) > options->step_limit) {
            m->dx[k] = copysign(options->step_limit / w, m->dx[k]);
        }
    }
    double share = s->longest_step != NULL ? s->longest_step(s->self, m->x, m->dx) : 1;
    share = share > 0 && share < 1 ? share : 1;
    for (int k = 0; k < s->n; k++) {
        m->x[k] += share * m->dx[k];
    }
    return NEWTON_CONVERGED;
}

enum newton_status settle(const struct nonlinear_system *system, struct linear_solver *solver,
                          const struct newton_options *options, const double *inertia, bool patient,
                          double *x, double *work, struct newton_report *report)
{
    const int n = system->n;
    const int step_limit = patient ? SETTLE_PATIENT_LIMIT : SETTLE_LIMIT;
    const double growth = patient ? patient_growth : most_growth;
    struct motion m = {.system = system,
                       .solver = solver,
                       .inertia = inertia,
                       .x = x,
                       .f = work,
                       .scale = work + n,
                       .dx = work + 2 * n,
                       .values = work + 3 * n};
    double h = 1, speed = 0;
    for (int steps = 0; steps < step_limit && h < newton_from; steps++) {
        if (options->stopped != NULL && options->stopped(options->stopped_self)) {
            return NEWTON_STOPPED;
        }
        if (!evaluate_at(&m)) {
            return NEWTON_NOT_FINITE;
        }
        const double now = speed_of(&m);
        if (steps > 0) {
            h *= fmin(fmax(now > 0 ? speed / now : growth, least_growth), growth);
        }
        if (!(now > at_rest)) {
            break;
        }
        speed = now;
        const enum newton_status status = step(&m, h, options);
        report->iterations++;
        if (status != NEWTON_CONVERGED) {
            return status;
        }
    }
    return newton_solve(system, solver, options, x, work, report);
}
