/*
 * law_test.c: expressions with derivatives by automatic differentiation.
 */
#include "device_check.h"

#include "devices/law.h"

#define CONSTANT(number)                                                                           \
    {                                                                                              \
        LAW_CONSTANT, number, 0                                                                    \
    }
#define INPUT(number)                                                                              \
    {                                                                                              \
        LAW_INPUT, 0, number                                                                       \
    }
#define DO(operation)                                                                              \
    {                                                                                              \
        operation, 0, 0                                                                            \
    }

static struct subject law_of(struct law_program *program, const struct law_step *steps, int count,
                             int inputs)
{
    *program = (struct law_program){steps, count, inputs};
    struct subject it = subject_of(device_find("law"));
    it.values.extra = program;
    prepare(&it);
    return it;
}

#define LAW(program, steps, inputs)                                                                \
    law_of(program, steps, (int)(sizeof(steps) / sizeof((steps)[0])), inputs)

/* i = 2.5 v^3 - 10.5 v^2 + 11.8 v (mA): a tunnel-diode cubic; values by hand. */
static void polynomial_has_value_and_slope(void **state)
{
    (void)state;
    static const struct law_step steps[] = {
        CONSTANT(2.5),    INPUT(0),       CONSTANT(3), DO(LAW_POWER),    DO(LAW_MULTIPLY),
        CONSTANT(10.5),   INPUT(0),       CONSTANT(2), DO(LAW_POWER),    DO(LAW_MULTIPLY),
        DO(LAW_SUBTRACT), CONSTANT(11.8), INPUT(0),    DO(LAW_MULTIPLY), DO(LAW_ADD),
    };
    struct law_program program;
    struct subject it = LAW(&program, steps, 1);
    double x[3] = {7, 3, 2}, f[3], jac[9];
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("into a", f[0], 20 - 42 + 23.6, 1e-13);
    check_relative("out of b", f[1], -1.6, 1e-13);
    check_relative("slope", jac[2], 7.5 * 4 - 21 * 2 + 11.8, 1e-12);
    check_relative("slope", jac[5], 0.2, 1e-11);
    check_relative("power", quantity(&it, "power", x), 4 * 1.6, 1e-12);
    for (double v = -2; v < 3; v += 0.21) {
        x[2] = v;
        check_bias(&it, x, STRICT);
    }
    assert_int_equal(size_of(&it), 3);
}

/* Every operation, three inputs, away from its joints. */
static const struct law_step everything[] = {
    INPUT(0),    INPUT(1),    DO(LAW_MULTIPLY), DO(LAW_EXP),    INPUT(2),    DO(LAW_SQRT),
    DO(LAW_ADD), INPUT(1),    INPUT(2),         DO(LAW_DIVIDE), DO(LAW_LN),  DO(LAW_SUBTRACT),
    INPUT(0),    INPUT(2),    DO(LAW_POWER),    DO(LAW_ADD),    INPUT(1),    DO(LAW_LOG10),
    DO(LAW_ADD), INPUT(0),    INPUT(1),         DO(LAW_MIN),    DO(LAW_ADD), INPUT(1),
    INPUT(2),    DO(LAW_MAX), DO(LAW_ADD),      INPUT(0),       DO(LAW_ABS), DO(LAW_NEGATE),
    DO(LAW_ADD),
};

static void operations_have_value_and_slope(void **state)
{
    (void)state;
    struct law_program program;
    struct subject it = LAW(&program, everything, 3);
    for (double a = 0.3; a < 2; a += 0.33) {
        for (double b = 0.25; b < 2; b += 0.41) {
            for (double c = 0.1; c < 2; c += 0.29) {
                double x[5] = {0, 0, a, b, c}, f[5], jac[25];
                it.type->evaluate(it.prepared, x, f, jac);
                double wanted = exp(a * b) + sqrt(c) - log(b / c) + pow(a, c) + log10(b) +
                                fmin(a, b) + fmax(b, c) - fabs(a);
                check_relative("value", f[0], wanted, 1e-12);
                check_bias(&it, x,
                           (struct strictness){.step = 1e-9, .derivative = 1e-7, .wide = 1e-12});
            }
        }
    }
}

