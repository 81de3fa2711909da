/* test_linear.c: the sparse solver against dense elimination with complete pivoting. */
#include "dense.h"

struct matrix {
    int n;
    struct pattern *pattern;
    double values[DENSE_LIMIT * DENSE_LIMIT];
    double dense[DENSE_LIMIT * DENSE_LIMIT]; /* column-major */
};

/* A random sparse matrix with a full (permuted) diagonal, so that it is structurally regular. */
static void make_random(struct matrix *m, struct arena *arena, uint32_t *seed)
{
    m->n = 1 + (int)(30 * dense_random(seed));
    const int n = m->n;
    const int shift = (int)(n * dense_random(seed));
    struct entry entries[DENSE_LIMIT * 5];
    int slots[DENSE_LIMIT * 5];
    int count = 0;
    for (int j = 0; j < n; j++) {
        entries[count++] = (struct entry){(j + shift) % n, j};
        for (int extra = 0; extra < 3; extra++) {
            int row = (int)(n * dense_random(seed));
            if (dense_random(seed) < 0.6) {
                entries[count++] = (struct entry){row, j};
            }
        }
    }
    m->pattern = pattern_build(arena, n, entries, count, slots);
    assert_non_null(m->pattern);
    for (int k = 0; k < n * n; k++) {
        m->dense[k] = 0;
    }
    for (int j = 0; j < n; j++) {
        for (int k = m->pattern->start[j]; k < m->pattern->start[j + 1]; k++) {
            m->values[k] = (dense_random(seed) - 0.5) * pow(10, 4 * dense_random(seed));
            m->dense[j * n + m->pattern->row[k]] = m->values[k];
        }
    }
}

static void copy_dense(const struct matrix *m, long double *to, bool transposed)
{
    for (int j = 0; j < m->n; j++) {
        for (int i = 0; i < m->n; i++) {
            to[j * m->n + i] =
                (long double)(transposed ? m->dense[i * m->n + j] : m->dense[j * m->n + i]);
        }
    }
}

/* 1-norm condition number by solving for every column of the inverse. */
static double dense_condition(const struct matrix *m)
{
    const int n = m->n;
    long double a[DENSE_LIMIT * DENSE_LIMIT], b[DENSE_LIMIT];
    long double norm = 0, inverse_norm = 0;
    for (int j = 0; j < n; j++) {
        long double sum = 0, inverse_sum = 0;
        copy_dense(m, a, false);
        for (int i = 0; i < n; i++) {
            b[i] = i == j ? 1 : 0;
        }
        dense_eliminate(a, n, b);
        for (int i = 0; i < n; i++) {
            sum += fabsl((long double)m->dense[j * n + i]);
            inverse_sum += fabsl(b[i]);
        }
        norm = fmaxl(norm, sum);
        inverse_norm = fmaxl(inverse_norm, inverse_sum);
    }
    return (double)(norm * inverse_norm);
}

static void check_solution(struct linear_solver *solver, const struct matrix *m, bool transposed,
                           double condition, uint32_t *seed)
{
    long double a[DENSE_LIMIT * DENSE_LIMIT], wanted[DENSE_LIMIT];
    double b[DENSE_LIMIT];
    for (int i = 0; i < m->n; i++) {
        b[i] = dense_random(seed) - 0.5;
        wanted[i] = (long double)b[i];
    }
    copy_dense(m, a, transposed);
    dense_eliminate(a, m->n, wanted);
    if (transposed) {
        linear_solve_transposed(solver, b);
    } else {
        linear_solve(solver, b);
    }
    double largest = 0, error = 0;
    for (int i = 0; i < m->n; i++) {
        largest = fmax(largest, fabs((double)wanted[i]));
        error = fmax(error, fabs(b[i] - (double)wanted[i]));
    }
    assert_true(error <= 1e-13 * condition * largest + 1e-14 * largest);
}

