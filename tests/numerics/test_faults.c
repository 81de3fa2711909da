/*
 * test_faults.c: what the solvers do when an evaluation fails, the work is stopped or memory is
 * short at any moment: they say so, and never call it a solution.
 */
#include "dense.h"

#include <suitesparse/SuiteSparse_config.h>

#include "numerics/continuation.h"

/* x^3 - 3 x = 6 (lambda - 1/2): two folds between lambda = 0 and 1. */
struct cubic {
    double lambda;
    int calls, fails_at; /* evaluation that is not finite, 0: none */
    double edge;         /* beyond it nothing is finite */
    int asked, stops_at;
};

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    struct cubic *c = self;
    const double drive = 6 * (c->lambda - 0.5);
    f[0] = x[0] * x[0] * x[0] - 3 * x[0] - drive;
    scale[0] = fabs(x[0] * x[0] * x[0]) + fabs(3 * x[0]) + fabs(drive) + 1e-300;
    values[0] = 3 * x[0] * x[0] - 3;
    return ++c->calls != c->fails_at && !(fabs(x[0]) > c->edge);
}

static void set_parameter(void *self, double lambda)
{
    struct cubic *c = self;
    c->lambda = lambda;
}

static void parameter_slope(void *self, const double *x, double *slope)
{
    (void)self;
    (void)x;
    slope[0] = -6;
}

static bool ask_stopped(void *self)
{
    struct cubic *c = self;
    return ++c->asked == c->stops_at;
}

static struct nonlinear_system cubic_system(struct arena *arena, struct cubic *c)
{
    *c = (struct cubic){.edge = INFINITY};
    return (struct nonlinear_system){.n = 1,
                                     .pattern = dense_pattern(arena, 1),
                                     .self = c,
                                     .evaluate = evaluate,
                                     .set_parameter = set_parameter,
                                     .parameter_slope = parameter_slope};
}

/* x is a root at lambda = 1. */
static void check_root(double x)
{
    assert_near(x * x * x - 3 * x, 3, 1e-8);
}

static enum newton_status trace(const struct nonlinear_system *system, struct cubic *c, double *x)
{
    struct continuation_options options = continuation_default_options();
    struct newton_report report = {0};
    options.newton.stopped = ask_stopped;
    options.newton.stopped_self = c;
    c->calls = c->asked = 0;
    x[0] = -2;
    return arclength_trace(system, &options, 0, 1, x, NULL, NULL, NULL, &report);
}

/* Every question is answered with a stop once. */
static void test_trace_stopped(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct cubic c;
    const struct nonlinear_system system = cubic_system(arena, &c);
    double x[1];
    assert_int_equal(trace(&system, &c, x), NEWTON_CONVERGED);
    check_root(x[0]);
    const int questions = c.asked;
    assert_true(questions > 20);
    for (int k = 1; k <= questions; k++) {
        c.stops_at = k;
        assert_int_equal(trace(&system, &c, x), NEWTON_STOPPED);
    }
    arena_destroy(arena);
}

/* One evaluation that is not finite costs a shorter step; a wall ends the trace. */
static void test_trace_not_finite(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct cubic c;
    const struct nonlinear_system system = cubic_system(arena, &c);
    double x[1];
    assert_int_equal(trace(&system, &c, x), NEWTON_CONVERGED);
    const int evaluations = c.calls;
    int solved = 0;
    for (int k = 1; k <= evaluations; k++) {
        c.fails_at = k;
        if (trace(&system, &c, x) == NEWTON_CONVERGED) {
            check_root(x[0]);
            solved++;
        }
    }
    assert_true(solved > evaluations / 2);
    c.fails_at = 0;
    c.edge = 2.05; /* the root at lambda = 1 is 2.1038 */
    assert_int_not_equal(trace(&system, &c, x), NEWTON_CONVERGED);
    arena_destroy(arena);
}

