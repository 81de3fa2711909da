/* expression_test.c: texts and the values they stand for, with their dimensions. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "check.h"
#include "language/expression.h"
#include "language/parser.h"
#include "language/source.h"

struct bench {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct buffer out;
    uint32_t file;
};

static void start(struct bench *bench, const char *text)
{
    memset(bench, 0, sizeof *bench);
    bench->arena = arena_create();
    bench->diagnostics.arena = bench->arena;
    assert_int_equal(source_add_text(bench->arena, &bench->sources, "value", text, strlen(text),
                                     &bench->diagnostics, &bench->file),
                     STATUS_OK);
}

static void finish(struct bench *bench)
{
    buffer_free(&bench->out);
    arena_destroy(bench->arena);
}

/* ITAIL is 800 nA, N is the plain 4, VGS is 0.62 V, "bad.v" reports an error of its own. */
static bool find(void *self, const char *name, struct span where, struct quantity *value)
{
    struct bench *bench = self;
    if (strcmp(name, "ITAIL") == 0) {
        *value = (struct quantity){8e-7, DIMENSION_CURRENT, false, false};
    } else if (strcmp(name, "N") == 0) {
        *value = (struct quantity){4.0, DIMENSION_NONE, true, false};
    } else if (strcmp(name, "M1.vgs") == 0) {
        *value = (struct quantity){0.62, DIMENSION_VOLTAGE, false, false};
    } else {
        if (strcmp(name, "bad.v") == 0) {
            diagnostics_add(&bench->diagnostics, where, NULL, "'bad' goes round in a circle");
        }
        return false;
    }
    return true;
}

static int list(void *self, const char *const **names)
{
    static const char *const known[] = {"ITAIL", "N", "M1.vgs"};
    (void)self;
    *names = known;
    return 3;
}

static struct expression_scope scope_of(struct bench *bench)
{
    return (struct expression_scope){find, bench, list, 0.025852};
}

enum kind { BARE, UNIT, CELSIUS };

struct value_case {
    const char *text;
    double value;
    enum kind kind;
    struct dimension dimension;
};

static void check_values(const struct value_case *cases, size_t count)
{
    for (size_t i = 0; i < count; i++) {
        struct bench bench;
        start(&bench, cases[i].text);
        const struct expression *expression =
            parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
        struct expression_scope scope = scope_of(&bench);
        struct quantity value = {0};
        if (expression == NULL ||
            !expression_value(expression, &scope, &bench.diagnostics, &value)) {
            diagnostics_print(&bench.diagnostics, &bench.sources, false, &bench.out);
            print_error("%s", bench.out.data);
            fail();
        }
        check_near(value.value, cases[i].value, 1e-15);
        assert_true(dimension_equal(value.dimension, cases[i].dimension));
        assert_int_equal(value.bare, cases[i].kind == BARE);
        assert_int_equal(value.celsius, cases[i].kind == CELSIUS);
        finish(&bench);
    }
}

/* IEC 60062 codes ("R47" is a name here, written 0R47; "47K" is 47 kelvin).
 */
static void test_letter_codes(void **state)
{
    (void)state;
    static const struct value_case cases[] = {
        {"0R47", 0.47, UNIT, {12, -12, 0, 0}},
        {"4R7", 4.7, UNIT, {12, -12, 0, 0}},
        {"470R", 470.0, UNIT, {12, -12, 0, 0}},
        {"4K7", 4700.0, BARE, {0, 0, 0, 0}},
        {"4k7", 4700.0, BARE, {0, 0, 0, 0}},
        {"1K0", 1000.0, BARE, {0, 0, 0, 0}},
        {"1M5", 1.5e6, BARE, {0, 0, 0, 0}},
        {"3G3", 3.3e9, BARE, {0, 0, 0, 0}},
        {"2u2", 2.2e-6, BARE, {0, 0, 0, 0}},
        {"6n8", 6.8e-9, BARE, {0, 0, 0, 0}},
        {"47K", 47.0, UNIT, {0, 0, 12, 0}},
        {"47k", 47e3, BARE, {0, 0, 0, 0}},
        {"4k7 ohm", 4700.0, UNIT, {12, -12, 0, 0}},
        {"2\xC2\xB5"
         "2",
         2.2e-6,
         BARE,
         {0, 0, 0, 0}},
    };
    check_values(cases, sizeof cases / sizeof cases[0]);
}

