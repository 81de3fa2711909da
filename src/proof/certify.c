/* certify.c: the operator of Krawczyk. */
#include "proof/certify.h"

#include <string.h>

enum { GROW_LIMIT = 30, POWER_ROUNDS = 12 };

struct certifier {
    const struct network *network;
    int n;
    struct interval *z;        /* [variable_count] */
    struct interval *jacobian; /* [n * n] */
    double *inverse;           /* [n * n] */
    double *middle;            /* [n * 2n] scratch of the inversion */
    double *defect;            /* [n * n] sizes of I - Y J */
    struct interval *residual; /* [n] */
    struct interval *step;     /* [n] Y f(c) */
    struct interval *image;    /* [n] K(X) */
    double *centre, *radius, *power;
};

struct certifier *certifier_create(const struct network *network)
{
    struct arena *arena = network->arena;
    struct certifier *c = arena_new(arena, struct certifier);
    const size_t n = (size_t)network->node_count;
    if (c == NULL) {
        return NULL;
    }
    c->network = network;
    c->n = network->node_count;
    c->z = arena_new_array(arena, struct interval, network->variable_count);
    c->jacobian = arena_new_array(arena, struct interval, n * n);
    c->inverse = arena_new_array(arena, double, n *n);
    c->middle = arena_new_array(arena, double, 2 * n * n);
    c->defect = arena_new_array(arena, double, n *n);
    c->residual = arena_new_array(arena, struct interval, n);
    c->step = arena_new_array(arena, struct interval, n);
    c->image = arena_new_array(arena, struct interval, n);
    c->centre = arena_new_array(arena, double, n);
    c->radius = arena_new_array(arena, double, n);
    c->power = arena_new_array(arena, double, 2 * n);
    const bool good = c->z != NULL && c->jacobian != NULL && c->inverse != NULL &&
                      c->middle != NULL && c->defect != NULL && c->residual != NULL &&
                      c->step != NULL && c->image != NULL && c->centre != NULL &&
                      c->radius != NULL && c->power != NULL;
    return good ? c : NULL;
}

/* Node voltages into z, with the differences that follow. */
static void set_nodes(struct certifier *c, const struct interval *nodes)
{
    const struct network *n = c->network;
    memcpy(c->z, nodes, (size_t)c->n * sizeof *nodes);
    for (int k = c->n; k < n->variable_count; k++) {
        c->z[k] = interval_sub(c->z[n->pairs[k][0]], c->z[n->pairs[k][1]]);
    }
}

/* f at z (a point). */
static void find_residual(struct certifier *c)
{
    const struct network *n = c->network;
    for (int r = 0; r < c->n; r++) {
        c->residual[r] = n->rows[r].constant;
        for (int k = 0; k < n->rows[r].term_count; k++) {
            const struct network_term *term = &n->rows[r].terms[k];
            if (term->index < n->variable_count) {
                c->residual[r] = interval_add(c->residual[r],
                                              interval_mul(term->coefficient, c->z[term->index]));
            }
        }
    }
    for (int index = 0; index < n->element_count; index++) {
        const struct element *e = &n->elements[index];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, c->z, arguments);
        element_range(e, arguments, &value, slopes);
        for (int t = 0; t < e->term_count; t++) {
            if (e->terms[t].row >= 0) {
                struct interval *f = &c->residual[e->terms[t].row];
                *f = interval_add(*f, interval_scale(e->terms[t].factor, value));
            }
        }
    }
}

static void add_slope(struct certifier *c, int row, int node, struct interval slope)
{
    struct interval *entry = &c->jacobian[row * c->n + node];
    *entry = interval_add(*entry, slope);
}

/* J over z. */
static void find_jacobian(struct certifier *c)
{
    const struct network *n = c->network;
    memset(c->jacobian, 0, (size_t)c->n * (size_t)c->n * sizeof *c->jacobian);
    for (int r = 0; r < c->n; r++) {
        for (int k = 0; k < n->rows[r].term_count; k++) {
            const struct network_term *term = &n->rows[r].terms[k];
            if (term->index < c->n) {
                add_slope(c, r, term->index, term->coefficient);
            }
        }
    }
    for (int index = 0; index < n->element_count; index++) {
        const struct element *e = &n->elements[index];
        struct interval arguments[ELEMENT_ARGUMENT_LIMIT], slopes[ELEMENT_ARGUMENT_LIMIT], value;
        network_arguments(e, c->z, arguments);
        e->kind->range(e, arguments, &value, slopes);
        for (int t = 0; t < e->term_count; t++) {
            const int row = e->terms[t].row;
            for (int k = 0; k < e->argument_count && row >= 0; k++) {
                const struct argument *a = &e->arguments[k];
                if (a->variable < 0) {
                    continue;
                }
                const struct interval slope =
                    interval_scale(e->terms[t].factor * a->sign, slopes[k]);
                if (a->variable < c->n) {
                    add_slope(c, row, a->variable, slope);
                } else {
                    add_slope(c, row, n->pairs[a->variable][0], slope);
                    add_slope(c, row, n->pairs[a->variable][1], interval_neg(slope));
                }
            }
        }
    }
}

