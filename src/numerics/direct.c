/*
 * direct.c: elimination by a list of steps, in double.
 */
#include "numerics/direct.h"

#include <math.h>
#include <string.h>

#include "numerics/replay.h"

struct direct {
    struct arena *arena;
    const struct replay *replay;
    const int *row; /* [nonzeros] of the pattern, which stays */
    int nonzeros;
    bool is_factored;
    double *values;  /* [replay->size] the factors */
    double *inverse; /* [n] of the pivots */
    double *work;    /* [n] */
    double *scale;   /* [n] of the equations */
};

struct direct *direct_create(const struct linear_solver *solver, const struct pattern *pattern,
                             const double *values)
{
    if (pattern->n > DIRECT_LIMIT) {
        return NULL;
    }
    struct arena *arena = arena_create();
    struct direct *d = arena == NULL ? NULL : arena_new(arena, struct direct);
    const struct replay *r = d == NULL ? NULL : replay_make(solver, pattern, values, arena);
    if (r != NULL) {
        *d = (struct direct){.arena = arena,
                             .replay = r,
                             .row = pattern->row,
                             .nonzeros = pattern->start[pattern->n]};
        d->values = arena_new_array(arena, double, r->size);
        d->inverse = arena_new_array(arena, double, r->n);
        d->work = arena_new_array(arena, double, r->n);
        d->scale = arena_new_array(arena, double, r->n);
    }
    if (r == NULL || d->values == NULL || d->inverse == NULL || d->work == NULL ||
        d->scale == NULL) {
        arena_destroy(arena);
        return NULL;
    }
    return d;
}

void direct_destroy(struct direct *direct)
{
    if (direct != NULL) {
        arena_destroy(direct->arena);
    }
}

/*
 * Each equation over its largest entry: where one conductance is all that matters, its entries are
 * 1 and products with them are exact. Then the largest entry of each unknown. False: an equation is
 * empty.
 */
static bool scale(struct direct *d, const double *values)
{
    const int n = d->replay->n;
    double *v = d->values;
    memset(d->scale, 0, (size_t)n * sizeof *d->scale);
    for (int k = 0; k < d->nonzeros; k++) {
        double *most = &d->scale[d->row[k]];
        const double size = fabs(values[k]);
        *most = size > *most ? size : *most;
    }
    bool good = true;
    for (int i = 0; i < n; i++) {
        good = good && d->scale[i] > 0;
        d->scale[i] = 1 / d->scale[i];
    }
    for (int k = 0; k < d->nonzeros; k++) {
        v[k] = values[k] * d->scale[d->row[k]];
    }
    return good;
}

bool direct_factor(struct direct *d, const double *values)
{
    const struct replay *r = d->replay;
    const int *below = r->below, *right = r->right, *target = r->target;
    double *v = d->values;
    d->is_factored = false;
    bool good = scale(d, values);
    memset(v + d->nonzeros, 0, (size_t)(r->size - d->nonzeros) * sizeof *v);
    for (int k = 0; k < r->n; k++) {
        const struct replay_pivot *p = &r->pivots[k];
        const double inverse = 1 / v[p->place];
        d->inverse[k] = inverse;
        /* neither zero nor too large: the pivot is neither; NaN is both */
        good = good && fabs(inverse) > 0 && fabs(inverse) < INFINITY;
        for (int i = 0; i < p->below_count; i++) {
            const double multiplier = v[below[i]] * inverse;
            v[below[i]] = multiplier;
            good = good && fabs(multiplier) <= REPLAY_GROWTH_LIMIT;
            for (int j = 0; j < p->right_count; j++) {
                v[*target++] -= multiplier * v[right[j]];
            }
        }
        below += p->below_count;
        right += p->right_count;
    }
    d->is_factored = good;
    return good;
}

bool direct_is_factored(const struct direct *direct)
{
    return direct != NULL && direct->is_factored;
}

void direct_solve(struct direct *d, double *b)
{
    const struct replay *r = d->replay;
    const int *below = r->below, *below_row = r->below_row;
    const double *v = d->values;
    double *x = d->work;
    int rights = 0;
    for (int i = 0; i < r->n; i++) {
        b[i] *= d->scale[i];
    }
    for (int k = 0; k < r->n; k++) {
        const struct replay_pivot *p = &r->pivots[k];
        const double known = b[p->row];
        for (int i = 0; i < p->below_count; i++) {
            b[*below_row++] -= v[*below++] * known;
        }
        rights += p->right_count;
    }
    for (int k = r->n - 1; k >= 0; k--) {
        const struct replay_pivot *p = &r->pivots[k];
        double sum = b[p->row];
        rights -= p->right_count;
        for (int j = rights; j < rights + p->right_count; j++) {
            sum -= v[r->right[j]] * x[r->right_column[j]];
        }
        x[p->column] = sum * d->inverse[k];
    }
    memcpy(b, x, (size_t)r->n * sizeof *b);
}

/* A = L U in pivot order: first the transposed U, then the transposed L. */
void direct_solve_transposed(struct direct *d, double *b)
{
    const struct replay *r = d->replay;
    const double *v = d->values;
    double *y = d->work; /* by equations */
    int rights = 0, belows = 0;
    for (int k = 0; k < r->n; k++) {
        const struct replay_pivot *p = &r->pivots[k];
        const double known = b[p->column] * d->inverse[k];
        y[p->row] = known;
        for (int j = 0; j < p->right_count; j++, rights++) {
            b[r->right_column[rights]] -= v[r->right[rights]] * known;
        }
        belows += p->below_count;
    }
    for (int k = r->n - 1; k >= 0; k--) {
        const struct replay_pivot *p = &r->pivots[k];
        double sum = y[p->row];
        belows -= p->below_count;
        for (int i = belows; i < belows + p->below_count; i++) {
            sum -= v[r->below[i]] * y[r->below_row[i]];
        }
        y[p->row] = sum;
    }
    for (int i = 0; i < r->n; i++) {
        y[i] *= d->scale[i];
    }
    memcpy(b, y, (size_t)r->n * sizeof *b);
}

int direct_negative_pivots(const struct direct *d)
{
    int count = 0;
    for (int k = 0; k < d->replay->n; k++) {
        count += d->inverse[k] < 0;
    }
    return count;
}
