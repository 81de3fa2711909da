/*
 * linearised.c: derivatives at a polished point.
 *
 * With F(x, p) = 0 and the Jacobian J: dx/dp = -J^-1 dF/dp; for one quantity x[k] and many p the
 * adjoint a = J^-T e_k gives dx[k]/dp = -a . dF/dp with one solve.
 */
#include "analyses/linearised.h"

#include <math.h>
#include <string.h>

/* Layout of the workspace: right side, solution, scratch of the refinement. */
struct workspace {
    long double *b, *y, *work;
};

static struct workspace workspace_of(struct operating_point *p)
{
    const int n = p->system->n;
    return (struct workspace){p->linear, p->linear + n, p->linear + 2 * n};
}

static void solve(struct operating_point *p, const struct workspace *w, bool transposed)
{
    struct system *s = p->system;
    linear_refine(s->solver, s->face.pattern, p->values, w->b, w->y, w->work, transposed);
}

static void unit_right_side(const struct operating_point *p, const struct workspace *w, int row)
{
    memset(w->b, 0, (size_t)p->system->n * sizeof *w->b);
    w->b[row] = 1;
}

/*
 * The branch row of a voltage source is v(a) - v(b) - V = 0, so dF/dV = -1 there and dx/dV = J^-1
 * e_row. The branch current flows into the source at its first terminal: into the cell it is the
 * negative.
 */
long double linearised_transfer(struct operating_point *p, int branch, int driver)
{
    const struct workspace w = workspace_of(p);
    unit_right_side(p, &w, driver);
    solve(p, &w, false);
    return w.y[branch];
}

long double linearised_conductance(struct operating_point *p, int branch)
{
    return -linearised_transfer(p, branch, branch);
}

long double linearised_temperature(struct operating_point *p, int branch)
{
    const struct workspace w = workspace_of(p);
    system_temperature_slope(p->system, p->refined, w.b);
    solve(p, &w, false);
    return -w.y[branch];
}

double linearised_sigma(struct operating_point *p, int branch)
{
    struct system *s = p->system;
    const struct circuit *c = s->circuit;
    const struct workspace w = workspace_of(p);
    unit_right_side(p, &w, branch);
    solve(p, &w, true);
    long double sum = 0;
    bool any = false;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const struct device_values values = {s->own[k], instance->model_values, instance->extra,
                                             c->resistor_factor};
        for (int d = 0; d < instance->type->deviate_count; d++) {
            const struct deviate *deviate = &instance->type->deviates[d];
            const double sigma = deviate->sigma(&values);
            if (!(sigma > 0)) {
                continue;
            }
            system_slope(s, k, deviate->own_parameter, p->refined, w.b);
            long double slope = 0;
            for (int l = 0; l < instance->local_count; l++) {
                const int row = instance->local[l];
                bool counted = row < 0; /* terminals may share a node: its row counts once */
                for (int before = 0; before < l; before++) {
                    counted |= instance->local[before] == row;
                }
                slope -= counted ? 0 : w.y[row] * w.b[row];
            }
            sum += slope * slope * sigma * sigma;
            any = true;
        }
    }
    return any ? (double)sqrtl(sum) : NAN;
}
