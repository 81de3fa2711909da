/* test_random.c: known answers of the generator, known quantiles of the normal distribution. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <stdlib.h>
#include <string.h>

#include "check.h"
#include "numerics/random.h"
#include "numerics/statistics.h"

/* The three vectors that Salmon et al. (2011) distribute with Philox4x32-10: zeros, ones, digits of
 * pi. */
static void known_answers(void **state)
{
    (void)state;
    static const struct {
        uint32_t counter[4], key[2], wanted[4];
    } rows[] = {
        {{0, 0, 0, 0}, {0, 0}, {0x6627e8d5, 0xe169c58d, 0xbc57ac4c, 0x9b00dbd8}},
        {{0xffffffff, 0xffffffff, 0xffffffff, 0xffffffff},
         {0xffffffff, 0xffffffff},
         {0x408f276d, 0x41c83b0e, 0xa20bc7c6, 0x6d5451fd}},
        {{0x243f6a88, 0x85a308d3, 0x13198a2e, 0x03707344},
         {0xa4093822, 0x299f31d0},
         {0xd16cfe09, 0x94fdcceb, 0x5001e420, 0x24126ea1}},
    };
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        uint32_t out[4];
        random_philox(rows[k].counter, rows[k].key, out);
        assert_memory_equal(out, rows[k].wanted, sizeof out);
    }
}

/* Quantiles to 16 digits: the first four from the tables that Wichura (1988) gives for his check
 * (p = 0.25, 0.001, 1e-20) and from tables of the normal distribution. */
static void known_quantiles(void **state)
{
    (void)state;
    check_near(normal_quantile(0.25), -0.6744897501960817, 1e-15);
    check_near(normal_quantile(0.001), -3.090232306167814, 1e-15);
    check_near(normal_quantile(1e-20), -9.262340089798408, 1e-15);
    check_near(normal_quantile(0.975), 1.959963984540054, 1e-15);
    check_near(normal_quantile(0.995), 2.575829303548901, 1e-15);
    assert_true(normal_quantile(0.5) == 0);
    assert_true(normal_quantile(0) == -INFINITY);
    assert_true(normal_quantile(1) == INFINITY);
    assert_true(isnan(normal_quantile(-0.1)));
    assert_true(isnan(normal_quantile(NAN)));
}

/* Phi(z) = erfc(-z/sqrt 2)/2 of the C library undoes it, over 300 decades. */
static void quantile_inverts(void **state)
{
    (void)state;
    for (double p = 0.5; p > 1e-300; p *= 0.83) {
        const double z = normal_quantile(p);
        /* an error of 1e-15 of z moves p by z^2 1e-15 of itself */
        check_near(erfc(-z / sqrt(2)) / 2, p, 1e-15 * (4 + z * z));
    }
}

/* Deviate k of a stream does not depend on how many are drawn, and streams differ. */
static void deviates_stand_alone(void **state)
{
    (void)state;
    double many[101], few[8], other[8];
    random_normals(7, 123456789012345ULL, 101, many);
    random_normals(7, 123456789012345ULL, 7, few);
    assert_memory_equal(many, few, 7 * sizeof few[0]);
    random_normals(7, 123456789012346ULL, 7, other);
    assert_true(few[0] != other[0] && few[6] != other[6]);
    random_normals(8, 123456789012345ULL, 7, other);
    assert_true(few[0] != other[0]);
    random_normals(7, 123456789012345ULL + (1ULL << 32), 7, other);
    assert_true(few[0] != other[0]);
}

/* Moments 0, 1, 0, 3 within five standard errors: sqrt(1/n), sqrt(2/n), sqrt(15/n), sqrt(96/n). */
static void moments(void **state)
{
    (void)state;
    enum { STREAMS = 50000, EACH = 4, N = STREAMS * EACH };
    double sum[5] = {0}, across = 0;
    for (int s = 0; s < STREAMS; s++) {
        double z[EACH];
        random_normals(1, (uint64_t)s, EACH, z);
        across += z[0] * z[1] + z[2] * z[3] + z[1] * z[2];
        for (int k = 0; k < EACH; k++) {
            double power = 1;
            for (int m = 1; m <= 4; m++) {
                power *= z[k];
                sum[m] += power;
            }
        }
    }
    assert_true(fabs(sum[1] / N) < 5 * sqrt(1.0 / N));
    assert_true(fabs(sum[2] / N - 1) < 5 * sqrt(2.0 / N));
    assert_true(fabs(sum[3] / N) < 5 * sqrt(15.0 / N));
    assert_true(fabs(sum[4] / N - 3) < 5 * sqrt(96.0 / N));
    assert_true(fabs(across / (3.0 * STREAMS)) < 5 * sqrt(1.0 / (3.0 * STREAMS)));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(known_answers),    cmocka_unit_test(known_quantiles),
        cmocka_unit_test(quantile_inverts), cmocka_unit_test(deviates_stand_alone),
        cmocka_unit_test(moments),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
