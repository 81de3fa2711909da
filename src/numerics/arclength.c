/*
 * arclength.c: pseudo-arclength continuation (Keller 1977; Allgower and Georg 1990, chapters 4-6).
 *
 * The parameter joins the unknowns as u[n] = (lambda - from)/(to - from), so that 0 is the start
 * and 1 the target. One more equation closes the system:
 *
 *     B(u) = [ J   F_u ]      the last row holds W^2 t: t the tangent at the last point, W the
 *            [ W^2 t'  ]      weights of the unknowns (1 for u[n])
 *
 *     t' W^2 (u - base) - h = 0
 *
 * B is regular at a fold, where J is not. newton_solve is the corrector; its last factors give the
 * next tangent from B z = e(n+1), which keeps the orientation because t' W^2 z = 1 > 0. By
 * Cramer's rule z[n] = det J / det B, so that sign det J = sign det B * sign z[n].
 *
 * With the last row e(n+1) and h = 0 the same system holds the parameter: it gives the start and
 * the roots at lambda = to.
 */
#include "numerics/continuation.h"

#include <math.h>

enum {
    EASY_ITERATIONS = 4,       /* of the corrector: the step may grow */
    CORRECTOR_ITERATIONS = 12, /* more means that the step was too long */
    CROSSING_LIMIT = 3,        /* roots of a cubic */
    BISECTIONS = 50
};

static const double LONGEST_STEP = 5;      /* in units of the first step */
static const double SMALLEST_COSINE = 0.8; /* of the turn of the tangent within a step */
static const double EASY_COSINE = 0.97;
/* A turn of the parameter this close to the target, in units of the step squared, is looked at with
 * a shorter step, unless that is short already. The cubic is good to the fourth power of the step.
 */
static const double TURN_DOUBT = 0.01;
static const double SHORT_ENOUGH = 1e-3;
static const double LARGEST_CORRECTION = 0.5; /* of the step; more may be another branch */

struct trace {
    const struct nonlinear_system *system;
    struct nonlinear_system bordered; /* n + 1 unknowns */
    struct linear_solver *solver;     /* of the bordered system */
    struct continuation_options options;
    struct newton_report *report;
    double from, to;

    int *slot_inner, *slot_slope, *slot_row; /* places in the bordered values */
    double *inner_values, *slope;            /* [nonzeros], [n] of the system */
    double *weight;                          /* [n + 1] */
    double *base, *row;                      /* [n + 1] of the closing equation */
    double distance;                         /* h */

    double *u, *tangent;               /* [n + 1] the last accepted point */
    double *next, *next_tangent;       /* [n + 1] the candidate */
    double *guess;                     /* [n + 1] */
    double *root[CROSSING_LIMIT];      /* [n + 1] roots at u[n] = 1 within the step */
    int root_sign[CROSSING_LIMIT];     /* sign of det J there */
    double root_share[CROSSING_LIMIT]; /* of the step */
    int root_count;
    double *newton_work;
    double arc;
    int next_sign; /* sign of det J at the candidate */
};

static bool bordered_evaluate(void *self, const double *u, double *f, double *scale, double *values)
{
    struct trace *t = self;
    const struct nonlinear_system *s = t->system;
    const int n = s->n;
    s->set_parameter(s->self, u[n] == 1 ? t->to : t->from + u[n] * (t->to - t->from));
    if (!s->evaluate(s->self, u, f, scale, t->inner_values)) {
        return false;
    }
    s->parameter_slope(s->self, u, t->slope);
    for (int k = 0; k < s->pattern->start[n]; k++) {
        values[t->slot_inner[k]] = t->inner_values[k];
    }
    for (int i = 0; i < n; i++) {
        values[t->slot_slope[i]] = t->slope[i] * (t->to - t->from);
    }
    f[n] = -t->distance;
    scale[n] = 1; /* the closing equation is a length in units of the way: absolute is right */
    for (int k = 0; k <= n; k++) {
        f[n] += t->row[k] * (u[k] - t->base[k]);
        values[t->slot_row[k]] = t->row[k];
    }
    return isfinite(f[n]);
}

static double bordered_longest_step(void *self, const double *u, const double *du)
{
    struct trace *t = self;
    return t->system->longest_step(t->system->self, u, du);
}

