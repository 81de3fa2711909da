/*
 * test_newton.c: the bare Newton solver on published systems, on systems with two roots, and on
 * what must not pass for a root.
 *
 * MGH: More, Garbow and Hillstrom 1981, ACM Trans. Math. Software 7, 17.
 */
#include "dense.h"

#include <string.h>

/* f[i]; J[i][j] = jacobian[j * n + i], which is zeroed before the call. */
typedef void equations(int n, const double *x, double *f, double *jacobian);

#define PI 3.14159265358979323846

static void rosenbrock(int n, const double *x, double *f, double *j)
{
    f[0] = 10 * (x[1] - x[0] * x[0]);
    f[1] = 1 - x[0];
    j[0] = -20 * x[0];
    j[n] = 10;
    j[1] = -1;
}

static void powell_singular(int n, const double *x, double *f, double *j)
{
    double a = x[1] - 2 * x[2];
    double b = x[0] - x[3];
    f[0] = x[0] + 10 * x[1];
    f[1] = sqrt(5) * (x[2] - x[3]);
    f[2] = a * a;
    f[3] = sqrt(10) * b * b;
    j[0] = 1;
    j[n] = 10;
    j[2 * n + 1] = sqrt(5);
    j[3 * n + 1] = -sqrt(5);
    j[n + 2] = 2 * a;
    j[2 * n + 2] = -4 * a;
    j[3] = 2 * sqrt(10) * b;
    j[3 * n + 3] = -2 * sqrt(10) * b;
}

static void powell_badly_scaled(int n, const double *x, double *f, double *j)
{
    f[0] = 1e4 * x[0] * x[1] - 1;
    f[1] = exp(-x[0]) + exp(-x[1]) - 1.0001;
    j[0] = 1e4 * x[1];
    j[n] = 1e4 * x[0];
    j[1] = -exp(-x[0]);
    j[n + 1] = -exp(-x[1]);
}

static void helical_valley(int n, const double *x, double *f, double *j)
{
    double theta = atan(x[1] / x[0]) / (2 * PI) + (x[0] < 0 ? 0.5 : 0);
    double r2 = x[0] * x[0] + x[1] * x[1];
    f[0] = 10 * (x[2] - 10 * theta);
    f[1] = 10 * (sqrt(r2) - 1);
    f[2] = x[2];
    j[0] = 100 * x[1] / (2 * PI * r2);
    j[n] = -100 * x[0] / (2 * PI * r2);
    j[2 * n] = 10;
    j[1] = 10 * x[0] / sqrt(r2);
    j[n + 1] = 10 * x[1] / sqrt(r2);
    j[2 * n + 2] = 1;
}

/* Square by leaving out the second of its three equations, x2 = 2e-6, which the root also meets. */
static void brown_badly_scaled(int n, const double *x, double *f, double *j)
{
    f[0] = x[0] - 1e6;
    f[1] = x[0] * x[1] - 2;
    j[0] = 1;
    j[1] = x[1];
    j[n + 1] = x[0];
}

static void brown_almost_linear(int n, const double *x, double *f, double *j)
{
    double sum = 0, product = 1;
    for (int k = 0; k < n; k++) {
        sum += x[k];
        product *= x[k];
    }
    for (int i = 0; i < n - 1; i++) {
        f[i] = x[i] + sum - (n + 1);
        for (int k = 0; k < n; k++) {
            j[k * n + i] = i == k ? 2 : 1;
        }
    }
    f[n - 1] = product - 1;
    for (int k = 0; k < n; k++) {
        double others = 1;
        for (int m = 0; m < n; m++) {
            others *= m == k ? 1 : x[m];
        }
        j[k * n + n - 1] = others;
    }
}

