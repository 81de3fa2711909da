/*
 * lanes_engine.c: Newton's iteration over lanes; compiled once a width.
 */
#include <math.h>
#include <string.h>

#include "analyses/lanes.h"
#include "devices/real.h"
#include "numerics/random_lanes.h"
#include "numerics/replay.h"

enum { LOCAL = DEVICE_LOCAL_LIMIT, STEP_LIMIT = 12 };

/* A step this long, V, is for the search with its damping. */
static const double longest = 1;
/* A step must shorten to this share of the one before: newton.c asks the same of a whole step. */
static const double contraction = 0.75;
/* The residual is measured once the last step was below this: a lane is not done before. */
static const double near = 1e-4;
/* A lane whose 1 + shift falls below this is prepared by its device. */
static const double least_share = 1e-3;

/* An instance as its equations see it. */
struct part {
    const struct device_lanes *lanes; /* NULL: one lane at a time by the type */
    const struct device_type *type;
    real *block; /* values that mismatch moves, then the prepared block */
    const int *local, *slots;
    int local_count;
};

/* A deviate. */
struct moved {
    real *value;
    double base, sigma;
    double *slope; /* [n] how the point moves with the shift, to first order */
    enum deviate_rule rule;
    bool is_even, goes_on; /* goes_on: adds to the shift of the one before */
    int instance;
    size_t place;
};

struct lanes_engine {
    struct system *system;
    struct replay *replay;
    struct part *parts;
    struct moved *moved;
    int moved_count;
    real *deviates;            /* [moved_count] */
    real *home, *x, *dx;       /* [n] */
    real *f, *scale, *inverse; /* [n]; scale is also the right side; inverse: of the pivots */
    real *values;              /* [replay->size] */
    const double *weight;      /* [n] */
    struct system_measure measure;
};

/* --- opening ------------------------------------------------------------------------------------
 */

static real *new_reals(struct arena *arena, size_t count)
{
    char *memory = arena_array(arena, count + 1, sizeof(real));
    if (memory == NULL) {
        return NULL;
    }
    const size_t over = (size_t)((uintptr_t)memory % sizeof(real));
    return (real *)(void *)(memory + (over == 0 ? 0 : sizeof(real) - over));
}

static const void *block_of(const struct part *part)
{
    return part->block + MOVED_LIMIT;
}

/* Which of the moved values a deviate is; -1: the equations read none such. */
static int moved_row(const struct part *part, const struct deviate *deviate)
{
    for (int d = 0; part->lanes != NULL && d < part->lanes->moved_count; d++) {
        if (part->lanes->moved[d] == deviate->moved) {
            return d;
        }
    }
    return -1;
}

static double prepared_value(const struct system *s, int instance, size_t place)
{
    double value;
    memcpy(&value, (const char *)system_block(s, instance) + place, sizeof value);
    return value;
}

static bool open_parts(struct lanes_engine *e, struct arena *arena)
{
    const struct system *s = e->system;
    const struct circuit *c = s->circuit;
    e->parts = arena_new_array(arena, struct part, c->instance_count);
    for (int k = 0; e->parts != NULL && k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const struct device_type *type = instance->type;
        const size_t size = type->prepared_size;
        struct part *part = &e->parts[k];
        *part = (struct part){REAL_NAME(device)(type),
                              type,
                              new_reals(arena, MOVED_LIMIT + size / sizeof(real) + 1),
                              instance->local,
                              s->slots + s->first_slot[k],
                              instance->local_count};
        if (part->block == NULL) {
            return false;
        }
        memcpy(part->block + MOVED_LIMIT, system_block(s, k), size);
        for (int d = 0; part->lanes != NULL && d < part->lanes->moved_count; d++) {
            part->block[d] = lanes_of(prepared_value(s, k, part->lanes->moved[d]));
        }
    }
    return e->parts != NULL;
}

