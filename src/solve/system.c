/*
 * system.c: assembly of a circuit's equations.
 *
 * Rows: for each node the sum of the currents into the devices there (A); for each branch its own
 * equation (V). Slots are found once, so assembly is an addition per entry.
 */
#include "solve/system.h"

#include <math.h>
#include <stdint.h>
#include <string.h>

#include "numerics/continuation.h"
#include "solve/groups.h"

enum { LOCAL = DEVICE_LOCAL_LIMIT };

/* Conductance stepping: from this value, S, to nothing. */
static const double conductance_first = 1e-3;
static const double conductance_decades = 12;
/* From all-region inversion to the square law: so often is its share halved, then it is 0. */
static const double inversion_halvings = 16;

const void *system_block(const struct system *s, int k)
{
    return s->prepared + s->block[k];
}

int system_branch(const struct instance *instance)
{
    return instance->local[instance->local_count - 1];
}

void system_gather(const struct instance *instance, const double *x, double *local)
{
    for (int l = 0; l < instance->local_count; l++) {
        local[l] = instance->local[l] < 0 ? 0 : x[instance->local[l]];
    }
}

static const double *model_values(const struct system *s, int k)
{
    const double *values = s->circuit->instances[k].model_values;
    return values != NULL && values == s->swapped ? s->swapped_in : values;
}

static void prepare(struct system *s, int k)
{
    const struct instance *instance = &s->circuit->instances[k];
    struct device_conditions conditions = s->conditions;
    conditions.measured_kelvin =
        instance->model != NULL ? instance->model->measured_kelvin : s->circuit->measured_kelvin;
    const struct device_values values = {s->own[k], model_values(s, k), instance->extra,
                                         s->circuit->resistor_factor};
    instance->type->prepare(&values, &conditions, s->prepared + s->block[k]);
    if (s->groups != NULL && !s->groups_are_old) {
        groups_update(s->groups, k);
    }
}

void system_blocks_changed(struct system *s)
{
    s->groups_are_old = true;
}

void system_conditions(struct system *s, double kelvin, unsigned effects)
{
    s->conditions.kelvin = kelvin;
    s->conditions.effects = effects;
    system_blocks_changed(s);
    for (int k = 0; k < s->circuit->instance_count; k++) {
        prepare(s, k);
    }
}

int system_last_part(const struct circuit *c, int k)
{
    int last = k;
    while (last + 1 < c->instance_count && c->instances[last + 1].parent == k) {
        last++;
    }
    return last;
}

static double scale_of(const struct system *s, int k, const char *name)
{
    const struct device_type *type = s->circuit->instances[k].type;
    const int p = parameter_find(type->parameters, type->parameter_count, name);
    return p < 0 ? 1 : s->own[k][p];
}

/* The resistances in the leads follow the model, the area and the number of devices; they stand
 * behind their device in the order of its table. */
static void prepare_leads(struct system *s, int k)
{
    const struct device_type *type = s->circuit->instances[k].type;
    const int last = system_last_part(s->circuit, k);
    int lead = k;
    for (int row = 0; row < type->series_count && lead < last; row++) {
        const int p = parameter_find(type->model_parameters, type->model_parameter_count,
                                     type->series[row].model_parameter);
        if (s->circuit->instances[k].model_values[p] > 0) {
            lead++;
            s->own[lead][0] =
                model_values(s, k)[p] / (scale_of(s, k, "area") * scale_of(s, k, "m"));
            prepare(s, lead);
        }
    }
}

void system_set(struct system *s, int k, int parameter, double value)
{
    s->own[k][parameter] = value;
    prepare(s, k);
    prepare_leads(s, k);
}

void system_swap_model(struct system *s, const double *values, const double *in_place)
{
    s->swapped = in_place == NULL ? NULL : values;
    s->swapped_in = in_place;
    for (int k = 0; k < s->circuit->instance_count; k++) {
        if (s->circuit->instances[k].model_values == values && values != NULL) {
            prepare(s, k);
            prepare_leads(s, k);
        }
    }
}

/* --- embedding ------------------------------------------------------------------------------ */

static double conductance(double lambda)
{
    return lambda >= 1 ? 0
                       : conductance_first * (1 - lambda) * pow(10, -conductance_decades * lambda);
}

