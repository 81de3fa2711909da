/*
 * linearised.c: derivatives at a polished point.
 *
 * With F(x, p) = 0 and the Jacobian J: dx/dp = -J^-1 dF/dp; for one quantity x[k] and many p the
 * adjoint a = J^-T e_k gives dx[k]/dp = -a . dF/dp with one solve.
 */
#include "solve/linearised.h"

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

/* Whether values of the cell may depend on the temperature by themselves. */
static bool names_thermal_voltage(const struct circuit *c)
{
    const struct source_set *sources = &c->cell->sources;
    for (int k = 0; k < sources->count; k++) {
        if (strstr(sources->files[k].text, "thermal_voltage") != NULL) {
            return true;
        }
    }
    return false;
}

/* Adds factor * F(x) of the cell built for another temperature. STATUS_INPUT when it cannot be
 * built, STATUS_MEMORY. */
static enum status add_residual_at(const struct system *s, double kelvin, long double factor,
                                   const long double *x, long double *slope)
{
    struct circuit_settings settings = s->circuit->settings;
    struct diagnostics unseen = {.arena = s->arena};
    struct circuit *circuit = NULL;
    settings.kelvin = kelvin;
    const enum status built = circuit_build(s->circuit->cell, &settings, &unseen, &circuit);
    if (built != STATUS_OK) {
        return built;
    }
    struct system *other = system_create(circuit, kelvin, s->conditions.effects);
    long double *f =
        other == NULL ? NULL : arena_new_array(other->arena, long double, 2 * (size_t)other->n);
    if (f == NULL) {
        system_free(other);
        circuit_free(circuit);
        return STATUS_MEMORY;
    }
    bool good = other->n == s->n && circuit->instance_count == s->circuit->instance_count;
    for (int k = 0; good && k < circuit->instance_count; k++) {
        /* Values that a sweep has turned stay turned. */
        for (int v = 0; v < circuit->instances[k].type->parameter_count; v++) {
            const double turned = s->own[k][v], base = s->circuit->instances[k].own[v];
            if (!(turned == base) && !(isnan(turned) && isnan(base))) {
                system_set(other, k, v, turned);
            }
        }
    }
    good = good && other->face.evaluate_extended(other, x, f, f + s->n, NULL);
    for (int k = 0; good && k < s->n; k++) {
        slope[k] += factor * f[k];
    }
    system_free(other);
    circuit_free(circuit);
    return good ? STATUS_OK : STATUS_INPUT;
}

/* dF/dT where lets and laws contain thermal_voltage: the whole cell is built anew on both sides. */
static enum status rebuilt_temperature_slope(const struct system *s, const long double *x,
                                             long double *slope)
{
    const double above = s->conditions.kelvin + 1e-3, below = s->conditions.kelvin - 1e-3;
    const long double width = (long double)above - below;
    memset(slope, 0, (size_t)s->n * sizeof *slope);
    const enum status status = add_residual_at(s, above, 1 / width, x, slope);
    return status != STATUS_OK ? status : add_residual_at(s, below, -1 / width, x, slope);
}

bool linearised_temperature(struct operating_point *p, int branch, long double *slope)
{
    struct system *s = p->system;
    const struct workspace w = workspace_of(p);
    enum status status = STATUS_INPUT;
    if ((s->conditions.effects & EFFECT_TEMPERATURE) != 0 && names_thermal_voltage(s->circuit)) {
        status = rebuilt_temperature_slope(s, p->refined, w.b);
    }
    if (status == STATUS_MEMORY) {
        return false;
    }
    if (status != STATUS_OK) {
        system_temperature_slope(s, p->refined, w.b);
    }
    solve(p, &w, false);
    *slope = -w.y[branch];
    return true;
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
