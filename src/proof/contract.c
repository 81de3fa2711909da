/* contract.c: hull consistency and linear programs. */
#include "proof/contract.h"

#include <assert.h>
#include <float.h>
#include <string.h>

#include "interval/program.h"

enum { ROUND_LIMIT = 8, SLICE_LIMIT = 6, PLANE_TERM_LIMIT = ELEMENT_ARGUMENT_LIMIT + 3 };

/* sum coefficient * (box entry) <= bound */
struct plane {
    int count;
    int index[PLANE_TERM_LIMIT];
    double coefficient[PLANE_TERM_LIMIT];
    double bound;
};

struct contractor {
    const struct network *network;
    struct interval *parts, *before; /* [row_limit + 1] terms of a row and sums of the first ones */
    struct plane *planes;            /* [plane_limit] */
    int plane_count, plane_limit;
    void *block; /* of the program */
    double *multipliers;
    struct interval *sum; /* [size] aggregated coefficients */
    bool *is_argument;    /* [variable_count] some element looks at it */
    double *diagonal;     /* [node_count] */
};

int contract_size(const struct network *n)
{
    return n->variable_count + n->element_count;
}

struct contractor *contractor_create(const struct network *n)
{
    struct arena *arena = n->arena;
    struct contractor *c = arena_new(arena, struct contractor);
    if (c == NULL) {
        return NULL;
    }
    const int size = contract_size(n);
    c->network = n;
    c->plane_limit = 6 * n->element_count;
    const int rows = n->variable_count + c->plane_limit;
    c->parts = arena_new_array(arena, struct interval, n->row_limit + 1);
    c->before = arena_new_array(arena, struct interval, n->row_limit + 1);
    c->planes = arena_new_array(arena, struct plane, c->plane_limit);
    c->block = arena_new_array(arena, double, program_bytes(rows, size) / sizeof(double) + 1);
    c->multipliers = arena_new_array(arena, double, 2 * (size_t)rows);
    c->sum = arena_new_array(arena, struct interval, size);
    c->is_argument = arena_new_array(arena, bool, n->variable_count);
    c->diagonal = arena_new_array(arena, double, n->node_count);
    if (c->parts == NULL || c->before == NULL || c->planes == NULL || c->block == NULL ||
        c->multipliers == NULL || c->sum == NULL || c->is_argument == NULL || c->diagonal == NULL) {
        return NULL;
    }
    for (int e = 0; e < n->element_count; e++) {
        for (int k = 0; k < n->elements[e].argument_count; k++) {
            if (n->elements[e].arguments[k].variable >= 0) {
                c->is_argument[n->elements[e].arguments[k].variable] = true;
            }
        }
    }
    return c;
}

void contract_start(const struct network *n, struct interval *box)
{
    memcpy(box, n->start, (size_t)n->node_count * sizeof *box);
    for (int k = n->node_count; k < n->variable_count; k++) {
        box[k] = interval_sub(box[n->pairs[k][0]], box[n->pairs[k][1]]);
    }
    for (int e = 0; e < n->element_count; e++) {
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT];
        network_arguments(&n->elements[e], box, arguments);
        element_range(&n->elements[e], arguments, &box[n->variable_count + e], slopes);
    }
}

/* --- propagation ------------------------------------------------------------------------------ */

/* Notes how much of its width an interval has lost: *best is the largest share. */
static bool narrow(struct interval *entry, struct interval by, double *best)
{
    const double width = interval_width(*entry);
    if (!interval_meet(entry, by)) {
        return false;
    }
    const double lost = width - interval_width(*entry);
    if (lost > 0) {
        const double share = isinf(width) ? 1 : lost / width;
        *best = share > *best ? share : *best;
    }
    return true;
}

