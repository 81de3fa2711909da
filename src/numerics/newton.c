/*
 * newton.c: damped Newton steps, error-oriented (Deuflhard 2004, Newton Methods for Nonlinear
 * Problems, section 3.3, algorithm NLEQ-ERR).
 *
 *     J(x) dx  = -F(x)            Newton correction
 *     J(x) bar = -F(x + t dx)     simplified correction at the trial point
 *     accept t when |bar| <= (1 - t/4) |dx|       restricted natural monotonicity
 *     otherwise     t <- min(0.5 t^2 |dx| / |bar - (1 - t) dx|, t / 2), at least t / 10
 *
 * |.| is the largest weighted component, so that a step is judged at its worst unknown whatever
 * the size of the system. Ours: the floor t / 10; the first trial is capped by the system's longest
 * step and by the step limit; a step below the step tolerance is taken whole, because its bar is
 * rounding; where no share passes, the step is judged by its residual (residual_step).
 */
#include "numerics/newton.h"

#include <math.h>

/* The search for a share of the step ends this far below the first trial allowed. */
#define LEAST_DAMPING 1e-3
#define LEAST_RESIDUAL_DAMPING 1e-8
/* After a residual step shorter than this the next one is judged by the residual at once. */
#define RESUME_SHARE 0.01
/* Share of the predicted fall of the residual that must come true (Dennis and Schnabel 1983). */
#define SUFFICIENT_DECREASE 1e-4
/* A prediction starts no lower than this share of the first trial allowed. */
#define LEAST_PREDICTION 1e-3
/* A trial that cannot be evaluated goes back by this factor. */
#define BACK_OFF 0.25
/* A trial that fails shortens the next to no less than this: far out, where a trial may be wrong by
 * many decades, its suggestion says nothing about the neighbourhood of x. */
#define LARGEST_CUT 0.1
/* A damping factor is raised once within an iteration when it may grow by this much. */
#define WORTH_RAISING 4.0
/* So many steps in a row below the step tolerance while the residual fails: no progress. */
enum { TINY_STEP_LIMIT = 8 };

struct search {
    const struct nonlinear_system *system;
    struct linear_solver *solver;
    const struct newton_options *options;
    struct newton_report *report;
    double *x, *f, *scale, *dx, *bar, *trial, *row; /* [n]; row: weights of equations */
    double *values;                                 /* [nonzeros] */
    double dx_size;                                 /* |dx| */
    double bar_size;                                /* |bar| at the accepted trial */
    double share; /* the accepted damping factor; 0 before the first step */
};

const char *newton_status_text(enum newton_status status)
{
    static const char *const texts[] = {
        [NEWTON_CONVERGED] = "converged",
        [NEWTON_STALLED] = "no step made the equations fit better",
        [NEWTON_SINGULAR] = "the equations do not determine every unknown",
        [NEWTON_NOT_FINITE] = "a value grew beyond every number",
        [NEWTON_LIMIT] = "too many iterations",
        [NEWTON_MEMORY] = "not enough memory",
        [NEWTON_STOPPED] = "stopped on request",
    };
    return texts[status];
}

struct newton_options newton_default_options(void)
{
    return (struct newton_options){.tolerance = 1e-10,
                                   .step_tolerance = 1e-9,
                                   .iteration_limit = 100,
                                   .step_limit = INFINITY,
                                   .stopped = NULL,
                                   .stopped_self = NULL};
}

size_t newton_work_size(const struct nonlinear_system *system)
{
    return 6 * (size_t)system->n + (size_t)system->pattern->start[system->n];
}

const double *newton_last_step(const struct nonlinear_system *system, const double *work)
{
    return work + 2 * system->n;
}

static double weight_of(const struct nonlinear_system *system, int k)
{
    return system->weight != NULL ? system->weight[k] : 1;
}

/* Largest weighted component; NaN when one is NaN. */
static double size_of(const struct nonlinear_system *system, const double *v)
{
    double largest = 0;
    for (int k = 0; k < system->n; k++) {
        double size = fabs(weight_of(system, k) * v[k]);
        if (!(size <= largest)) {
            largest = size;
            if (isnan(size)) {
                break;
            }
        }
    }
    return largest;
}

/* Largest weighted step relative to 1 + |x|, unknown by unknown. */
static double relative_step(const struct search *s)
{
    double largest = 0;
    for (int k = 0; k < s->system->n; k++) {
        double w = weight_of(s->system, k);
        largest = fmax(largest, fabs(w * s->dx[k]) / (1 + fabs(w * s->x[k])));
    }
    return largest;
}