/* False: a deviate that lanes cannot follow, or no memory. */
static bool open_moved(struct lanes_engine *e, const struct mismatch *m, struct arena *arena)
{
    const struct system *s = e->system;
    e->moved_count = m->count;
    e->moved = arena_new_array(arena, struct moved, m->count);
    e->deviates = new_reals(arena, (size_t)m->count + 1);
    if (e->moved == NULL || e->deviates == NULL) {
        return false;
    }
    for (int k = 0; k < m->count; k++) {
        const struct mismatch_row *row = &m->rows[k];
        const struct instance *instance = &s->circuit->instances[row->instance];
        const int place = moved_row(&e->parts[row->instance], row->deviate);
        const double own = instance->own[row->deviate->own_parameter];
        if (place < 0 || own < 0 || own > 0) {
            return false;
        }
        e->moved[k] = (struct moved){.value = &e->parts[row->instance].block[place],
                                     .base = prepared_value(s, row->instance, row->deviate->moved),
                                     .sigma = row->sigma,
                                     .rule = row->deviate->rule,
                                     .is_even = row->is_even,
                                     .goes_on = k > 0 && m->rows[k - 1].instance == row->instance &&
                                                m->rows[k - 1].deviate->own_parameter ==
                                                    row->deviate->own_parameter,
                                     .instance = row->instance,
                                     .place = row->deviate->moved};
    }
    return true;
}

/* False when memory is short. */
static bool find_slopes(struct lanes_engine *e, const struct mismatch *m, const double *home,
                        struct arena *arena)
{
    struct system *s = e->system;
    const size_t n = (size_t)s->n;
    long double *wide = arena_new_array(arena, long double, 2 * n);
    for (size_t i = 0; wide != NULL && i < n; i++) {
        wide[i] = home[i];
    }
    for (int k = 0; wide != NULL && k < m->count; k++) {
        e->moved[k].slope = arena_new_array(arena, double, n);
        if (e->moved[k].slope == NULL) {
            return false;
        }
        system_slope(s, m->rows[k].instance, m->rows[k].deviate->own_parameter, wide, wide + n);
        for (size_t i = 0; i < n; i++) {
            e->moved[k].slope[i] = -(double)wide[n + i];
        }
        linear_solve(s->solver, e->moved[k].slope);
    }
    return wide != NULL;
}

/* False when memory is short, or a deviate is not for lanes. */
static bool open_arrays(struct lanes_engine *e, const struct mismatch *mismatch, const double *home,
                        struct arena *arena)
{
    const size_t n = (size_t)e->system->n;
    e->home = new_reals(arena, n);
    e->x = new_reals(arena, n);
    e->dx = new_reals(arena, n);
    e->f = new_reals(arena, n);
    e->scale = new_reals(arena, n);
    e->inverse = new_reals(arena, n);
    e->values = new_reals(arena, (size_t)e->replay->size);
    return e->home != NULL && e->x != NULL && e->dx != NULL && e->f != NULL && e->scale != NULL &&
           e->inverse != NULL && e->values != NULL && open_parts(e, arena) &&
           open_moved(e, mismatch, arena) && find_slopes(e, mismatch, home, arena);
}

static struct lanes_engine *begin_engine(struct system *s, const struct mismatch *mismatch,
                                         const double *home, const double *home_values,
                                         struct arena *arena, enum status *status)
{
    const size_t n = (size_t)s->n;
    int *order = arena_new_array(arena, int, 2 * n);
    *status = STATUS_MEMORY;
    if (order == NULL) {
        return NULL;
    }
    if (s->n > REPLAY_LIMIT || !linear_pivots(s->solver, order, order + n)) {
        *status = STATUS_OK;
        return NULL;
    }
    struct lanes_engine *e = arena_new(arena, struct lanes_engine);
    struct replay *replay = replay_make(s->solver, s->face.pattern, home_values, arena);
    if (e == NULL || replay == NULL) {
        return NULL;
    }
    *e = (struct lanes_engine){.system = s, .replay = replay, .measure = system_measure()};
    const bool is_ready = open_arrays(e, mismatch, home, arena);
    *status = arena_failed(arena) ? STATUS_MEMORY : STATUS_OK;
    if (!is_ready) {
        return NULL;
    }
    e->weight = s->weight;
    for (size_t k = 0; k < n; k++) {
        e->home[k] = lanes_of(home[k]);
    }
    return e;
}

/* --- the samples --------------------------------------------------------------------------------
 */

static real shift_of(const struct moved *m, real z)
{
    if (m->is_even) {
        for (int l = 0; l < LANES; l++) {
            z[l] = mismatch_even(z[l]);
        }
    }
    return m->sigma * z;
}

/* Draws the samples and starts each from the own point, moved to first order; the lanes that can be
 * prepared here. */
