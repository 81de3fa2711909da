/*
 * explain.c: the lattice of effects, solved, and the share of each effect.
 */
#include "analyses/explain.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/derivative.h"
#include "solve/measure.h"
#include "analyses/output.h"
#include "analyses/quantity.h"

enum { QUANTITY_LIMIT = 32 };

/* Shares below this part of the greatest need no sentence. */
static const double share_that_matters = 0.02;

/* Corner `code` of the lattice has the effects whose bits of `code` are set. */
struct lattice {
    const struct circuit *circuit;
    const struct analysis_options *options;
    struct arena *arena; /* scratch */
    struct system *system;
    struct operating_point point;
    int bits[EFFECT_COUNT];
    int bit_count;
    int corner_count;     /* 1 << bit_count */
    double **states;      /* [corner_count] [n]; NULL: not solved */
    struct probe *probes; /* [hand_count] */
    int probe_count;
    double *values; /* [corner_count * probe_count] */
};

/* --- which effects there are -------------------------------------------------------------------
 */

static bool blocks_differ(const struct system *s, const char *before)
{
    for (int k = 0; k < s->circuit->instance_count; k++) {
        if (memcmp(s->prepared + s->block[k], before + s->block[k],
                   s->circuit->instances[k].type->prepared_size) != 0) {
            return true;
        }
    }
    return false;
}

static bool switching_changes(struct system *s, unsigned from, unsigned to, char *copy, size_t size)
{
    system_conditions(s, s->conditions.kelvin, from);
    memcpy(copy, s->prepared, size);
    system_conditions(s, s->conditions.kelvin, to);
    return blocks_differ(s, copy);
}

bool explain_effects(struct system *s, unsigned *effects)
{
    const unsigned before = s->conditions.effects;
    const int count = s->circuit->instance_count;
    const size_t size =
        count == 0 ? 0 : s->block[count - 1] + s->circuit->instances[count - 1].type->prepared_size;
    char *copy = malloc(size + 1);
    if (copy == NULL) {
        return false;
    }
    *effects = 0;
    for (int bit = 0; bit < EFFECT_COUNT; bit++) {
        const unsigned effect = 1u << bit;
        if (switching_changes(s, EFFECTS_HAND, effect, copy, size) ||
            switching_changes(s, EFFECTS_FULL, EFFECTS_FULL & ~effect, copy, size)) {
            *effects |= effect;
        }
    }
    free(copy);
    system_conditions(s, s->conditions.kelvin, before);
    return true;
}

/* --- the corners -------------------------------------------------------------------------------
 */

/* Effects of a corner. Those that the cell lacks are on: they change nothing. */
static unsigned corner_effects(const struct lattice *l, int code)
{
    unsigned effects = EFFECTS_FULL;
    for (int b = 0; b < l->bit_count; b++) {
        if ((code & 1 << b) == 0) {
            effects &= ~(1u << l->bits[b]);
        }
    }
    return effects;
}

/* From a neighbour that differs in one effect, else from cold. */
static enum status solve_corner(struct lattice *l, int code)
{
    struct operating_point *p = &l->point;
    const size_t size = (size_t)l->system->n * sizeof *p->x;
    for (int b = 0; b < l->bit_count; b++) {
        const double *near = l->states[code ^ 1 << b];
        if (near == NULL) {
            continue;
        }
        memcpy(p->x, near, size);
        const enum newton_status status = operating_point_newton(p);
        if (status == NEWTON_STOPPED || status == NEWTON_MEMORY) {
            return status == NEWTON_STOPPED ? STATUS_STOPPED : STATUS_MEMORY;
        }
        if (status == NEWTON_CONVERGED) {
            return operating_point_polish(p);
        }
    }
    return operating_point_find(p);
}

