/* quantity_test.c: numbers, units, dimensions, and how they are shown. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <locale.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "base/quantity.h"
#include "check.h"

/* Texts that are hard to round, each with the double that C's own hexadecimal constant names.
 * Sources: halfway cases of IEEE 754 binary64 by construction (2^53 + 1 lies between two doubles);
 * smallest numbers from IEEE 754-2019, table 3.5. */
static void test_parse(void **state)
{
    (void)state;
    static const struct {
        const char *text;
        size_t used;
        double value;
    } cases[] = {
        {"0", 1, 0.0},
        {"47k", 2, 47.0},
        {"1.5e3", 5, 1500.0},
        {"1E3", 3, 1000.0},
        {"1e", 1, 1.0},
        {"1e+", 1, 1.0},
        {"5.", 1, 5.0},
        {"0.1", 3, 0x1.999999999999ap-4},
        {"9007199254740993", 16, 0x1.0p53}, /* tie: to even */
        {"9007199254740993.0000000000000000000001", 39, 0x1.0000000000001p53},
        {"2.2250738585072014e-308", 23, 0x1p-1022},
        {"5e-324", 6, 0x1p-1074},
        {"1e999", 5, HUGE_VAL},
        {"1e-999", 6, 0.0},
        {"0.000e99999999999999999999", 26, 0.0},
        {"1e99999999999999999999", 22, HUGE_VAL},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        double value = -1.0;
        assert_int_equal(number_parse(cases[i].text, strlen(cases[i].text), &value), cases[i].used);
        assert_true(value == cases[i].value);
    }
    double value = 0.0;
    assert_int_equal(number_parse("", 0, &value), 0);
    assert_int_equal(number_parse(".5", 2, &value), 0);
    assert_int_equal(number_parse("-5", 2, &value), 0);
    assert_int_equal(number_parse("12", 1, &value), 1);
    assert_true(value == 1.0);
    assert_int_equal(number_parse_scaled("0.1", 3, -6, &value), 3);
    assert_true(value == 1e-7);
}

/* 2000 digits: 2^53 + 1, and far behind the point a digit that breaks the tie, or none. */
static void test_long_digits(void **state)
{
    (void)state;
    char text[2100] = "9007199254740993.";
    memset(text + 17, '0', 2000);
    double value = 0.0;
    assert_int_equal(number_parse(text, 2017, &value), 2017);
    assert_true(value == 0x1.0p53);
    text[2016] = '1';
    assert_int_equal(number_parse(text, 2017, &value), 2017);
    assert_true(value == 0x1.0000000000001p53);
    memset(text, '1', 400);
    assert_int_equal(number_parse(text, 400, &value), 400);
    assert_true(isinf(value));
}

static void test_show(void **state)
{
    (void)state;
    static const struct {
        double value;
        int digits;
        const char *unit, *text;
    } cases[] = {
        {816.4e-9, 4, "A", "816.4 nA"},
        {1.2, 4, "V", "1.200 V"},
        {47e3, 4, "ohm", "47.00 kohm"},
        {0.0, 4, "A", "0 A"},
        {-0.0, 4, "A", "0 A"},
        {999.96e-6, 4, "A", "1.000 mA"},
        {-999.94e-6, 4, "A", "-999.9 uA"},
        {31e12, 4, "ohm", "31.00 Tohm"},
        {999.99e12, 4, "ohm", "1.000e+15 ohm"},
        {1e-15, 4, "A", "1.000 fA"},
        {9.9e-16, 4, "A", "9.900e-16 A"},
        {2.9e-4, 4, "A/V^2", "2.900e-04 A/V^2"},
        {0.45, 3, "V^0.5", "4.50e-01 V^0.5"},
        {816.4e-9, 1, "A", "800 nA"},
        {4e-6, 3, "m", "4.00 um"},
        {0.02134, 3, "", "0.0213"},
        {150.0, 4, "", "150.0"},
        {1234567.0, 3, "", "1.23e+06"},
        {2.5, 2, "%", "2.5 %"},
        {-35.2, 3, "ppm/K", "-35.2 ppm/K"},
        {27.0, 3, "C", "27.0 C"},
        {5e-324, 2, "V", "4.9e-324 V"},
    };
    char text[64];
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        number_show(cases[i].value, cases[i].digits, cases[i].unit, text, sizeof text);
        assert_string_equal(text, cases[i].text);
    }
    number_show((double)NAN, 4, "V", text, sizeof text);
    assert_string_equal(text, "-");
    number_show(-HUGE_VAL, 4, "ohm", text, sizeof text);
    assert_string_equal(text, "-infinite ohm");
    number_show(816.4e-9, 4, "A", text, 4);
    assert_string_equal(text, "816");
}