/* Worked by hand from the rules of the language. */
static void test_numbers(void **state)
{
    (void)state;
    static const struct value_case cases[] = {
        {"800nA", 8e-7, UNIT, {0, 12, 0, 0}},
        {"800 nA", 8e-7, UNIT, {0, 12, 0, 0}},
        {"4 um", 4e-6, UNIT, {0, 0, 0, 12}},
        {"4u", 4e-6, BARE, {0, 0, 0, 0}},
        {"8 m", 8e-3, BARE, {0, 0, 0, 0}},
        {"2%", 0.02, UNIT, {0, 0, 0, 0}},
        {"100 %", 1.0, UNIT, {0, 0, 0, 0}},
        {"30ppm", 3e-5, UNIT, {0, 0, 0, 0}},
        {"30 ppm/K", 3e-5, UNIT, {0, 0, -12, 0}},
        {"1e-6", 1e-6, BARE, {0, 0, 0, 0}},
        {"1.5e3 mV", 1.5, UNIT, {12, 0, 0, 0}},
        {"1E3", 1000.0, BARE, {0, 0, 0, 0}},
        {"27 C", 300.15, CELSIUS, {0, 0, 12, 0}},
        {"-20 C", 253.15, CELSIUS, {0, 0, 12, 0}},
        {"60 C - -20 C", 80.0, UNIT, {0, 0, 12, 0}},
        {"27 C + 10 K", 310.15, CELSIUS, {0, 0, 12, 0}},
        {"27 C - 10", 290.15, CELSIUS, {0, 0, 12, 0}},
        {"max(27 C, -20 C)", 300.15, CELSIUS, {0, 0, 12, 0}},
        {"47 k\xCE\xA9", 47e3, UNIT, {12, -12, 0, 0}},
        {"10 \xCE\xBC"
         "m",
         1e-5,
         UNIT,
         {0, 0, 0, 12}},
        {"0.45 V^0.5", 0.45, UNIT, {6, 0, 0, 0}},
        {"2 mV^2", 2e-6, UNIT, {24, 0, 0, 0}},
        {"2 V^(1/2)", 2.0, UNIT, {6, 0, 0, 0}},
        {"3 V^-1", 3.0, UNIT, {-12, 0, 0, 0}},
        {"3k^2", 9e6, BARE, {0, 0, 0, 0}},
        {"290 uA/V^2", 2.9e-4, UNIT, {-24, 12, 0, 0}},
        {"1.5e-9 V*m", 1.5e-9, UNIT, {12, 0, 0, 12}},
        {"1e-12 A/m", 1e-12, UNIT, {0, 12, 0, -12}},
        {"3.5 mV*um", 3.5e-9, UNIT, {12, 0, 0, 12}},
    };
    check_values(cases, sizeof cases / sizeof cases[0]);
}

static void test_arithmetic(void **state)
{
    (void)state;
    static const struct value_case cases[] = {
        {"1 + 2*3", 7.0, BARE, {0, 0, 0, 0}},
        {"(1 + 2)*3", 9.0, BARE, {0, 0, 0, 0}},
        {"8/4/2", 1.0, BARE, {0, 0, 0, 0}},
        {"7 - 2 - 1", 4.0, BARE, {0, 0, 0, 0}},
        {"2^3^2", 512.0, BARE, {0, 0, 0, 0}},
        {"-2^2", -4.0, BARE, {0, 0, 0, 0}},
        {"2^-1", 0.5, BARE, {0, 0, 0, 0}},
        {"--3", 3.0, BARE, {0, 0, 0, 0}},
        {"+3", 3.0, BARE, {0, 0, 0, 0}},
        {"(-8)^3", -512.0, BARE, {0, 0, 0, 0}},
        {"1 + 2 V", 3.0, UNIT, {12, 0, 0, 0}},
        {"1 + 2%", 1.02, UNIT, {0, 0, 0, 0}},
        {"47k*(1 + 2%)", 47940.0, BARE, {0, 0, 0, 0}},
        {"3 V/2 V", 1.5, UNIT, {0, 0, 0, 0}},
        {"3 V/10 kohm", 3e-4, UNIT, {0, 12, 0, 0}},
        {"1/(4 kohm)", 2.5e-4, UNIT, {-12, 12, 0, 0}},
        {"(2 V)^2", 4.0, UNIT, {24, 0, 0, 0}},
        {"sqrt(4 V^2)", 2.0, UNIT, {12, 0, 0, 0}},
        {"sqrt(2 V)^2", 2.0, UNIT, {12, 0, 0, 0}},
        {"abs(-3 V)", 3.0, UNIT, {12, 0, 0, 0}},
        {"min(3 V, 2, 5 V)", 2.0, UNIT, {12, 0, 0, 0}},
        {"max(1, 2)", 2.0, BARE, {0, 0, 0, 0}},
        {"ln(2)", 0.69314718055994530942, BARE, {0, 0, 0, 0}},  /* OEIS A002162 */
        {"exp(1)", 2.71828182845904523536, BARE, {0, 0, 0, 0}}, /* OEIS A001113 */
        {"log10(1000)", 3.0, BARE, {0, 0, 0, 0}},
        {"pi", 3.14159265358979323846, BARE, {0, 0, 0, 0}}, /* OEIS A000796 */
        {"2*thermal_voltage", 0.051704, UNIT, {12, 0, 0, 0}},
        {"ITAIL*N", 3.2e-6, UNIT, {0, 12, 0, 0}},
        {"M1.vgs - 20 mV", 0.6, UNIT, {12, 0, 0, 0}},
        {"ITAIL # comment", 8e-7, UNIT, {0, 12, 0, 0}},
        {"ITAIL*\\\n2", 1.6e-6, UNIT, {0, 12, 0, 0}},
    };
    check_values(cases, sizeof cases / sizeof cases[0]);
}

