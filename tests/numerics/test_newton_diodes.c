/*
 * test_newton_diodes.c: exponential circuits from cold, with a junction limit of the test's own
 * through longest_step. Answers: bisection of the one-dimensional circuit equation in long double.
 *
 * A diode carries IS (exp(v / UT) - 1), IS 1e-14 A, UT 25.852 mV.
 */
#include "dense.h"

#define SATURATION 1e-14
#define UT 0.025852

/* A ladder: supply - resistor - node 1 - diode - node 2 - diode - ... - ground; node k is x[k-1].
 * antiparallel adds the opposite diode to each. A last unknown is the supply's current. */
struct ladder {
    int diodes;
    bool antiparallel;
    double supply, resistance;
    int evaluations;
};

static double current(double v, double *slope)
{
    *slope = SATURATION / UT * exp(v / UT);
    return SATURATION * expm1(v / UT);
}

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    struct ladder *l = self;
    const int n = l->diodes + 1;
    l->evaluations++;
    for (int k = 0; k < n * n; k++) {
        values[k] = 0;
    }
    /* Equation n-1: (supply - v1) / R - i = 0; equation k: what enters node k. */
    double through = (l->supply - x[0]) / l->resistance;
    f[n - 1] = through - x[n - 1];
    scale[n - 1] = fabs(through) + fabs(x[n - 1]);
    values[n - 1] = -1 / l->resistance;
    values[(n - 1) * n + n - 1] = -1;
    for (int k = 0; k < n - 1; k++) {
        f[k] = k == 0 ? x[n - 1] : 0;
        scale[k] = fabs(f[k]);
    }
    values[(n - 1) * n] = 1;
    for (int k = 0; k < n - 1; k++) {
        double slope, back_slope = 0;
        double v = x[k] - (k + 1 < n - 1 ? x[k + 1] : 0);
        double i = current(v, &slope);
        if (l->antiparallel) {
            i -= current(-v, &back_slope);
            slope += back_slope;
        }
        f[k] -= i;
        scale[k] += fabs(i);
        values[k * n + k] -= slope;
        if (k + 1 < n - 1) {
            f[k + 1] += i;
            scale[k + 1] += fabs(i);
            values[(k + 1) * n + k] += slope;
            values[k * n + k + 1] += slope;
            values[(k + 1) * n + k + 1] -= slope;
        }
    }
    return isfinite(f[0]);
}

/* A junction may not jump far past the voltage where its current becomes ample. */
static double junction_limit(void *self, const double *x, const double *dx)
{
    const struct ladder *l = self;
    double share = 1;
    for (int k = 0; k < l->diodes; k++) {
        double v = x[k] - (k + 1 < l->diodes ? x[k + 1] : 0);
        double dv = dx[k] - (k + 1 < l->diodes ? dx[k + 1] : 0);
        if (l->antiparallel && dv < 0) {
            v = -v;
            dv = -dv;
        }
        double ceiling = fmax(0.6, v + 3 * UT);
        if (v + dv > ceiling) {
            share = fmin(share, (ceiling - v) / dv);
        }
    }
    return share;
}

/* Voltage of one diode of the ladder, by bisection. */
static double answer(const struct ladder *l)
{
    const long double sign = l->supply < 0 ? -1 : 1;
    long double low = 0, high = fabsl((long double)l->supply) / l->diodes;
    for (int i = 0; i < 200; i++) {
        long double v = (low + high) / 2;
        long double diode = (long double)SATURATION * expm1l(v / (long double)UT);
        if (l->antiparallel) {
            diode -= (long double)SATURATION * expm1l(-v / (long double)UT);
        }
        long double supplied =
            (fabsl((long double)l->supply) - v * l->diodes) / (long double)l->resistance;
        if (diode < supplied) {
            low = v;
        } else {
            high = v;
        }
    }
    return (double)(sign * low);
}

static void check(struct ladder ladder, bool limited, int iteration_limit)
{
    struct arena *arena = arena_create();
    const int n = ladder.diodes + 1;
    double weight[16], x[16] = {0};
    for (int k = 0; k < n; k++) {
        weight[k] = k < n - 1 ? 1 : 0;
    }
    struct nonlinear_system system = {.n = n,
                                      .pattern = dense_pattern(arena, n),
                                      .self = &ladder,
                                      .evaluate = evaluate,
                                      .longest_step = limited ? junction_limit : NULL,
                                      .weight = weight};
    struct linear_solver *solver = linear_create(system.pattern);
    double *work = arena_new_array(arena, double, newton_work_size(&system));
    struct newton_options options = newton_default_options();
    struct newton_report report = {0};
    enum newton_status status = newton_solve(&system, solver, &options, x, work, &report);
    print_message("%d diodes %s %g V %g ohm, %s limit: %s, %d iterations, %d evaluations\n",
                  ladder.diodes, ladder.antiparallel ? "both ways" : "", ladder.supply,
                  ladder.resistance, limited ? "with" : "no", newton_status_text(status),
                  report.iterations, ladder.evaluations);
    assert_int_equal(status, NEWTON_CONVERGED);
    assert_true(report.iterations <= iteration_limit);
    const double v = answer(&ladder);
    for (int k = 0; k < n - 1; k++) {
        assert_near(x[k], v * (n - 1 - k), 1e-11);
    }
    double wanted = (ladder.supply - v * ladder.diodes) / ladder.resistance;
    assert_near(x[n - 1], wanted, 1e-9 * fabs(wanted));
    linear_destroy(solver);
    arena_destroy(arena);
}

static void test_one_diode(void **state)
{
    (void)state;
    check((struct ladder){.diodes = 1, .supply = 5, .resistance = 1e3}, true, 40);
    check((struct ladder){.diodes = 1, .supply = 5, .resistance = 1e3}, false, 40);
    check((struct ladder){.diodes = 1, .supply = 5, .resistance = 5e9}, true, 40);
    check((struct ladder){.diodes = 1, .supply = 60, .resistance = 1}, true, 40);
    check((struct ladder){.diodes = 1, .supply = 60, .resistance = 1}, false, 40);
}

static void test_stack(void **state)
{
    (void)state;
    check((struct ladder){.diodes = 4, .supply = 5, .resistance = 1e3}, true, 40);
    check((struct ladder){.diodes = 4, .supply = 5, .resistance = 1e3}, false, 40);
    check((struct ladder){.diodes = 8, .supply = 12, .resistance = 1e6}, true, 40);
}

static void test_antiparallel(void **state)
{
    (void)state;
    check((struct ladder){.diodes = 1, .antiparallel = true, .supply = 5, .resistance = 1e3}, true,
          40);
    check((struct ladder){.diodes = 1, .antiparallel = true, .supply = -5, .resistance = 1e3}, true,
          40);
    check((struct ladder){.diodes = 2, .antiparallel = true, .supply = -5, .resistance = 1e3}, true,
          40);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_one_diode),
        cmocka_unit_test(test_stack),
        cmocka_unit_test(test_antiparallel),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
