/*
 * continuation.c: walking along a parameter with a tangent predictor and an adaptive step
 * (Allgower and Georg 1990, Numerical Continuation Methods, chapter 2; Deuflhard 2004,
 * section 5.1).
 */
#include "numerics/continuation.h"

#include <math.h>

/* Newton iterations of a step that count as easy: the next step may be twice as long. */
enum { EASY_ITERATIONS = 5 };

struct continuation_options continuation_default_options(void)
{
    struct continuation_options options = {.newton = newton_default_options(),
                                           .first_step = 0.1,
                                           .least_step = 1e-6,
                                           .step_limit = 1000,
                                           .surprise = INFINITY};
    options.newton.iteration_limit = 25;
    return options;
}

size_t continuation_walk_work_size(const struct nonlinear_system *system)
{
    return 2 * (size_t)system->n + newton_work_size(system);
}

/* tangent = dx/dlambda = -J^-1 dF/dlambda; the solver holds J at x. 0 when the slope is unknown or
 * the tangent is not finite: then the last root is the prediction. */
static void take_tangent(const struct nonlinear_system *system, struct linear_solver *solver,
                         const double *x, double *tangent)
{
    bool usable = system->parameter_slope != NULL;
    if (usable) {
        system->parameter_slope(system->self, x, tangent);
        linear_solve(solver, tangent);
    }
    for (int k = 0; k < system->n; k++) {
        tangent[k] = -tangent[k];
        usable = usable && isfinite(tangent[k]);
    }
    for (int k = 0; !usable && k < system->n; k++) {
        tangent[k] = 0;
    }
}

/* trial = x + move along the tangent, cut by the system's longest step. */
static void predict(const struct nonlinear_system *system, const double *x, const double *tangent,
                    double change, double *move, double *trial)
{
    double share = 1;
    for (int k = 0; k < system->n; k++) {
        move[k] = change * tangent[k];
    }
    if (system->longest_step != NULL) {
        double longest = system->longest_step(system->self, x, move);
        share = longest > 0 && longest < 1 ? longest : 1;
    }
    for (int k = 0; k < system->n; k++) {
        trial[k] = x[k] + share * move[k];
    }
}

/* Whether the root at trial lies where the tangent at x led: a Newton that starts near a fold, or
 * with too long a step, may well converge on another branch. */
static bool is_expected(const struct nonlinear_system *system, const double *x,
                        const double *tangent, double change, const double *trial, double surprise)
{
    for (int k = 0; k < system->n && isfinite(surprise); k++) {
        const double w = system->weight != NULL ? system->weight[k] : 1;
        if (!(w * fabs(trial[k] - x[k] - change * tangent[k]) <= surprise)) {
            return false;
        }
    }
    return true;
}

static bool ends_everything(enum newton_status status)
{
    return status == NEWTON_STOPPED || status == NEWTON_MEMORY;
}

enum newton_status continuation_walk(const struct nonlinear_system *system,
                                     struct linear_solver *solver,
                                     const struct continuation_options *options, double from,
                                     double to, double *x, double *reached, double *work,
                                     struct newton_report *report)
{
    const int n = system->n;
    double *tangent = work;
    double *trial = work + n;
    double *newton_work = work + 2 * n;
    *reached = from;
    system->set_parameter(system->self, from);
    enum newton_status status =
        newton_solve(system, solver, &options->newton, x, newton_work, report);
    if (status != NEWTON_CONVERGED || from == to) {
        return status;
    }
    take_tangent(system, solver, x, tangent);
    double share = 0; /* of the way, solved */
    double step = options->first_step;
    for (int steps = 0; steps < options->step_limit; steps++) {
        double next = share + step < 1 - options->least_step ? share + step : 1;
        double lambda = next < 1 ? from + next * (to - from) : to;
        predict(system, x, tangent, lambda - *reached, newton_work, trial);
        system->set_parameter(system->self, lambda);
        int before = report->iterations;
        status = newton_solve(system, solver, &options->newton, trial, newton_work, report);
        if (status == NEWTON_CONVERGED &&
            !is_expected(system, x, tangent, lambda - *reached, trial, options->surprise)) {
            status = NEWTON_STALLED;
        }
        if (status == NEWTON_CONVERGED) {
            for (int k = 0; k < n; k++) {
                x[k] = trial[k];
            }
            share = next;
            *reached = lambda;
            if (lambda == to) {
                return NEWTON_CONVERGED;
            }
            take_tangent(system, solver, x, tangent);
            step *= report->iterations - before <= EASY_ITERATIONS ? 2 : 1;
            continue;
        }
        step = (next - share) / 2;
        if (ends_everything(status) || !(step >= options->least_step)) {
            system->set_parameter(system->self, *reached);
            return status;
        }
    }
    system->set_parameter(system->self, *reached);
    return NEWTON_LIMIT;
}