/* Without a slope in the parameter the last root is the prediction: as good, in more steps. */
static void test_walk_without_slope(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct cubic c;
    struct nonlinear_system system = cubic_system(arena, &c);
    struct linear_solver *solver = linear_create(system.pattern);
    double *work = arena_new_array(arena, double, continuation_walk_work_size(&system));
    const struct continuation_options options = continuation_default_options();
    struct newton_report report = {0};
    double x[1] = {2}, reached;
    system.parameter_slope = NULL;
    assert_int_equal(
        continuation_walk(&system, solver, &options, 0.9, 1, x, &reached, work, &report),
        NEWTON_CONVERGED);
    check_root(x[0]);
    linear_destroy(solver);
    arena_destroy(arena);
}

/* Each evaluation of Newton and of the polish fails once. */
static void test_evaluation_fails(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct cubic c;
    const struct nonlinear_system system = cubic_system(arena, &c);
    struct linear_solver *solver = linear_create(system.pattern);
    const struct newton_options options = newton_default_options();
    double *work = arena_new_array(arena, double, newton_work_size(&system));
    long double *wide = arena_new_array(arena, long double, newton_polish_work_size(&system));
    /* plain steps from afar; from beside the fold, steps that shorten the residual */
    static const double starts[] = {5, 1.001, 0.98, -0.9, -1.02};
    for (int k = 1; k < 200; k++) {
        struct newton_report report = {0};
        double x[1] = {starts[k % 5]}, worst;
        long double refined[1] = {2.1L}, values[1];
        int equation;
        c = (struct cubic){.lambda = 1, .fails_at = 1 + k / 5, .edge = INFINITY};
        enum newton_status status = newton_solve(&system, solver, &options, x, work, &report);
        if (status == NEWTON_CONVERGED) {
            check_root(x[0]);
        } else if (x[0] > 3) { /* beside the fold it may also rest there: |f| is least */
            assert_int_equal(status, NEWTON_NOT_FINITE);
        }
        c.calls = 0;
        status = newton_polish(&system, solver, refined, values, wide, &worst, &equation);
        if (status == NEWTON_CONVERGED) { /* how good it is, the residual says */
            assert_true(worst < 1e-9 || fabs((double)refined[0] - 2.1) < 0.01);
        } else {
            assert_int_equal(status, NEWTON_NOT_FINITE);
        }
    }
    linear_destroy(solver);
    arena_destroy(arena);
}

static void *refuse(size_t size)
{
    (void)size;
    return NULL;
}

/* A solver that has not factored yet asks for memory, and is refused. */
static void test_memory(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct cubic c;
    const struct nonlinear_system system = cubic_system(arena, &c);
    struct linear_solver *solver = linear_create(system.pattern);
    long double *wide = arena_new_array(arena, long double, newton_polish_work_size(&system));
    long double refined[1] = {2.1L}, values[1];
    const double matrix[1] = {2};
    double worst;
    int equation;
    c.lambda = 1;
    assert_true(isinf(linear_condition(solver, matrix))); /* nothing is factored */
    void *(*plain)(size_t) = SuiteSparse_config.malloc_func;
    SuiteSparse_config.malloc_func = refuse;
    assert_int_equal(newton_polish(&system, solver, refined, values, wide, &worst, &equation),
                     NEWTON_MEMORY);
    SuiteSparse_config.malloc_func = plain;
    assert_int_equal(linear_factor(solver, matrix), LINEAR_OK);
    assert_near(linear_condition(solver, matrix), 1, 1e-12);

    /* A right side that is not finite has no correction. */
    const long double wide_matrix[1] = {2}, right[1] = {INFINITY};
    long double y[1], scratch[2];
    assert_true(
        isinf(linear_refine(solver, system.pattern, wide_matrix, right, y, scratch, false)));
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_trace_stopped),
        cmocka_unit_test(test_trace_not_finite),
        cmocka_unit_test(test_walk_without_slope),
        cmocka_unit_test(test_evaluation_fails),
        cmocka_unit_test(test_memory),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