static enum status read_corner(struct lattice *l, int code)
{
    system_conditions(l->system, l->circuit->kelvin, corner_effects(l, code));
    l->states[code] = NULL;
    enum status status = solve_corner(l, code);
    double *values = l->values + (size_t)code * (size_t)l->probe_count;
    for (int k = 0; k < l->probe_count; k++) {
        values[k] = NAN;
    }
    if (status != STATUS_OK) {
        return status == STATUS_UNSOLVED ? STATUS_OK : status;
    }
    l->states[code] = arena_new_array(l->arena, double, l->system->n);
    if (l->states[code] == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(l->states[code], l->point.x, (size_t)l->system->n * sizeof *l->point.x);
    status = quantity_values(&l->point, l->probes, l->probe_count, values);
    return status == STATUS_UNSOLVED ? STATUS_OK : status;
}

/* In Gray order from the full view, so that each corner has a solved neighbour. */
static enum status read_all(struct lattice *l)
{
    for (int k = 0; k < l->corner_count; k++) {
        const int code = (l->corner_count - 1) ^ (k ^ k >> 1);
        if (l->options->progress != NULL) {
            l->options->progress(l->options->progress_self, "effects", (double)k / l->corner_count);
        }
        const enum status status = read_corner(l, code);
        if (status != STATUS_OK) {
            return status;
        }
    }
    return STATUS_OK;
}

static enum status lattice_open(struct lattice *l, const struct operating_point *home,
                                const struct analysis_options *options)
{
    const struct circuit *c = home->system->circuit;
    *l = (struct lattice){.circuit = c, .options = options, .arena = arena_create()};
    l->system = system_create(c, c->kelvin, EFFECTS_FULL);
    if (l->arena == NULL || l->system == NULL ||
        !operating_point_create(&l->point, l->system, options->stopped, options->stopped_self)) {
        return STATUS_MEMORY;
    }
    unsigned effects;
    if (!explain_effects(l->system, &effects)) {
        return STATUS_MEMORY;
    }
    for (int bit = 0; bit < EFFECT_COUNT; bit++) {
        if ((effects & 1u << bit) != 0) {
            l->bits[l->bit_count++] = bit;
        }
    }
    l->corner_count = 1 << l->bit_count;
    l->probe_count = c->hand_count;
    l->states = arena_new_array(l->arena, double *, l->corner_count);
    l->probes = arena_new_array(l->arena, struct probe, l->probe_count);
    l->values =
        arena_new_array(l->arena, double, (size_t)l->corner_count *(size_t)(l->probe_count + 1));
    if (l->states == NULL || l->probes == NULL || l->values == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < l->probe_count; k++) {
        l->probes[k] = c->hands[k].probe;
    }
    /* the full view is the state at hand, not another one that a search might find */
    double *state = arena_new_array(l->arena, double, l->system->n);
    if (state == NULL) {
        return STATUS_MEMORY;
    }
    memcpy(state, home->x, (size_t)l->system->n * sizeof *state);
    memcpy(l->point.x, state, (size_t)l->system->n * sizeof *state);
    if (l->bit_count > 0) {
        l->states[l->corner_count - 2] = state; /* seeds the first corner; overwritten later */
    }
    return STATUS_OK;
}

static void lattice_close(struct lattice *l)
{
    system_free(l->system);
    arena_destroy(l->arena);
}

/* --- the value ----------------------------------------------------------------------------------
 */

static double corner_value(const struct lattice *l, int code, int probe, bool as_conductance)
{
    const double value = l->values[(size_t)code * (size_t)l->probe_count + (size_t)probe];
    if (!as_conductance) {
        return value;
    }
    return isnan(value) && l->states[code] != NULL ? 0 : 1 / value;
}

/*
 * Orders of switching the effects on, from corner `base` to the full view, of which every corner
 * has a value. Where all have one, these are all orders, and the shares are the Shapley values.
 */
struct orders {
    double *before, *after; /* [corner_count] of the ways from base to a corner, and on to full */
    int base;               /* the corner of the fewest effects that leads to full; -1: none */
    double count, all;      /* from base to full; if there were no gaps */
};

static int effect_count(int code)
{
    int count = 0;
    for (; code != 0; code &= code - 1) {
        count++;
    }
    return count;
}

/* Ways by neighbours that have one effect less (side 0) or more. */
static double ways_by(const struct lattice *l, const double *ways, int code, bool more)
{
    double sum = 0;
    for (int b = 0; b < l->bit_count; b++) {
        sum += ((code & 1 << b) == 0) == more ? ways[code ^ 1 << b] : 0;
    }
    return sum;
}

static bool find_orders(const struct lattice *l, int probe, bool as_conductance, struct orders *o)
{
    const int full = l->corner_count - 1;
    *o = (struct orders){.before = arena_new_array(l->arena, double, l->corner_count),
                         .after = arena_new_array(l->arena, double, l->corner_count),
                         .base = -1,
                         .all = 1};
    if (o->before == NULL || o->after == NULL) {
        return false;
    }
    for (int code = full; code >= 0; code--) {
        if (isfinite(corner_value(l, code, probe, as_conductance))) {
            o->after[code] = code == full ? 1 : ways_by(l, o->after, code, true);
        }
        if (o->after[code] > 0 && (o->base < 0 || effect_count(code) <= effect_count(o->base))) {
            o->base = code;
        }
    }
    for (int code = o->base; code >= 0 && code <= full; code++) {
        if (o->after[code] > 0) {
            o->before[code] = code == o->base ? 1 : ways_by(l, o->before, code, false);
        }
    }
    o->count = o->base < 0 ? 0 : o->after[o->base];
    for (int k = l->bit_count - effect_count(o->base < 0 ? 0 : o->base); k > 1; k--) {
        o->all *= k;
    }
    return true;
}

/* Share of effect b: the mean over the orders of what it adds. */
static double mean_share(const struct lattice *l, const struct orders *o, int b, int probe,
                         bool as_conductance)
{
    long double sum = 0;
    for (int code = 0; code < l->corner_count; code++) {
        const int with = code | 1 << b;
        const double weight = with == code ? 0 : o->before[code] * o->after[with] / o->count;
        if (weight > 0) {
            sum +=
                (long double)weight * ((long double)corner_value(l, with, probe, as_conductance) -
                                       corner_value(l, code, probe, as_conductance));
        }
    }
    return (double)sum;
}

static bool is_resistance(const struct probe *probe)
{
    return dimension_equal(probe->dimension, DIMENSION_RESISTANCE);
}

/* The first corner where the quantity has no value, -1: none. */
static int first_gap(const struct lattice *l, int probe, bool as_conductance)
{
    for (int code = l->corner_count - 1; code >= 0; code--) {
        if (!isfinite(corner_value(l, code, probe, as_conductance))) {
            return code;
        }
    }
    return -1;
}

/* "body effect, leakage"; NULL: none. */
static const char *effect_list(const struct lattice *l, int code, struct arena *arena)
{
    const char *list = NULL;
    for (int b = 0; b < l->bit_count; b++) {
        if ((code & 1 << b) != 0) {
            const char *name = effect_name(l->bits[b]);
            list = list == NULL ? name : arena_format(arena, "%s, %s", list, name);
        }
    }
    return list;
}

static const char *gap_text(const struct lattice *l, int code, struct arena *arena)
{
    const char *what =
        l->states[code] != NULL ? "the quantity has no value" : "the cell has no state";
    const char *list = effect_list(l, ~code, arena);
    return list == NULL ? what : arena_format(arena, "%s without: %s", what, list);
}

/* Which subset has a gap, and over what the shares are taken then. */
static const char *gap_note(const struct lattice *l, const struct orders *o, int gap,
                            const char *first_with, struct arena *arena)
{
    const char *which = gap_text(l, gap, arena);
    if (which != NULL && first_with != NULL) {
        which = arena_format(arena, "%s; the shares begin with this on: %s", which, first_with);
    }
    if (which != NULL && o->count < o->all) {
        which = arena_format(arena,
                             "%s; the shares are the mean over the %.0f of %.0f orders of the "
                             "effects that pass no such subset",
                             which, o->count, o->all);
    }
    return which;
}

/* --- sentences ----------------------------------------------------------------------------------
 */

/* The quantity by which the device behind a share is looked for: edges of a curve have no adjoint
 * at `at`, the current there stands for them. */
static struct probe pointer_probe(const struct probe *probe)
{
    struct probe it = *probe;
    if (it.kind == PROBE_OUTPUT) {
        it.quantity = OUTPUT_CURRENT;
    }
    return it;
}

/* The transistor that ends the range of an output, for quantities that are about that; -1: none. */
static enum status edge_device(struct operating_point *home, const struct probe *probe, int *found)
{
    struct output_result r = {0};
    *found = -1;
    if (probe->kind != PROBE_OUTPUT ||
        (probe->quantity != OUTPUT_COMPLIANCE && probe->quantity != OUTPUT_LOW &&
         probe->quantity != OUTPUT_HIGH)) {
        return STATUS_OK;
    }
    struct arena *arena = arena_create();
    enum status status = arena == NULL
                             ? STATUS_MEMORY
                             : output_edges(home, probe->index, EDGE_COMPLIANCE, arena, &r);
    if (status == STATUS_OK && r.compliance_device != NULL) {
        *found = circuit_find_instance(home->system->circuit, r.compliance_device);
    }
    arena_destroy(arena);
    return status == STATUS_OK ? operating_point_polish(home) : status;
}

/* The device through which most of an effect goes; of those in weak inversion the deepest that has
 * a tenth of it. A hidden resistance stands for its device. */
static enum status find_device(const struct lattice *l, struct operating_point *home,
                               const struct probe *probe, bool inversion, int *instance)
{
    const struct circuit *c = l->circuit;
    const struct probe pointer = pointer_probe(probe);
    double *parts = arena_new_array(l->arena, double, c->instance_count);
    if (parts == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = derivative_exchange(home, &pointer, l->system, parts);
    double most = 0, deepest = INFINITY;
    for (int k = 0; status == STATUS_OK && k < c->instance_count; k++) {
        if (fabs(parts[k]) > most) {
            most = fabs(parts[k]);
            *instance = c->instances[k].parent >= 0 ? c->instances[k].parent : k;
        }
    }
    for (int k = 0; status == STATUS_OK && inversion && k < c->instance_count; k++) {
        const int row = quantity_find(c->instances[k].type, "inversion");
        if (row >= 0 && fabs(parts[k]) > 0.1 * most) {
            const double level = measure_device_quantity(home->system, k, row, home->refined);
            if (level < deepest) {
                deepest = level;
                *instance = k;
            }
        }
    }
    return status == STATUS_MEMORY ? STATUS_MEMORY : STATUS_OK;
}

static enum status add_sentence(struct lattice *l, struct operating_point *home,
                                const struct hand_line *hand, int b, int edge, struct arena *arena,
                                const char **sentence)
{
    const struct circuit *c = l->circuit;
    const int code = (l->corner_count - 1) ^ 1 << b;
    double with[QUANTITY_LIMIT], without[QUANTITY_LIMIT];
    int instance = edge;
    if (l->states[code] == NULL) {
        return STATUS_OK;
    }
    system_conditions(l->system, c->kelvin, corner_effects(l, code));
    const bool inversion = 1u << l->bits[b] == EFFECT_INVERSION;
    if (instance < 0 || !inversion) {
        const enum status status = find_device(l, home, &hand->probe, inversion, &instance);
        if (status != STATUS_OK) {
            return status;
        }
    }
    if (instance < 0 || c->instances[instance].is_hidden) {
        return STATUS_OK;
    }
    long double *x = arena_new_array(l->arena, long double, l->system->n);
    if (x == NULL) {
        return STATUS_MEMORY;
    }
    for (int k = 0; k < l->system->n; k++) {
        x[k] = l->states[code][k];
    }
    measure_device(home->system, instance, home->refined, with);
    measure_device(l->system, instance, x, without);
    const struct instance *it = &c->instances[instance];
    const struct effect_case story = {
        .bit = l->bits[b],
        .probe = &hand->probe,
        .instance = instance,
        .with = with,
        .without = without,
        .kelvin = c->kelvin,
        .measured_kelvin = it->model != NULL ? it->model->measured_kelvin : c->measured_kelvin};
    *sentence = explain_sentence(c, &story, arena);
    return *sentence == NULL ? STATUS_MEMORY : STATUS_OK;
}

/* --- one hand line ------------------------------------------------------------------------------
 */

static int by_size(const void *a, const void *b)
{
    const double x = fabs(((const struct effect_share *)a)->share);
    const double y = fabs(((const struct effect_share *)b)->share);
    return x < y ? 1 : x > y ? -1 : 0;
}

/* The paper need not follow the square law; what lies between is a share of its own. */
static bool add_paper(struct explanation *e, double first, struct arena *arena)
{
    const double share = first - e->paper;
    const char *name =
        e->first_with == NULL
            ? "the paper beside the hand view"
            : arena_format(arena, "the paper beside the square law with %s", e->first_with);
    if (fabs(share) > 0) {
        e->shares[e->share_count++] = (struct effect_share){.effect = name, .share = share};
    }
    return name != NULL;
}

static enum status add_shares(struct lattice *l, struct operating_point *home, int h,
                              const struct orders *o, struct arena *arena, struct explanation *e)
{
    const struct hand_line *hand = &l->circuit->hands[h];
    int edge;
    const enum status found = edge_device(home, &hand->probe, &edge);
    if (found != STATUS_OK) {
        return found;
    }
    double most = 0, share[EFFECT_COUNT] = {0};
    for (int b = 0; b < l->bit_count; b++) {
        share[b] = mean_share(l, o, b, h, e->as_conductance);
        most = fmax(most, fabs(share[b]));
    }
    for (int b = 0; b < l->bit_count; b++) {
        if ((o->base & 1 << b) != 0) {
            continue;
        }
        struct effect_share *row = &e->shares[e->share_count++];
        *row = (struct effect_share){effect_name(l->bits[b]), share[b], NULL};
        if (fabs(share[b]) > share_that_matters * most) {
            const enum status status = add_sentence(l, home, hand, b, edge, arena, &row->sentence);
            if (status != STATUS_OK) {
                return status;
            }
        }
    }
    return STATUS_OK;
}

static enum status explain_line(struct lattice *l, struct operating_point *home, int h,
                                struct arena *arena, struct explanation *e)
{
    const struct hand_line *hand = &l->circuit->hands[h];
    const int full = l->corner_count - 1;
    struct orders o;
    e->as_conductance = is_resistance(&hand->probe) && first_gap(l, h, false) >= 0;
    const int gap = first_gap(l, h, e->as_conductance);
    e->paper = e->as_conductance ? 1 / hand->value : hand->value;
    e->hand_view = corner_value(l, 0, h, e->as_conductance);
    e->computed = corner_value(l, full, h, e->as_conductance);
    if (!find_orders(l, h, e->as_conductance, &o)) {
        return STATUS_MEMORY;
    }
    if (gap >= 0 && (o.base < 0 || o.base == full)) {
        e->trouble = gap_text(l, gap, arena);
        return e->trouble == NULL ? STATUS_MEMORY : STATUS_OK;
    }
    if (gap >= 0) {
        e->first_with = effect_list(l, o.base, arena);
        e->note = gap_note(l, &o, gap, e->first_with, arena);
        if (e->note == NULL || (o.base != 0 && e->first_with == NULL)) {
            return STATUS_MEMORY;
        }
    }
    e->shares = arena_new_array(arena, struct effect_share, l->bit_count + 1);
    if (e->shares == NULL) {
        return STATUS_MEMORY;
    }
    const enum status status = add_shares(l, home, h, &o, arena, e);
    if (status != STATUS_OK) {
        return status;
    }
    if (!add_paper(e, corner_value(l, o.base, h, e->as_conductance), arena)) {
        return STATUS_MEMORY;
    }
    qsort(e->shares, (size_t)e->share_count, sizeof *e->shares, by_size);
    return STATUS_OK;
}

enum status explain_hands(struct operating_point *home, const struct analysis_options *options,
                          struct result *result)
{
    const struct circuit *c = home->system->circuit;
    struct explanation *list = arena_new_array(result->arena, struct explanation, c->hand_count);
    if (list == NULL) {
        return STATUS_MEMORY;
    }
    for (int h = 0; h < c->hand_count; h++) {
        list[h] = (struct explanation){.hand = &c->hands[h],
                                       .paper = c->hands[h].value,
                                       .hand_view = NAN,
                                       .computed = NAN,
                                       .trouble = "not done"};
    }
    result->explanations = list;
    result->explanation_count = c->hand_count;
    if (c->hand_count == 0) {
        return STATUS_OK;
    }
    struct lattice lattice;
    enum status status = lattice_open(&lattice, home, options);
    if (status == STATUS_OK) {
        status = read_all(&lattice);
    }
    for (int h = 0; status == STATUS_OK && h < c->hand_count; h++) {
        list[h].trouble = NULL;
        status = explain_line(&lattice, home, h, result->arena, &list[h]);
    }
    lattice_close(&lattice);
    return status;
}