/* A prefix is folded in before rounding: the same value has the same bits however it is written. */
static void test_same_bits(void **state)
{
    (void)state;
    static const char *const texts[] = {"100 nV", "0.1 uV", "0.0001 mV", "1e-7 V", "100000 pV"};
    for (size_t i = 0; i < sizeof texts / sizeof texts[0]; i++) {
        struct bench bench;
        start(&bench, texts[i]);
        const struct expression *expression =
            parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
        assert_non_null(expression);
        assert_true(expression->number.value == 1e-7);
        finish(&bench);
    }
}

enum reader { VALUE, OHMS, LENGTH, KELVIN, SHARE };

struct error_case {
    const char *text;
    enum reader reader;
    int column, marked; /* place and width of the mark */
    const char *message, *hint;
};

static bool read_as(enum reader reader, const struct expression *expression,
                    const struct expression_scope *scope, struct diagnostics *diagnostics,
                    double *value)
{
    struct quantity quantity = {0};
    switch (reader) {
    case OHMS:
        return expression_wanted(expression, scope, DIMENSION_RESISTANCE, diagnostics, value);
    case LENGTH:
        return expression_wanted(expression, scope, DIMENSION_LENGTH, diagnostics, value);
    case KELVIN:
        return expression_temperature(expression, scope, diagnostics, value);
    case SHARE:
        return expression_share(expression, scope, diagnostics, value);
    default:
        return expression_value(expression, scope, diagnostics, &quantity);
    }
}