static void discrete_boundary_value(int n, const double *x, double *f, double *j)
{
    double h = 1.0 / (n + 1);
    for (int i = 0; i < n; i++) {
        double t = (i + 1) * h;
        double before = i > 0 ? x[i - 1] : 0;
        double after = i < n - 1 ? x[i + 1] : 0;
        f[i] = 2 * x[i] - before - after + h * h * pow(x[i] + t + 1, 3) / 2;
        j[i * n + i] = 2 + 1.5 * h * h * pow(x[i] + t + 1, 2);
        if (i > 0) {
            j[(i - 1) * n + i] = -1;
        }
        if (i < n - 1) {
            j[(i + 1) * n + i] = -1;
        }
    }
}

static void broyden_tridiagonal(int n, const double *x, double *f, double *j)
{
    for (int i = 0; i < n; i++) {
        double before = i > 0 ? x[i - 1] : 0;
        double after = i < n - 1 ? x[i + 1] : 0;
        f[i] = (3 - 2 * x[i]) * x[i] - before - 2 * after + 1;
        j[i * n + i] = 3 - 4 * x[i];
        if (i > 0) {
            j[(i - 1) * n + i] = -1;
        }
        if (i < n - 1) {
            j[(i + 1) * n + i] = -2;
        }
    }
}

static void chebyquad(int n, const double *x, double *f, double *j)
{
    for (int k = 1; k <= n; k++) {
        f[k - 1] = k % 2 == 0 ? 1.0 / (k * k - 1) : 0;
    }
    for (int m = 0; m < n; m++) {
        double z = 2 * x[m] - 1;
        double last = 1, here = z, last_slope = 0, slope = 2; /* by x */
        for (int k = 1; k <= n; k++) {
            f[k - 1] += here / n;
            j[m * n + k - 1] = slope / n;
            double next = 2 * z * here - last;
            double next_slope = 4 * here + 2 * z * slope - last_slope;
            last = here;
            here = next;
            last_slope = slope;
            slope = next_slope;
        }
    }
}

static void trigonometric(int n, const double *x, double *f, double *j)
{
    double sum = 0;
    for (int k = 0; k < n; k++) {
        sum += cos(x[k]);
    }
    for (int i = 0; i < n; i++) {
        f[i] = n - sum + (i + 1) * (1 - cos(x[i])) - sin(x[i]);
        for (int k = 0; k < n; k++) {
            j[k * n + i] = sin(x[k]);
        }
        j[i * n + i] += (i + 1) * sin(x[i]) - cos(x[i]);
    }
}

static void variably_dimensioned(int n, const double *x, double *f, double *j)
{
    double s = 0;
    for (int k = 0; k < n; k++) {
        s += (k + 1) * (x[k] - 1);
    }
    for (int i = 0; i < n; i++) {
        f[i] = x[i] - 1 + (i + 1) * s * (1 + 2 * s * s);
        for (int k = 0; k < n; k++) {
            j[k * n + i] = (i + 1) * (k + 1) * (1 + 6 * s * s) + (i == k ? 1 : 0);
        }
    }
}

struct problem {
    const char *name;
    const char *source;
    equations *equations;
    int n;
    double start[10];
    double start_norm; /* published or derived |F(start)|; 0: none */
    double root[10];
    double root_tolerance; /* 0: any root will do */
    bool sorted;           /* the order of the unknowns means nothing */
    bool singular;         /* the Jacobian is singular at the root: linear convergence */
};

#define ALL_10(v)                                                                                  \
    {                                                                                              \
        v, v, v, v, v, v, v, v, v, v                                                               \
    }

