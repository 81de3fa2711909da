/* test_direct.c: the list of steps of a small matrix against KLU's own factors. */
#include "dense.h"

#include "numerics/direct.h"

enum { SIZES = 45, ENTRIES = 6 * SIZES };

struct drawn {
    struct pattern *pattern;
    double values[ENTRIES];
};

/* A full, permuted diagonal and up to four more entries a column. */
static void draw(struct drawn *m, struct arena *arena, int n, uint32_t *seed)
{
    struct entry entries[ENTRIES];
    int slots[ENTRIES], count = 0;
    for (int j = 0; j < n; j++) {
        entries[count++] = (struct entry){(j + n / 2) % n, j};
        for (int extra = 0; extra < 4; extra++) {
            const int row = (int)(n * dense_random(seed));
            if (dense_random(seed) < 0.5) {
                entries[count++] = (struct entry){row, j};
            }
        }
    }
    m->pattern = pattern_build(arena, n, entries, count, slots);
    assert_non_null(m->pattern);
    for (int k = 0; k < m->pattern->start[n]; k++) {
        m->values[k] = (dense_random(seed) - 0.5) * pow(10, 3 * dense_random(seed));
    }
}

/* Largest |A x - b| (or of the transposed) relative to what meets in an equation. */
static double misfit(const struct drawn *m, const double *x, const double *b, bool transposed)
{
    const struct pattern *p = m->pattern;
    long double sum[SIZES] = {0}, size[SIZES] = {0};
    for (int j = 0; j < p->n; j++) {
        for (int k = p->start[j]; k < p->start[j + 1]; k++) {
            const int at = transposed ? j : p->row[k];
            const int from = transposed ? p->row[k] : j;
            sum[at] += (long double)m->values[k] * x[from];
            size[at] += fabsl((long double)m->values[k] * x[from]);
        }
    }
    double worst = 0;
    for (int k = 0; k < p->n; k++) {
        worst = fmax(worst, (double)(fabsl(sum[k] - b[k]) / (size[k] + fabs(b[k]))));
    }
    return worst;
}

/* New values with the pivots of the old ones: solutions, and the sign of the determinant. */
static void test_solutions(void **state)
{
    (void)state;
    uint32_t seed = 7;
    int used = 0;
    for (int n = 1; n <= SIZES; n++) {
        struct arena *arena = arena_create();
        struct drawn m;
        draw(&m, arena, n, &seed);
        struct linear_solver *solver = linear_create(m.pattern), *fresh = linear_create(m.pattern);
        if (linear_factor(solver, m.values) == LINEAR_OK) {
            for (int k = 0; k < m.pattern->start[n]; k++) {
                m.values[k] *= 1 + 0.2 * (dense_random(&seed) - 0.5);
            }
            double b[SIZES], x[SIZES], y[SIZES];
            for (int k = 0; k < n; k++) {
                b[k] = x[k] = y[k] = dense_random(&seed) - 0.5;
            }
            int full, again;
            assert_int_equal(linear_factor(solver, m.values), LINEAR_OK);
            assert_int_equal(linear_factor(fresh, m.values), LINEAR_OK);
            linear_counts(solver, &full, &again);
            used += again;
            linear_solve(solver, x);
            linear_solve_transposed(solver, y);
            assert_true(misfit(&m, x, b, false) < 1e-10);
            assert_true(misfit(&m, y, b, true) < 1e-10);
            assert_int_equal(linear_determinant_sign(solver), linear_determinant_sign(fresh));
            assert_near(linear_condition(solver, m.values) / linear_condition(fresh, m.values), 1,
                        0.01);
        }
        linear_destroy(solver);
        linear_destroy(fresh);
        arena_destroy(arena);
    }
    assert_true(used > SIZES / 2);
}

/* [1 1; 1 v]: with v = 1 the second pivot is 0, with NaN it is none; a pivot 1e-12 lets a
 * multiplier grow beyond 1e8. */
static void test_refusals(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct entry entries[] = {{0, 0}, {1, 0}, {0, 1}, {1, 1}};
    int slots[4];
    const struct pattern *p = pattern_build(arena, 2, entries, 4, slots);
    struct linear_solver *solver = linear_create(p);
    double good[4] = {1, 0.5, 0.5, 2};
    assert_int_equal(linear_factor(solver, good), LINEAR_OK);
    struct direct *d = direct_create(solver, p, good);
    assert_non_null(d);
    assert_false(direct_is_factored(d));
    assert_true(direct_factor(d, good));
    assert_int_equal(direct_negative_pivots(d), 0);
    assert_true(direct_factor(d, (const double[4]){1, 1, 1, -3}));
    assert_int_equal(direct_negative_pivots(d), 1);
    assert_false(direct_factor(d, (const double[4]){1, 1, 1, 1}));
    assert_false(direct_is_factored(d));
    assert_false(direct_factor(d, (const double[4]){1, 1, 1, NAN}));
    assert_false(direct_factor(d, (const double[4]){1, 1, 1, INFINITY}));
    assert_false(direct_factor(d, (const double[4]){NAN, 1, 1, 3}));
    assert_false(direct_factor(d, (const double[4]){1e-12, 1, 1, 1e-12}));
    assert_true(direct_factor(d, good));
    direct_destroy(d);
    direct_destroy(NULL);
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_solutions),
        cmocka_unit_test(test_refusals),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
