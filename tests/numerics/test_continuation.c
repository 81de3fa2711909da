/*
 * test_continuation.c: walks along a parameter, traces through folds, and all published roots of
 * the tunnel-diode problems (docs/numerics.md).
 */
#include "dense.h"

#include "numerics/continuation.h"

enum { N_LIMIT = 10, ROOT_LIMIT = 32 };

struct test_system {
    int n;
    double lambda;
    /* f, jacobian[j * n + i] (zeroed before), slope dF/dlambda */
    void (*equations)(const struct test_system *s, const double *x, double *f, double *jacobian,
                      double *slope);
};

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    const struct test_system *s = self;
    double slope[N_LIMIT];
    for (int k = 0; k < s->n * s->n; k++) {
        values[k] = 0;
    }
    s->equations(s, x, f, values, slope);
    for (int i = 0; i < s->n; i++) {
        scale[i] = 1;
    }
    return true;
}

static void set_parameter(void *self, double lambda)
{
    struct test_system *s = self;
    s->lambda = lambda;
}

static void parameter_slope(void *self, const double *x, double *slope)
{
    const struct test_system *s = self;
    double f[N_LIMIT], jacobian[N_LIMIT * N_LIMIT];
    for (int k = 0; k < s->n * s->n; k++) {
        jacobian[k] = 0;
    }
    s->equations(s, x, f, jacobian, slope);
}

static struct nonlinear_system make_system(struct test_system *s, struct arena *arena)
{
    return (struct nonlinear_system){.n = s->n,
                                     .pattern = dense_pattern(arena, s->n),
                                     .self = s,
                                     .evaluate = evaluate,
                                     .set_parameter = set_parameter,
                                     .parameter_slope = parameter_slope};
}

/* N01: E - v - 1.5 i(v), the supply E as parameter; mA, V, kohm. */
static double tunnel(double v, double *slope)
{
    static const double c[] = {0, 17.76, -103.79, 229.62, -226.31, 83.72};
    double i = 0;
    *slope = 0;
    for (int k = 5; k >= 0; k--) {
        *slope = *slope * v + i;
        i = i * v + c[k];
    }
    return i;
}

static void tunnel_diode(const struct test_system *s, const double *x, double *f, double *jacobian,
                         double *slope)
{
    double g;
    double i = tunnel(x[0], &g);
    f[0] = s->lambda - x[0] - 1.5 * i;
    jacobian[0] = -1 - 1.5 * g;
    slope[0] = 1;
}

/* N02: two diodes in series; unknowns v1, v2. */
static void tunnel_pair(const struct test_system *s, const double *x, double *f, double *jacobian,
                        double *slope)
{
    double a = x[0], b = x[1];
    double i1 = ((2.5 * a - 10.5) * a + 11.8) * a;
    double i2 = ((0.43 * b - 2.69) * b + 4.56) * b;
    double g1 = (7.5 * a - 21) * a + 11.8;
    double g2 = (1.29 * b - 5.38) * b + 4.56;
    f[0] = s->lambda - 13.3 * i1 - a - b;
    f[1] = i1 - i2;
    jacobian[0] = -13.3 * g1 - 1;
    jacobian[2] = -1;
    jacobian[1] = g1;
    jacobian[3] = -g2;
    slope[0] = 1;
    slope[1] = 0;
}

/* N06 with the right side i scaled by the parameter. */
static void yamamura(const struct test_system *s, const double *x, double *f, double *jacobian,
                     double *slope)
{
    const int n = s->n;
    double sum = 0;
    for (int k = 0; k < n; k++) {
        sum += x[k];
    }
    for (int i = 0; i < n; i++) {
        f[i] = ((2.5 * x[i] - 10.5) * x[i] + 11.8) * x[i] + sum - s->lambda * (i + 1);
        for (int k = 0; k < n; k++) {
            jacobian[k * n + i] = 1;
        }
        jacobian[i * n + i] += (7.5 * x[i] - 21) * x[i] + 11.8;
        slope[i] = -(i + 1);
    }
}

/* x^2 + lambda^2 = 1: folds at lambda = 1 and -1. */
static void circle(const struct test_system *s, const double *x, double *f, double *jacobian,
                   double *slope)
{
    f[0] = x[0] * x[0] + s->lambda * s->lambda - 1;
    jacobian[0] = 2 * x[0];
    slope[0] = 2 * s->lambda;
}