static const struct problem problems[] = {
    {.name = "Rosenbrock",
     .source = "MGH 1",
     .equations = rosenbrock,
     .n = 2,
     .start = {-1.2, 1},
     .start_norm = 4.91934955047,
     .root = {1, 1},
     .root_tolerance = 1e-10},
    {.name = "Powell singular",
     .source = "MGH 13",
     .equations = powell_singular,
     .n = 4,
     .start = {3, -1, 0, 1},
     .start_norm = 14.6628782986,
     .root = {0, 0, 0, 0},
     .root_tolerance = 1e-6,
     .singular = true},
    {.name = "Powell badly scaled",
     .source = "MGH 3; x1 to 5e-12 below",
     .equations = powell_badly_scaled,
     .n = 2,
     .start = {0, 1},
     .start_norm = 1.065487,
     .root = {1.098159e-5, 9.10614674},
     .root_tolerance = 5e-9},
    {.name = "helical valley",
     .source = "MGH 7",
     .equations = helical_valley,
     .n = 3,
     .start = {-1, 0, 0},
     .start_norm = 50,
     .root = {1, 0, 0},
     .root_tolerance = 1e-10},
    {.name = "Brown badly scaled, equations 1 and 3",
     .source = "MGH 4",
     .equations = brown_badly_scaled,
     .n = 2,
     .start = {1, 1},
     .root = {1e6, 2e-6},
     .root_tolerance = 1e-9},
    {.name = "Brown almost-linear",
     .source = "MGH 27",
     .equations = brown_almost_linear,
     .n = 10,
     .start = ALL_10(0.5),
     .root = ALL_10(1),
     .root_tolerance = 1e-9},
    {.name = "discrete boundary value",
     .source = "MGH 28",
     .equations = discrete_boundary_value,
     .n = 10,
     .start = {-10. / 121, -18. / 121, -24. / 121, -28. / 121, -30. / 121, -30. / 121, -28. / 121,
               -24. / 121, -18. / 121, -10. / 121},
     .root = {-0.04316498252, -0.08157715654, -0.1144857144, -0.1409735769, -0.1599086962,
              -0.1698772023, -0.1690899838, -0.1552495352, -0.1253558917, -0.07541653369},
     .root_tolerance = 5e-11},
    {.name = "Broyden tridiagonal",
     .source = "MINPACK user guide ANL-80-74",
     .equations = broyden_tridiagonal,
     .n = 9,
     .start = {-1, -1, -1, -1, -1, -1, -1, -1, -1},
     .root = {-0.5706545, -0.6816283, -0.7017325, -0.7042129, -0.7013690, -0.6918656, -0.6657920,
              -0.5960342, -0.4164121},
     .root_tolerance = 6e-8},
    {.name = "Chebyquad 5",
     .source = "MGH 35",
     .equations = chebyquad,
     .n = 5,
     .start = {1. / 6, 2. / 6, 3. / 6, 4. / 6, 5. / 6},
     .root = {0.08375125650, 0.3127292952, 0.5, 0.6872707048, 0.9162487435},
     .root_tolerance = 1e-10,
     .sorted = true},
    {.name = "Chebyquad 6",
     .source = "MGH 35",
     .equations = chebyquad,
     .n = 6,
     .start = {1. / 7, 2. / 7, 3. / 7, 4. / 7, 5. / 7, 6. / 7},
     .root = {0.06687659095, 0.2887406731, 0.3666822992, 0.6333177008, 0.7112593269, 0.9331234091},
     .root_tolerance = 1e-10,
     .sorted = true},
    {.name = "trigonometric",
     .source = "MGH 26 (several roots; |F| = 0 is asked)",
     .equations = trigonometric,
     .n = 10,
     .start = ALL_10(0.1)},
    {.name = "variably dimensioned, gradient",
     .source = "MGH 25",
     .equations = variably_dimensioned,
     .n = 10,
     .start = {0.9, 0.8, 0.7, 0.6, 0.5, 0.4, 0.3, 0.2, 0.1, 0},
     .root = ALL_10(1),
     .root_tolerance = 1e-10},
};

enum { PROBLEM_COUNT = sizeof problems / sizeof problems[0] };

static bool evaluate_problem(void *self, const double *x, double *f, double *scale, double *values)
{
    const struct problem *p = self;
    memset(values, 0, sizeof(double) * (size_t)(p->n * p->n));
    p->equations(p->n, x, f, values);
    for (int i = 0; i < p->n; i++) {
        scale[i] = 1; /* the published residuals are absolute */
    }
    return true;
}