/* The pattern of the system with a dense last column and row. */
static struct pattern *bordered_pattern(struct trace *t, struct arena *arena)
{
    const struct pattern *inner = t->system->pattern;
    const int n = inner->n;
    const int nonzeros = inner->start[n];
    const int count = nonzeros + 2 * n + 1;
    struct entry *entries = arena_new_array(arena, struct entry, count);
    int *slots = arena_new_array(arena, int, count);
    if (entries == NULL || slots == NULL) {
        return NULL;
    }
    int used = 0;
    for (int column = 0; column < n; column++) {
        for (int k = inner->start[column]; k < inner->start[column + 1]; k++) {
            entries[used++] = (struct entry){inner->row[k], column};
        }
    }
    for (int i = 0; i < n; i++) {
        entries[used++] = (struct entry){i, n};
    }
    for (int k = 0; k <= n; k++) {
        entries[used++] = (struct entry){n, k};
    }
    t->slot_inner = slots;
    t->slot_slope = slots + nonzeros;
    t->slot_row = slots + nonzeros + n;
    return pattern_build(arena, n + 1, entries, count, slots);
}

/* Everything the trace needs; the linear solver apart. False: memory is short. */
static bool prepare(struct trace *t, struct arena *arena)
{
    const struct nonlinear_system *s = t->system;
    const int n = s->n;
    struct pattern *pattern = bordered_pattern(t, arena);
    if (pattern == NULL) {
        return false;
    }
    t->inner_values = arena_new_array(arena, double, s->pattern->start[n]);
    t->slope = arena_new_array(arena, double, n);
    double **const vectors[] = {&t->weight,  &t->base,    &t->row,         &t->u,
                                &t->tangent, &t->next,    &t->guess,       &t->root[0],
                                &t->root[1], &t->root[2], &t->next_tangent};
    for (size_t i = 0; i < sizeof vectors / sizeof vectors[0]; i++) {
        *vectors[i] = arena_new_array(arena, double, n + 1);
    }
    t->bordered = (struct nonlinear_system){.n = n + 1,
                                            .pattern = pattern,
                                            .self = t,
                                            .evaluate = bordered_evaluate,
                                            .weight = t->weight};
    if (s->longest_step != NULL) {
        t->bordered.longest_step = bordered_longest_step;
    }
    t->newton_work = arena_new_array(arena, double, newton_work_size(&t->bordered));
    if (arena_failed(arena)) {
        return false;
    }
    for (int k = 0; k < n; k++) {
        t->weight[k] = s->weight != NULL ? s->weight[k] : 1;
    }
    t->weight[n] = 1;
    t->solver = linear_create(pattern);
    return t->solver != NULL;
}

static void copy(double *to, const double *from, int count)
{
    for (int k = 0; k < count; k++) {
        to[k] = from[k];
    }
}

/* Weighted Euclidean length. */
static double length_of(const struct trace *t, const double *v)
{
    double sum = 0;
    for (int k = 0; k <= t->system->n; k++) {
        sum += (t->weight[k] * v[k]) * (t->weight[k] * v[k]);
    }
    return sqrt(sum);
}

static double distance_of(const struct trace *t, const double *a, const double *b)
{
    double sum = 0;
    for (int k = 0; k <= t->system->n; k++) {
        double d = t->weight[k] * (a[k] - b[k]);
        sum += d * d;
    }
    return sqrt(sum);
}

/* Closing equation: the parameter is held at `value`. */
static void hold_parameter(struct trace *t, double value)
{
    const int n = t->system->n;
    for (int k = 0; k <= n; k++) {
        t->row[k] = 0;
        t->base[k] = 0;
    }
    t->row[n] = 1;
    t->distance = value;
}

/* Closing equation: a plane across the tangent, h away from the last point. */
static void cross_tangent(struct trace *t, double h)
{
    for (int k = 0; k <= t->system->n; k++) {
        t->row[k] = t->weight[k] * t->weight[k] * t->tangent[k];
        t->base[k] = t->u[k];
    }
    t->distance = h;
}

/* Newton on the bordered system from u, in place. */
static enum newton_status correct(struct trace *t, double *u)
{
    return newton_solve(&t->bordered, t->solver, &t->options.newton, u, t->newton_work, t->report);
}

/* Tangent from the factors of the last correction, of length 1, in the direction of the last row;
 * cosine out: of the angle to the last tangent. Returns the sign of det J, cosine NaN if lost. */
static int take_tangent(struct trace *t, double *tangent, double *cosine)
{
    const int n = t->system->n;
    for (int k = 0; k < n; k++) {
        tangent[k] = 0;
    }
    tangent[n] = 1;
    linear_solve(t->solver, tangent);
    const double length = length_of(t, tangent);
    *cosine = length > 0 && isfinite(length) ? 1 / length : NAN;
    const int turn = (tangent[n] > 0) - (tangent[n] < 0);
    for (int k = 0; k <= n; k++) {
        tangent[k] /= length;
    }
    return linear_determinant_sign(t->solver) * turn;
}