struct roots {
    int n, count, wanted;
    double x[ROOT_LIMIT][N_LIMIT];
    int det_sign[ROOT_LIMIT];
    int points, folds, last_sign;
    double arc;
};

/* Collects roots; ends the trace when all wanted are there. */
static bool collect(void *self, const struct trace_point *point)
{
    struct roots *r = self;
    r->points++;
    assert_true(point->arc >= r->arc);
    r->arc = point->arc;
    if (point->at_target) {
        assert_true(r->count < ROOT_LIMIT);
        for (int k = 0; k < r->n; k++) {
            r->x[r->count][k] = point->x[k];
        }
        r->det_sign[r->count++] = point->det_sign;
    } else {
        r->folds += r->last_sign * point->det_sign < 0 ? 1 : 0;
        r->last_sign = point->det_sign;
    }
    return r->count < r->wanted;
}

static enum newton_status trace(struct test_system *s, const struct continuation_options *options,
                                double from, double to, double *x, struct roots *roots, bool *ended)
{
    struct arena *arena = arena_create();
    struct nonlinear_system system = make_system(s, arena);
    struct newton_report report = {0};
    if (roots != NULL) {
        roots->n = s->n;
    }
    enum newton_status status = arclength_trace(
        &system, options, from, to, x, roots != NULL ? collect : NULL, roots, ended, &report);
    assert_true(report.iterations > 0);
    arena_destroy(arena);
    return status;
}

static struct continuation_options tight_options(void)
{
    struct continuation_options options = continuation_default_options();
    options.newton.step_tolerance = 1e-12;
    return options;
}

/* N01: three roots on one curve, through two folds. det dF/dx changes sign from root to root: the
 * middle one cannot be held (Green and Willson 1992). */
static void test_tunnel_diode(void **state)
{
    (void)state;
    struct test_system s = {.n = 1, .equations = tunnel_diode};
    struct continuation_options options = tight_options();
    struct roots roots = {.wanted = 3};
    double x = 0;
    bool ended = false;
    assert_int_equal(trace(&s, &options, 0, 1.2, &x, &roots, &ended), NEWTON_CONVERGED);
    assert_true(ended);
    assert_int_equal(roots.count, 3);
    assert_int_equal(roots.folds, 2);
    const double wanted[] = {0.06263595921, 0.2853687241, 0.8844295889};
    for (int k = 0; k < 3; k++) {
        assert_near(roots.x[k][0], wanted[k], 6e-11);
        assert_int_equal(roots.det_sign[k], k == 1 ? 1 : -1);
    }
    assert_near(x, wanted[0], 6e-11); /* the first root */

    /* Without a visitor the trace ends at the first; with step limit, at its last point. */
    x = 0;
    assert_int_equal(trace(&s, &options, 0, 1.2, &x, NULL, &ended), NEWTON_CONVERGED);
    assert_false(ended);
    assert_near(x, wanted[0], 6e-11);
    assert_near(s.lambda, 1.2, 0);
    x = 0;
    options.step_limit = 1;
    assert_int_equal(trace(&s, &options, 0, 1.2, &x, NULL, &ended), NEWTON_LIMIT);

    /* All wanted roots and more: the curve goes on, and what was found counts. */
    options.step_limit = 400;
    roots = (struct roots){.wanted = ROOT_LIMIT};
    x = 0;
    assert_int_equal(trace(&s, &options, 0, 1.2, &x, &roots, &ended), NEWTON_CONVERGED);
    assert_false(ended);
    assert_int_equal(roots.count, 3);
}

/* Marks the root of N02 among the wanted ones; each may be met once. */
static void mark(const double *x, const double wanted[9][2], bool *seen)
{
    int which = -1;
    for (int k = 0; k < 9; k++) {
        if (fabs(x[0] - wanted[k][0]) <= 1e-6 && fabs(x[1] - wanted[k][1]) <= 1e-6) {
            which = k;
        }
    }
    assert_int_not_equal(which, -1);
    assert_false(seen[which]);
    seen[which] = true;
}

/* N02: nine roots (own calculation, 6 decimals). Five lie on the curve from E = 0,
 * four on a closed curve of its own, entered from the neighbourhood of root 5. */
