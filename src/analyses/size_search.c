/*
 * size_search.c: the `choose` lines as a square system, solved inside bounds.
 *
 * Unknown k is t_k (the logarithm of its value where its range is positive), equation j is r_j (the
 * logarithm of quantity over target where both have the same sign). The node equations are solved
 * at every t, so Newton's step on (t, r) is that of the extended system after its block
 * elimination, with exact derivatives by one adjoint solve an equation. Steps are damped after
 * Levenberg and Marquardt (Moré 1978) and projected on the bounds (Bertsekas 1982), so that where
 * there is no solution the search ends at the nearest point.
 */
#include <math.h>
#include <string.h>

#include "analyses/sizer.h"

enum { ITERATION_LIMIT = 60, STEP_LIMIT = 40, START_LIMIT = 27 };

/* Targets are met within this share; the roots of curves are exact to about 1e-8. */
static const double met = 1e-6, well_met = 1e-12;

static bool is_log(const struct choice *choice)
{
    return choice->from > 0;
}

double sizer_to_t(const struct choice *choice, double value)
{
    return is_log(choice) ? log(value) : value / fmax(fabs(choice->from), fabs(choice->to));
}

double sizer_from_t(const struct choice *choice, double t)
{
    const double value = is_log(choice) ? exp(t) : t * fmax(fabs(choice->from), fabs(choice->to));
    return fmin(fmax(value, choice->from), choice->to);
}

/* dp/dt */
static double rate(const struct choice *choice, double value)
{
    return is_log(choice) ? value : fmax(fabs(choice->from), fabs(choice->to));
}

/* r and dr/dq of one equation. */
static double residual(double q, double goal, double *slope)
{
    if (q * goal > 0) {
        *slope = 1 / q;
        return log(q / goal);
    }
    const double scale = fabs(goal) > 0 ? fabs(goal) : 1;
    *slope = 1 / scale;
    return (q - goal) / scale;
}

bool sizer_place_create(const struct sizer *z, struct place *place)
{
    const size_t n = (size_t)z->n;
    place->t = arena_new_array(z->arena, double, n);
    place->q = arena_new_array(z->arena, double, n);
    place->r = arena_new_array(z->arena, double, n);
    place->jac = arena_new_array(z->arena, double, n *n);
    place->cost = INFINITY;
    return place->t != NULL && place->q != NULL && place->r != NULL && place->jac != NULL;
}

/* Residual of the quantities at hand against the goals in force. */
static void compare(const struct sizer *z, struct place *place)
{
    place->cost = 0;
    for (int j = 0; j < z->n; j++) {
        double slope;
        place->r[j] = residual(place->q[j], z->goal[j], &slope);
        place->cost += place->r[j] * place->r[j] / 2;
    }
    if (!isfinite(place->cost)) {
        place->cost = INFINITY;
    }
}

static enum status read_derivatives(const struct sizer *z, struct trial *trial,
                                    struct parameter_ref *refs, struct place *place)
{
    for (int j = 0; j < z->n; j++) {
        double *row = place->jac + j * z->n;
        const enum status status =
            quantity_derivative(&trial->point, &z->probes[j], refs, z->n, &place->q[j], row, NULL);
        if (status != STATUS_OK) {
            return status;
        }
        double slope;
        residual(place->q[j], z->goal[j], &slope);
        for (int k = 0; k < z->n; k++) {
            row[k] *= slope * rate(&z->choices[k], sizer_from_t(&z->choices[k], place->t[k]));
            z->column[k] = fmax(z->column[k], fabs(row[k]));
            z->row[j] = fmax(z->row[j], fabs(row[k]));
        }
    }
    return STATUS_OK;
}

/* Solves the cell at place->t; with derivatives when asked. No state is an infinite cost. */
static enum status evaluate(struct sizer *z, struct place *place, bool derivatives)
{
    struct arena *arena = arena_create();
    double *values = arena == NULL ? NULL : arena_new_array(arena, double, z->n);
    struct parameter_ref *refs =
        values == NULL ? NULL : arena_new_array(arena, struct parameter_ref, z->n);
    if (refs == NULL) {
        arena_destroy(arena);
        return STATUS_MEMORY;
    }
    for (int k = 0; k < z->n; k++) {
        values[k] = sizer_from_t(&z->choices[k], place->t[k]);
    }
    struct trial trial;
    z->evaluations++;
    enum status status = trial_open(&trial, z->home, z->state, z->refs, values, z->n);
    if (status == STATUS_OK) {
        memcpy(z->state, trial.point.x, (size_t)trial.point.system->n * sizeof *z->state);
        for (int k = 0; k < z->n; k++) {
            refs[k] = derivative_knob(trial.point.system, &z->choices[k].knob);
        }
        status = derivatives ? read_derivatives(z, &trial, refs, place)
                             : quantity_values(&trial.point, z->probes, z->n, place->q);
    }
    if (status == STATUS_OK) {
        compare(z, place);
    } else if (status == STATUS_UNSOLVED) {
        place->cost = INFINITY;
        status = STATUS_OK;
    }
    trial_close(&trial);
    arena_destroy(arena);
    return status;
}

