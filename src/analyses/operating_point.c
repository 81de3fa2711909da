/*
 * operating_point.c: the ladder of searches, and following a root.
 */
#include "analyses/operating_point.h"

#include <math.h>
#include <string.h>

#include "numerics/continuation.h"

bool operating_point_create(struct operating_point *p, struct system *system,
                            const struct analysis_options *options)
{
    *p = (struct operating_point){.system = system,
                                  .stopped = options->stopped,
                                  .stopped_self = options->stopped_self,
                                  .stalled_equation = -1,
                                  .stalled_column = -1,
                                  .best_residual = INFINITY};
    p->x = arena_new_array(system->arena, double, system->n);
    p->refined = arena_new_array(system->arena, long double, system->n);
    p->values = arena_new_array(system->arena, long double, system->nonzeros);
    p->saved = arena_new_array(system->arena, double, system->n);
    p->linear = arena_new_array(system->arena, long double, 4 * (size_t)system->n);
    return p->linear != NULL && p->saved != NULL && p->x != NULL && p->refined != NULL &&
           p->values != NULL;
}

static struct newton_options newton_settings(const struct operating_point *p)
{
    struct newton_options options = newton_default_options();
    options.stopped = p->stopped;
    options.stopped_self = p->stopped_self;
    return options;
}