/* Evaluates at `point` and writes residual and equation into the report. False: not finite. */
static bool evaluate_at(struct search *s, const double *point)
{
    const struct nonlinear_system *system = s->system;
    if (!system->evaluate(system->self, point, s->f, s->scale, s->values)) {
        return false;
    }
    double worst = 0;
    int equation = 0;
    for (int i = 0; i < system->n; i++) {
        if (!isfinite(s->f[i]) || !isfinite(s->scale[i])) {
            return false;
        }
        /* A zero scale with a residual gives infinity, which passes no test. */
        double ratio = s->f[i] == 0 ? 0 : fabs(s->f[i]) / s->scale[i];
        if (ratio > worst) {
            worst = ratio;
            equation = i;
        }
    }
    s->report->residual = worst;
    s->report->equation = equation;
    return true;
}

/* direction = -J^-1 f with the factors at hand. */
static void correct(struct search *s, double *direction)
{
    for (int i = 0; i < s->system->n; i++) {
        direction[i] = -s->f[i];
    }
    linear_solve(s->solver, direction);
}

static enum newton_status newton_direction(struct search *s)
{
    switch (linear_factor(s->solver, s->values)) {
    case LINEAR_OK:
        break;
    case LINEAR_SINGULAR:
        s->report->column = linear_singular_column(s->solver);
        return NEWTON_SINGULAR;
    case LINEAR_NOT_FINITE:
        return NEWTON_NOT_FINITE;
    case LINEAR_MEMORY:
        return NEWTON_MEMORY;
    }
    correct(s, s->dx);
    for (int k = 0; k < s->system->n; k++) {
        if (!isfinite(s->dx[k])) { /* a pivot next to zero */
            s->report->column = k;
            return NEWTON_SINGULAR;
        }
    }
    return NEWTON_CONVERGED;
}

/* The largest share of dx that the system and the step limit allow. */
static double longest_share(const struct search *s)
{
    const struct nonlinear_system *system = s->system;
    double share = 1;
    if (system->longest_step != NULL) {
        double own = system->longest_step(system->self, s->x, s->dx);
        share = own > 0 && own < 1 ? own : 1;
    }
    if (share * s->dx_size > s->options->step_limit) {
        share = s->options->step_limit / s->dx_size;
    }
    return share;
}

/* Damping factor predicted from the last iteration; 1 at first. bar still holds the last simplified
 * correction and dx the new Newton correction at one point. */
static double predicted_share(const struct search *s, double last_dx_size)
{
    if (s->share == 0) {
        return 1;
    }
    double difference = 0;
    for (int k = 0; k < s->system->n; k++) {
        double w = weight_of(s->system, k);
        difference = fmax(difference, fabs(w * (s->bar[k] - s->dx[k])));
    }
    double share = s->share * (last_dx_size / s->dx_size) * (s->bar_size / difference);
    return share < 1 ? share : 1;
}

/* Damping factor that the trial at t suggests. */
static double suggested_share(const struct search *s, double t)
{
    double difference = 0;
    for (int k = 0; k < s->system->n; k++) {
        double w = weight_of(s->system, k);
        difference = fmax(difference, fabs(w * (s->bar[k] - (1 - t) * s->dx[k])));
    }
    return difference > 0 ? 0.5 * t * t * s->dx_size / difference : 1;
}

static void accept(struct search *s, double t)
{
    for (int k = 0; k < s->system->n; k++) {
        s->x[k] = s->trial[k];
    }
    s->share = t;
    s->report->iterations++;
}

/* trial = x + t dx, evaluated. False: not finite. */
static bool try_share(struct search *s, double t)
{
    for (int k = 0; k < s->system->n; k++) {
        s->trial[k] = s->x[k] + t * s->dx[k];
    }
    return evaluate_at(s, s->trial);
}

/* Looks for a share of dx that passes the monotonicity test, from t downwards, once upwards, never
 * above `longest`. STALLED: none above LEAST_DAMPING. tested = false: the first finite one will do.
 */
