/*
 * test_settle.c: roots by pseudo-transient continuation, against closed forms.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include <math.h>
#include <stdlib.h>

#include "numerics/settle.h"

/* One unknown; dx/dt = -f(x). */
struct scalar {
    void (*f)(double x, double *value, double *slope);
};

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    const struct scalar *s = self;
    s->f(x[0], f, values);
    scale[0] = fabs(f[0]) + 1;
    return isfinite(f[0]);
}

static bool always(void *self)
{
    (void)self;
    return true;
}

static enum newton_status run_until(void (*f)(double, double *, double *), double start,
                                    bool patient, bool (*stopped)(void *), double *x)
{
    struct arena *arena = arena_create();
    const struct entry entry = {0, 0};
    struct scalar self = {f};
    const double inertia = 1;
    int slot;
    struct nonlinear_system system = {.n = 1,
                                      .pattern = pattern_build(arena, 1, &entry, 1, &slot),
                                      .self = &self,
                                      .evaluate = evaluate};
    struct linear_solver *solver = linear_create(system.pattern);
    double *work = calloc(newton_work_size(&system), sizeof *work);
    struct newton_report report = {0};
    struct newton_options options = newton_default_options();
    options.stopped = stopped;
    assert_non_null(work);
    *x = start;
    const enum newton_status status =
        settle(&system, solver, &options, &inertia, patient, x, work, &report);
    free(work);
    linear_destroy(solver);
    arena_destroy(arena);
    return status;
}

static enum newton_status run(void (*f)(double, double *, double *), double start, bool patient,
                              double *x)
{
    return run_until(f, start, patient, NULL, x);
}

/* dx/dt = x - x^3: rests in 1 and -1; 0 is a root that nothing comes to rest in. */
static void pitchfork(double x, double *value, double *slope)
{
    *value = x * x * x - x;
    *slope = 3 * x * x - 1;
}

static void keeps_to_roots_that_can_be_held(void **state)
{
    (void)state;
    double x;
    for (int patient = 0; patient < 2; patient++) {
        assert_int_equal(run(pitchfork, 0.1, patient, &x), NEWTON_CONVERGED);
        assert_true(fabs(x - 1) < 1e-9);
        assert_int_equal(run(pitchfork, -0.1, patient, &x), NEWTON_CONVERGED);
        assert_true(fabs(x + 1) < 1e-9);
        assert_int_equal(run(pitchfork, 7, patient, &x), NEWTON_CONVERGED);
        assert_true(fabs(x - 1) < 1e-9);
    }
}

/* A square law against a current of 4: below 0 there is no slope for Newton. */
static void square_law(double x, double *value, double *slope)
{
    const double over = x > 0 ? x : 0;
    *value = over * over - 4;
    *slope = 2 * over;
}

static void passes_where_the_jacobian_is_singular(void **state)
{
    (void)state;
    double x;
    assert_int_equal(run(square_law, -3, false, &x), NEWTON_CONVERGED);
    assert_true(fabs(x - 2) < 1e-9);
}

/* 1 + x^2 has no root. */
static void without_root(double x, double *value, double *slope)
{
    *value = 1 + x * x;
    *slope = 2 * x;
}

static void no_root_is_no_success(void **state)
{
    (void)state;
    double x;
    assert_int_not_equal(run(without_root, 0.3, false, &x), NEWTON_CONVERGED);
}

static void not_a_number(double x, double *value, double *slope)
{
    *value = x < 1 ? x - 2 : (double)NAN;
    *slope = 1;
}

static void nan_is_no_success(void **state)
{
    (void)state;
    double x;
    assert_int_equal(run(not_a_number, 0, false, &x), NEWTON_NOT_FINITE);
}

static void stops_when_told(void **state)
{
    (void)state;
    double x;
    assert_int_equal(run_until(pitchfork, 0.1, false, always, &x), NEWTON_STOPPED);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(keeps_to_roots_that_can_be_held),
        cmocka_unit_test(passes_where_the_jacobian_is_singular),
        cmocka_unit_test(no_root_is_no_success),
        cmocka_unit_test(nan_is_no_success),
        cmocka_unit_test(stops_when_told),
    };
    return cmocka_run_group_tests(tests, NULL, NULL) == 0 ? 0 : 1;
}
