/* test_polish.c: a root in double goes on to the end of long double, and never gets worse. */
#include "dense.h"

/* x^2 = 2, x y = exp(z), z + y = 3 with a part that only long double sees. */
static bool evaluate_extended(void *self, const long double *x, long double *f, long double *scale,
                              long double *values)
{
    (void)self;
    long double e = expl(x[2]);
    f[0] = x[0] * x[0] - 2;
    f[1] = x[0] * x[1] - e;
    f[2] = x[2] + x[1] - 3;
    scale[0] = x[0] * x[0] + 2;
    scale[1] = fabsl(x[0] * x[1]) + e;
    scale[2] = fabsl(x[2]) + fabsl(x[1]) + 3;
    if (values != NULL) {
        const long double j[9] = {2 * x[0], x[1], 0, 0, x[0], 1, 0, -e, 1};
        for (int k = 0; k < 9; k++) {
            values[k] = j[k];
        }
    }
    return true;
}

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    long double wide[3] = {(long double)x[0], (long double)x[1], (long double)x[2]};
    long double wide_f[3], wide_scale[3], wide_values[9];
    evaluate_extended(self, wide, wide_f, wide_scale, wide_values);
    for (int i = 0; i < 3; i++) {
        f[i] = (double)wide_f[i];
        scale[i] = (double)wide_scale[i];
    }
    for (int k = 0; k < 9; k++) {
        values[k] = (double)wide_values[k];
    }
    return true;
}

/* The third unknown by bisection of sqrt(2) (3 - z) = exp(z). */
static long double answer(void)
{
    long double low = 0, high = 3;
    for (int i = 0; i < 200; i++) {
        long double z = (low + high) / 2;
        if (sqrtl(2) * (3 - z) > expl(z)) {
            low = z;
        } else {
            high = z;
        }
    }
    return low;
}

static void check(bool extended, const long double *start, long double tolerance)
{
    struct arena *arena = arena_create();
    struct nonlinear_system system = {.n = 3,
                                      .pattern = dense_pattern(arena, 3),
                                      .evaluate = evaluate,
                                      .evaluate_extended = extended ? evaluate_extended : NULL};
    struct linear_solver *solver = linear_create(system.pattern);
    long double x[3] = {start[0], start[1], start[2]}, values[9];
    long double *work = arena_new_array(arena, long double, newton_polish_work_size(&system));
    double worst;
    int equation;
    assert_int_equal(newton_polish(&system, solver, x, values, work, &worst, &equation),
                     NEWTON_CONVERGED);
    assert_in_range(equation, 0, 2);
    assert_true(worst <= (extended ? 2e-19 : 4e-16));
    assert_true(fabsl(x[0] - sqrtl(2)) <= tolerance);
    assert_true(fabsl(x[2] - answer()) <= tolerance);
    assert_true(fabsl(x[1] - (3 - answer())) <= tolerance);
    assert_true(fabsl(values[0] - 2 * x[0]) <= 1e-15L);
    /* The solver holds the factors at x: J d = (J's first column) gives the first unit vector. */
    double d[3] = {(double)values[0], (double)values[1], (double)values[2]};
    linear_solve(solver, d);
    assert_near(d[0], 1, 1e-14);
    assert_near(d[1], 0, 1e-14);
    linear_destroy(solver);
    arena_destroy(arena);
}

static void test_extended(void **state)
{
    (void)state;
    const long double near_root[3] = {1.41421356L, 1.9L, 1.1L};
    const long double root[3] = {sqrtl(2), 3 - answer(), answer()};
    check(true, near_root, 1e-18L);
    check(true, root, 1e-18L);
}

static void test_without_extended(void **state)
{
    (void)state;
    const long double near_root[3] = {1.41421356L, 1.9L, 1.1L};
    check(false, near_root, 1e-15L);
}

static bool evaluate_broken(void *self, const long double *x, long double *f, long double *scale,
                            long double *values)
{
    const double *slope = self;
    f[0] = isnan(*slope) ? NAN : x[0];
    scale[0] = 1;
    values[0] = (long double)*slope;
    return true;
}

static void test_failures(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    double slope = NAN, worst;
    struct nonlinear_system system = {.n = 1,
                                      .pattern = dense_pattern(arena, 1),
                                      .self = &slope,
                                      .evaluate_extended = evaluate_broken};
    struct linear_solver *solver = linear_create(system.pattern);
    long double x = 1, values, *work;
    int equation;
    work = arena_new_array(arena, long double, newton_polish_work_size(&system));
    assert_int_equal(newton_polish(&system, solver, &x, &values, work, &worst, &equation),
                     NEWTON_NOT_FINITE);
    assert_true(isinf(worst));
    slope = 0;
    assert_int_equal(newton_polish(&system, solver, &x, &values, work, &worst, &equation),
                     NEWTON_SINGULAR);
    slope = INFINITY;
    assert_int_equal(newton_polish(&system, solver, &x, &values, work, &worst, &equation),
                     NEWTON_NOT_FINITE);
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_extended),
        cmocka_unit_test(test_without_extended),
        cmocka_unit_test(test_failures),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
