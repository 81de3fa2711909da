/*
 * interval_test.c: results of interval operations hold the exact ones, which are computed in long
 * double, and are not much wider.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>

#include <cmocka.h>

#include "check.h"
#include "interval/dual.h"

static uint64_t seed = 20240611;

/* 0 to 1 (an LCG of Knuth, MMIX) */
static double any(void)
{
    seed = seed * 6364136223846793005u + 1442695040888963407u;
    return (double)(seed >> 11) / 9007199254740992.0;
}

/* Over many decades and both signs. */
static double wide(void)
{
    return (any() < 0.5 ? -1 : 1) * pow(10, 40 * any() - 20);
}

static struct interval around(double a, double b)
{
    return a < b ? (struct interval){a, b} : (struct interval){b, a};
}

static void hold(struct interval range, long double value)
{
    if (!((long double)range.lo <= value && value <= (long double)range.hi)) {
        print_error("%.20Lg is not in [%.17g, %.17g]\n", value, range.lo, range.hi);
        fail();
    }
}

static void test_arithmetic(void **state)
{
    (void)state;
    for (int k = 0; k < 20000; k++) {
        const struct interval a = around(wide(), wide()), b = around(wide(), wide());
        const double x = a.lo + (a.hi - a.lo) * any(), y = b.lo + (b.hi - b.lo) * any();
        const double u = fmin(fmax(x, a.lo), a.hi), v = fmin(fmax(y, b.lo), b.hi);
        hold(interval_add(a, b), (long double)u + v);
        hold(interval_sub(a, b), (long double)u - v);
        hold(interval_mul(a, b), (long double)u * v);
        hold(interval_scale(v, a), (long double)u * v);
        hold(interval_square(a), (long double)u * u);
        if (v < 0 || v > 0) {
            hold(interval_div(a, b), (long double)u / v);
        }
    }
}

/* Points: no wider than a few units in the last place. */
static void test_tight(void **state)
{
    (void)state;
    for (int k = 0; k < 2000; k++) {
        const double x = 20 * any() - 10, y = 20 * any() - 10;
        const struct interval a = interval_point(x), b = interval_point(y);
        assert_true(interval_width(interval_add(a, b)) <= 1e-15 * fabs(x + y));
        assert_true(interval_width(interval_mul(a, b)) <= 1e-15 * fabs(x * y));
        assert_true(interval_width(interval_div(a, b)) <= 2e-15 * fabs(x / y));
        assert_true(interval_width(interval_exp(a)) <= 1e-14 * exp(x));
    }
}

static void test_functions(void **state)
{
    (void)state;
    for (int k = 0; k < 20000; k++) {
        const struct interval a = around(60 * any() - 30, 60 * any() - 30);
        const double u = a.lo + (a.hi - a.lo) * any();
        const double x = fmin(fmax(u, a.lo), a.hi);
        hold(interval_exp(a), expl(x));
        hold(interval_expm1(a), expm1l(x));
        hold(interval_tanh(a), tanhl(x));
        hold(interval_power(a, 3), (long double)x * x * x);
        hold(interval_power(a, 4), (long double)x * x * x * x);
        const struct interval p = {fabs(x), fabs(x) + any()};
        hold(interval_sqrt(p), sqrtl(p.lo));
        hold(interval_log1p(p), log1pl(p.hi));
        if (p.lo > 0) {
            hold(interval_log(p), logl(p.lo));
        }
    }
}

static void test_limits(void **state)
{
    (void)state;
    const struct interval crosses = {-1, 2};
    const struct interval line = interval_div(interval_point(1), crosses);
    assert_true(isinf(line.lo) && isinf(line.hi));
    assert_true(interval_mul(interval_point(0), interval_line()).hi < 1e-300);
    struct interval a = {0, 1};
    assert_false(interval_meet(&a, (struct interval){2, 3}));
    assert_true(interval_holds(a, 1) && interval_meet(&a, (struct interval){0.5, 3}));
    check_near(a.lo, 0.5, 0);
    const struct interval square = interval_power(crosses, 2);
    assert_true(square.lo <= 0 && square.lo > -1e-300 && interval_holds(square, 4));
    const struct interval inverse = interval_power((struct interval){2, 4}, -2);
    assert_true(interval_holds(inverse, 0.0625) && interval_holds(inverse, 0.25));
}

/* f = x y/(x + 3) at points inside: value and slopes by hand. */
static void test_dual(void **state)
{
    (void)state;
    for (int k = 0; k < 2000; k++) {
        const double x0 = any(), y0 = 4 * any() - 2, dx = any() * 0.1, dy = any() * 0.1;
        struct dual x, y, sum;
        dual_variable(&x, (struct interval){x0, x0 + dx}, 0, 2);
        dual_variable(&y, (struct interval){y0, y0 + dy}, 1, 2);
        dual_chain(&sum, interval_add(x.v, interval_point(3)), interval_point(1), &x, 2);
        struct dual f;
        dual_product(&f, &x, &y, 2);
        dual_quotient(&f, &f, &sum, 2);
        const long double u = x0 + dx * any(), v = y0 + dy * any();
        hold(f.v, u * v / (u + 3));
        hold(f.d[0], v * 3 / ((u + 3) * (u + 3)));
        hold(f.d[1], u / (u + 3));
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_arithmetic), cmocka_unit_test(test_tight),
        cmocka_unit_test(test_functions),  cmocka_unit_test(test_limits),
        cmocka_unit_test(test_dual),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