/* Cubic with the ends and slopes of one component over the step (Hermite). */
static double hermite(const struct trace *t, int k, double h, double share)
{
    double a = share * share * (3 - 2 * share);
    double b = share * (1 - share) * (1 - share);
    double c = share * share * (share - 1);
    return (1 - a) * t->u[k] + a * t->next[k] + h * (b * t->tangent[k] + c * t->next_tangent[k]);
}

/* Refines the crossing of u[n] = 1 between two shares of the step. False: Newton went elsewhere. */
static bool refine_crossing(struct trace *t, double h, double low, double high,
                            enum newton_status *status)
{
    const int n = t->system->n;
    const bool rises = hermite(t, n, h, high) > 1;
    for (int i = 0; i < BISECTIONS; i++) {
        double middle = (low + high) / 2;
        if ((hermite(t, n, h, middle) > 1) == rises) {
            high = middle;
        } else {
            low = middle;
        }
    }
    for (int k = 0; k <= n; k++) {
        t->guess[k] = hermite(t, k, h, high);
    }
    double *root = t->root[t->root_count];
    copy(root, t->guess, n + 1);
    root[n] = 1;
    hold_parameter(t, 1);
    *status = correct(t, root);
    if (*status != NEWTON_CONVERGED ||
        !(distance_of(t, root, t->guess) <= LARGEST_CORRECTION * h)) {
        return false;
    }
    /* The last row is e(n+1): det B = det J. */
    t->root_sign[t->root_count] = linear_determinant_sign(t->solver);
    t->root_share[t->root_count] = high;
    t->root_count++;
    return true;
}

/* Where the cubic of the parameter turns within the step: 0 to 2 shares, rising. */
static int find_turns(const struct trace *t, double h, double *turn)
{
    const int n = t->system->n;
    const double rise = t->next[n] - t->u[n];
    const double before = h * t->tangent[n];
    const double after = h * t->next_tangent[n];
    /* Its slope is a s^2 + 2 b s + c. */
    const double a = 3 * (before + after - 2 * rise);
    const double b = 3 * rise - 2 * before - after;
    const double c = before;
    const double root = b * b - a * c;
    if (!(root > 0)) {
        return 0;
    }
    const double q = -(b + copysign(sqrt(root), b)); /* no cancellation */
    double low = fmin(c / q, q / a);
    double high = fmax(c / q, q / a);
    int count = 0;
    if (low > 0 && low < 1) {
        turn[count++] = low;
    }
    if (high > 0 && high < 1) {
        turn[count++] = high;
    }
    return count;
}

/* Collects the roots at u[n] = 1 that the step passes. False: the step must be shorter. */
static bool find_crossings(struct trace *t, double h, enum newton_status *status)
{
    const int n = t->system->n;
    t->root_count = 0;
    double share[CROSSING_LIMIT + 1] = {0};
    const int turns = find_turns(t, h, share + 1);
    share[turns + 1] = 1;
    double before = t->u[n] - 1;
    for (int i = 1; i <= turns + 1; i++) {
        double here = i <= turns ? hermite(t, n, h, share[i]) - 1 : t->next[n] - 1;
        /* A turn so near the target that the cubic cannot tell on which side it lies. */
        if (i <= turns && fabs(here) <= TURN_DOUBT * h * h && h > SHORT_ENOUGH) {
            return false;
        }
        /* A start exactly on the target was found by the last step. */
        if (before != 0 && (before > 0) != (here > 0) &&
            !refine_crossing(t, h, share[i - 1], share[i], status)) {
            return false;
        }
        before = here;
    }
    return true;
}

/* One step of length h from u to `next`; crossings too. CONVERGED, or why it must be shorter. */
static enum newton_status try_step(struct trace *t, double h, bool *is_easy)
{
    const int n = t->system->n;
    cross_tangent(t, h);
    for (int k = 0; k <= n; k++) {
        t->guess[k] = t->u[k] + h * t->tangent[k];
    }
    copy(t->next, t->guess, n + 1);
    const int before = t->report->iterations;
    enum newton_status status = correct(t, t->next);
    if (status != NEWTON_CONVERGED) {
        return status;
    }
    *is_easy = t->report->iterations - before <= EASY_ITERATIONS;
    double cosine;
    t->next_sign = take_tangent(t, t->next_tangent, &cosine);
    if (!(cosine >= SMALLEST_COSINE) ||
        !(distance_of(t, t->next, t->guess) <= LARGEST_CORRECTION * h)) {
        return NEWTON_STALLED;
    }
    *is_easy = *is_easy && cosine >= EASY_COSINE;
    if (find_crossings(t, h, &status)) {
        return NEWTON_CONVERGED;
    }
    if (status != NEWTON_CONVERGED) {
        return status;
    }
    return NEWTON_STALLED;
}