/* Every double reads back with the same bits, and short ones stay short. */
static void test_exact(void **state)
{
    (void)state;
    char text[64];
    number_exact(0.1, text, sizeof text);
    assert_string_equal(text, "0.1");
    number_exact(-47000.0, text, sizeof text);
    assert_string_equal(text, "-47000");
    number_exact(1e-5, text, sizeof text);
    assert_string_equal(text, "1e-5");
    number_exact(1.0 / 3.0, text, sizeof text);
    assert_string_equal(text, "0.3333333333333333"); /* Steele and White 1990, shortest form */
    number_exact(1e300 * 1e10, text, sizeof text);
    assert_string_equal(text, "inf");
    number_exact(0.0, text, sizeof text);
    assert_string_equal(text, "0");
    uint64_t bits = 88172645463325252U; /* xorshift64, Marsaglia 2003 */
    for (int i = 0; i < 20000; i++) {
        bits ^= bits << 13;
        bits ^= bits >> 7;
        bits ^= bits << 17;
        double value = 0.0, back = 0.0;
        memcpy(&value, &bits, sizeof value);
        if (!isfinite(value) || value == 0.0) {
            continue;
        }
        number_exact(fabs(value), text, sizeof text);
        assert_int_equal(number_parse(text, strlen(text), &back), strlen(text));
        assert_true(back == fabs(value));
    }
}

/* A locale with a decimal comma changes nothing. */
static void test_locale(void **state)
{
    (void)state;
    static const char *const names[] = {"de_DE.UTF-8", "de_DE.utf8", "fr_FR.UTF-8", "nl_NL.UTF-8"};
    bool found = false;
    for (size_t i = 0; i < 4 && !found; i++) {
        found = setlocale(LC_ALL, names[i]) != NULL;
    }
    if (!found) {
        print_message("no locale with a decimal comma is installed\n");
        skip();
    }
    char text[64];
    double value = 0.0;
    number_show(816.4e-9, 4, "A", text, sizeof text);
    assert_string_equal(text, "816.4 nA");
    number_exact(0.1, text, sizeof text);
    assert_string_equal(text, "0.1");
    assert_int_equal(number_parse("1.5", 3, &value), 3);
    assert_true(value == 1.5);
    (void)setlocale(LC_ALL, "C");
}