static void test_random_matrices(void **state)
{
    (void)state;
    uint32_t seed = 77;
    int estimates_close = 0, matrices = 0;
    for (int round = 0; round < 300; round++) {
        struct arena *arena = arena_create();
        struct matrix m;
        make_random(&m, arena, &seed);
        long double a[DENSE_LIMIT * DENSE_LIMIT];
        copy_dense(&m, a, false);
        long double determinant = dense_eliminate(a, m.n, NULL);
        double condition = dense_condition(&m);
        if (determinant == 0 || !(condition < 1e10)) {
            arena_destroy(arena);
            continue;
        }
        struct linear_solver *solver = linear_create(m.pattern);
        assert_non_null(solver);
        assert_int_equal(linear_structural_rank(solver), m.n);
        assert_int_equal(linear_factor(solver, m.values), LINEAR_OK);
        check_solution(solver, &m, false, condition, &seed);
        check_solution(solver, &m, true, condition, &seed);
        assert_int_equal(linear_determinant_sign(solver), determinant > 0 ? 1 : -1);
        /* The estimate is a lower bound, exact most of the time (Higham 2002, section 15.3). */
        double estimate = linear_condition(solver, m.values);
        assert_true(estimate <= condition * (1 + 1e-6));
        assert_true(estimate >= condition / 10);
        estimates_close += estimate >= 0.99 * condition ? 1 : 0;
        matrices++;
        /* The same pivots serve slightly other values, and the sign follows them. */
        for (int k = 0; k < m.pattern->start[m.n]; k++) {
            m.values[k] *= -1;
        }
        assert_int_equal(linear_factor(solver, m.values), LINEAR_OK);
        int sign = m.n % 2 != 0 ? -1 : 1;
        assert_int_equal(linear_determinant_sign(solver), determinant > 0 ? sign : -sign);
        int full, again;
        linear_counts(solver, &full, &again);
        assert_int_equal(full, 1);
        assert_int_equal(again, 1);
        linear_destroy(solver);
        arena_destroy(arena);
    }
    assert_true(matrices > 200);
    assert_true(estimates_close > matrices / 2);
}

static void test_tiny(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    int slot;
    struct pattern *none = pattern_build(arena, 0, NULL, 0, &slot);
    struct linear_solver *solver = linear_create(none);
    double nothing[1] = {0};
    assert_non_null(solver);
    assert_int_equal(linear_structural_rank(solver), 0);
    assert_int_equal(linear_factor(solver, nothing), LINEAR_OK);
    linear_solve(solver, nothing);
    linear_solve_transposed(solver, nothing);
    assert_int_equal(linear_determinant_sign(solver), 1);
    assert_near(linear_condition(solver, nothing), 1, 0);
    linear_destroy(solver);

    struct pattern *one = dense_pattern(arena, 1);
    solver = linear_create(one);
    double value = -4, b = 10;
    assert_int_equal(linear_factor(solver, &value), LINEAR_OK);
    linear_solve(solver, &b);
    assert_near(b, -2.5, 0);
    assert_int_equal(linear_determinant_sign(solver), -1);
    assert_near(linear_condition(solver, &value), 1, 1e-15);
    linear_destroy(solver);
    linear_destroy(NULL);
    arena_destroy(arena);
}

/* Column 2 holds entries only in a row that column 1 needs: rank 2 of 3. */
static void test_singular_pattern(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct entry entries[] = {{0, 0}, {1, 1}, {1, 2}};
    int slots[3];
    struct pattern *p = pattern_build(arena, 3, entries, 3, slots);
    struct linear_solver *solver = linear_create(p);
    const double values[] = {1, 2, 3};
    assert_int_equal(linear_structural_rank(solver), 2);
    assert_int_equal(linear_factor(solver, values), LINEAR_SINGULAR);
    assert_in_range(linear_singular_column(solver), 1, 2);
    assert_int_equal(linear_determinant_sign(solver), 0);
    assert_true(isinf(linear_condition(solver, values)));
    linear_destroy(solver);
    arena_destroy(arena);
}

/* Regular pattern, but the values of column 2 vanish; then, singular values after regular ones. */
static void test_singular_values(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct pattern *p = dense_pattern(arena, 3);
    struct linear_solver *solver = linear_create(p);
    double values[] = {4, 1, 0, 1, 3, 1, 0, 0, 0};
    assert_int_equal(linear_structural_rank(solver), 3);
    assert_int_equal(linear_factor(solver, values), LINEAR_SINGULAR);
    assert_int_equal(linear_singular_column(solver), 2);
    values[8] = 2;
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    assert_int_equal(linear_singular_column(solver), -1);
    assert_int_equal(linear_determinant_sign(solver), 1); /* 2 * 11 */
    values[8] = 0;
    assert_int_equal(linear_factor(solver, values), LINEAR_SINGULAR);
    assert_int_equal(linear_singular_column(solver), 2);
    assert_int_equal(linear_determinant_sign(solver), 0);
    linear_destroy(solver);
    arena_destroy(arena);
}

static void test_not_finite(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct pattern *p = dense_pattern(arena, 2);
    struct linear_solver *solver = linear_create(p);
    double values[] = {1, NAN, 0, 1};
    assert_int_equal(linear_factor(solver, values), LINEAR_NOT_FINITE);
    values[1] = INFINITY;
    assert_int_equal(linear_factor(solver, values), LINEAR_NOT_FINITE);
    values[1] = 0;
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    values[1] = -INFINITY;
    assert_int_equal(linear_factor(solver, values), LINEAR_NOT_FINITE);
    assert_int_equal(linear_determinant_sign(solver), 0);
    linear_destroy(solver);
    arena_destroy(arena);
}