static lanes_truth draw(struct lanes_engine *e, uint64_t seed, uint64_t first)
{
    lanes_truth good = lanes_of(0) < lanes_of(1);
    real shift = lanes_of(0);
    const int n = e->system->n;
    random_normals_lanes(seed, first, e->moved_count, e->deviates);
    memcpy(e->x, e->home, (size_t)n * sizeof *e->x);
    for (int k = 0; k < e->moved_count; k++) {
        const struct moved *m = &e->moved[k];
        const real own = shift_of(m, e->deviates[k]);
        for (int i = 0; i < n; i++) {
            e->x[i] += m->slope[i] * own;
        }
        shift = m->goes_on ? shift + own : own;
        if (m->rule == DEVIATE_ADDS) {
            *m->value = m->base + shift;
        } else {
            *m->value = m->base * (1 + shift);
            good &= 1 + shift > lanes_of(least_share);
        }
    }
    return good;
}

/* --- the equations ------------------------------------------------------------------------------
 */

/* A device without lanes. */
static void evaluate_singly(const struct part *part, const real *local, real *f, real *jac)
{
    const int n = part->local_count;
    double x[LOCAL], one[LOCAL], slopes[LOCAL * LOCAL];
    for (int l = 0; l < LANES; l++) {
        for (int k = 0; k < n; k++) {
            x[k] = local[k][l];
        }
        part->type->evaluate(block_of(part), x, one, slopes);
        for (int k = 0; k < n; k++) {
            f[k][l] = one[k];
        }
        for (int k = 0; k < n * n; k++) {
            jac[k][l] = slopes[k];
        }
    }
}

/* The magnitudes of system.c that meet in the equations of one part. */
static void add_scale(struct lanes_engine *e, const struct part *part, const real *local,
                      const real *f, const real *jac)
{
    const struct system *s = e->system;
    const int n = part->local_count;
    const struct system_measure measure = e->measure;
    for (int r = 0; r < n; r++) {
        const int row = part->local[r];
        if (row < 0) {
            continue;
        }
        real size = lanes_abs(f[r]);
        for (int q = 0; q < n; q++) {
            const real slope = lanes_abs(jac[n * r + q]), volts = lanes_abs(local[q]);
            const real counted = lanes_choose(slope < lanes_of(1), slope, lanes_of(1));
            size += row < s->node_count
                        ? slope * (part->local[q] < s->node_count ? measure.volts : measure.amperes)
                        : counted * (volts + measure.volts);
            size += measure.rounding * (slope * volts);
        }
        e->scale[row] += size;
    }
}

static void evaluate(struct lanes_engine *e, bool with_scale)
{
    const int n = e->system->n;
    memset(e->f, 0, (size_t)n * sizeof *e->f);
    memset(e->scale, 0, (size_t)n * sizeof *e->scale);
    memset(e->values, 0, (size_t)e->replay->size * sizeof *e->values);
    for (int k = 0; k < e->system->circuit->instance_count; k++) {
        const struct part *part = &e->parts[k];
        const int count = part->local_count;
        const int *slot = part->slots;
        real local[LOCAL], f[LOCAL], jac[LOCAL * LOCAL];
        for (int l = 0; l < count; l++) {
            local[l] = part->local[l] < 0 ? lanes_of(0) : e->x[part->local[l]];
        }
        if (part->lanes != NULL) {
            part->lanes->evaluate(block_of(part), local, f, jac);
        } else {
            evaluate_singly(part, local, f, jac);
        }
        for (int r = 0; r < count; r++) {
            if (part->local[r] < 0) {
                continue;
            }
            e->f[part->local[r]] += f[r];
            for (int q = 0; q < count; q++) {
                const int place = *slot++;
                if (place >= 0) {
                    e->values[place] += jac[count * r + q];
                }
            }
        }
        if (with_scale) {
            add_scale(e, part, local, f, jac);
        }
    }
}

/* --- the linear equations -----------------------------------------------------------------------
 */

/* Factors in place. The lanes whose pivots are still good; NaN is not. */
static lanes_truth factor(struct lanes_engine *e)
{
    const struct replay *r = e->replay;
    const int *below = r->below, *right = r->right, *target = r->target;
    const double *largest = r->largest;
    real *v = e->values;
    lanes_truth good = lanes_of(0) < lanes_of(1);
    for (int k = 0; k < r->n; k++) {
        const struct replay_pivot *p = &r->pivots[k];
        const real inverse = 1 / v[p->place];
        e->inverse[k] = inverse;
        good &= lanes_abs(inverse) < lanes_of(INFINITY);
        for (int i = 0; i < p->below_count; i++) {
            const real multiplier = v[*below] * inverse;
            v[*below++] = multiplier;
            good &= lanes_abs(multiplier) <= lanes_of(*largest++);
            for (int j = 0; j < p->right_count; j++) {
                v[*target++] -= multiplier * v[right[j]];
            }
        }
        right += p->right_count;
    }
    return good;
}