static struct continuation_options walk_settings(const struct operating_point *p)
{
    struct continuation_options options = continuation_default_options();
    options.newton.stopped = p->stopped;
    options.newton.stopped_self = p->stopped_self;
    return options;
}

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
enum newton_status operating_point_newton(struct operating_point *p)
{
    struct system *s = p->system;
    const struct newton_options options = newton_settings(p);
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

/* The largest relative residual of the plain system at p->x, INFINITY when it has none. The
 * searches report that of their own, embedded one, which may well be solved. */
static double plain_residual(struct operating_point *p, int *equation)
{
    struct system *s = p->system;
    double *f = arena_new_array(s->arena, double, 2 * (size_t)s->n + (size_t)s->nonzeros);
    double worst = -1;
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
    return worst < 0 ? INFINITY : worst;
}

/* Remembers where a search came to an end, for the message. */
static void note_failure(struct operating_point *p, enum newton_status status)
{
    int equation = -1;
    const double residual = plain_residual(p, &equation);
    if (status == NEWTON_SINGULAR) {
        p->stalled_column = p->report.column;
    }
    if (residual < p->best_residual) {
        p->best_residual = residual;
        p->stalled_equation = equation;
    }
}

static bool ends_search(enum newton_status status)
{
    return status == NEWTON_STOPPED || status == NEWTON_MEMORY;
}

/* --- the ladder: each starts from p->x and leaves a root of the plain system there ------------ */

static enum newton_status try_direct(struct operating_point *p)
{
    return operating_point_guess(p->system, p->x) ? operating_point_newton(p) : NEWTON_MEMORY;
}

static enum newton_status walk(struct operating_point *p, enum embedding embedding, double from)
{
    struct system *s = p->system;
    const struct continuation_options options = walk_settings(p);
    double reached = from;
    s->embedding = embedding;
    enum newton_status status = continuation_walk(&s->face, s->solver, &options, from, 1, p->x,
                                                  &reached, s->work, &p->report);
    s->embedding = EMBED_NONE;
    s->lambda = 1;
    return status;
}

static enum newton_status try_sources(struct operating_point *p)
{
    memset(p->x, 0, (size_t)p->system->n * sizeof *p->x);
    return walk(p, EMBED_SOURCES, 0);
}

static enum newton_status try_conductance(struct operating_point *p)
{
    double *anchor = arena_new_array(p->system->arena, double, p->system->n);
    if (anchor == NULL || !operating_point_guess(p->system, anchor)) {
        return NEWTON_MEMORY;
    }
    memcpy(p->x, anchor, (size_t)p->system->n * sizeof *anchor);
    p->system->anchor = anchor;
    return walk(p, EMBED_CONDUCTANCE, 0);
}

static enum newton_status trace(struct operating_point *p, enum embedding embedding)
{
    struct system *s = p->system;
    struct continuation_options options = walk_settings(p);
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
    if (status != NEWTON_CONVERGED && !ends_search(status)) {
        if (p->system->anchor != NULL) {
            memcpy(p->x, p->system->anchor, (size_t)p->system->n * sizeof *p->x);
        }
        status = trace(p, EMBED_CONDUCTANCE);
    }
    return status;
}

/*
 * The square law has no current below threshold, so a search that starts there sees no slope. It is
 * therefore started from the all-region solution of the same cell, which lies close by.
 */
static enum newton_status try_blended(struct operating_point *p)
{
    struct system *s = p->system;
    const unsigned effects = s->conditions.effects;
    if ((effects & EFFECT_INVERSION) != 0) {
        return NEWTON_STALLED;
    }
    system_conditions(s, s->conditions.kelvin, effects | EFFECT_INVERSION);
    enum newton_status status = try_direct(p);
    if (status != NEWTON_CONVERGED && !ends_search(status)) {
        status = try_sources(p);
    }
    system_conditions(s, s->conditions.kelvin, effects);
    return status == NEWTON_CONVERGED ? operating_point_newton(p) : status;
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
    {"from the all-region solution", try_blended},
    {"gain stepping", try_gain},
    {"source stepping", try_sources},
    {"conductance stepping", try_conductance},
    {"arclength continuation", try_arclength},
};

/* --- words for a search that found nothing -------------------------------------------------- */

static const char *name_of(const struct operating_point *p, int unknown)
{
    char text[200];
    circuit_unknown_name(p->system->circuit, unknown, text, sizeof text);
    const char *name = arena_copy(p->system->arena, text, strlen(text));
    return name == NULL ? "" : name;
}

/* Devices at a node, at most three, for the message. Without memory "", as name_of: the arena
 * remembers. */
static const char *devices_at(const struct operating_point *p, int unknown)
{
    const struct circuit *c = p->system->circuit;
    struct arena *arena = p->system->arena;
    const char *text = "no device";
    int count = 0;
    for (int k = 0; k < c->instance_count && count < 3 && text != NULL; k++) {
        const struct instance *instance = &c->instances[k];
        bool touches = false;
        for (int l = 0; l < instance->local_count; l++) {
            touches |= instance->local[l] == unknown;
        }
        if (touches && !instance->is_hidden) {
            text =
                count == 0 ? instance->name : arena_format(arena, "%s, %s", text, instance->name);
            count++;
        }
    }
    return text == NULL ? "" : text;
}

static void tell_trouble(struct operating_point *p)
{
    struct arena *arena = p->system->arena;
    struct solver_result *solver = &p->solver;
    const int where = p->stalled_equation >= 0 ? p->stalled_equation : p->stalled_column;
    solver->converged = false;
    solver->method = "none";
    solver->iterations = p->report.iterations;
    solver->worst_residual = p->best_residual;
    solver->worst_name = where < 0 ? "" : name_of(p, where);
    const char *devices = where < 0 ? "" : devices_at(p, where);
    /* Balanced and singular: any voltage would do. */
    const bool open = p->best_residual < 1e-9 || !(p->best_residual < 1e-3);
    if (p->stalled_column >= 0 && open) {
        solver->trouble =
            arena_format(arena,
                         "nothing sets the %s: every device there (%s) is off or holds its current "
                         "whatever the voltage",
                         name_of(p, p->stalled_column), devices_at(p, p->stalled_column));
        solver->advice = "look for a gate or a node held by nothing, for two current sources that "
                         "face each other, or for a transistor that is off in this view";
        return;
    }
    solver->trouble = arena_format(
        arena,
        "no operating point was found: the search stalled at %s (%s); the currents there "
        "miss balance by %.3g of their sum",
        solver->worst_name, devices, p->best_residual);
    solver->advice =
        "check that currents set against each other can agree, that every device has a "
        "path for its current, and the values of the devices named";
}

/* A residual above 1e-12 after the polish: rounding, and how badly the equations carry it on. False
 * when memory is short. */
static bool tell_limit(struct operating_point *p)
{
    struct system *s = p->system;
    double *values = arena_new_array(s->arena, double, s->nonzeros);
    if (values == NULL) {
        return false;
    }
    for (int k = 0; k < s->nonzeros; k++) {
        values[k] = (double)p->values[k];
    }
    const double condition = linear_condition(s->solver, values);
    p->solver.limited_by = arena_format(
        s->arena, "rounding at %s: the equations have a condition number of about %.1e",
        p->solver.worst_name, condition);
    return p->solver.limited_by != NULL && !isnan(condition);
}

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
    tell_trouble(p);
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
    p->solver.worst_name = equation < 0 ? "" : name_of(p, equation);
    p->solver.limited_by = NULL;
    if (!p->solver.converged) {
        note_failure(p, status);
        tell_trouble(p);
        return STATUS_UNSOLVED;
    }
    if (!(worst < 1e-12) && !tell_limit(p)) {
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

enum status operating_point_move(struct operating_point *p, int instance, int parameter,
                                 double from, double to, bool *jumped)
{
    struct system *s = p->system;
    double *start = p->saved;
    memcpy(start, p->x, (size_t)s->n * sizeof *start);
    system_set(s, instance, parameter, to);
    enum newton_status status = operating_point_newton(p);
    if (status == NEWTON_CONVERGED || ends_search(status)) {
        return operating_point_status(status);
    }
    memcpy(p->x, start, (size_t)s->n * sizeof *start);
    s->knob_instance = instance;
    s->knob_parameter = parameter;
    s->knob_from = from;
    s->knob_to = to;
    status = walk(p, EMBED_KNOB, 0);
    system_set(s, instance, parameter, to);
    if (status == NEWTON_CONVERGED || ends_search(status)) {
        return operating_point_status(status);
    }
    if (jumped == NULL) {
        memcpy(p->x, start, (size_t)s->n * sizeof *start);
        return STATUS_UNSOLVED;
    }
    *jumped = true;
    const enum status found = operating_point_find(p);
    if (found != STATUS_OK) {
        memcpy(p->x, start, (size_t)s->n * sizeof *start);
    }
    return found;
}