static bool narrow_row(struct contractor *c, const struct network_row *row, struct interval *box,
                       double *best)
{
    struct interval sum = row->constant;
    for (int k = 0; k < row->term_count; k++) {
        c->before[k] = sum;
        c->parts[k] = interval_mul(row->terms[k].coefficient, box[row->terms[k].index]);
        sum = interval_add(sum, c->parts[k]);
    }
    if (sum.lo > 0 || sum.hi < 0) {
        return false;
    }
    struct interval after = interval_point(0);
    for (int k = row->term_count - 1; k >= 0; k--) {
        const struct interval rest = interval_neg(interval_add(c->before[k], after));
        const struct interval value = interval_div(rest, row->terms[k].coefficient);
        if (!narrow(&box[row->terms[k].index], value, best)) {
            return false;
        }
        after = interval_add(after, c->parts[k]);
    }
    return true;
}

/* Back from a range of the argument to that of its variable. */
static struct interval variable_of(const struct argument *a, struct interval u)
{
    const struct interval v = interval_sub(u, a->shift);
    return a->sign > 0 ? v : interval_neg(v);
}

/* coefficient (exp(u/thermal) - 1) in y: u. The straight part above the limit is left alone. */
static struct interval junction_inverse(const struct element *e, struct interval y)
{
    const struct interval ratio = interval_div(y, interval_point(e->coefficient));
    struct interval u = interval_scale(e->thermal, interval_log1p(ratio));
    if (!(u.hi < 79 * e->thermal)) {
        u.hi = INFINITY;
    }
    if (!(u.lo < 79 * e->thermal)) {
        u.lo = 79 * e->thermal;
    }
    return u;
}