static void test_errors(void **state)
{
    (void)state;
    static const struct error_case cases[] = {
        {"3 uA", OHMS, 1, 4, "a resistance is wanted; this is a current", NULL},
        {"10K", OHMS, 1, 3, "a resistance is wanted; this is a temperature",
         "K is kelvin; kilo is k: '10k'"},
        {"2%", OHMS, 1, 2, "a resistance is wanted; this is a ratio", NULL},
        {"290 uA/V^2", OHMS, 1, 10, "a resistance is wanted; this is a quantity in A/V^2", NULL},
        {"27 C", OHMS, 1, 4, "a resistance is wanted; this is a temperature", NULL},
        {"3 V", LENGTH, 1, 3, "a length is wanted; this is a voltage", NULL},
        {"10K + 3 kohm", VALUE, 1, 3, "a temperature and a resistance cannot be added",
         "K is kelvin; kilo is k: '10k'"},
        {"3 kohm + 10K", VALUE, 10, 3, "a resistance and a temperature cannot be added",
         "K is kelvin; kilo is k: '10k'"},
        {"1 V + (2 - 1 A)", VALUE, 7, 9, "a voltage and a current cannot be added", NULL},
        {"2% - 1 V", VALUE, 6, 3, "a ratio and a voltage cannot be subtracted", NULL},
        {"min(1 V, 2 A)", VALUE, 10, 3, "a voltage and a current cannot be compared", NULL},
        {"1/0", VALUE, 3, 1, "this is a division by zero", NULL},
        {"0^-1", VALUE, 1, 4, "this is a division by zero", NULL},
        {"2/(1 - 1)", VALUE, 3, 7, "this is a division by zero", NULL},
        {"1e308*10", VALUE, 1, 8, "the result is too large to be a number", NULL},
        {"exp(1000)", VALUE, 1, 9, "the result is too large to be a number", NULL},
        {"1e308 + 1e308", VALUE, 1, 13, "the result is too large to be a number", NULL},
        {"10^400", VALUE, 1, 6, "the result is too large to be a number", NULL},
        {"sqrt(-1)", VALUE, 6, 2, "a negative number has no square root", NULL},
        {"ln(0)", VALUE, 4, 1, "ln wants a number above 0", NULL},
        {"log10(-1)", VALUE, 7, 2, "log10 wants a number above 0", NULL},
        {"ln(2 V)", VALUE, 4, 3, "ln wants a plain number; this is a voltage",
         "divide it by its unit"},
        {"(-8)^0.5", VALUE, 1, 8, "a negative number has no such power", NULL},
        {"2^(1 V)", VALUE, 3, 5, "an exponent is a plain number; this is a voltage", NULL},
        {"(2 V)^0.3", VALUE, 7, 3, "this exponent is not possible for a unit", NULL},
        {"2*27 C", VALUE, 3, 4, "a Celsius temperature cannot be multiplied or divided",
         "write it in K"},
        {"27 C + 3 C", VALUE, 1, 10, "two Celsius temperatures cannot be added", "write it in K"},
        {"10 K - 3 C", VALUE, 1, 10, "a Celsius temperature cannot be taken from a difference",
         "write it in K"},
        {"-(20 C)", VALUE, 1, 7, "a Celsius temperature has no negative", "write it in K"},
        {"(20 C)^2", VALUE, 1, 6, "a Celsius temperature has no powers", "write it in K"},
        {"abs(20 C)", VALUE, 5, 4, "abs cannot take a Celsius temperature", "write it in K"},
        {"min(20 C, 3 K)", VALUE, 11, 3, "a Celsius temperature cannot be compared with this",
         "write it in K"},
        {"sqr(2)", VALUE, 1, 3, "there is no function 'sqr'", "did you mean 'sqrt'?"},
        {"cosine(2)", VALUE, 1, 6, "there is no function 'cosine'",
         "the functions are sqrt ln log10 exp min max abs"},
        {"sqrt()", VALUE, 1, 6, "sqrt wants one value; this gives 0", NULL},
        {"sqrt(1, 2)", VALUE, 1, 10, "sqrt wants one value; this gives 2", NULL},
        {"max(1)", VALUE, 1, 6, "max wants two or more values; this gives 1", NULL},
        {"ITIAL*2", VALUE, 1, 5, "there is no 'ITIAL'", "did you mean 'ITAIL'?"},
        {"2*thermal_volts", VALUE, 3, 13, "there is no 'thermal_volts'",
         "did you mean 'thermal_voltage'?"},
        {"3/Kohm", VALUE, 3, 4, "there is no 'Kohm'", "did you mean 'kohm'?"},
        {"bad.v + 1", VALUE, 1, 5, "'bad' goes round in a circle", NULL},
        {"nothing", VALUE, 1, 7, "there is no 'nothing'", NULL},
        {"27", KELVIN, 1, 2, "a plain number is a temperature in K, and 27 K is very cold",
         "write '27 C'"},
        {"-300 C", KELVIN, 1, 6, "a temperature lies above absolute zero, 0 K or -273.15 C", NULL},
        {"0 K", KELVIN, 1, 3, "a temperature lies above absolute zero, 0 K or -273.15 C", NULL},
        {"3 V", KELVIN, 1, 3, "a temperature is wanted; this is a voltage", NULL},
        {"3 V", SHARE, 1, 3, "a share such as 2% is wanted; this is a voltage", NULL},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const struct error_case *wanted = &cases[i];
        struct bench bench;
        double value = 0.0;
        start(&bench, wanted->text);
        const struct expression *expression =
            parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
        assert_non_null(expression);
        struct expression_scope scope = scope_of(&bench);
        assert_false(read_as(wanted->reader, expression, &scope, &bench.diagnostics, &value));
        assert_int_equal(bench.diagnostics.count, 1);
        const struct diagnostic *found = &bench.diagnostics.list[0];
        assert_string_equal(found->text, wanted->message);
        assert_int_equal(found->where.begin + 1, wanted->column);
        assert_int_equal(found->where.end - found->where.begin, wanted->marked);
        if (wanted->hint == NULL) {
            assert_null(found->hint);
        } else {
            assert_non_null(found->hint);
            assert_string_equal(found->hint, wanted->hint);
        }
        finish(&bench);
    }
}

