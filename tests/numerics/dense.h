/*
 * dense.h: what the numerics tests share: dense patterns, dense systems, elimination, comparison.
 * The elimination is the independent answer for the sparse solver: it shares no code with src/.
 */
#ifndef TESTS_DENSE_H
#define TESTS_DENSE_H

#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>

#include "numerics/newton.h"

enum { DENSE_LIMIT = 64 };

#define assert_near(value, wanted, tolerance)                                                      \
    dense_check((value), (wanted), (tolerance), __FILE__, __LINE__)

static inline void dense_check(double value, double wanted, double tolerance, const char *file,
                               int line)
{
    if (!(fabs(value - wanted) <= tolerance)) {
        print_error("%.17g, wanted %.17g within %g\n", value, wanted, tolerance);
        _fail(file, line);
    }
}

/* The full n by n pattern; entry (i, j) is values[j * n + i]. */
static inline struct pattern *dense_pattern(struct arena *arena, int n)
{
    struct entry entries[DENSE_LIMIT * DENSE_LIMIT];
    int slots[DENSE_LIMIT * DENSE_LIMIT];
    int used = 0;
    for (int j = 0; j < n; j++) {
        for (int i = 0; i < n; i++) {
            entries[used++] = (struct entry){i, j};
        }
    }
    struct pattern *pattern = pattern_build(arena, n, entries, used, slots);
    assert_non_null(pattern);
    return pattern;
}

/* Gauss with complete pivoting on a (column-major copy, destroyed). Returns the determinant;
 * b (may be NULL) becomes the solution when the determinant is not 0. */
static inline long double dense_eliminate(long double *a, int n, long double *b)
{
    int column_of[DENSE_LIMIT];
    long double determinant = 1;
    for (int k = 0; k < n; k++) {
        column_of[k] = k;
    }
    for (int k = 0; k < n; k++) {
        int r = k, c = k;
        for (int j = k; j < n; j++) {
            for (int i = k; i < n; i++) {
                if (fabsl(a[j * n + i]) > fabsl(a[c * n + r])) {
                    r = i;
                    c = j;
                }
            }
        }
        if (a[c * n + r] == 0) {
            return 0;
        }
        for (int j = 0; j < n; j++) {
            long double keep = a[j * n + k];
            a[j * n + k] = a[j * n + r];
            a[j * n + r] = keep;
        }
        for (int i = 0; i < n; i++) {
            long double keep = a[k * n + i];
            a[k * n + i] = a[c * n + i];
            a[c * n + i] = keep;
        }
        int keep_column = column_of[k];
        column_of[k] = column_of[c];
        column_of[c] = keep_column;
        determinant *= (r != k) != (c != k) ? -a[k * n + k] : a[k * n + k];
        if (b != NULL) {
            long double keep = b[k];
            b[k] = b[r];
            b[r] = keep;
        }
        for (int i = k + 1; i < n; i++) {
            long double factor = a[k * n + i] / a[k * n + k];
            for (int j = k; j < n; j++) {
                a[j * n + i] -= factor * a[j * n + k];
            }
            if (b != NULL) {
                b[i] -= factor * b[k];
            }
        }
    }
    if (b != NULL) {
        long double y[DENSE_LIMIT];
        for (int k = n - 1; k >= 0; k--) {
            for (int j = k + 1; j < n; j++) {
                b[k] -= a[j * n + k] * b[j];
            }
            b[k] /= a[k * n + k];
        }
        for (int k = 0; k < n; k++) {
            y[column_of[k]] = b[k];
        }
        for (int k = 0; k < n; k++) {
            b[k] = y[k];
        }
    }
    return determinant;
}

/* A reproducible random number in [0, 1) (Park and Miller 1988, minimal standard generator). */
static inline double dense_random(uint32_t *state)
{
    *state = (uint32_t)((uint64_t)*state * 48271U % 2147483647U);
    return (double)*state / 2147483647.0;
}

#endif