static enum newton_status solve(const struct problem *p, const struct newton_options *options,
                                double *x, struct newton_report *report)
{
    struct arena *arena = arena_create();
    struct problem mine = *p;
    struct nonlinear_system system = {.n = p->n,
                                      .pattern = dense_pattern(arena, p->n),
                                      .self = &mine,
                                      .evaluate = evaluate_problem};
    struct linear_solver *solver = linear_create(system.pattern);
    double *work = arena_new_array(arena, double, newton_work_size(&system));
    assert_non_null(solver);
    assert_non_null(work);
    *report = (struct newton_report){0};
    enum newton_status status = newton_solve(&system, solver, options, x, work, report);
    linear_destroy(solver);
    arena_destroy(arena);
    return status;
}

static struct newton_options tight_options(void)
{
    struct newton_options options = newton_default_options();
    options.tolerance = 1e-11;
    options.step_tolerance = 1e-11;
    return options;
}

static double norm(const double *f, int n)
{
    double sum = 0;
    for (int i = 0; i < n; i++) {
        sum += f[i] * f[i];
    }
    return sqrt(sum);
}

/* The table checks itself: norms at the start, roots, and derivatives against differences. */
static void test_table(void **state)
{
    (void)state;
    for (int t = 0; t < PROBLEM_COUNT; t++) {
        const struct problem *p = &problems[t];
        double f[10], up[10], down[10], j[100] = {0}, ignored[100];
        p->equations(p->n, p->start, f, j);
        if (p->start_norm > 0) {
            assert_near(norm(f, p->n), p->start_norm, 5e-7 * fmax(1, p->start_norm));
        }
        for (int k = 0; k < p->n; k++) {
            double x[10];
            const double h = 1e-6;
            memcpy(x, p->start, sizeof x);
            x[k] += h;
            p->equations(p->n, x, up, ignored);
            x[k] -= 2 * h;
            p->equations(p->n, x, down, ignored);
            for (int i = 0; i < p->n; i++) {
                double slope = (up[i] - down[i]) / (2 * h);
                assert_near(j[k * p->n + i], slope,
                            2e-6 * fmax(1, fabs(slope)) + 4e-10 * fabs(f[i])); /* rounding / h */
            }
        }
        if (p->root_tolerance > 0) {
            p->equations(p->n, p->root, f, j);
            assert_true(norm(f, p->n) <= 1e-3);
        }
    }
}

