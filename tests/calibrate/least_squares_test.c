/*
 * least_squares_test.c: the search against certified and closed-form answers.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "calibrate/least_squares.h"
#include "check.h"

/*
 * NIST Statistical Reference Datasets, nonlinear regression, Misra1a (Misra 1978): y = b1 (1 -
 * exp(-b2 x)), certified to 11 digits.
 */
static const double misra_y[] = {10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02,
                                 44.82, 50.76, 55.05, 61.01, 66.40, 75.47, 81.78};
static const double misra_x[] = {77.6,  114.9, 141.1, 190.8, 239.9, 289.0, 332.8,
                                 378.4, 434.8, 477.3, 536.8, 593.1, 689.1, 760.0};
enum { MISRA = 14 };

static void misra(void *self, const double *b, double *residuals, double *jacobian)
{
    (void)self;
    for (int k = 0; k < MISRA; k++) {
        double decay = exp(-b[1] * misra_x[k]);
        if (residuals != NULL) {
            residuals[k] = b[0] * (1 - decay) - misra_y[k];
        }
        if (jacobian != NULL) {
            jacobian[k] = 1 - decay;
            jacobian[k + MISRA] = b[0] * misra_x[k] * decay;
        }
    }
}

static void check_misra(const struct bounded *bounds, const double *start)
{
    struct arena *arena = arena_create();
    double b[2] = {start[0], start[1]};
    struct least_squares_answer answer;
    struct least_squares_problem problem = {2, MISRA, bounds, 0, misra, NULL, NULL};
    assert_int_equal(least_squares_solve(arena, &problem, b, &answer), STATUS_OK);
    check_near(b[0], 2.3894212918e+02, 1e-6);
    check_near(b[1], 5.5015643181e-04, 1e-6);
    check_near(answer.sum, 1.2455138894e-01, 1e-9);
    check_near(answer.standard[0], 2.7070075241e+00, 1e-5);
    check_near(answer.standard[1], 7.2668688436e-06, 1e-5);
    assert_int_equal(answer.rank, 2);
    assert_false(answer.at_bound[0] || answer.at_bound[1]);
    assert_true(answer.correlation[1] < -0.99); /* b1 and b2 trade against each other */
    arena_destroy(arena);
}

static void certified_values(void **state)
{
    (void)state;
    const struct bounded linear[2] = {{0, 1000, false}, {0, 0.01, false}};
    const struct bounded logarithmic[2] = {{1, 1e5, true}, {1e-7, 1, true}};
    check_misra(linear, (const double[]){500, 1e-4});
    check_misra(linear, (const double[]){250, 5e-4});
    check_misra(logarithmic, (const double[]){500, 1e-4});
}

/* (p0 - 2)^2 + (p1 - p0)^2 with p0 at most 1: the bound, and p1 = 1. */
static void corner(void *self, const double *p, double *residuals, double *jacobian)
{
    (void)self;
    if (residuals != NULL) {
        residuals[0] = p[0] - 2;
        residuals[1] = p[1] - p[0];
    }
    if (jacobian != NULL) {
        jacobian[0] = 1;
        jacobian[1] = -1;
        jacobian[2] = 0;
        jacobian[3] = 1;
    }
}

static void stops_at_a_bound(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct bounded bounds[2] = {{-5, 1, false}, {-5, 5, false}};
    double p[2] = {-3, 3};
    struct least_squares_answer answer;
    struct least_squares_problem problem = {2, 2, bounds, 0, corner, NULL, NULL};
    assert_int_equal(least_squares_solve(arena, &problem, p, &answer), STATUS_OK);
    check_near(p[0], 1, 1e-6);
    check_near(p[1], 1, 1e-6);
    assert_true(answer.at_bound[0]);
    assert_false(answer.at_bound[1]);
    assert_true(isnan(answer.standard[0]));
    assert_int_equal(answer.rank, 1);
    arena_destroy(arena);
}

/* Only p0 + p1 is told. */
static void sum_only(void *self, const double *p, double *residuals, double *jacobian)
{
    (void)self;
    for (int k = 0; k < 4; k++) {
        double x = k + 1, noise = k % 2 == 0 ? 0.01 : -0.01;
        if (residuals != NULL) {
            residuals[k] = x * (p[0] + p[1] - 3) + noise;
        }
        if (jacobian != NULL) {
            jacobian[k] = jacobian[k + 4] = x;
        }
    }
}

static void tells_the_rank(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct bounded bounds[2] = {{-10, 10, false}, {-10, 10, false}};
    double p[2] = {0, 0};
    struct least_squares_answer answer;
    struct least_squares_problem problem = {2, 4, bounds, 0, sum_only, NULL, NULL};
    assert_int_equal(least_squares_solve(arena, &problem, p, &answer), STATUS_OK);
    check_near(p[0] + p[1], 3, 0.01);
    assert_int_equal(answer.rank, 1);
    assert_true(isinf(answer.standard[0]) != isinf(answer.standard[1]));
    arena_destroy(arena);
}

static bool always(void *self)
{
    (void)self;
    return true;
}

static void can_be_stopped(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct bounded bounds[2] = {{0, 1000, false}, {0, 0.01, false}};
    double b[2] = {500, 1e-4};
    struct least_squares_answer answer;
    struct least_squares_problem problem = {2, MISRA, bounds, 0, misra, always, NULL};
    assert_int_equal(least_squares_solve(arena, &problem, b, &answer), STATUS_STOPPED);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(certified_values),
        cmocka_unit_test(stops_at_a_bound),
        cmocka_unit_test(tells_the_rank),
        cmocka_unit_test(can_be_stopped),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