static double conductance_slope(double lambda)
{
    return lambda >= 1 ? 0
                       : -conductance_first * pow(10, -conductance_decades * lambda) *
                             (1 + (1 - lambda) * conductance_decades * log(10));
}

static void set_parameter(void *self, double lambda)
{
    struct system *s = self;
    s->lambda = lambda;
    if (s->embedding == EMBED_KNOB) {
        system_set(s, s->knob_instance, s->knob_parameter,
                   s->knob_from + lambda * (s->knob_to - s->knob_from));
    }
    if (s->embedding == EMBED_INVERSION) {
        const unsigned rest = s->conditions.effects & ~(unsigned)EFFECT_INVERSION;
        s->conditions.inversion_cut = lambda < 1 ? 1 - pow(2, -inversion_halvings * lambda) : 0;
        system_conditions(s, s->conditions.kelvin, lambda < 1 ? rest | EFFECT_INVERSION : rest);
    }
}

/* Sum over all sources of what they drive, at full value. */
static void add_drive(const struct system *s, double factor, double *f)
{
    for (int k = 0; k < s->circuit->instance_count; k++) {
        const struct instance *instance = &s->circuit->instances[k];
        if (instance->type->drive == NULL) {
            continue;
        }
        double local[LOCAL] = {0};
        instance->type->drive(system_block(s, k), local);
        for (int l = 0; l < instance->local_count; l++) {
            if (instance->local[l] >= 0) {
                f[instance->local[l]] += factor * local[l];
            }
        }
    }
}

static void parameter_slope(void *self, const double *x, double *slope)
{
    struct system *s = self;
    memset(slope, 0, (size_t)s->n * sizeof *slope);
    switch (s->embedding) {
    case EMBED_NONE:
    case EMBED_INVERSION: /* no tangent: the last root is the prediction */
        break;
    case EMBED_SOURCES:
        add_drive(s, 1, slope);
        break;
    case EMBED_CONDUCTANCE:
        for (int k = 0; k < s->node_count; k++) {
            slope[k] = conductance_slope(s->lambda) * (x[k] - s->anchor[k]);
        }
        break;
    case EMBED_KNOB: {
        long double *wide = s->extended_work;
        long double *out = wide + s->n;
        for (int k = 0; k < s->n; k++) {
            wide[k] = x[k];
        }
        system_slope(s, s->knob_instance, s->knob_parameter, wide, out);
        for (int k = 0; k < s->n; k++) {
            slope[k] = (double)out[k] * (s->knob_to - s->knob_from);
        }
        break;
    }
    }
}

/* --- evaluation ----------------------------------------------------------------------------- */

/*
 * The magnitude that an equation is measured against. Node: the sum of the current magnitudes, and
 * what a microvolt would drive (a node where no current flows has no other measure). Branch: the
 * volts in it, each weighted by at most 1 so that a high gain does not hide an error of the output,
 * and the same microvolt.
 */
static const double volts_floor = 1e-6;
/* The same for a branch current, which enters its nodes as it is, A. */
static const double amperes_floor = 1e-18;

static double floor_of(const struct system *s, int unknown)
{
    return unknown < s->node_count ? volts_floor : amperes_floor;
}

/*
 * In double, what rounding of the unknowns alone makes of an equation (eps |J| |x|) must pass the
 * tolerance of Newton (1e-10): an opamp of gain 1e9, a wire of a milliohm. The polish in long
 * double then removes it.
 */
static const double rounding_share = 8 * 2.220446049250313e-16 / 1e-10;

struct system_measure system_measure(void)
{
    return (struct system_measure){volts_floor, amperes_floor, rounding_share};
}

/* Adds one device. */
static void add_device(const struct system *s, int k, const double *x, double *f, double *scale,
                       double *values)
{
    const struct instance *instance = &s->circuit->instances[k];
    const int n = instance->local_count;
    const int *slot = s->slots + s->first_slot[k];
    double local[LOCAL], part[LOCAL], jac[LOCAL * LOCAL];
    system_gather(instance, x, local);
    instance->type->evaluate(system_block(s, k), local, part, jac);
    for (int r = 0; r < n; r++) {
        const int row = instance->local[r];
        if (row < 0) {
            continue;
        }
        f[row] += part[r];
        double size = fabs(part[r]);
        for (int q = 0; q < n; q++) {
            const int place = *slot++;
            if (place >= 0) {
                values[place] += jac[n * r + q];
            }
            const double slope = fabs(jac[n * r + q]);
            size += row < s->node_count ? slope * floor_of(s, instance->local[q])
                                        : fmin(slope, 1) * (fabs(local[q]) + volts_floor);
            size += rounding_share * slope * fabs(local[q]);
        }
        scale[row] += size;
    }
}