/* --- one step --------------------------------------------------------------------------------- */

/* Solves the n by n system in place by elimination with pivoting; false when it is singular. */
static bool solve_dense(double *a, double *b, int n)
{
    for (int k = 0; k < n; k++) {
        int pivot = k;
        for (int i = k + 1; i < n; i++) {
            pivot = fabs(a[i * n + k]) > fabs(a[pivot * n + k]) ? i : pivot;
        }
        if (!(fabs(a[pivot * n + k]) > 0)) {
            return false;
        }
        for (int c = 0; c < n; c++) {
            const double held = a[k * n + c];
            a[k * n + c] = a[pivot * n + c];
            a[pivot * n + c] = held;
        }
        const double held = b[k];
        b[k] = b[pivot];
        b[pivot] = held;
        for (int i = k + 1; i < n; i++) {
            const double factor = a[i * n + k] / a[k * n + k];
            for (int c = k; c < n; c++) {
                a[i * n + c] -= factor * a[k * n + c];
            }
            b[i] -= factor * b[k];
        }
    }
    for (int k = n - 1; k >= 0; k--) {
        for (int c = k + 1; c < n; c++) {
            b[k] -= a[k * n + c] * b[c];
        }
        b[k] /= a[k * n + k];
    }
    return true;
}

/* An unknown at a bound whose descent leads out of the range stays there. */
static bool is_held(const struct sizer *z, const struct place *place, int k)
{
    double slope = 0;
    for (int j = 0; j < z->n; j++) {
        slope += place->jac[j * z->n + k] * place->r[j];
    }
    return (place->t[k] <= z->from[k] && slope > 0) || (place->t[k] >= z->to[k] && slope < 0);
}

/* J step = -r when nothing is held and no damping is asked for. */
static bool newton_step(const struct sizer *z, const struct place *place, double *work,
                        double *step)
{
    const int n = z->n;
    memcpy(work, place->jac, (size_t)n * (size_t)n * sizeof *work);
    for (int k = 0; k < n; k++) {
        step[k] = -place->r[k];
        if (is_held(z, place, k)) {
            return false;
        }
    }
    return solve_dense(work, step, n);
}

/* (J^T J + mu D) step = -J^T r over the free unknowns; work: [n*n]. */
static bool find_step(const struct sizer *z, const struct place *place, double mu, double *work,
                      double *step)
{
    const int n = z->n;
    if (!(mu > 0) && newton_step(z, place, work, step)) {
        return true;
    }
    for (int k = 0; k < n; k++) {
        const bool held = is_held(z, place, k);
        step[k] = 0;
        for (int c = 0; c < n; c++) {
            double sum = 0;
            for (int j = 0; j < n; j++) {
                sum += place->jac[j * n + k] * place->jac[j * n + c];
            }
            const bool out = held || is_held(z, place, c);
            work[k * n + c] = out ? (k == c ? 1 : 0) : k == c ? sum * (1 + mu) : sum;
        }
        for (int j = 0; j < n && !held; j++) {
            step[k] -= place->jac[j * n + k] * place->r[j];
        }
        if (!held && !(fabs(work[k * n + k]) > 0)) {
            work[k * n + k] = 1; /* this unknown changes nothing here */
        }
    }
    return solve_dense(work, step, n);
}

static double largest(const struct sizer *z, const struct place *place)
{
    double most = 0;
    for (int j = 0; j < z->n; j++) {
        const double size = fabs(place->r[j]);
        most = size > most || isnan(size) ? size : most;
    }
    return isfinite(place->cost) ? most : INFINITY;
}

static void place_copy(const struct sizer *z, struct place *to, const struct place *from)
{
    const size_t n = (size_t)z->n;
    memcpy(to->t, from->t, n * sizeof *to->t);
    memcpy(to->q, from->q, n * sizeof *to->q);
    memcpy(to->r, from->r, n * sizeof *to->r);
    memcpy(to->jac, from->jac, n * n * sizeof *to->jac);
    to->cost = from->cost;
}