static int rising(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static void test_published_roots(void **state)
{
    (void)state;
    const struct newton_options options = tight_options();
    for (int t = 0; t < PROBLEM_COUNT; t++) {
        const struct problem *p = &problems[t];
        double x[10], f[10], j[100];
        struct newton_report report;
        memcpy(x, p->start, sizeof x);
        enum newton_status status = solve(p, &options, x, &report);
        print_message("%-40s %-28s %3d iterations, residual %.1e\n", p->name,
                      newton_status_text(status), report.iterations, report.residual);
        assert_int_equal(status, NEWTON_CONVERGED);
        p->equations(p->n, x, f, j);
        assert_true(norm(f, p->n) <= 1e-10);
        if (p->sorted) {
            qsort(x, (size_t)p->n, sizeof x[0], rising);
        }
        for (int k = 0; k < p->n && p->root_tolerance > 0; k++) {
            assert_near(x[k], p->root[k], p->root_tolerance);
        }
        assert_true(report.iterations <= (p->singular ? 60 : 40));
    }
}

/* Powell badly scaled: the small unknown, which the common tolerance does not see. */
static void test_badly_scaled_small_unknown(void **state)
{
    (void)state;
    const struct newton_options options = tight_options();
    double x[10] = {0, 1};
    struct newton_report report;
    assert_int_equal(solve(&problems[2], &options, x, &report), NEWTON_CONVERGED);
    assert_near(x[0], 1.098159e-5, 5e-12);
}

/* Brown almost-linear has a second root (MINPACK test driver): each start goes
 * to its own. */
static void test_two_roots(void **state)
{
    (void)state;
    const struct newton_options options = tight_options();
    struct newton_report report;
    double x[10] = {0.98, 0.98, 0.98, 0.98, 0.98, 0.98, 0.98, 0.98, 0.98, 1.2};
    assert_int_equal(solve(&problems[5], &options, x, &report), NEWTON_CONVERGED);
    for (int k = 0; k < 9; k++) {
        assert_near(x[k], 0.9794303033, 5e-11);
    }
    assert_near(x[9], 1.205696967, 5e-10);
    for (int k = 0; k < 10; k++) {
        x[k] = 1.001;
    }
    assert_int_equal(solve(&problems[5], &options, x, &report), NEWTON_CONVERGED);
    for (int k = 0; k < 10; k++) {
        assert_near(x[k], 1, 1e-9);
    }
}

static void linear_equations(int n, const double *x, double *f, double *j)
{
    f[0] = 3 * x[0] + x[1] - 5;
    f[1] = x[0] - 2 * x[1] + 4;
    j[0] = 3;
    j[n] = 1;
    j[1] = 1;
    j[n + 1] = -2;
}

/* 3a + b = 5, a - 2b = -4: a = 6/7, b = 17/7. */
static void test_linear_takes_one_step(void **state)
{
    (void)state;
    const struct problem linear = {.equations = linear_equations, .n = 2};
    const struct newton_options options = newton_default_options();
    double x[10] = {1000, -77};
    struct newton_report report;
    assert_int_equal(solve(&linear, &options, x, &report), NEWTON_CONVERGED);
    assert_int_equal(report.iterations, 1);
    assert_near(x[0], 6. / 7, 1e-13);
    assert_near(x[1], 17. / 7, 1e-13);
}

static void no_root(int n, const double *x, double *f, double *j)
{
    (void)n;
    f[0] = x[0] * x[0] + 1;
    j[0] = 2 * x[0];
}

static void singular_equations(int n, const double *x, double *f, double *j)
{
    f[0] = x[0] - 1;
    f[1] = 3;
    j[0] = 1;
    j[n] = 0;
    j[1] = 0;
    j[n + 1] = 0;
}

static void not_a_number(int n, const double *x, double *f, double *j)
{
    (void)n;
    f[0] = x[0] < 0.5 ? x[0] - 1 : NAN;
    j[0] = 1;
}

static void never_a_number(int n, const double *x, double *f, double *j)
{
    (void)n;
    (void)x;
    f[0] = NAN;
    j[0] = 1;
}

static void nan_slope(int n, const double *x, double *f, double *j)
{
    (void)n;
    f[0] = x[0];
    j[0] = NAN;
}

/* Every step is 0 to working precision while the residual stays at 1: no root. */
static void tiny_steps(int n, const double *x, double *f, double *j)
{
    (void)n;
    (void)x;
    f[0] = 1;
    j[0] = 1e30;
}

static void test_failures(void **state)
{
    (void)state;
    const struct {
        equations *equations;
        int n;
        double start;
        enum newton_status wanted;
    } cases[] = {
        /* the first step leads to the minimum of x^2 + 1, where J is 0 */
        {no_root, 1, 1, NEWTON_SINGULAR},          {singular_equations, 2, 0, NEWTON_SINGULAR},
        {never_a_number, 1, 0, NEWTON_NOT_FINITE}, {nan_slope, 1, 0, NEWTON_NOT_FINITE},
        {tiny_steps, 1, 0, NEWTON_STALLED},
    };
    const struct newton_options options = newton_default_options();
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const struct problem p = {.equations = cases[i].equations, .n = cases[i].n};
        double x[10] = {cases[i].start};
        struct newton_report report;
        enum newton_status status = solve(&p, &options, x, &report);
        assert_int_equal(status, cases[i].wanted);
        assert_true(strlen(newton_status_text(status)) > 0);
        if (cases[i].equations == singular_equations) {
            assert_int_equal(report.column, 1);
            assert_int_equal(report.equation, 1);
            assert_near(report.residual, 3, 0);
        }
    }
    /* Not a number beyond 0.5: the search comes close and gives up; 0.5 is no root. */
    const struct problem p = {.equations = not_a_number, .n = 1};
    double x[10] = {0};
    struct newton_report report;
    assert_int_not_equal(solve(&p, &options, x, &report), NEWTON_CONVERGED);
    assert_true(x[0] < 0.5);
    assert_true(report.residual >= 0.5);
}