/* Adds all devices, like ones side by side. */
static void add_devices(struct system *s, const double *x, double *f, double *scale, double *values)
{
    const int count = s->circuit->instance_count;
    struct groups *groups = s->groups;
    if (groups == NULL) {
        for (int k = 0; k < count; k++) {
            add_device(s, k, x, f, scale, values);
        }
        return;
    }
    if (s->groups_are_old) {
        groups_make(groups);
        s->groups_are_old = false;
    }
    groups_evaluate(groups, x, f, scale, values);
    for (int k = 0; k < groups->single_count; k++) {
        add_device(s, groups->singles[k], x, f, scale, values);
    }
    for (int k = 0; groups->left_out_count > 0 && k < count; k++) {
        if (groups_left_out(groups, k)) {
            add_device(s, k, x, f, scale, values);
        }
    }
}

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    struct system *s = self;
    const struct circuit *c = s->circuit;
    memset(f, 0, (size_t)s->n * sizeof *f);
    memset(scale, 0, (size_t)s->n * sizeof *scale);
    memset(values, 0, (size_t)s->nonzeros * sizeof *values);
    s->evaluations++;
    add_devices(s, x, f, scale, values);
    if (s->embedding == EMBED_SOURCES && s->lambda != 1) {
        add_drive(s, s->lambda - 1, f);
    }
    if (s->embedding == EMBED_CONDUCTANCE && s->lambda < 1) {
        const double g = conductance(s->lambda);
        const int *slot = s->slots + s->first_slot[c->instance_count];
        for (int k = 0; k < s->node_count; k++) {
            f[k] += g * (x[k] - s->anchor[k]);
            scale[k] += g * fabs(x[k] - s->anchor[k]);
            values[slot[k]] += g;
        }
    }
    double sum = 0;
    for (int k = 0; k < s->n; k++) {
        sum += f[k];
    }
    return isfinite(sum);
}

static bool evaluate_extended(void *self, const long double *x, long double *f, long double *scale,
                              long double *values)
{
    struct system *s = self;
    const struct circuit *c = s->circuit;
    memset(f, 0, (size_t)s->n * sizeof *f);
    memset(scale, 0, (size_t)s->n * sizeof *scale);
    if (values != NULL) {
        memset(values, 0, (size_t)s->nonzeros * sizeof *values);
    }
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int n = instance->local_count;
        const int *slot = s->slots + s->first_slot[k];
        long double local[LOCAL], part[LOCAL], jac[LOCAL * LOCAL];
        for (int l = 0; l < n; l++) {
            local[l] = instance->local[l] < 0 ? 0 : x[instance->local[l]];
        }
        instance->type->evaluate_extended(system_block(s, k), local, part, jac);
        for (int r = 0; r < n; r++) {
            const int row = instance->local[r];
            if (row < 0) {
                continue;
            }
            f[row] += part[r];
            long double size = fabsl(part[r]);
            for (int q = 0; q < n; q++) {
                const int place = *slot++;
                if (place >= 0 && values != NULL) {
                    values[place] += jac[n * r + q];
                }
                const long double slope = fabsl(jac[n * r + q]);
                size += row < s->node_count ? slope * floor_of(s, instance->local[q])
                                            : fminl(slope, 1) * (fabsl(local[q]) + volts_floor);
            }
            scale[row] += size;
        }
    }
    long double sum = 0;
    for (int k = 0; k < s->n; k++) {
        sum += f[k];
    }
    return isfinite(sum);
}

static double longest_step(void *self, const double *x, const double *dx)
{
    const struct system *s = self;
    const struct circuit *c = s->circuit;
    double t = 1;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        if (instance->type->longest_step == NULL) {
            continue;
        }
        double local[LOCAL], step[LOCAL];
        system_gather(instance, x, local);
        system_gather(instance, dx, step);
        const double most = instance->type->longest_step(system_block(s, k), local, step);
        t = most < t ? most : t;
    }
    return t;
}