/* From `best`, which is evaluated with derivatives, to a point where nothing improves. */
static enum status descend(struct sizer *z, struct place *best)
{
    struct place next;
    double *work = arena_new_array(z->arena, double, z->n * z->n);
    double *step = arena_new_array(z->arena, double, z->n);
    if (!sizer_place_create(z, &next) || work == NULL || step == NULL) {
        return STATUS_MEMORY;
    }
    double mu = 0;
    for (int k = 0; k < ITERATION_LIMIT && largest(z, best) > well_met; k++) {
        bool moves = false;
        if (find_step(z, best, mu, work, step)) {
            for (int u = 0; u < z->n; u++) {
                /* a factor of e^2 at most: the linear model reaches no further */
                const double bold = fmax(fmin(step[u], 2), -2);
                next.t[u] = fmin(fmax(best->t[u] + bold, z->from[u]), z->to[u]);
                moves |= fabs(next.t[u] - best->t[u]) > 1e-14 * (1 + fabs(best->t[u]));
            }
        }
        if (moves) {
            const enum status status = evaluate(z, &next, true);
            if (status != STATUS_OK) {
                return status;
            }
        }
        if (moves && next.cost < best->cost) {
            place_copy(z, best, &next);
            mu = mu < 1e-8 ? 0 : mu / 10;
        } else if (mu > 1e8 || (!moves && mu > 0) || largest(z, best) < 1e-9) {
            return STATUS_OK;
        } else {
            mu = mu > 0 ? 8 * mu : 1e-3;
        }
    }
    return STATUS_OK;
}

/* --- starts and targets in steps -------------------------------------------------------------- */

void sizer_set_goals(struct sizer *z, const double *begin, double share)
{
    for (int j = 0; j < z->n; j++) {
        const double end = z->choices[j].value;
        z->goal[j] = begin == NULL || share >= 1 ? end
                     : begin[j] * end > 0        ? begin[j] * pow(end / begin[j], share)
                                                 : begin[j] + share * (end - begin[j]);
    }
}

/* Moves the targets from what the start gives to what is asked, in steps that adapt. */
static enum status continue_targets(struct sizer *z, struct place *place)
{
    struct place held;
    double *begin = arena_new_array(z->arena, double, z->n);
    if (begin == NULL || !sizer_place_create(z, &held)) {
        return STATUS_MEMORY;
    }
    memcpy(begin, place->q, (size_t)z->n * sizeof *begin);
    double share = 0, step = 0.25;
    enum status status = STATUS_OK;
    for (int k = 0; k < STEP_LIMIT && share < 1 && step > 1e-3 && status == STATUS_OK; k++) {
        const double next = fmin(share + step, 1);
        place_copy(z, &held, place);
        sizer_set_goals(z, begin, next);
        status = evaluate(z, place, true);
        status = status == STATUS_OK ? descend(z, place) : status;
        if (status == STATUS_OK && largest(z, place) < met) {
            share = next;
            step *= 2;
        } else {
            place_copy(z, place, &held);
            step /= 4;
        }
    }
    sizer_set_goals(z, NULL, 1);
    compare(z, place);
    return status;
}

/* Places spread over the ranges: thirds of each of the first three unknowns. */
static void spread_start(const struct sizer *z, int number, double *t)
{
    static const double share[3] = {0.5, 0.1, 0.9};
    for (int k = 0; k < z->n; k++) {
        t[k] = z->from[k] + share[number % 3] * (z->to[k] - z->from[k]);
        number = k < 2 ? number / 3 : number;
    }
}

static int start_count(int n)
{
    return n == 1 ? 3 : n == 2 ? 9 : START_LIMIT;
}

static enum status try_from(struct sizer *z, const double *t, struct place *place,
                            struct place *best, bool in_steps)
{
    memcpy(place->t, t, (size_t)z->n * sizeof *t);
    memcpy(z->state, z->home->x, (size_t)z->home->system->n * sizeof *z->state);
    enum status status = evaluate(z, place, true);
    if (status == STATUS_OK && isfinite(place->cost)) {
        status = in_steps ? continue_targets(z, place) : descend(z, place);
    }
    if (status == STATUS_OK && place->cost < best->cost) {
        place_copy(z, best, place);
    }
    return status;
}

/* Newton from the own start, then with the targets in steps, then from places over the ranges. */
enum status sizer_search(struct sizer *z, struct place *best, const char **method)
{
    struct place place;
    double *start = arena_new_array(z->arena, double, z->n);
    if (start == NULL || !sizer_place_create(z, &place)) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < z->n; k++) {
        const double own = z->refs[k].value;
        const bool inside = own >= z->choices[k].from && own <= z->choices[k].to;
        start[k] = inside ? sizer_to_t(&z->choices[k], own) : (z->from[k] + z->to[k]) / 2;
    }
    *method = "Newton from the cell's own values";
    enum status status = try_from(z, start, &place, best, false);
    if (status == STATUS_OK && !sizer_is_met(z, best)) {
        *method = "Newton, the targets moved in steps";
        status = try_from(z, start, &place, best, true);
    }
    for (int k = 0; k < start_count(z->n) && status == STATUS_OK && !sizer_is_met(z, best); k++) {
        *method = "Newton from places over the ranges";
        if (z->options->progress != NULL) {
            z->options->progress(z->options->progress_self, "choose",
                                 (double)k / start_count(z->n));
        }
        spread_start(z, k, start);
        status = try_from(z, start, &place, best, false);
    }
    return status;
}

bool sizer_is_met(const struct sizer *z, const struct place *place)
{
    return largest(z, place) < met;
}