/* Y: inverse of the middle of J by elimination with row exchange; *sign: of the determinant. */
static bool invert(struct certifier *c, int *sign)
{
    *sign = 1;
    const int n = c->n, wide = 2 * n;
    double *m = c->middle;
    for (int i = 0; i < n; i++) {
        for (int j = 0; j < n; j++) {
            m[i * wide + j] = interval_middle(c->jacobian[i * n + j]);
            m[i * wide + n + j] = i == j ? 1 : 0;
        }
    }
    for (int k = 0; k < n; k++) {
        int pivot = k;
        double best = 0;
        for (int i = k; i < n; i++) { /* relative to the size of the row: units differ */
            double size = 0;
            for (int j = k; j < n; j++) {
                size = fmax(size, fabs(m[i * wide + j]));
            }
            const double share = size > 0 ? fabs(m[i * wide + k]) / size : 0;
            if (share > best) {
                best = share;
                pivot = i;
            }
        }
        if (!(best > 0) || !isfinite(m[pivot * wide + k])) {
            return false;
        }
        if ((m[pivot * wide + k] < 0) != (pivot != k)) {
            *sign = -*sign;
        }
        for (int j = 0; j < wide && pivot != k; j++) {
            const double swap = m[k * wide + j];
            m[k * wide + j] = m[pivot * wide + j];
            m[pivot * wide + j] = swap;
        }
        const double by = 1 / m[k * wide + k];
        for (int j = 0; j < wide; j++) {
            m[k * wide + j] *= by;
        }
        for (int i = 0; i < n; i++) {
            const double factor = m[i * wide + k];
            for (int j = k; j < wide && i != k && fabs(factor) > 0; j++) {
                m[i * wide + j] -= factor * m[k * wide + j];
            }
        }
    }
    for (int i = 0; i < n; i++) {
        for (int j = 0; j < n; j++) {
            c->inverse[i * n + j] = m[i * wide + n + j];
            if (!isfinite(c->inverse[i * n + j])) {
                return false;
            }
        }
    }
    return true;
}

/* Sizes of I - Y J. */
static void find_defect(struct certifier *c)
{
    const int n = c->n;
    for (int i = 0; i < n; i++) {
        for (int j = 0; j < n; j++) {
            struct interval sum = interval_point(i == j ? 1 : 0);
            for (int k = 0; k < n; k++) {
                const struct interval entry = c->jacobian[k * n + j];
                const double y = c->inverse[i * n + k];
                if (fabs(y) > 0 && (entry.lo < 0 || entry.hi > 0)) {
                    sum = interval_sub(sum, interval_scale(y, entry));
                }
            }
            c->defect[i * n + j] = interval_magnitude(sum);
        }
    }
}

static void find_step(struct certifier *c)
{
    for (int i = 0; i < c->n; i++) {
        struct interval sum = interval_point(0);
        for (int k = 0; k < c->n; k++) {
            sum = interval_add(sum, interval_scale(c->inverse[i * c->n + k], c->residual[k]));
        }
        c->step[i] = sum;
    }
}

/* (|I - Y J| r)_i, rounded up */
static double grown(const struct certifier *c, const double *r, int i)
{
    double sum = 0;
    for (int j = 0; j < c->n; j++) {
        sum = interval_up(sum + interval_up(c->defect[i * c->n + j] * r[j]));
    }
    return sum;
}

/* |I - Y J| p < p for a p found by the power method? */
static bool is_regular(struct certifier *c)
{
    const int n = c->n;
    double *p = c->power, *next = c->power + n;
    for (int i = 0; i < n; i++) {
        p[i] = 1;
    }
    for (int round = 0; round < POWER_ROUNDS; round++) {
        bool holds = true;
        double largest = 0;
        for (int i = 0; i < n; i++) {
            next[i] = grown(c, p, i);
            holds = holds && next[i] < p[i];
            largest = fmax(largest, next[i]);
        }
        if (holds) {
            return true;
        }
        if (!isfinite(largest)) {
            return false;
        }
        for (int i = 0; i < n; i++) { /* kept positive, and of size one */
            p[i] = next[i] / largest + 1e-4 + 0.1 * p[i];
        }
    }
    return false;
}