/* Cuts slices off both ends of argument k while the element cannot give a value in y there. */
static bool slice_argument(const struct element *e, const struct interval *arguments, int k,
                           struct interval y, struct interval *kept)
{
    struct interval trial[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
    memcpy(trial, arguments, (size_t)e->argument_count * sizeof *trial);
    for (int end = 0; end < 2; end++) {
        double share = 0.25;
        for (int cut = 0; cut < SLICE_LIMIT && share > 0.05; cut++) {
            const double width = interval_width(*kept) * share;
            const double at = end == 0 ? kept->lo + width : kept->hi - width;
            trial[k] = *kept;
            *(end == 0 ? &trial[k].hi : &trial[k].lo) = at;
            e->kind->range(e, trial, &value, slopes);
            if (value.lo > y.hi || value.hi < y.lo) {
                *(end == 0 ? &kept->lo : &kept->hi) = at;
                share = share < 0.5 ? 2 * share : 0.5;
                if (!(interval_width(*kept) > 0)) {
                    return true;
                }
            } else {
                share /= 4;
            }
        }
    }
    return true;
}

static bool narrow_element(struct contractor *c, int index, struct interval *box, double *best)
{
    const struct network *n = c->network;
    const struct element *e = &n->elements[index];
    struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
    struct interval *y = &box[n->variable_count + index];
    network_arguments(e, box, arguments);
    element_range(e, arguments, &value, slopes);
    if (!narrow(y, value, best)) {
        return false;
    }
    if (e->kind == &element_junction) {
        const struct argument *a = &e->arguments[0];
        return a->variable < 0 ||
               narrow(&box[a->variable], variable_of(a, junction_inverse(e, *y)), best);
    }
    if (!(interval_width(*y) < 0.9 * interval_width(value))) {
        return true;
    }
    for (int k = 0; k < e->argument_count; k++) {
        const struct argument *a = &e->arguments[k];
        struct interval kept = arguments[k];
        if (a->variable < 0) {
            continue;
        }
        slice_argument(e, arguments, k, *y, &kept);
        if (!narrow(&box[a->variable], variable_of(a, kept), best)) {
            return false;
        }
        arguments[k] = kept;
    }
    return true;
}

bool contract_propagate(struct contractor *c, struct interval *box)
{
    const struct network *n = c->network;
    for (int round = 0; round < ROUND_LIMIT; round++) {
        double best = 0;
        for (int r = 0; r < n->variable_count; r++) {
            if (!narrow_row(c, &n->rows[r], box, &best)) {
                return false;
            }
        }
        for (int e = 0; e < n->element_count; e++) {
            if (!narrow_element(c, e, box, &best)) {
                return false;
            }
        }
        if (best < 0.1) {
            break;
        }
    }
    return true;
}

/* --- planes ----------------------------------------------------------------------------------- */

/*
 * sign y <= sign (value + sum slope (argument - corner)), with value the end of the range at the
 * corner that makes it true.
 */
static void add_plane(struct contractor *c, int index, double sign, double value,
                      const double *slope, const double *corner)
{
    const struct network *n = c->network;
    const struct element *e = &n->elements[index];
    if (c->plane_count == c->plane_limit || !isfinite(value)) {
        return;
    }
    struct plane *p = &c->planes[c->plane_count];
    struct interval bound = interval_point(sign * value);
    p->count = 1;
    p->index[0] = n->variable_count + index;
    p->coefficient[0] = sign;
    for (int k = 0; k < e->argument_count; k++) {
        const struct argument *a = &e->arguments[k];
        if (!isfinite(slope[k]) || !isfinite(corner[k]) || fabs(slope[k]) > 1e30) {
            return;
        }
        if (a->variable < 0) {
            continue;
        }
        const struct interval step = interval_sub(a->shift, interval_point(corner[k]));
        bound = interval_add(bound, interval_scale(sign * slope[k], step));
        p->index[p->count] = a->variable;
        p->coefficient[p->count++] = -sign * slope[k] * a->sign;
    }
    p->bound = bound.hi;
    if (isfinite(p->bound)) {
        c->plane_count++;
    }
}

/* Both planes through one corner: the lower by the slopes that fall short, the upper by the rest.
 */
static void corner_planes(struct contractor *c, int index, const struct interval *arguments,
                          const struct interval *slopes, bool high)
{
    const struct element *e = &c->network->elements[index];
    struct interval at[ELEMENT_ARGUMENT_LIMIT], unused[ELEMENT_ARGUMENT_LIMIT], value;
    double corner[ELEMENT_ARGUMENT_LIMIT] = {0}, above[ELEMENT_ARGUMENT_LIMIT] = {0},
           below[ELEMENT_ARGUMENT_LIMIT] = {0};
    assert(e->argument_count <= ELEMENT_ARGUMENT_LIMIT);
    for (int k = 0; k < e->argument_count; k++) {
        corner[k] = high ? arguments[k].hi : arguments[k].lo;
        at[k] = e->arguments[k].variable < 0 ? arguments[k] : interval_point(corner[k]);
        above[k] = high ? slopes[k].lo : slopes[k].hi;
        below[k] = high ? slopes[k].hi : slopes[k].lo;
    }
    e->kind->range(e, at, &value, unused);
    add_plane(c, index, 1, value.hi, above, corner);
    add_plane(c, index, -1, value.lo, below, corner);
}

/* Tangent of a curved element at u, and its chord: `bend` 1 convex, -1 concave. */
static void add_tangent(struct contractor *c, int index, struct interval argument, double u,
                        int bend)
{
    const struct element *e = &c->network->elements[index];
    const struct interval at = interval_point(u);
    struct interval value, slope;
    e->kind->range(e, &at, &value, &slope);
    const double used = interval_middle(slope);
    /* the slope in use is off by at most its width, over at most the width of the box */
    const double error = interval_up(interval_width(slope) * interval_width(argument));
    const double safe = bend > 0 ? value.lo - error : value.hi + error;
    add_plane(c, index, -bend, bend > 0 ? interval_down(safe) : interval_up(safe), &used, &u);
}

static void add_chord(struct contractor *c, int index, struct interval argument, int bend)
{
    const struct element *e = &c->network->elements[index];
    const struct interval ends[2] = {interval_point(argument.lo), interval_point(argument.hi)};
    struct interval low, high, unused;
    e->kind->range(e, &ends[0], &low, &unused);
    e->kind->range(e, &ends[1], &high, &unused);
    const double slope = (high.lo - low.hi) / interval_width(argument);
    if (!isfinite(slope)) {
        return;
    }
    /* the worse end decides */
    const struct interval rise = interval_scale(slope, interval_sub(ends[1], ends[0]));
    const struct interval from_high = interval_sub(high, rise);
    const double value = bend > 0 ? fmax(low.hi, from_high.hi) : fmin(low.lo, from_high.lo);
    add_plane(c, index, bend, value, &slope, &argument.lo);
}

/* Where a chord is farthest from its exponential: there the slope is the chord's. */
static double farthest(const struct element *e, struct interval u)
{
    const double bend = e->kind->curvature;
    const double low = exp(bend * u.lo / e->thermal), high = exp(bend * u.hi / e->thermal);
    const double slope = (high - low) / (bend * interval_width(u)) * e->thermal;
    const double at = bend * e->thermal * log(slope);
    return at > u.lo && at < u.hi ? at : interval_middle(u);
}

static void curved_planes(struct contractor *c, int index, struct interval argument)
{
    const struct element *e = &c->network->elements[index];
    const int bend = e->kind->curvature;
    const double middle = farthest(e, argument);
    add_chord(c, index, argument, bend);
    add_tangent(c, index, argument, argument.lo, bend);
    add_tangent(c, index, argument, argument.hi, bend);
    add_tangent(c, index, argument, middle, bend);
}

/*
 * T = h (IF - IR) with h = 1/qb in [h.lo, h.hi], IF + IS >= 0 and IR + IS >= 0:
 *
 *   T <= h.hi (IF + IS) - h.lo (IR + IS)      T >= h.lo (IF + IS) - h.hi (IR + IS)
 */
static void share_planes(struct contractor *c, int index, const struct interval *arguments)
{
    const struct network *n = c->network;
    const struct element *e = &n->elements[index];
    const struct interval h = element_transport_share(e, arguments);
    const struct interval IS = interval_point(n->elements[e->forward].coefficient);
    for (int side = 0; side < 2 && c->plane_count < c->plane_limit; side++) {
        const double sign = side == 0 ? 1 : -1;
        const double f = side == 0 ? h.hi : h.lo, r = side == 0 ? h.lo : h.hi;
        struct plane *p = &c->planes[c->plane_count];
        if (!isfinite(f) || !isfinite(r)) {
            continue;
        }
        p->count = 3;
        p->index[0] = n->variable_count + index;
        p->coefficient[0] = sign;
        p->index[1] = n->variable_count + e->forward;
        p->coefficient[1] = -sign * f;
        p->index[2] = n->variable_count + e->reverse;
        p->coefficient[2] = sign * r;
        const struct interval both = interval_sub(interval_point(f), interval_point(r));
        p->bound = interval_scale(sign, interval_mul(IS, both)).hi;
        c->plane_count++;
    }
}

static void make_planes(struct contractor *c, const struct interval *box)
{
    const struct network *n = c->network;
    c->plane_count = 0;
    for (int index = 0; index < n->element_count; index++) {
        const struct element *e = &n->elements[index];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, box, arguments);
        if (e->kind->curvature != 0 && interval_width(arguments[0]) > 0) {
            curved_planes(c, index, arguments[0]);
            continue;
        }
        if (e->kind == &element_transport) {
            share_planes(c, index, arguments);
        }
        e->kind->range(e, arguments, &value, slopes);
        corner_planes(c, index, arguments, slopes, false);
        corner_planes(c, index, arguments, slopes, true);
    }
}

