/*
 * polish.c: from a converged root in double to the end of long double.
 *
 * Newton with residuals in long double and factors in double is iterative refinement of a
 * nonlinear system (Tisseur 2001, SIAM J. Matrix Anal. Appl. 22, 1038): what limits the result is
 * the precision of the residual, not that of the factors.
 */
#include "numerics/newton.h"

#include <math.h>

enum { POLISH_STEP_LIMIT = 8 };

/* Long doubles, as long doubles and as room for doubles. Allocated memory takes the type that is
 * stored into it (C11 6.5), so the last part serves as doubles. */
struct polish {
    const struct nonlinear_system *system;
    struct linear_solver *solver;
    long double *x, *values;       /* the caller's */
    long double *f, *scale, *best; /* [n] */
    double *d;                     /* [n] right side and step */
    double *dx, *df, *dscale;      /* [n] for a system without a wider version */
    double *dvalues;               /* [nonzeros] */
};

size_t newton_polish_work_size(const struct nonlinear_system *system)
{
    size_t n = (size_t)system->n;
    size_t doubles = 4 * n + (size_t)system->pattern->start[system->n];
    return 3 * n + (doubles * sizeof(double) + sizeof(long double) - 1) / sizeof(long double);
}

/* In double, widened, for a system without a wider version. */
static bool evaluate_narrow(const struct polish *p)
{
    const struct nonlinear_system *system = p->system;
    for (int k = 0; k < system->n; k++) {
        p->dx[k] = (double)p->x[k];
    }
    if (!system->evaluate(system->self, p->dx, p->df, p->dscale, p->dvalues)) {
        return false;
    }
    for (int i = 0; i < system->n; i++) {
        p->f[i] = (long double)p->df[i];
        p->scale[i] = (long double)p->dscale[i];
    }
    for (int k = 0; k < system->pattern->start[system->n]; k++) {
        p->values[k] = (long double)p->dvalues[k];
    }
    return true;
}

/* Residual and Jacobian at x; worst out: largest |f|/scale. False: not finite. */
static bool evaluate_at(const struct polish *p, double *worst, int *equation)
{
    const struct nonlinear_system *system = p->system;
    bool is_finite = system->evaluate_extended != NULL
                         ? system->evaluate_extended(system->self, p->x, p->f, p->scale, p->values)
                         : evaluate_narrow(p);
    if (!is_finite) {
        return false;
    }
    *worst = 0;
    *equation = 0;
    for (int i = 0; i < system->n; i++) {
        if (!isfinite(p->f[i]) || !isfinite(p->scale[i])) {
            return false;
        }
        double ratio = p->f[i] == 0 ? 0 : (double)(fabsl(p->f[i]) / p->scale[i]);
        if (ratio > *worst) {
            *worst = ratio;
            *equation = i;
        }
    }
    return true;
}

/* Factors the double rounding of the Jacobian at x. */
static enum newton_status factor_here(const struct polish *p)
{
    for (int k = 0; k < p->system->pattern->start[p->system->n]; k++) {
        p->dvalues[k] = (double)p->values[k];
    }
    switch (linear_factor(p->solver, p->dvalues)) {
    case LINEAR_OK:
        return NEWTON_CONVERGED;
    case LINEAR_SINGULAR:
        return NEWTON_SINGULAR;
    case LINEAR_NOT_FINITE:
        return NEWTON_NOT_FINITE;
    case LINEAR_MEMORY:
        break;
    }
    return NEWTON_MEMORY;
}

static void step(const struct polish *p)
{
    for (int i = 0; i < p->system->n; i++) {
        p->d[i] = (double)-p->f[i];
    }
    linear_solve(p->solver, p->d);
    for (int k = 0; k < p->system->n; k++) {
        p->x[k] += (long double)p->d[k];
    }
}

static void copy(long double *to, const long double *from, int n)
{
    for (int k = 0; k < n; k++) {
        to[k] = from[k];
    }
}

/* Goes back to the best point; its values and factors too. */
static enum newton_status return_to_best(const struct polish *p, double *worst, int *equation)
{
    copy(p->x, p->best, p->system->n);
    if (!evaluate_at(p, worst, equation)) {
        return NEWTON_NOT_FINITE;
    }
    return factor_here(p);
}

enum newton_status newton_polish(const struct nonlinear_system *system,
                                 struct linear_solver *solver, long double *x, long double *values,
                                 long double *work, double *worst, int *equation)
{
    const int n = system->n;
    double *doubles = (double *)(void *)(work + 3 * n);
    const struct polish p = {.system = system,
                             .solver = solver,
                             .x = x,
                             .values = values,
                             .f = work,
                             .scale = work + n,
                             .best = work + 2 * n,
                             .d = doubles,
                             .dx = doubles + n,
                             .df = doubles + 2 * n,
                             .dscale = doubles + 3 * n,
                             .dvalues = doubles + 4 * n};
    *worst = INFINITY;
    *equation = 0;
    double least = INFINITY; /* residual of p.best */
    int idle = 0;            /* steps since it fell */
    for (int steps = 0;; steps++) {
        double here;
        int where;
        bool is_finite = evaluate_at(&p, &here, &where);
        if (!is_finite && steps == 0) {
            return NEWTON_NOT_FINITE;
        }
        bool is_better = is_finite && (steps == 0 || here < least);
        idle = is_better ? 0 : idle + 1;
        if (is_better) {
            least = here;
            copy(p.best, x, n);
        }
        /* One step may fail to improve: the residual of a start far below 1e-16 can rise once. */
        if (!is_finite || idle > 1 || steps == POLISH_STEP_LIMIT || (here == 0 && is_better)) {
            break;
        }
        enum newton_status status = factor_here(&p);
        if (status != NEWTON_CONVERGED) {
            return status;
        }
        step(&p);
    }
    return return_to_best(&p, worst, equation);
}