/* --- derivatives in values ------------------------------------------------------------------ */

static void add_residual(const struct system *s, int k, const long double *x, long double factor,
                         long double *f)
{
    const struct instance *instance = &s->circuit->instances[k];
    long double local[LOCAL], part[LOCAL], jac[LOCAL * LOCAL];
    for (int l = 0; l < instance->local_count; l++) {
        local[l] = instance->local[l] < 0 ? 0 : x[instance->local[l]];
    }
    instance->type->evaluate_extended(system_block(s, k), local, part, jac);
    for (int l = 0; l < instance->local_count; l++) {
        if (instance->local[l] >= 0) {
            f[instance->local[l]] += factor * part[l];
        }
    }
}

const double stencil_offset[STENCIL_POINTS] = {-2, -1, 1, 2};
const double stencil_weight[STENCIL_POINTS] = {1.0 / 12, -8.0 / 12, 8.0 / 12, -1.0 / 12};

double stencil_step(const struct parameter *parameter, double value)
{
    /* Relative: the fifth-order term of exponentials and the rounding of prepared values are both
     * near 1e-11. At zero: a picometre, a microvolt, ..., small in any device. */
    if (fabs(value) > 0) {
        return 1e-5 * fabs(value);
    }
    return parameter->dimension.metre > 0 ? 1e-12 : 1e-6;
}

void system_slope(struct system *s, int k, int parameter, const long double *x, long double *slope)
{
    const double value = s->own[k][parameter];
    const double step = stencil_step(&s->circuit->instances[k].type->parameters[parameter], value);
    const int last = system_last_part(s->circuit, k);
    memset(slope, 0, (size_t)s->n * sizeof *slope);
    for (int p = 0; p < STENCIL_POINTS; p++) {
        system_set(s, k, parameter, value + stencil_offset[p] * step);
        for (int part = k; part <= last; part++) {
            add_residual(s, part, x, (long double)stencil_weight[p] / step, slope);
        }
    }
    system_set(s, k, parameter, value);
}

void system_temperature_slope(struct system *s, const long double *x, long double *slope)
{
    const double kelvin = s->conditions.kelvin, step = 5e-3; /* K */
    memset(slope, 0, (size_t)s->n * sizeof *slope);
    for (int p = 0; p < STENCIL_POINTS; p++) {
        system_conditions(s, kelvin + stencil_offset[p] * step, s->conditions.effects);
        for (int k = 0; k < s->circuit->instance_count; k++) {
            add_residual(s, k, x, (long double)stencil_weight[p] / step, slope);
        }
    }
    system_conditions(s, kelvin, s->conditions.effects);
}

/* --- creation ------------------------------------------------------------------------------- */

static size_t aligned(size_t size)
{
    const size_t unit = sizeof(long double);
    return (size + unit - 1) / unit * unit;
}

static bool create_blocks(struct system *s)
{
    const struct circuit *c = s->circuit;
    s->own = arena_new_array(s->arena, double *, c->instance_count);
    s->block = arena_new_array(s->arena, size_t, c->instance_count);
    if (s->own == NULL || s->block == NULL) {
        return false;
    }
    size_t total = 0, count = 0;
    for (int k = 0; k < c->instance_count; k++) {
        s->block[k] = total;
        total += aligned(c->instances[k].type->prepared_size);
        count += (size_t)c->instances[k].type->parameter_count;
    }
    s->prepared = arena_array(s->arena, total / sizeof(long double) + 1, sizeof(long double));
    double *own = arena_new_array(s->arena, double, count);
    if (s->prepared == NULL || own == NULL) {
        return false;
    }
    for (int k = 0; k < c->instance_count; k++) {
        const size_t values = (size_t)c->instances[k].type->parameter_count;
        s->own[k] = own;
        memcpy(own, c->instances[k].own, values * sizeof *own);
        own += values;
    }
    return true;
}