/* --- programs ------------------------------------------------------------------------------------
 */

/* Fills row r of the program: the entries are shares of the widths of the box, the row scaled. */
static void fill_row(struct program *p, int r, const int *index, const double *coefficient,
                     int count, double bound, const struct interval *box, double *factor)
{
    double *a = p->a + r * p->columns;
    double largest = 0;
    for (int k = 0; k < count; k++) {
        const struct interval entry = box[index[k]];
        a[index[k]] += coefficient[k] * interval_width(entry);
        bound -= coefficient[k] * entry.lo;
    }
    for (int k = 0; k < count; k++) {
        largest = fmax(largest, fabs(a[index[k]]));
    }
    *factor = largest > 0 ? 1 / largest : 1;
    for (int j = 0; j < p->columns && largest > 0; j++) {
        a[j] *= *factor;
    }
    p->value[r] = bound * *factor;
}

static void fill_program(struct contractor *c, struct program *p, const struct interval *box,
                         double *factors)
{
    const struct network *n = c->network;
    memset(p->a, 0, (size_t)p->rows * (size_t)p->columns * sizeof *p->a);
    for (int r = 0; r < n->variable_count; r++) {
        const struct network_row *row = &n->rows[r];
        double *a = p->a + r * p->columns;
        double bound = -interval_middle(row->constant), largest = 0;
        for (int k = 0; k < row->term_count; k++) {
            const double coefficient = interval_middle(row->terms[k].coefficient);
            const struct interval entry = box[row->terms[k].index];
            a[row->terms[k].index] = coefficient * interval_width(entry);
            bound -= coefficient * entry.lo;
            largest = fmax(largest, fabs(a[row->terms[k].index]));
        }
        factors[r] = largest > 0 ? 1 / largest : 1;
        for (int k = 0; k < row->term_count; k++) {
            a[row->terms[k].index] *= factors[r];
        }
        p->value[r] = bound * factors[r];
        p->equality[r] = true;
    }
    for (int k = 0; k < c->plane_count; k++) {
        const struct plane *plane = &c->planes[k];
        const int r = n->variable_count + k;
        fill_row(p, r, plane->index, plane->coefficient, plane->count, plane->bound, box,
                 &factors[r]);
        p->equality[r] = false;
    }
}

