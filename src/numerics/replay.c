/*
 * replay.c: symbolic elimination with given pivots (Duff, Erisman and Reid 2017, Direct Methods for
 * Sparse Matrices, section 5.3), on a square table of places: for small systems.
 */
#include "numerics/replay.h"

#include <math.h>

struct maker {
    int n, size;
    int *at; /* [n * n] place of an entry in pivot order, -1: none */
    int *row, *column;
    double *largest; /* [n] magnitude of each equation */
    struct replay_pivot *pivots;
    int below, right, target; /* lengths of the lists */
};

static bool begin(struct maker *m, const struct linear_solver *solver,
                  const struct pattern *pattern, const double *values, struct arena *scratch)
{
    const int n = pattern->n;
    int *place = arena_new_array(scratch, int, 2 * (size_t)n); /* in pivot order, of each row */
    *m = (struct maker){.n = n, .size = pattern->start[n]};
    m->at = arena_new_array(scratch, int, (size_t)n *(size_t)n);
    m->row = arena_new_array(scratch, int, n);
    m->column = arena_new_array(scratch, int, n);
    m->largest = arena_new_array(scratch, double, n);
    if (place == NULL || m->at == NULL || m->row == NULL || m->column == NULL ||
        m->largest == NULL || !linear_pivots(solver, m->row, m->column)) {
        return false;
    }
    for (int k = 0; k < n; k++) {
        place[m->row[k]] = k;
        place[n + m->column[k]] = k;
    }
    for (int k = 0; k < n * n; k++) {
        m->at[k] = -1;
    }
    for (int j = 0; j < n; j++) {
        for (int k = pattern->start[j]; k < pattern->start[j + 1]; k++) {
            const int i = pattern->row[k];
            m->at[place[i] * n + place[n + j]] = k;
            m->largest[i] = fmax(m->largest[i], fabs(values[k]));
        }
    }
    return true;
}

/* Fills in, and counts what the lists will hold. False: a pivot has no place. */
static bool eliminate(struct maker *m)
{
    const int n = m->n;
    for (int k = 0; k < n; k++) {
        struct replay_pivot *p = &m->pivots[k];
        *p = (struct replay_pivot){m->row[k], m->column[k], m->at[k * n + k], 0, 0};
        if (p->place < 0) {
            return false;
        }
        for (int j = k + 1; j < n; j++) {
            p->right_count += m->at[k * n + j] >= 0;
        }
        for (int i = k + 1; i < n; i++) {
            if (m->at[i * n + k] < 0) {
                continue;
            }
            p->below_count++;
            for (int j = k + 1; j < n; j++) {
                if (m->at[k * n + j] >= 0 && m->at[i * n + j] < 0) {
                    m->at[i * n + j] = m->size++;
                }
            }
        }
        m->below += p->below_count;
        m->right += p->right_count;
        m->target += p->below_count * p->right_count;
    }
    return true;
}

/* Whether two magnitudes can be compared. */
static double ratio_of(double above, double below)
{
    return above > 0 && below > 0 ? above / below : 1;
}

static bool list(const struct maker *m, struct arena *arena, struct replay *r)
{
    const int n = m->n;
    int *below = arena_new_array(arena, int, m->below);
    int *below_row = arena_new_array(arena, int, m->below);
    double *largest = arena_new_array(arena, double, m->below);
    int *right = arena_new_array(arena, int, m->right);
    int *right_column = arena_new_array(arena, int, m->right);
    int *target = arena_new_array(arena, int, m->target);
    if (below == NULL || below_row == NULL || largest == NULL || right == NULL ||
        right_column == NULL || target == NULL) {
        return false;
    }
    *r = (struct replay){n,       m->size, m->pivots,    below, below_row,
                         largest, right,   right_column, target};
    for (int k = 0; k < n; k++) {
        for (int j = k + 1; j < n; j++) {
            if (m->at[k * n + j] >= 0) {
                *right++ = m->at[k * n + j];
                *right_column++ = m->column[j];
            }
        }
        for (int i = k + 1; i < n; i++) {
            if (m->at[i * n + k] < 0) {
                continue;
            }
            *below++ = m->at[i * n + k];
            *below_row++ = m->row[i];
            *largest++ =
                ratio_of(m->largest[m->row[i]], m->largest[m->row[k]]) * REPLAY_GROWTH_LIMIT;
            for (int j = k + 1; j < n; j++) {
                if (m->at[k * n + j] >= 0) {
                    *target++ = m->at[i * n + j];
                }
            }
        }
    }
    return true;
}

struct replay *replay_make(const struct linear_solver *solver, const struct pattern *pattern,
                           const double *values, struct arena *arena)
{
    if (pattern->n == 0 || pattern->n > REPLAY_LIMIT) {
        return NULL;
    }
    struct arena *scratch = arena_create();
    struct replay *r = arena_new(arena, struct replay);
    struct maker m;
    bool good = scratch != NULL && r != NULL && begin(&m, solver, pattern, values, scratch);
    if (good) {
        m.pivots = arena_new_array(arena, struct replay_pivot, m.n);
        good = m.pivots != NULL && eliminate(&m) && list(&m, arena, r);
    }
    arena_destroy(scratch);
    return good ? r : NULL;
}
