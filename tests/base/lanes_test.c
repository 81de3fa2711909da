/*
 * lanes_test.c: exp, expm1, log, log1p and tanh over lanes against the long double functions of the
 * C library; compiled once a width.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <stdbool.h>

#include "base/lanes.h"

enum { ROUNDS = 100000 };

/* Documented in lanes.h. */
static const double units = 3;

static uint64_t state = 1;

/* Marsaglia (2003), xorshift: any spread of arguments will do. */
static double uniform(void)
{
    state ^= state << 13;
    state ^= state >> 7;
    state ^= state << 17;
    return (double)(state >> 11) * 0x1p-53;
}

/* Of all sizes, both signs. */
static double argument(int round)
{
    const double sign = uniform() < 0.5 ? -1 : 1;
    return round % 3 == 0   ? sign * 700 * uniform()
           : round % 3 == 1 ? sign * uniform()
                            : sign * exp(60 * uniform() - 55);
}

static void check(const char *name, double u, double got, long double wanted)
{
    const double size = fabs((double)wanted);
    const double unit = nextafter(size, INFINITY) - size;
    if (!(fabsl((long double)got - wanted) <= (long double)(units * unit))) {
        print_error("%s(%.17g) is %.17g, wanted %.17Lg\n", name, u, got, wanted);
        fail();
    }
}

static void functions_hold(void **test)
{
    (void)test;
    for (int round = 0; round < ROUNDS; round++) {
        lanes u, above, exponential;
        for (int l = 0; l < LANES; l++) {
            u[l] = argument(round);
            above[l] = u[l] > -0.99 ? u[l] : -0.99 * uniform();
        }
        const lanes size = lanes_abs(u);
        const lanes e = lanes_exp(u), less = lanes_expm1(u, &exponential), t = lanes_tanh(u);
        const lanes ln = lanes_log(size), ln1 = lanes_log1p(above);
        for (int l = 0; l < LANES; l++) {
            check("exp", u[l], e[l], expl((long double)u[l]));
            assert_true(exponential[l] >= e[l] && exponential[l] <= e[l]);
            check("expm1", u[l], less[l], expm1l((long double)u[l]));
            check("tanh", u[l], t[l], tanhl((long double)u[l]));
            check("log", size[l], ln[l], logl((long double)size[l]));
            check("log1p", above[l], ln1[l], log1pl((long double)above[l]));
        }
    }
}

static void ends_hold(void **test)
{
    (void)test;
    lanes u = lanes_of(1);
    u[0] = -1e6;
    u[1] = -INFINITY;
    u[2] = NAN;
    u[3] = 0;
    const lanes e = lanes_exp(u), ln = lanes_log(u);
    assert_true(e[0] <= 0 && e[0] >= 0 && e[1] <= 0 && e[1] >= 0);
    assert_true(isnan(e[2]) && isnan(ln[2]));
    assert_true(e[3] <= 1 && e[3] >= 1);
    assert_true(isnan(ln[0]) && isnan(ln[3]));
}

/* What is done for one lane leaves the others as they were. */
static void choice_is_by_lane(void **test)
{
    (void)test;
    lanes u = lanes_of(2);
    u[1] = -1;
    const lanes chosen = lanes_choose(u > lanes_of(0), u, lanes_of(7));
    assert_int_equal(lanes_mask(u > lanes_of(0)), ((1u << LANES) - 1) & ~2u);
    for (int l = 0; l < LANES; l++) {
        const double wanted = l == 1 ? 7 : 2;
        assert_true(chosen[l] >= wanted && chosen[l] <= wanted);
    }
}

int main(void)
{
#if LANES == 8
    const bool runs = __builtin_cpu_supports("avx512f") && __builtin_cpu_supports("avx512dq");
#else
    const bool runs = __builtin_cpu_supports("avx2") && __builtin_cpu_supports("fma");
#endif
    if (!runs) {
        print_message("this processor has no such lanes\n");
        return 77;
    }
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(functions_hold),
        cmocka_unit_test(ends_hold),
        cmocka_unit_test(choice_is_by_lane),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
