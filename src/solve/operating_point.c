/*
 * operating_point.c: the ladder of searches for a resting state, and the polish.
 */
#include "solve/operating_point.h"

#include <math.h>
#include <string.h>

#include "solve/search.h"

bool operating_point_create(struct operating_point *p, struct system *system,
                            bool (*stopped)(void *self), void *stopped_self)
{
    *p = (struct operating_point){.system = system,
                                  .stopped = stopped,
                                  .stopped_self = stopped_self,
                                  .stalled_equation = -1,
                                  .stalled_column = -1,
                                  .best_residual = INFINITY};
    p->x = arena_new_array(system->arena, double, system->n);
    p->refined = arena_new_array(system->arena, long double, system->n);
    p->values = arena_new_array(system->arena, long double, system->nonzeros);
    p->best = arena_new_array(system->arena, double, system->n);
    p->saved = arena_new_array(system->arena, double, system->n);
    p->linear = arena_new_array(system->arena, long double, 4 * (size_t)system->n);
    return p->linear != NULL && p->saved != NULL && p->best != NULL && p->x != NULL &&
           p->refined != NULL && p->values != NULL;
}

bool search_ends(enum newton_status status)
{
    return status == NEWTON_STOPPED || status == NEWTON_MEMORY;
}

struct newton_options search_newton_options(const struct operating_point *p)
{
    struct newton_options options = newton_default_options();
    options.stopped = p->stopped;
    options.stopped_self = p->stopped_self;
    return options;
}

struct continuation_options search_walk_options(const struct operating_point *p)
{
    struct continuation_options options = continuation_default_options();
    options.newton.stopped = p->stopped;
    options.newton.stopped_self = p->stopped_self;
    return options;
}

/* Newton from a guess is given up early: what it has not solved by then, settling does sooner. */
enum { COLD_ITERATIONS = 60 };
/* A residual below this in a search that stalled may be rounding alone. */
static const double near_root = 1e-2;
/* What the polish must reach for a stalled search to count as a root. */
static const double polished = 1e-9;

/* Widens x, polishes it and measures it. */
static enum newton_status polish(struct operating_point *p, double *worst, int *equation)
{
    struct system *s = p->system;
    for (int k = 0; k < s->n; k++) {
        p->refined[k] = p->x[k];
    }
    return newton_polish(&s->face, s->solver, p->refined, p->values, s->extended_work, worst,
                         equation);
}

/*
 * Where a high gain magnifies the rounding of double (an opamp of 1e9), the plain iteration stalls
 * next to the root; in long double it gets there.
 */
static enum newton_status newton_within(struct operating_point *p, int iteration_limit)
{
    struct system *s = p->system;
    struct newton_options options = search_newton_options(p);
    options.iteration_limit = iteration_limit;
    enum newton_status status =
        newton_solve(&s->face, s->solver, &options, p->x, s->work, &p->report);
    if ((status == NEWTON_STALLED || status == NEWTON_LIMIT) && s->embedding == EMBED_NONE &&
        p->report.residual < near_root) {
        double worst = INFINITY;
        int equation;
        const enum newton_status refined = polish(p, &worst, &equation);
        if (refined == NEWTON_MEMORY) {
            return NEWTON_MEMORY;
        }
        if (refined == NEWTON_CONVERGED && worst < polished) {
            for (int k = 0; k < s->n; k++) {
                p->x[k] = (double)p->refined[k];
            }
            status = NEWTON_CONVERGED;
        }
    }
    return status;
}

enum newton_status operating_point_newton(struct operating_point *p)
{
    return newton_within(p, newton_default_options().iteration_limit);
}

/* A node whose equation, or whose voltage, takes part in nothing: the plain reason of a singular
 * matrix, which the column without a pivot may be far from. -1: none. */
static int find_loose(const struct system *s, const double *values, double *seen)
{
    const struct pattern *pattern = s->face.pattern;
    memset(seen, 0, 2 * (size_t)s->n * sizeof *seen);
    for (int column = 0; column < s->n; column++) {
        for (int k = pattern->start[column]; k < pattern->start[column + 1]; k++) {
            seen[column] = fmax(seen[column], fabs(values[k]));
            seen[s->n + pattern->row[k]] = fmax(seen[s->n + pattern->row[k]], fabs(values[k]));
        }
    }
    for (int k = 0; k < s->node_count; k++) {
        if (!(seen[k] > 0) || !(seen[s->n + k] > 0)) {
            return k;
        }
    }
    return -1;
}

/* The largest relative residual of the plain system at p->x, INFINITY when it has none. The
 * searches report that of their own, embedded one, which may well be solved. */