static void test_limits(void **state)
{
    (void)state;
    struct newton_options options = newton_default_options();
    struct newton_report report;
    double x[10] = {-1.2, 1};
    options.iteration_limit = 1;
    assert_int_equal(solve(&problems[0], &options, x, &report), NEWTON_LIMIT);
    assert_int_equal(report.iterations, 1);

    /* 100 away at most 10 a step: at least 10 iterations. */
    const struct problem linear = {.equations = linear_equations, .n = 2};
    options = newton_default_options();
    options.step_limit = 10;
    double y[10] = {100 + 6. / 7, 17. / 7};
    assert_int_equal(solve(&linear, &options, y, &report), NEWTON_CONVERGED);
    assert_int_equal(report.iterations, 10);
    assert_near(y[0], 6. / 7, 1e-12);
}

static bool stop_at_third(void *self)
{
    int *asked = self;
    return ++*asked >= 3;
}

static void test_stop(void **state)
{
    (void)state;
    struct newton_options options = newton_default_options();
    struct newton_report report;
    int asked = 0;
    double x[10];
    memcpy(x, problems[1].start, sizeof x);
    options.stopped = stop_at_third;
    options.stopped_self = &asked;
    assert_int_equal(solve(&problems[1], &options, x, &report), NEWTON_STOPPED);
    assert_int_equal(report.iterations, 2);
}

/* A residual with nothing to measure it against passes only when it is 0. */
static bool scale_zero(void *self, const double *x, double *f, double *scale, double *values)
{
    (void)x;
    f[0] = *(const double *)self;
    scale[0] = 0;
    values[0] = 1e20;
    return true;
}

static void test_zero_scale(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    double residual = 0;
    struct nonlinear_system system = {
        .n = 1, .pattern = dense_pattern(arena, 1), .self = &residual, .evaluate = scale_zero};
    struct linear_solver *solver = linear_create(system.pattern);
    const struct newton_options options = newton_default_options();
    struct newton_report report = {0};
    double x = 1, work[7];
    assert_int_equal(newton_work_size(&system), 7);
    assert_int_equal(newton_solve(&system, solver, &options, &x, work, &report), NEWTON_CONVERGED);
    residual = 1e-300;
    assert_int_equal(newton_solve(&system, solver, &options, &x, work, &report), NEWTON_STALLED);
    assert_true(isinf(report.residual));
    linear_destroy(solver);
    arena_destroy(arena);
}

static bool evaluate_nothing(void *self, const double *x, double *f, double *scale, double *values)
{
    (void)self, (void)x, (void)f, (void)scale, (void)values;
    return true;
}

static void test_empty_system(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    int slot;
    struct nonlinear_system system = {
        .n = 0, .pattern = pattern_build(arena, 0, NULL, 0, &slot), .evaluate = evaluate_nothing};
    struct linear_solver *solver = linear_create(system.pattern);
    const struct newton_options options = newton_default_options();
    struct newton_report report = {0};
    double nothing[1];
    assert_int_equal(newton_solve(&system, solver, &options, nothing, nothing, &report),
                     NEWTON_CONVERGED);
    assert_int_equal(report.iterations, 0);
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_table),
        cmocka_unit_test(test_published_roots),
        cmocka_unit_test(test_badly_scaled_small_unknown),
        cmocka_unit_test(test_two_roots),
        cmocka_unit_test(test_linear_takes_one_step),
        cmocka_unit_test(test_failures),
        cmocka_unit_test(test_limits),
        cmocka_unit_test(test_stop),
        cmocka_unit_test(test_zero_scale),
        cmocka_unit_test(test_empty_system),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