/*
 * The sum of all rows with the multipliers: D z <= beta. Returns a lower bound of (extra z[column]
 * + D z) - beta over the box; *own gets the coefficient that D has at `column`.
 */
static double aggregate(struct contractor *c, const struct interval *box, const double *multipliers,
                        int column, double extra)
{
    const struct network *n = c->network;
    const int size = contract_size(n);
    struct interval beta = interval_point(0);
    memset(c->sum, 0, (size_t)size * sizeof *c->sum);
    if (column >= 0) {
        c->sum[column] = interval_point(extra);
    }
    for (int r = 0; r < n->variable_count; r++) {
        const struct network_row *row = &n->rows[r];
        const double p = multipliers[r];
        if (!(fabs(p) > 0)) {
            continue;
        }
        beta = interval_sub(beta, interval_scale(p, row->constant));
        for (int k = 0; k < row->term_count; k++) {
            struct interval *s = &c->sum[row->terms[k].index];
            *s = interval_add(*s, interval_scale(p, row->terms[k].coefficient));
        }
    }
    for (int q = 0; q < c->plane_count; q++) {
        const struct plane *plane = &c->planes[q];
        const double p = multipliers[n->variable_count + q];
        if (!(p > 0)) {
            continue; /* an inequality proves nothing with a negative multiplier */
        }
        beta = interval_add(beta, interval_scale(p, interval_point(plane->bound)));
        for (int k = 0; k < plane->count; k++) {
            struct interval *s = &c->sum[plane->index[k]];
            *s = interval_add(*s, interval_scale(p, interval_point(plane->coefficient[k])));
        }
    }
    struct interval total = interval_neg(beta);
    for (int j = 0; j < size; j++) {
        total = interval_add(total, interval_mul(c->sum[j], box[j]));
    }
    return total.lo;
}

static void scale_multipliers(const struct program *p, const double *factors, double *multipliers)
{
    for (int r = 0; r < p->rows; r++) {
        multipliers[r] *= factors[r];
    }
}

/* Both ends of one variable. */
static bool bound_variable(struct contractor *c, struct program *p, struct interval *box, int k,
                           const double *factors)
{
    const double width = interval_width(box[k]);
    for (int end = 0; end < 2; end++) {
        const double sign = end == 0 ? 1 : -1;
        if (!(width > 0) || program_least(p, k, sign, c->multipliers) != PROGRAM_DONE) {
            continue;
        }
        /* the program counts in shares of the width */
        for (int r = 0; r < p->rows; r++) {
            c->multipliers[r] *= factors[r] * width;
        }
        const double least = aggregate(c, box, c->multipliers, k, sign);
        struct interval found = interval_line();
        if (end == 0) {
            found.lo = least;
        } else {
            found.hi = -least;
        }
        if (!interval_meet(&box[k], found)) {
            return false;
        }
    }
    return true;
}

