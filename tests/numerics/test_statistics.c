/* test_statistics.c: certified values of NIST, published intervals, histograms by hand. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <stdlib.h>

#include "check.h"
#include "numerics/random.h"
#include "numerics/statistics.h"

static void assert_within(double got, double wanted, double tolerance)
{
    if (!(fabs(got - wanted) <= tolerance)) {
        print_error("%.17g where %.17g is wanted\n", got, wanted);
        fail();
    }
}

/* Michelso of the NIST Statistical Reference Datasets: speed of light, 100 values. */
static const double michelso[100] = {
    299.85, 299.74, 299.90, 300.07, 299.93, 299.85, 299.95, 299.98, 299.98, 299.88, 300.00, 299.98,
    299.93, 299.65, 299.76, 299.81, 300.00, 300.00, 299.96, 299.96, 299.96, 299.94, 299.96, 299.94,
    299.88, 299.80, 299.85, 299.88, 299.90, 299.84, 299.83, 299.79, 299.81, 299.88, 299.88, 299.83,
    299.80, 299.79, 299.76, 299.80, 299.88, 299.88, 299.88, 299.86, 299.72, 299.72, 299.62, 299.86,
    299.97, 299.95, 299.88, 299.91, 299.85, 299.87, 299.84, 299.84, 299.85, 299.84, 299.84, 299.84,
    299.89, 299.81, 299.81, 299.82, 299.80, 299.77, 299.76, 299.74, 299.75, 299.76, 299.91, 299.92,
    299.89, 299.86, 299.88, 299.72, 299.84, 299.85, 299.85, 299.78, 299.89, 299.84, 299.78, 299.81,
    299.76, 299.81, 299.79, 299.81, 299.82, 299.85, 299.87, 299.87, 299.81, 299.74, 299.81, 299.94,
    299.95, 299.80, 299.81, 299.87,
};

/* NIST StRD, univariate summary statistics: certified mean and standard deviation. Tolerances allow
 * for storing decimals as doubles. */
static void certified(void **state)
{
    (void)state;
    static const double first[] = {10000001, 10000003, 10000002};
    struct statistics s = statistics_of(first, 3);
    assert_within(s.mean, 10000002, 1e-9);
    assert_within(s.sigma, 1, 1e-12);
    assert_true(s.least == 10000001 && s.most == 10000003);
    double second[1001] = {1.2}, fourth[1001] = {10000000.2};
    for (int k = 1; k < 1001; k++) {
        second[k] = k % 2 == 1 ? 1.1 : 1.3;
        fourth[k] = k % 2 == 1 ? 10000000.1 : 10000000.3;
    }
    s = statistics_of(second, 1001);
    assert_within(s.mean, 1.2, 1e-14);
    assert_within(s.sigma, 0.1, 1e-13);
    s = statistics_of(fourth, 1001);
    assert_within(s.mean, 10000000.2, 1e-8);
    assert_within(s.sigma, 0.1, 1e-9);
    s = statistics_of(michelso, 100);
    assert_within(s.mean, 299.8524, 5e-13);
    assert_within(s.sigma, 0.0790105478190518, 1e-13);
}

static void few_values(void **state)
{
    (void)state;
    static const double one[] = {4};
    struct statistics s = statistics_of(NULL, 0);
    assert_true(s.count == 0 && isnan(s.mean) && isnan(s.sigma) && isnan(s.least));
    s = statistics_of(one, 1);
    assert_true(s.mean == 4 && isnan(s.sigma));
    static const double equal[] = {2, 2, 2};
    s = statistics_of(equal, 3);
    assert_true(s.sigma == 0 && s.sigma_error == 0);
}

/* Of normal values the standard error of sigma is sigma/sqrt(2 n) (Mood, Graybill and Boes 1974).
 */
static void error_of_sigma(void **state)
{
    (void)state;
    enum { N = 20000 };
    double *z = malloc(N * sizeof *z);
    assert_non_null(z);
    random_normals(3, 0, N, z);
    const struct statistics s = statistics_of(z, N);
    check_near(s.sigma_error, 1 / sqrt(2.0 * N), 0.05);
    free(z);
}

/* Newcombe, Statistics in Medicine 17 (1998) 857, table I, method 3: score without correction. */
static void intervals(void **state)
{
    (void)state;
    static const struct {
        int hits, n;
        double low, high;
    } rows[] = {{81, 263, 0.2553, 0.3662},
                {15, 148, 0.0624, 0.1605},
                {0, 20, 0.0000, 0.1611},
                {1, 29, 0.0061, 0.1718}};
    for (size_t k = 0; k < sizeof rows / sizeof rows[0]; k++) {
        double low, high;
        wilson_interval(rows[k].hits, rows[k].n, &low, &high);
        assert_within(low, rows[k].low, 5e-5);
        assert_within(high, rows[k].high, 5e-5);
        wilson_interval(rows[k].n - rows[k].hits, rows[k].n, &low, &high);
        assert_within(low, 1 - rows[k].high, 5e-5);
        assert_within(high, 1 - rows[k].low, 5e-5);
    }
    double low, high;
    wilson_interval(0, 0, &low, &high);
    assert_true(low == 0 && high == 1);
}

static void histograms(void **state)
{
    (void)state;
    static const double values[] = {0, 0, 1, 1, 1, 2, 2, 4};
    struct statistics s = statistics_of(values, 8);
    struct histogram h = histogram_of(values, 8, &s);
    /* sigma = 1.3024, Scott's width 3.49*1.3024/2 = 2.273, 4/2.273 = 1.76: two bins, 2 V wide */
    assert_int_equal(h.bins, 2);
    assert_int_equal(h.counts[0], 5);
    assert_int_equal(h.counts[1], 3);
    static const double equal[] = {5, 5};
    s = statistics_of(equal, 2);
    h = histogram_of(equal, 2, &s);
    assert_int_equal(h.bins, 1);
    assert_int_equal(h.counts[0], 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(certified), cmocka_unit_test(few_values), cmocka_unit_test(error_of_sigma),
        cmocka_unit_test(intervals), cmocka_unit_test(histograms),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