static double plain_residual(struct operating_point *p, int *equation, int *loose)
{
    struct system *s = p->system;
    double *f = arena_new_array(s->arena, double, 2 * (size_t)s->n + (size_t)s->nonzeros);
    double worst = -1;
    *loose = -1;
    if (f == NULL || !s->face.evaluate(s, p->x, f, f + s->n, f + 2 * s->n)) {
        return INFINITY;
    }
    for (int k = 0; k < s->n; k++) {
        const double share = fabs(f[k]) / fmax(f[s->n + k], 1e-300);
        if (!(share <= worst)) {
            worst = share;
            *equation = k;
        }
    }
    *loose = find_loose(s, f + 2 * s->n, f);
    return worst < 0 ? INFINITY : worst;
}

/* Remembers where a search came to an end, for the message. */
static void note_failure(struct operating_point *p, enum newton_status status)
{
    int equation = -1, loose;
    const double residual = plain_residual(p, &equation, &loose);
    if (loose >= 0) {
        p->stalled_column = loose;
        p->is_loose = true;
    } else if (status == NEWTON_SINGULAR && !p->is_loose) {
        p->stalled_column = p->report.column;
    }
    if (residual < p->best_residual) {
        p->best_residual = residual;
        memcpy(p->best, p->x, (size_t)p->system->n * sizeof *p->best);
        p->stalled_equation = equation;
    }
}

/* Newton again, from the guess in which the current of one mirror sets the voltage of the next. */
static enum newton_status try_balanced(struct operating_point *p)
{
    const bool good =
        operating_point_guess(p->system, p->x) && operating_point_balance(p->system, p->x);
    return good ? newton_within(p, COLD_ITERATIONS) : NEWTON_MEMORY;
}

/* --- the ladder: each starts from p->x and leaves a root of the plain system there ------------ */

static enum newton_status try_direct(struct operating_point *p)
{
    return operating_point_guess(p->system, p->x) ? newton_within(p, COLD_ITERATIONS)
                                                  : NEWTON_MEMORY;
}

static enum newton_status try_settling(struct operating_point *p)
{
    if (!operating_point_guess(p->system, p->x)) {
        return NEWTON_MEMORY;
    }
    enum newton_status status = search_settle(p, false);
    if (status != NEWTON_CONVERGED && !search_ends(status)) {
        const bool good =
            operating_point_guess(p->system, p->x) && operating_point_balance(p->system, p->x);
        status = good ? search_settle(p, false) : NEWTON_MEMORY;
    }
    return status;
}

static enum newton_status try_patient_settling(struct operating_point *p)
{
    const bool good =
        operating_point_guess(p->system, p->x) && operating_point_balance(p->system, p->x);
    return good ? search_settle(p, true) : NEWTON_MEMORY;
}

enum newton_status search_walk(struct operating_point *p, enum embedding embedding,
                               const struct continuation_options *options)
{
    struct system *s = p->system;
    s->embedding = embedding;
    enum newton_status status = continuation_walk(&s->face, s->solver, options, 0, 1, p->x,
                                                  &p->reached, s->work, &p->report);
    s->embedding = EMBED_NONE;
    s->lambda = 1;
    return status;
}

static enum newton_status walk(struct operating_point *p, enum embedding embedding)
{
    const struct continuation_options options = search_walk_options(p);
    return search_walk(p, embedding, &options);
}

static enum newton_status try_sources(struct operating_point *p)
{
    memset(p->x, 0, (size_t)p->system->n * sizeof *p->x);
    return walk(p, EMBED_SOURCES);
}

/*
 * The square law has no current below threshold, so a search that gets there sees no slope. It is
 * therefore started from the all-region solution of the same cell, whose weak inversion is then
 * halved again and again (published_test.c shows that its limit is the square law).
 */
static enum newton_status try_blended(struct operating_point *p)
{
    struct system *s = p->system;
    const unsigned effects = s->conditions.effects;
    if ((effects & EFFECT_INVERSION) != 0) {
        return NEWTON_STALLED;
    }
    system_conditions(s, s->conditions.kelvin, effects | EFFECT_INVERSION);
    static enum newton_status (*const searches[])(struct operating_point *) = {
        try_direct, try_balanced, try_settling, try_patient_settling, try_sources};
    enum newton_status status = NEWTON_STALLED;
    for (size_t k = 0; k < sizeof searches / sizeof searches[0]; k++) {
        status = status == NEWTON_CONVERGED || search_ends(status) ? status : searches[k](p);
    }
    if (status == NEWTON_CONVERGED) {
        status = walk(p, EMBED_INVERSION);
    }
    s->conditions.inversion_cut = 0;
    system_conditions(s, s->conditions.kelvin, effects);
    return status;
}

static enum newton_status try_conductance(struct operating_point *p)
{
    double *anchor = arena_new_array(p->system->arena, double, p->system->n);
    if (anchor == NULL || !operating_point_guess(p->system, anchor)) {
        return NEWTON_MEMORY;
    }
    memcpy(p->x, anchor, (size_t)p->system->n * sizeof *anchor);
    p->system->anchor = anchor;
    return walk(p, EMBED_CONDUCTANCE);
}