bool contract_program(struct contractor *c, struct interval *box, bool narrows)
{
    const struct network *n = c->network;
    struct program p;
    for (int k = 0; k < contract_size(n); k++) {
        if (!isfinite(interval_width(box[k]))) {
            return true;
        }
    }
    make_planes(c, box);
    program_place(&p, n->variable_count + c->plane_count, contract_size(n), c->block);
    double *factors = c->multipliers + (n->variable_count + c->plane_limit);
    fill_program(c, &p, box, factors);
    program_start(&p);
    const enum program_status status = program_feasible(&p, c->multipliers);
    if (status == PROGRAM_INFEASIBLE) {
        scale_multipliers(&p, factors, c->multipliers);
        return !(aggregate(c, box, c->multipliers, -1, 0) > 0);
    }
    if (status != PROGRAM_DONE || !narrows) {
        return true;
    }
    for (int k = 0; k < n->variable_count; k++) {
        if (c->is_argument[k] && !bound_variable(c, &p, box, k, factors)) {
            return false;
        }
    }
    return true;
}

/* --- where to cut ----------------------------------------------------------------------------- */

static double slope_size(struct interval slope)
{
    const double size = interval_magnitude(slope);
    return size < 1e30 ? size : 1e30;
}

/* Largest conductance of a node against its own voltage over the box: what turns current into
 * volts.
 */
static void find_diagonals(struct contractor *c, const struct interval *box)
{
    const struct network *n = c->network;
    for (int r = 0; r < n->node_count; r++) {
        c->diagonal[r] = 1e-300;
        for (int k = 0; k < n->rows[r].term_count; k++) {
            if (n->rows[r].terms[k].index == r) {
                c->diagonal[r] += interval_magnitude(n->rows[r].terms[k].coefficient);
            }
        }
    }
    for (int index = 0; index < n->element_count; index++) {
        const struct element *e = &n->elements[index];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, box, arguments);
        e->kind->range(e, arguments, &value, slopes);
        for (int k = 0; k < e->argument_count; k++) {
            const int v = e->arguments[k].variable;
            for (int t = 0; t < e->term_count && v >= 0; t++) {
                const int row = e->terms[t].row;
                const bool own =
                    row >= 0 && (v == row || (v >= n->node_count &&
                                              (n->pairs[v][0] == row || n->pairs[v][1] == row)));
                if (own) {
                    c->diagonal[row] += fabs(e->terms[t].factor) * slope_size(slopes[k]);
                }
            }
        }
    }
}

int contract_branch(struct contractor *c, const struct interval *box, double *at)
{
    const struct network *n = c->network;
    double most = 0;
    int best = -1;
    find_diagonals(c, box);
    for (int index = 0; index < n->element_count; index++) {
        const struct element *e = &n->elements[index];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, box, arguments);
        e->kind->range(e, arguments, &value, slopes);
        for (int k = 0; k < e->argument_count; k++) {
            const int v = e->arguments[k].variable;
            const double width = v < 0 ? 0 : interval_width(box[v]);
            if (!(width > 1e-13 * (1 + interval_magnitude(box[v])))) {
                continue;
            }
            const double spread = fmin(interval_width(slopes[k]), 1e30) * width;
            double score = 0;
            for (int t = 0; t < e->term_count; t++) {
                const int row = e->terms[t].row;
                if (row >= 0) {
                    const double volts = fabs(e->terms[t].factor) * spread / c->diagonal[row];
                    score = fmax(score, fmin(volts, interval_width(box[row]) + 1e-12));
                }
            }
            score += 1e-6 * width;
            if (score > most) {
                most = score;
                best = v;
                *at = interval_middle(box[v]);
                if (e->kind == &element_junction) {
                    const double u = farthest(e, arguments[k]);
                    const double z = variable_of(&e->arguments[k], interval_point(u)).lo;
                    const double edge = 0.1 * width;
                    *at = fmin(fmax(z, box[v].lo + edge), box[v].hi - edge);
                }
            }
        }
    }
    return best;
}