/* dx = -J^-1 f. */
static void solve_step(struct lanes_engine *e)
{
    const struct replay *r = e->replay;
    const int *below = r->below, *below_row = r->below_row;
    const real *v = e->values;
    int rights = 0;
    for (int k = 0; k < r->n; k++) {
        const struct replay_pivot *p = &r->pivots[k];
        const real b = e->scale[p->row];
        for (int i = 0; i < p->below_count; i++) {
            e->scale[*below_row++] -= v[*below++] * b;
        }
        rights += p->right_count;
    }
    for (int k = r->n - 1; k >= 0; k--) {
        const struct replay_pivot *p = &r->pivots[k];
        real b = e->scale[p->row];
        rights -= p->right_count;
        for (int j = 0; j < p->right_count; j++) {
            b -= v[r->right[rights + j]] * e->dx[r->right_column[rights + j]];
        }
        e->dx[p->column] = b * e->inverse[k];
    }
}

/* --- Newton -------------------------------------------------------------------------------------
 */

/* What a step is; the names of newton.c. */
struct step {
    real size;        /* largest weighted component */
    lanes_truth tiny; /* below the step tolerance in each unknown */
};

static struct step measure_step(const struct lanes_engine *e, double tolerance)
{
    struct step step = {lanes_of(0), lanes_of(0) < lanes_of(1)};
    for (int k = 0; k < e->system->n; k++) {
        if (e->weight[k] > 0) {
            const real size = lanes_abs(e->dx[k]) * e->weight[k];
            step.tiny &= size <= tolerance * (1 + lanes_abs(e->x[k]) * e->weight[k]);
            step.size = lanes_choose(size <= step.size, step.size, size); /* keeps NaN */
        }
    }
    return step;
}

static lanes_truth residual_holds(const struct lanes_engine *e, double tolerance)
{
    lanes_truth holds = lanes_of(0) < lanes_of(1);
    for (int k = 0; k < e->system->n; k++) {
        holds &= lanes_abs(e->f[k]) <= tolerance * e->scale[k];
    }
    return holds;
}

static unsigned solve(struct lanes_engine *e, uint64_t seed, uint64_t first)
{
    const struct newton_options options = newton_default_options();
    const int n = e->system->n;
    lanes_truth open = draw(e, seed, first), done = {0}, is_near = {0};
    real last = lanes_of(INFINITY);
    for (int step = 0; step < STEP_LIMIT && lanes_mask(open) != 0; step++) {
        evaluate(e, lanes_mask(open & is_near) != 0);
        const lanes_truth held = residual_holds(e, options.tolerance) & is_near;
        for (int k = 0; k < n; k++) {
            e->scale[k] = -e->f[k];
        }
        lanes_truth good = factor(e);
        solve_step(e);
        const struct step it = measure_step(e, options.step_tolerance);
        const lanes_truth is_done = open & held & it.tiny & good;
        good &= (it.tiny | (it.size <= contraction * last)) & (it.size <= lanes_of(longest));
        open &= good;
        for (int k = 0; k < n; k++) {
            e->x[k] = lanes_choose(open, e->x[k] + e->dx[k], e->x[k]);
        }
        done |= is_done;
        open &= ~is_done;
        is_near = it.size <= lanes_of(near);
        last = it.size;
    }
    return lanes_mask(done);
}

/* --- reading ------------------------------------------------------------------------------------
 */

static void read_lane(const struct lanes_engine *e, int lane, double *x)
{
    for (int k = 0; k < e->system->n; k++) {
        x[k] = e->x[k][lane];
    }
}

static void stand_in(const struct lanes_engine *e, int lane)
{
    for (int k = 0; k < e->moved_count; k++) {
        const struct moved *m = &e->moved[k];
        const double value = (*m->value)[lane];
        memcpy(e->system->prepared + e->system->block[m->instance] + m->place, &value,
               sizeof value);
    }
    system_blocks_changed(e->system);
}

#if LANES == 8
#define KIND lanes_kind_8
#define KIND_NAME "avx512"
#else
#define KIND lanes_kind_4
#define KIND_NAME "avx2"
#endif

extern const struct lanes_kind KIND;
const struct lanes_kind KIND = {.name = KIND_NAME,
                                .width = LANES,
                                .is_supported = lanes_supported,
                                .begin = begin_engine,
                                .solve = solve,
                                .read = read_lane,
                                .stand_in = stand_in};