static enum newton_status trace(struct operating_point *p, enum embedding embedding)
{
    struct system *s = p->system;
    struct continuation_options options = search_walk_options(p);
    bool ended = false;
    options.step_limit = 4000;
    s->embedding = embedding;
    s->face.set_parameter(s, 0);
    enum newton_status status = operating_point_newton(p);
    if (status == NEWTON_CONVERGED) {
        status = arclength_trace(&s->face, &options, 0, 1, p->x, NULL, NULL, &ended, &p->report);
    }
    s->embedding = EMBED_NONE;
    s->lambda = 1;
    return status == NEWTON_CONVERGED ? operating_point_newton(p) : status;
}

static enum newton_status try_arclength(struct operating_point *p)
{
    memset(p->x, 0, (size_t)p->system->n * sizeof *p->x);
    enum newton_status status = trace(p, EMBED_SOURCES);
    if (status != NEWTON_CONVERGED && !search_ends(status)) {
        if (p->system->anchor != NULL) {
            memcpy(p->x, p->system->anchor, (size_t)p->system->n * sizeof *p->x);
        }
        status = trace(p, EMBED_CONDUCTANCE);
    }
    return status;
}

/* Sets every opamp's gain to at most `limit`; the largest gain of the cell. */
static double limit_gain(struct operating_point *p, double limit)
{
    struct system *s = p->system;
    double largest = 0;
    for (int k = 0; k < s->circuit->instance_count; k++) {
        const struct instance *instance = &s->circuit->instances[k];
        const int gain =
            parameter_find(instance->type->parameters, instance->type->parameter_count, "gain");
        if (gain >= 0) {
            system_set(s, k, gain, fmin(instance->own[gain], limit));
            largest = fmax(largest, instance->own[gain]);
        }
    }
    return largest;
}

/*
 * An opamp of high gain is a cliff between two flat sides, where no slope leads on. With a low gain
 * the cell is easily solved; the gain then grows by decades, each from the last solution.
 */
static enum newton_status try_gain(struct operating_point *p)
{
    double limit = 100;
    const double largest = limit_gain(p, limit);
    if (!(largest > limit)) {
        return NEWTON_STALLED;
    }
    enum newton_status status = try_direct(p);
    for (; status == NEWTON_CONVERGED && limit < largest;) {
        limit *= 10;
        limit_gain(p, limit);
        status = operating_point_newton(p);
    }
    limit_gain(p, INFINITY);
    return status;
}

static const struct {
    const char *name;
    enum newton_status (*search)(struct operating_point *p);
} ladder[] = {
    {"direct", try_direct},
    {"balanced start", try_balanced},
    {"settling", try_settling},
    {"from the all-region solution", try_blended},
    {"gain stepping", try_gain},
    {"patient settling", try_patient_settling},
    {"source stepping", try_sources},
    {"conductance stepping", try_conductance},
    {"arclength continuation", try_arclength},
};

enum status operating_point_find(struct operating_point *p)
{
    const size_t rungs = sizeof ladder / sizeof ladder[0];
    for (size_t k = 0; k < rungs; k++) {
        const enum newton_status status = ladder[k].search(p);
        if (status == NEWTON_STOPPED) {
            return STATUS_STOPPED;
        }
        if (status == NEWTON_MEMORY) {
            return STATUS_MEMORY;
        }
        if (status == NEWTON_CONVERGED) {
            p->solver.method = ladder[k].name;
            return operating_point_polish(p);
        }
        note_failure(p, status);
    }
    trouble_tell(p);
    return STATUS_UNSOLVED;
}

enum status operating_point_polish(struct operating_point *p)
{
    struct system *s = p->system;
    double worst = INFINITY;
    int equation = -1;
    const enum newton_status status = polish(p, &worst, &equation);
    if (status == NEWTON_MEMORY) {
        return STATUS_MEMORY;
    }
    p->solver.converged = status == NEWTON_CONVERGED && worst < polished;
    p->solver.iterations = p->report.iterations;
    p->solver.worst_residual = worst;
    p->solver.worst_name = equation < 0 ? "" : trouble_name(p, equation);
    p->solver.limited_by = NULL;
    if (arena_failed(s->arena)) { /* a name was lost */
        return STATUS_MEMORY;
    }
    if (!p->solver.converged) {
        note_failure(p, status);
        trouble_tell(p);
        return arena_failed(s->arena) ? STATUS_MEMORY : STATUS_UNSOLVED;
    }
    if (!(worst < 1e-12) && !trouble_tell_limit(p)) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < s->n; k++) {
        p->x[k] = (double)p->refined[k];
    }
    return STATUS_OK;
}

enum status operating_point_status(enum newton_status status)
{
    return status == NEWTON_CONVERGED ? STATUS_OK
           : status == NEWTON_STOPPED ? STATUS_STOPPED
           : status == NEWTON_MEMORY  ? STATUS_MEMORY
                                      : STATUS_UNSOLVED;
}