static void test_tunnel_pair(void **state)
{
    (void)state;
    static const double wanted[9][2] = {
        {0.199791, 3.754217}, {0.219855, 1.672951}, {0.228267, 0.828626},
        {1.666378, 0.739343}, {1.702658, 1.809030}, {1.775504, 3.707178},
        {2.224730, 3.693044}, {2.277597, 1.857492}, {2.305222, 0.705560}};
    static const struct {
        double from, x[2];
        int roots;
    } curves[] = {{0, {0, 0}, 5}, {28, {1.70, 1.81}, 4}};
    bool seen[9] = {false};
    for (int c = 0; c < 2; c++) {
        struct test_system s = {.n = 2, .equations = tunnel_pair};
        struct continuation_options options = tight_options();
        struct roots roots = {.wanted = curves[c].roots};
        double x[2] = {curves[c].x[0], curves[c].x[1]};
        bool ended = false;
        assert_int_equal(trace(&s, &options, curves[c].from, 30, x, &roots, &ended),
                         NEWTON_CONVERGED);
        assert_true(ended);
        assert_int_equal(roots.count, curves[c].roots);
        for (int r = 0; r < roots.count; r++) {
            mark(roots.x[r], wanted, seen);
        }
    }
    for (int k = 0; k < 9; k++) {
        assert_true(seen[k]);
    }
}

/* N06: the one curve from lambda = 0 to infinity carries an odd number of the published roots (its
 * determinant begins and ends with one sign); other roots lie on closed curves. */
static void test_yamamura(void **state)
{
    (void)state;
    const struct {
        int n, published;
    } cases[] = {{3, 1}, {5, 5}, {10, 9}};
    for (int c = 0; c < 3; c++) {
        struct test_system s = {.n = cases[c].n, .equations = yamamura};
        struct continuation_options options = tight_options();
        options.step_limit = 600;
        struct roots roots = {.wanted = ROOT_LIMIT};
        double x[N_LIMIT] = {0};
        bool ended = true;
        assert_int_equal(trace(&s, &options, 0, 1, x, &roots, &ended), NEWTON_CONVERGED);
        assert_false(ended);
        assert_in_range(roots.count, 1, cases[c].published);
        assert_int_equal(roots.count % 2, 1);
        for (int r = 0; r < roots.count; r++) {
            double f[N_LIMIT], jacobian[N_LIMIT * N_LIMIT], slope[N_LIMIT];
            s.lambda = 1;
            yamamura(&s, roots.x[r], f, jacobian, slope);
            for (int i = 0; i < s.n; i++) {
                assert_near(f[i], 0, 1e-10);
            }
            assert_int_equal(roots.det_sign[r], r % 2 == 0 ? 1 : -1);
            for (int q = 0; q < r; q++) {
                assert_true(fabs(roots.x[r][0] - roots.x[q][0]) > 1e-3);
            }
        }
    }
}

/* Both crossings near the tip of a fold are seen, even inside one step; roots +-sqrt(1 - l^2). */
static void test_tip_of_fold(void **state)
{
    (void)state;
    const double targets[] = {0.5, 0.99, 0.9999, 0.999999};
    for (int t = 0; t < 4; t++) {
        struct test_system s = {.n = 1, .equations = circle};
        const struct continuation_options options = tight_options();
        struct roots roots = {.wanted = 2};
        double x = 1;
        bool ended = false;
        assert_int_equal(trace(&s, &options, 0, targets[t], &x, &roots, &ended), NEWTON_CONVERGED);
        assert_true(ended);
        assert_int_equal(roots.count, 2);
        double root = sqrt((1 - targets[t]) * (1 + targets[t]));
        assert_near(roots.x[0][0], root, 1e-9);
        assert_near(roots.x[1][0], -root, 1e-9);
        assert_int_equal(roots.det_sign[0], 1);
        assert_int_equal(roots.det_sign[1], -1);
    }
    /* 1.01 is never reached: the curve turns round and round until the step limit. */
    struct test_system s = {.n = 1, .equations = circle};
    const struct continuation_options options = tight_options();
    struct roots roots = {.wanted = 1};
    double x = 1;
    bool ended = true;
    assert_int_equal(trace(&s, &options, 0, 1.01, &x, &roots, &ended), NEWTON_LIMIT);
    assert_false(ended);
    assert_int_equal(roots.count, 0);
    assert_true(roots.folds > 4);
}

static bool never(void *self, const struct trace_point *point)
{
    (void)point;
    int *calls = self;
    ++*calls;
    return false;
}