/* Pivots on the diagonal, which then shrinks by 1e14: the old pivots would let entries grow past
 * the limit; the answer must stay as good as that of a fresh factorisation. */
static void test_bad_pivots_are_replaced(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct pattern *p = dense_pattern(arena, 3);
    struct linear_solver *solver = linear_create(p);
    double values[] = {1, 0.5, 0.25, 0.5, 1, 0.5, 0.25, 0.5, 1};
    int full, again;
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    linear_counts(solver, &full, &again);
    assert_int_equal(full, 1);
    assert_int_equal(again, 1);
    values[0] = 1e-14;
    values[4] = 1e-14;
    values[8] = 1e-14;
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    linear_counts(solver, &full, &again);
    assert_int_equal(full, 2);
    assert_int_equal(again, 1);
    long double a[9], wanted[3] = {1, 2, 3};
    double b[3] = {1, 2, 3};
    for (int k = 0; k < 9; k++) {
        a[k] = (long double)values[k];
    }
    dense_eliminate(a, 3, wanted);
    linear_solve(solver, b);
    for (int i = 0; i < 3; i++) {
        assert_near(b[i], (double)wanted[i], 1e-14 * 20);
    }
    linear_destroy(solver);
    arena_destroy(arena);
}

/* Hilbert matrix of order 8 (condition 1.5e10 in the 2-norm), in long double, against complete
 * pivoting in long double; the solver holds factors of its double rounding only. */
static void check_hilbert(bool transposed)
{
    enum { N = 8 };
    struct arena *arena = arena_create();
    struct pattern *p = dense_pattern(arena, N);
    struct linear_solver *solver = linear_create(p);
    double values[N * N];
    long double wide[N * N], a[N * N], b[N], y[N], wanted[N], work[2 * N];
    for (int j = 0; j < N; j++) {
        for (int i = 0; i < N; i++) {
            /* Rows doubled by turns, so that the transpose is another matrix. */
            wide[j * N + i] = (long double)(1 + i % 2) / (long double)(i + j + 1);
            values[j * N + i] = (double)wide[j * N + i];
        }
    }
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    for (int j = 0; j < N; j++) {
        b[j] = (long double)(j + 1) / 7;
        wanted[j] = b[j];
        for (int i = 0; i < N; i++) {
            a[j * N + i] = transposed ? wide[i * N + j] : wide[j * N + i];
        }
    }
    long double matrix[N * N];
    for (int k = 0; k < N * N; k++) {
        matrix[k] = a[k];
    }
    dense_eliminate(a, N, wanted);
    long double last = linear_refine(solver, p, wide, b, y, work, transposed);
    assert_true(last <= 1e-8L); /* condition * 5e-20 */
    long double largest = 0;
    for (int i = 0; i < N; i++) {
        largest = fmaxl(largest, fabsl(wanted[i]));
    }
    for (int i = 0; i < N; i++) {
        long double residual = -b[i], meeting = fabsl(b[i]);
        for (int j = 0; j < N; j++) {
            residual += matrix[j * N + i] * y[j];
            meeting += fabsl(matrix[j * N + i] * y[j]);
        }
        assert_true(fabsl(residual) <= 1e-18L * meeting);
        /* Both answers carry condition * 5e-20. */
        assert_true(fabsl(y[i] - wanted[i]) <= 1e-8L * largest);
    }
    linear_destroy(solver);
    arena_destroy(arena);
}

static void test_refine(void **state)
{
    (void)state;
    check_hilbert(false);
    check_hilbert(true);
}

/* A right side of zero, and unknowns twenty decades apart: a small one is refined as well. */
static void test_refine_scales(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct pattern *p = dense_pattern(arena, 2);
    struct linear_solver *solver = linear_create(p);
    const long double wide[] = {3, 1, 0, 1e-10L};
    const double values[] = {3, 1, 0, 1e-10};
    long double b[] = {0, 0}, y[2], work[4];
    assert_int_equal(linear_factor(solver, values), LINEAR_OK);
    assert_true(linear_refine(solver, p, wide, b, y, work, false) == 0);
    assert_true(y[0] == 0 && y[1] == 0);
    /* y0 = 1e-20 / 3, y1 = (1 - y0) * 1e10 */
    b[0] = 1e-20L;
    b[1] = 1;
    linear_refine(solver, p, wide, b, y, work, false);
    assert_near((double)(y[0] * 3e20L - 1), 0, 1e-18);
    assert_near((double)(y[1] * 1e-10L - 1), 0, 1e-18);
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_random_matrices),  cmocka_unit_test(test_tiny),
        cmocka_unit_test(test_singular_pattern), cmocka_unit_test(test_singular_values),
        cmocka_unit_test(test_not_finite),       cmocka_unit_test(test_bad_pivots_are_replaced),
        cmocka_unit_test(test_refine),           cmocka_unit_test(test_refine_scales),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