static void anything_stays_finite(void **state)
{
    (void)state;
    struct law_program program;
    struct subject it = LAW(&program, everything, 3);
    static const double nasty[] = {-1e300, -1e6,  -1, -1e-70, -0.0, 0,
                                   1e-310, 1e-70, 1,  90,     1e6,  1e300};
    enum { NASTY = sizeof nasty / sizeof nasty[0] };
    for (int k = 0; k < NASTY * NASTY * NASTY; k++) {
        double x[5] = {0, 0, nasty[k % NASTY], nasty[k / NASTY % NASTY], nasty[k / NASTY / NASTY]};
        long double wide_x[5] = {0, 0, x[2], x[3], x[4]}, wide[5], wide_jac[25];
        double f[5], jac[25];
        it.type->evaluate(it.prepared, x, f, jac);
        it.type->evaluate_extended(it.prepared, wide_x, wide, wide_jac);
        bool finite = isfinite(f[0]) && isfinite(wide[0]);
        for (int j = 0; j < 25; j++) {
            finite = finite && isfinite(jac[j]) && isfinite(wide_jac[j]);
        }
        if (!finite) {
            complain(&it, x, "not finite", 0, 0, f[0], (double)wide[0]);
        }
    }
}

/* Whole powers of negative bases, and the continuations that law.h promises. */
static void continuations_are_as_documented(void **state)
{
    (void)state;
    struct law_program program;
    static const struct law_step cube[] = {INPUT(0), CONSTANT(-3), DO(LAW_POWER)};
    struct subject it = LAW(&program, cube, 1);
    double x[3] = {0, 0, -2}, f[3], jac[9];
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("(-2)^-3", f[0], -0.125, 1e-15);
    check_relative("slope", jac[2], -3.0 / 16, 1e-15);
    static const struct law_step zeroth[] = {INPUT(0), CONSTANT(0), DO(LAW_POWER)};
    it = LAW(&program, zeroth, 1);
    x[2] = 0;
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("0^0", f[0], 1, 0);
    check_absolute("slope", jac[2], 0, 0);
    static const struct law_step root[] = {INPUT(0), DO(LAW_SQRT)};
    it = LAW(&program, root, 1);
    x[2] = -4;
    it.type->evaluate(it.prepared, x, f, jac);
    assert_true(f[0] > 0 && f[0] < 1e-30 && jac[2] > 0);
    static const struct law_step logarithm[] = {INPUT(0), DO(LAW_LN)};
    it = LAW(&program, logarithm, 1);
    x[2] = -1; /* 2 ln 1e-60 - ln(2e-60 + 1) */
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("ln", f[0], -120 * log(10.0), 1e-14);
    static const struct law_step steep[] = {INPUT(0), DO(LAW_EXP)};
    it = LAW(&program, steep, 1);
    x[2] = 100;
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("exp", f[0], 21 * exp(80.0), 1e-14);
    static const struct law_step inverse[] = {CONSTANT(1), INPUT(0), DO(LAW_DIVIDE)};
    it = LAW(&program, inverse, 1);
    x[2] = 0;
    it.type->evaluate(it.prepared, x, f, jac);
    check_absolute("1/0", f[0], 0, 0);
    x[2] = 1e-15; /* an ampere of the small kind is no zero */
    it.type->evaluate(it.prepared, x, f, jac);
    check_relative("1/1e-15", f[0], 1e15, 1e-15);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(polynomial_has_value_and_slope),
        cmocka_unit_test(operations_have_value_and_slope),
        cmocka_unit_test(anything_stays_finite),
        cmocka_unit_test(continuations_are_as_documented),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