/* K of the box around c->centre with c->radius, from the defect and the step at hand. */
static void find_image(struct certifier *c)
{
    for (int i = 0; i < c->n; i++) {
        const double r = grown(c, c->radius, i);
        const struct interval around = {-r, r};
        c->image[i] = interval_add(interval_sub(interval_point(c->centre[i]), c->step[i]), around);
    }
}

static void set_centre(struct certifier *c, const double *centre)
{
    for (int i = 0; i < c->n; i++) {
        c->centre[i] = centre[i];
        c->z[i] = interval_point(centre[i]);
    }
    for (int k = c->n; k < c->network->variable_count; k++) {
        c->z[k] = interval_sub(c->z[c->network->pairs[k][0]], c->z[c->network->pairs[k][1]]);
    }
}

bool certify_exactly(struct certifier *c, const double *centre, struct interval *box)
{
    int sign;
    set_centre(c, centre);
    find_residual(c);
    find_jacobian(c);
    if (!invert(c, &sign)) {
        return false;
    }
    find_step(c);
    for (int i = 0; i < c->n; i++) {
        c->radius[i] = 2 * interval_magnitude(c->step[i]) + 1e-15 * (1e-3 + fabs(centre[i]));
    }
    bool proved = false;
    for (int round = 0; round < GROW_LIMIT; round++) {
        for (int i = 0; i < c->n; i++) {
            box[i] = (struct interval){interval_down(centre[i] - c->radius[i]),
                                       interval_up(centre[i] + c->radius[i])};
        }
        set_nodes(c, box);
        find_jacobian(c);
        find_defect(c);
        for (int i = 0; i < c->n; i++) { /* the rounded box is a little wider */
            c->radius[i] = interval_up(fmax(box[i].hi - centre[i], centre[i] - box[i].lo));
        }
        find_image(c);
        proved = true;
        for (int i = 0; i < c->n; i++) {
            const bool inside = c->image[i].lo > box[i].lo && c->image[i].hi < box[i].hi;
            proved = proved && inside;
            if (!inside) {
                const double reach =
                    fmax(fabs(c->image[i].lo - centre[i]), fabs(c->image[i].hi - centre[i]));
                c->radius[i] = 1.5 * fmax(reach, c->radius[i]);
            }
        }
        if (proved || !isfinite(c->image[0].lo)) {
            break;
        }
    }
    for (int i = 0; i < c->n && proved; i++) {
        interval_meet(&box[i], c->image[i]); /* the solution is in both */
    }
    return proved;
}

bool certify_box(struct certifier *c, struct interval *box, bool *single)
{
    const struct network *n = c->network;
    bool inside = true;
    int sign;
    *single = false;
    for (int i = 0; i < c->n; i++) {
        c->centre[i] = interval_middle(box[i]);
    }
    set_centre(c, c->centre);
    for (int k = c->n; k < n->variable_count; k++) {
        inside = inside && interval_inside(c->z[k], box[k]);
    }
    find_residual(c);
    set_nodes(c, box);
    for (int k = c->n; k < n->variable_count && inside; k++) {
        interval_meet(&c->z[k], box[k]); /* a convex set that holds the middle */
    }
    find_jacobian(c);
    if (!invert(c, &sign)) {
        return true;
    }
    find_defect(c);
    *single = is_regular(c);
    find_step(c);
    for (int i = 0; i < c->n; i++) {
        c->radius[i] = interval_up(fmax(box[i].hi - c->centre[i], c->centre[i] - box[i].lo));
    }
    find_image(c);
    for (int i = 0; i < c->n; i++) {
        if (!interval_meet(&box[i], c->image[i])) {
            return false;
        }
    }
    return true;
}

bool certify_single(struct certifier *c, const struct interval *nodes)
{
    int sign;
    set_nodes(c, nodes);
    find_jacobian(c);
    if (!invert(c, &sign)) {
        return false;
    }
    find_defect(c);
    return is_regular(c);
}

int certify_determinant(struct certifier *c, const double *centre)
{
    int sign;
    set_centre(c, centre);
    find_jacobian(c);
    return invert(c, &sign) ? sign : 0;
}