static bool stop_now(void *self)
{
    (void)self;
    return true;
}

static void test_trace_ends(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct test_system s = {.n = 1, .equations = tunnel_diode};
    struct nonlinear_system system = make_system(&s, arena);
    struct continuation_options options = continuation_default_options();
    struct newton_report report = {0};
    int calls = 0;
    bool ended = false;
    double x = 0.01;
    assert_int_equal(arclength_trace(&system, &options, 0, 1.2, &x, never, &calls, &ended, &report),
                     NEWTON_CONVERGED);
    assert_true(ended);
    assert_int_equal(calls, 1);
    assert_near(x, 0, 1e-9); /* the start, solved */
    assert_int_equal(arclength_trace(&system, &options, 0, 1.2, &x, NULL, NULL, NULL, &report),
                     NEWTON_CONVERGED);
    options.newton.stopped = stop_now;
    assert_int_equal(arclength_trace(&system, &options, 0, 1.2, &x, NULL, NULL, &ended, &report),
                     NEWTON_STOPPED);
    /* Starting in a fold there is no direction. */
    options.newton.stopped = NULL;
    s.equations = circle;
    x = 0;
    assert_int_equal(arclength_trace(&system, &options, 1, 2, &x, NULL, NULL, &ended, &report),
                     NEWTON_SINGULAR);
    arena_destroy(arena);
}

static enum newton_status walk(struct test_system *s, const struct continuation_options *options,
                               double from, double to, double *x, double *reached,
                               struct newton_report *report)
{
    struct arena *arena = arena_create();
    struct nonlinear_system system = make_system(s, arena);
    struct linear_solver *solver = linear_create(system.pattern);
    double *work = arena_new_array(arena, double, continuation_walk_work_size(&system));
    enum newton_status status =
        continuation_walk(&system, solver, options, from, to, x, reached, work, report);
    linear_destroy(solver);
    arena_destroy(arena);
    return status;
}

static void test_walk(void **state)
{
    (void)state;
    struct test_system s = {.n = 1, .equations = tunnel_diode};
    struct continuation_options options = tight_options();
    struct newton_report report = {0};
    double x = 0, reached;
    assert_int_equal(walk(&s, &options, 0, 1.2, &x, &reached, &report), NEWTON_CONVERGED);
    assert_near(reached, 1.2, 0);
    assert_near(s.lambda, 1.2, 0);
    assert_near(x, 0.06263595921, 6e-11);
    /* Downwards, and nowhere to go. */
    assert_int_equal(walk(&s, &options, 1.2, 0.3, &x, &reached, &report), NEWTON_CONVERGED);
    double g;
    assert_near(x + 1.5 * tunnel(x, &g), 0.3, 1e-10);
    assert_int_equal(walk(&s, &options, 0.3, 0.3, &x, &reached, &report), NEWTON_CONVERGED);
    assert_near(reached, 0.3, 0);

    options.step_limit = 1;
    options.first_step = 0.01;
    assert_int_equal(walk(&s, &options, 0.3, 1, &x, &reached, &report), NEWTON_LIMIT);
    assert_near(reached, 0.307, 1e-12);
    assert_near(x + 1.5 * tunnel(x, &g), 0.307, 1e-10);
    options.newton.stopped = stop_now;
    assert_int_equal(walk(&s, &options, 0.3, 1, &x, &reached, &report), NEWTON_STOPPED);
}

/* On the circle no root lies beyond 1: the walk ends just below, at a root, and says so. */
static void test_walk_stops_at_fold(void **state)
{
    (void)state;
    struct test_system s = {.n = 1, .equations = circle};
    const struct continuation_options options = tight_options();
    struct newton_report report = {0};
    double x = 1, reached;
    assert_int_not_equal(walk(&s, &options, 0, 2, &x, &reached, &report), NEWTON_CONVERGED);
    assert_true(reached <= 1);
    assert_true(reached > 1 - 1e-4);
    assert_near(s.lambda, reached, 0);
    assert_near(x * x + reached * reached, 1, 1e-10);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_tunnel_diode),       cmocka_unit_test(test_tunnel_pair),
        cmocka_unit_test(test_yamamura),           cmocka_unit_test(test_tip_of_fold),
        cmocka_unit_test(test_trace_ends),         cmocka_unit_test(test_walk),
        cmocka_unit_test(test_walk_stops_at_fold),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