/* Factors from the SI brochure (9th edition, table 7). */
static void test_units(void **state)
{
    (void)state;
    static const struct {
        const char *word;
        double factor;
        struct dimension dimension;
    } good[] = {
        {"V", 1.0, {12, 0, 0, 0}},
        {"mV", 1e-3, {12, 0, 0, 0}},
        {"fA", 1e-15, {0, 12, 0, 0}},
        {"pA", 1e-12, {0, 12, 0, 0}},
        {"uA", 1e-6, {0, 12, 0, 0}},
        {"\xC2\xB5"
         "A",
         1e-6,
         {0, 12, 0, 0}},
        {"\xCE\xBC"
         "m",
         1e-6,
         {0, 0, 0, 12}},
        {"kohm", 1e3, {12, -12, 0, 0}},
        {"M\xCE\xA9", 1e6, {12, -12, 0, 0}},
        {"T\xE2\x84\xA6", 1e12, {12, -12, 0, 0}},
        {"GW", 1e9, {12, 12, 0, 0}},
        {"nS", 1e-9, {-12, 12, 0, 0}},
        {"mm", 1e-3, {0, 0, 0, 12}},
        {"K", 1.0, {0, 0, 12, 0}},
        {"mK", 1e-3, {0, 0, 12, 0}},
        {"C", 1.0, {0, 0, 12, 0}},
        {"%", 0.01, {0, 0, 0, 0}},
        {"ppm", 1e-6, {0, 0, 0, 0}},
    };
    static const char *const bad[] = {"",  "m",   "k",  "Kohm", "mC",  "k%",  "kppm", "volt",
                                      "v", "Meg", "VV", "kkV",  "mm2", "Ohm", "u"};
    double factor = 0.0;
    struct dimension dimension;
    bool celsius = true;
    for (size_t i = 0; i < sizeof good / sizeof good[0]; i++) {
        const char *word = good[i].word;
        assert_true(unit_parse(word, strlen(word), &factor, &dimension, &celsius));
        assert_true(factor == good[i].factor);
        assert_true(dimension_equal(dimension, good[i].dimension));
        assert_int_equal(celsius, strcmp(word, "C") == 0);
    }
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        assert_false(unit_parse(bad[i], strlen(bad[i]), &factor, &dimension, &celsius));
    }
    size_t bytes = 0;
    assert_true(prefix_parse("M", 1, &bytes) == 1e6 && bytes == 1);
    assert_true(prefix_parse("\xC2\xB5x", 3, &bytes) == 1e-6 && bytes == 2);
    assert_true(prefix_parse("K", 1, &bytes) == 0.0 && bytes == 0);
}

static void test_dimensions(void **state)
{
    (void)state;
    const struct dimension volt = DIMENSION_VOLTAGE, ampere = DIMENSION_CURRENT;
    assert_true(dimension_equal(dimension_divide(volt, ampere), DIMENSION_RESISTANCE));
    assert_true(dimension_equal(dimension_multiply(volt, ampere), DIMENSION_POWER));
    struct dimension root, back;
    assert_true(dimension_power(volt, 0.5, &root));
    assert_true(dimension_equal(dimension_multiply(root, root), volt));
    assert_true(dimension_power(volt, 1.0 / 3.0, &root)); /* exact in twelfths */
    assert_true(dimension_power(root, 3.0, &back));
    assert_true(dimension_equal(back, volt));
    assert_false(dimension_power(volt, 0.123, &root));
    assert_false(dimension_power(volt, 1e9, &root));
    assert_false(dimension_power(volt, (double)NAN, &root));
    assert_true(dimension_power(DIMENSION_NONE, 0.123, &root));

    char text[64];
    struct dimension kprime = {-24, 12, 0, 0}, tempco = {0, 0, -12, 0}, odd = {18, 0, 0, 12};
    dimension_unit(kprime, text, sizeof text);
    assert_string_equal(text, "A/V^2");
    dimension_describe(kprime, text, sizeof text);
    assert_string_equal(text, "a quantity in A/V^2");
    dimension_unit(tempco, text, sizeof text);
    assert_string_equal(text, "1/K");
    dimension_unit(odd, text, sizeof text);
    assert_string_equal(text, "V^1.5*m");
    dimension_describe(DIMENSION_RESISTANCE, text, sizeof text);
    assert_string_equal(text, "a resistance");
    dimension_describe(DIMENSION_NONE, text, sizeof text);
    assert_string_equal(text, "a plain number");
    dimension_unit(DIMENSION_RESISTANCE, text, 3);
    assert_string_equal(text, "oh");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_parse),      cmocka_unit_test(test_long_digits),
        cmocka_unit_test(test_show),       cmocka_unit_test(test_exact),
        cmocka_unit_test(test_locale),     cmocka_unit_test(test_units),
        cmocka_unit_test(test_dimensions),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