/* Plain numbers take what is wanted; temperatures and shares in each of their forms. */
static void test_wanted(void **state)
{
    (void)state;
    static const struct {
        const char *text;
        enum reader reader;
        double value;
    } cases[] = {
        {"47k", OHMS, 47e3},      {"3 V/1 mA", OHMS, 3000.0}, {"4u", LENGTH, 4e-6},
        {"8", LENGTH, 8.0},       {"27 C", KELVIN, 300.15},   {"300", KELVIN, 300.0},
        {"5 K", KELVIN, 5.0},     {"2%", SHARE, 0.02},        {"0.02", SHARE, 0.02},
        {"300 ppm", SHARE, 3e-4}, {"1 V/4 V", SHARE, 0.25},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        struct bench bench;
        double value = 0.0;
        start(&bench, cases[i].text);
        const struct expression *expression =
            parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
        assert_non_null(expression);
        struct expression_scope scope = scope_of(&bench);
        assert_true(read_as(cases[i].reader, expression, &scope, &bench.diagnostics, &value));
        check_near(value, cases[i].value, 1e-15);
        finish(&bench);
    }
}

/* A sum of `count` ones, and what comes of it. */
static int sum_of_ones(int count, double *value)
{
    char *text = malloc((size_t)count * 2 + 2);
    assert_non_null(text);
    for (int i = 0; i < count; i++) {
        text[2 * i] = '1';
        text[2 * i + 1] = '+';
    }
    text[2 * count - 1] = '\0';
    struct bench bench;
    start(&bench, text);
    free(text);
    const struct expression *expression =
        parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
    struct expression_scope scope = scope_of(&bench);
    struct quantity result = {0};
    if (expression != NULL) {
        assert_true(expression_value(expression, &scope, &bench.diagnostics, &result));
    } else {
        assert_string_equal(bench.diagnostics.list[0].text,
                            "this expression has more than 10000 operators, the limit");
    }
    int errors = bench.diagnostics.count;
    *value = result.value;
    finish(&bench);
    return errors;
}

static void test_long_sum(void **state)
{
    (void)state;
    double value = 0.0;
    assert_int_equal(sum_of_ones(33, &value), 0);
    check_near(value, 33.0, 0.0);
    assert_int_equal(sum_of_ones(LANGUAGE_TERM_LIMIT + 1, &value), 0);
    check_near(value, (double)LANGUAGE_TERM_LIMIT + 1.0, 0.0);
    assert_int_equal(sum_of_ones(LANGUAGE_TERM_LIMIT + 2, &value), 1);
}

/* Each way to nest reaches its limit at the same depth. */
static void test_depth(void **state)
{
    (void)state;
    static const struct {
        const char *open, *close;
    } ways[] = {{"(", ")"}, {"-", ""}, {"+", ""}, {"2^", ""}, {"sqrt(", ")"}, {"abs(-", ")"}};
    for (size_t w = 0; w < sizeof ways / sizeof ways[0]; w++) {
        for (int over = 0; over < 2; over++) {
            int levels = (w == 5 ? LANGUAGE_DEPTH_LIMIT / 2 : LANGUAGE_DEPTH_LIMIT) + over;
            struct buffer text = BUFFER_EMPTY;
            for (int i = 0; i < levels; i++) {
                buffer_text(&text, ways[w].open);
            }
            buffer_text(&text, "1");
            for (int i = 0; i < levels; i++) {
                buffer_text(&text, ways[w].close);
            }
            struct bench bench;
            start(&bench, text.data);
            const struct expression *expression =
                parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics);
            assert_int_equal(expression == NULL, over);
            if (over) {
                assert_string_equal(bench.diagnostics.list[0].text,
                                    "this expression is nested more than 64 deep, the limit");
            }
            buffer_free(&text);
            finish(&bench);
        }
    }
}

/* An expression that stands alone: nothing, too much, or a second line. */
static void test_alone(void **state)
{
    (void)state;
    static const struct {
        const char *text, *message;
    } cases[] = {
        {"", "a value is wanted here"},
        {"# nothing", "a value is wanted here"},
        {"1 2", "nothing more is wanted here; found '2'"},
        {"1\n2", "the value ends with its line"},
        {"1 +", "a value is wanted here; found the end of the line"},
        {"$", "the character '$' has no meaning here"},
        {"R47 = 3", "nothing more is wanted here; found '='"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        struct bench bench;
        start(&bench, cases[i].text);
        assert_null(parse_expression(bench.arena, &bench.sources, bench.file, &bench.diagnostics));
        assert_int_equal(bench.diagnostics.count, 1);
        assert_string_equal(bench.diagnostics.list[0].text, cases[i].message);
        finish(&bench);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_letter_codes), cmocka_unit_test(test_numbers),
        cmocka_unit_test(test_arithmetic),   cmocka_unit_test(test_same_bits),
        cmocka_unit_test(test_errors),       cmocka_unit_test(test_wanted),
        cmocka_unit_test(test_long_sum),     cmocka_unit_test(test_depth),
        cmocka_unit_test(test_alone),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