static bool show(const struct trace *t, const double *u, double arc, int det_sign, bool at_target,
                 bool (*visit)(void *self, const struct trace_point *point), void *visit_self)
{
    const int n = t->system->n;
    struct trace_point point = {.x = u,
                                .lambda = at_target ? t->to : t->from + u[n] * (t->to - t->from),
                                .arc = arc,
                                .det_sign = det_sign,
                                .at_target = at_target};
    return visit(visit_self, &point);
}

/* Shows the roots of the step and its end. found: a root is in x. False: the visitor ended it. */
static bool show_step(struct trace *t, double h, double *x, bool *found,
                      bool (*visit)(void *self, const struct trace_point *point), void *visit_self)
{
    const int n = t->system->n;
    for (int i = 0; i < t->root_count; i++) {
        if (!*found) {
            copy(x, t->root[i], n);
            *found = true;
        }
        if (visit == NULL || !show(t, t->root[i], t->arc + t->root_share[i] * h, t->root_sign[i],
                                   true, visit, visit_self)) {
            return false;
        }
    }
    return visit == NULL || show(t, t->next, t->arc + h, t->next_sign, false, visit, visit_self);
}

/* Solves at the start and takes the first tangent. */
static enum newton_status start(struct trace *t, const double *x)
{
    const int n = t->system->n;
    copy(t->u, x, n);
    t->u[n] = 0;
    hold_parameter(t, 0);
    enum newton_status status = correct(t, t->u);
    if (status != NEWTON_CONVERGED) {
        return status;
    }
    double cosine;
    t->next_sign = take_tangent(t, t->tangent, &cosine);
    t->options.newton.iteration_limit = CORRECTOR_ITERATIONS;
    return isnan(cosine) ? NEWTON_SINGULAR : NEWTON_CONVERGED;
}

/* The trace itself; found out: x holds a root at `to`. */
static enum newton_status follow(struct trace *t, double *x, bool *found, bool *ended,
                                 bool (*visit)(void *self, const struct trace_point *point),
                                 void *visit_self)
{
    const int n = t->system->n;
    enum newton_status status = start(t, x);
    if (status != NEWTON_CONVERGED) {
        return status;
    }
    copy(x, t->u, n);
    if (visit != NULL && !show(t, t->u, 0, t->next_sign, false, visit, visit_self)) {
        *ended = true;
        return NEWTON_CONVERGED;
    }
    double h = t->options.first_step;
    for (int steps = 0; steps < t->options.step_limit; steps++) {
        bool is_easy = false;
        status = try_step(t, h, &is_easy);
        if (status != NEWTON_CONVERGED) {
            h /= 2;
            if (status == NEWTON_STOPPED || status == NEWTON_MEMORY ||
                !(h >= t->options.least_step)) {
                return status;
            }
            continue;
        }
        bool goes_on = show_step(t, h, x, found, visit, visit_self);
        if (!*found) {
            copy(x, t->next, n);
        }
        if (!goes_on) {
            *ended = visit != NULL;
            return NEWTON_CONVERGED;
        }
        t->arc += h;
        copy(t->u, t->next, n + 1);
        copy(t->tangent, t->next_tangent, n + 1);
        h = is_easy ? fmin(2 * h, LONGEST_STEP * t->options.first_step) : h;
    }
    return NEWTON_LIMIT;
}

enum newton_status arclength_trace(const struct nonlinear_system *system,
                                   const struct continuation_options *options, double from,
                                   double to, double *x,
                                   bool (*visit)(void *self, const struct trace_point *point),
                                   void *visit_self, bool *ended, struct newton_report *report)
{
    struct trace trace = {
        .system = system, .options = *options, .report = report, .from = from, .to = to};
    bool wish = false;
    bool found = false;
    enum newton_status status = NEWTON_MEMORY;
    struct arena *arena = arena_create();
    if (arena != NULL && prepare(&trace, arena)) {
        status = follow(&trace, x, &found, &wish, visit, visit_self);
    }
    linear_destroy(trace.solver);
    arena_destroy(arena);
    if (ended != NULL) {
        *ended = wish;
    }
    /* Whatever stopped the trace later, the target was reached. */
    if (found && status != NEWTON_STOPPED && status != NEWTON_MEMORY) {
        system->set_parameter(system->self, to);
        return NEWTON_CONVERGED;
    }
    return status;
}