static enum newton_status natural_step(struct search *s, double t, double longest, bool tested)
{
    bool may_raise = true;
    while (t >= LEAST_DAMPING * longest) {
        if (!try_share(s, t)) {
            t *= BACK_OFF;
            may_raise = false;
            continue;
        }
        correct(s, s->bar);
        s->bar_size = size_of(s->system, s->bar);
        double suggested = tested ? suggested_share(s, t) : t;
        if (tested && !(s->bar_size <= (1 - t / 4) * s->dx_size)) {
            t = fmax(fmin(suggested, t / 2), LARGEST_CUT * t);
            may_raise = false;
            continue;
        }
        double next = fmin(suggested, longest);
        if (!may_raise || !(next >= WORTH_RAISING * t)) {
            accept(s, t);
            return NEWTON_CONVERGED;
        }
        t = next;
        may_raise = false;
    }
    return NEWTON_STALLED;
}

/* Length of the residual, each equation relative to what met in it at x. */
static double residual_length(const struct search *s)
{
    double sum = 0;
    for (int i = 0; i < s->system->n; i++) {
        sum += (s->row[i] * s->f[i]) * (s->row[i] * s->f[i]);
    }
    return sqrt(sum);
}

/* When the error-oriented search finds nothing: the path to the root passes a nearly singular
 * Jacobian, where corrections grow although the residual falls. Takes the largest share that
 * shortens the residual (Armijo 1966; Dennis and Schnabel 1983, section 6.3). */
static enum newton_status residual_step(struct search *s, double longest)
{
    if (!evaluate_at(s, s->x)) { /* values, f and report again those of x */
        return NEWTON_NOT_FINITE;
    }
    const struct newton_report here = *s->report;
    for (int i = 0; i < s->system->n; i++) {
        s->row[i] = s->scale[i] > 0 ? 1 / s->scale[i] : 0;
    }
    const double before = residual_length(s);
    bool finite = true;
    for (double t = longest; t >= LEAST_RESIDUAL_DAMPING * longest; t /= 2) {
        finite = try_share(s, t);
        if (finite && residual_length(s) <= (1 - SUFFICIENT_DECREASE * t) * before) {
            correct(s, s->bar);
            s->bar_size = size_of(s->system, s->bar);
            accept(s, t);
            return NEWTON_CONVERGED;
        }
    }
    s->report->residual = here.residual; /* of x, not of the last trial */
    s->report->equation = here.equation;
    return finite ? NEWTON_STALLED : NEWTON_NOT_FINITE;
}

enum newton_status newton_solve(const struct nonlinear_system *system, struct linear_solver *solver,
                                const struct newton_options *options, double *x, double *work,
                                struct newton_report *report)
{
    const int n = system->n;
    struct search s = {.system = system,
                       .solver = solver,
                       .options = options,
                       .report = report,
                       .x = x,
                       .f = work,
                       .scale = work + n,
                       .dx = work + 2 * n,
                       .bar = work + 3 * n,
                       .trial = work + 4 * n,
                       .row = work + 5 * n,
                       .values = work + 6 * n};
    report->column = -1;
    report->step = INFINITY;
    report->residual = INFINITY;
    if (!evaluate_at(&s, x)) {
        return NEWTON_NOT_FINITE;
    }
    int tiny_steps = 0;
    bool by_residual = false;
    for (int iteration = 0;; iteration++) {
        if (options->stopped != NULL && options->stopped(options->stopped_self)) {
            return NEWTON_STOPPED;
        }
        enum newton_status status = newton_direction(&s);
        if (status != NEWTON_CONVERGED) {
            return status;
        }
        double last_dx_size = s.dx_size;
        s.dx_size = size_of(system, s.dx);
        report->step = s.dx_size;
        bool is_tiny = relative_step(&s) <= options->step_tolerance;
        tiny_steps = is_tiny ? tiny_steps + 1 : 0;
        if (is_tiny && report->residual <= options->tolerance) {
            return NEWTON_CONVERGED;
        }
        if (tiny_steps > TINY_STEP_LIMIT) {
            return NEWTON_STALLED;
        }
        if (iteration >= options->iteration_limit) {
            return NEWTON_LIMIT;
        }
        double longest = longest_share(&s);
        double first = is_tiny ? 1 : predicted_share(&s, last_dx_size);
        first = fmin(fmax(first, LEAST_PREDICTION * longest), longest);
        status = NEWTON_STALLED;
        if (!by_residual || is_tiny) {
            status = natural_step(&s, first, longest, !is_tiny);
        }
        if (status == NEWTON_STALLED) {
            status = residual_step(&s, longest);
            by_residual = s.share < RESUME_SHARE * longest;
        }
        if (status != NEWTON_CONVERGED) {
            return status;
        }
    }
}