/* Entries of all instances in the order in which evaluate meets them, then the node diagonals. */
static int list_entries(const struct system *s, struct entry *entries, int *places, int *first)
{
    const struct circuit *c = s->circuit;
    int count = 0, slots = 0;
    for (int k = 0; k < c->instance_count; k++) {
        const struct instance *instance = &c->instances[k];
        const int n = instance->local_count;
        const bool *pattern = instance->type->pattern;
        first[k] = slots;
        for (int r = 0; r < n; r++) {
            for (int q = 0; q < n && instance->local[r] >= 0; q++) {
                const bool used =
                    instance->local[q] >= 0 && (pattern == NULL || pattern[n * r + q]);
                if (used && entries != NULL) {
                    entries[count] = (struct entry){instance->local[r], instance->local[q]};
                }
                if (places != NULL) {
                    places[slots] = used ? count : -1;
                }
                count += used;
                slots++;
            }
        }
    }
    first[c->instance_count] = slots;
    for (int k = 0; k < s->node_count; k++, count++, slots++) {
        if (entries != NULL) {
            entries[count] = (struct entry){k, k};
        }
        if (places != NULL) {
            places[slots] = count;
        }
    }
    return count;
}

static bool create_pattern(struct system *s)
{
    const struct circuit *c = s->circuit;
    s->first_slot = arena_new_array(s->arena, int, c->instance_count + 1);
    if (s->first_slot == NULL) {
        return false;
    }
    const int count = list_entries(s, NULL, NULL, s->first_slot);
    const int slots = s->first_slot[c->instance_count] + s->node_count;
    struct arena *scratch = arena_create();
    struct entry *entries = scratch == NULL ? NULL : arena_new_array(scratch, struct entry, count);
    int *found = entries == NULL ? NULL : arena_new_array(scratch, int, count);
    s->slots = arena_new_array(s->arena, int, slots);
    bool good = found != NULL && s->slots != NULL;
    if (good) {
        list_entries(s, entries, s->slots, s->first_slot);
        s->face.pattern = pattern_build(s->arena, s->n, entries, count, found);
        good = s->face.pattern != NULL;
    }
    for (int k = 0; good && k < slots; k++) {
        s->slots[k] = s->slots[k] < 0 ? -1 : found[s->slots[k]];
    }
    arena_destroy(scratch);
    return good;
}

static bool create_work(struct system *s)
{
    const size_t plain = newton_work_size(&s->face), walk = continuation_walk_work_size(&s->face);
    const size_t polish = newton_polish_work_size(&s->face), refine = 3 * (size_t)s->n;
    s->work = arena_new_array(s->arena, double, plain > walk ? plain : walk);
    s->extended_work = arena_new_array(s->arena, long double, polish > refine ? polish : refine);
    s->weight = arena_new_array(s->arena, double, s->n);
    if (s->work == NULL || s->extended_work == NULL || s->weight == NULL) {
        return false;
    }
    for (int k = 0; k < s->node_count; k++) {
        s->weight[k] = 1;
    }
    s->face.weight = s->weight;
    s->solver = linear_create(s->face.pattern);
    return s->solver != NULL;
}

struct system *system_create(const struct circuit *circuit, double kelvin, unsigned effects)
{
    struct arena *arena = arena_create();
    struct system *s = arena == NULL ? NULL : arena_new(arena, struct system);
    if (s == NULL) {
        arena_destroy(arena);
        return NULL;
    }
    s->arena = arena;
    s->circuit = circuit;
    s->n = circuit->unknown_count;
    s->node_count = circuit->node_count - 1;
    s->lambda = 1;
    s->face = (struct nonlinear_system){.n = s->n,
                                        .self = s,
                                        .evaluate = evaluate,
                                        .evaluate_extended = evaluate_extended,
                                        .longest_step = longest_step,
                                        .set_parameter = set_parameter,
                                        .parameter_slope = parameter_slope};
    if (!create_blocks(s) || !create_pattern(s)) {
        system_free(s);
        return NULL;
    }
    s->nonzeros = s->face.pattern->start[s->n];
    if (!create_work(s)) {
        system_free(s);
        return NULL;
    }
    s->groups = groups_create(s);
    if (arena_failed(arena)) {
        system_free(s);
        return NULL;
    }
    system_conditions(s, kelvin, effects);
    return s;
}

void system_free(struct system *system)
{
    if (system != NULL) {
        linear_destroy(system->solver);
        arena_destroy(system->arena);
    }
}
