/*
 * limits_test.c: a cell of a few lines cannot make the program take more memory than it says: every
 * limit is met with a message that prints it.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>

#include <cmocka.h>

#include "circuit_fixture.h"

/* Builds a text and looks for a message. */
static void expect(const char *text, const struct circuit_settings *settings, const char *message)
{
    struct bench bench;
    bench_open(&bench, "limits.cell", text, settings);
    assert_int_equal(bench.status, STATUS_INPUT);
    if (strstr(bench.out.data, message) == NULL) {
        fail_msg("no '%s' in:\n%.2000s", message, bench.out.data);
    }
    bench_close(&bench);
}

/* `levels` blocks, each of ten uses of the next; the innermost holds `inside`. */
static void bomb(struct buffer *text, int levels, const char *inside)
{
    buffer_text(text, "rail vdd 3 V\nresistor R vdd -> gnd 1k\n");
    for (int k = 0; k < levels; k++) {
        buffer_format(text, "block b%d in\n", k);
        for (int u = 0; u < 10 && k < levels - 1; u++) {
            buffer_format(text, "  use b%d X%d in=in\n", k + 1, u);
        }
        buffer_format(text, "%send\n", k < levels - 1 ? "" : inside);
    }
    buffer_text(text, "use b0 X in=vdd\n");
}

/* 10^17 parts, and as many uses of an empty block. */
static void test_blocks_multiply(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    bomb(&text, 18, "  resistor R in -> gnd 1k\n");
    expect(text.data, NULL, "the cell has more than 3000000 parts, the limit");
    buffer_free(&text);
    bomb(&text, 18, "");
    expect(text.data, NULL, "the cell has more than 3000000 parts, the limit");
    buffer_free(&text);
    const struct circuit_settings small = {.kelvin = NAN, .part_limit = 3};
    expect("rail vdd 1 V\nresistor A vdd -> gnd 1\nresistor B vdd -> gnd 1\n"
           "resistor C vdd -> gnd 1\nresistor D vdd -> gnd 1\nhand vdd.v = 1 V\n",
           &small, "limits.cell:5:1: the cell has more than 3 parts, the limit");
}

/* Few parts that each need much: a long expression a thousand times over. */
static void test_memory(void **state)
{
    (void)state;
    struct buffer law = BUFFER_EMPTY, text = BUFFER_EMPTY;
    buffer_text(&law, "  law L in -> gnd i = 1 uA");
    for (int k = 0; k < 400; k++) {
        buffer_text(&law, " + 1 uA * in.v / 1 V");
    }
    buffer_text(&law, "\n");
    bomb(&text, 18, law.data);
    expect(text.data, NULL, "the parts of the cell need more than 2048 MiB, the limit");
    buffer_free(&law);
    buffer_free(&text);
}

static void test_errors(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    bomb(&text, 18, "  resistor R in -> gnd 1 V\n  nmos Q d=in\n");
    expect(text.data, NULL, "more than 1000 errors: the rest of the cell was not built");
    buffer_free(&text);
}

static void test_names_of_a_block(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "block wide in\n");
    for (int k = 0; k < 1000; k++) {
        buffer_format(&text, "  let A%d = 1\n", k);
    }
    buffer_text(&text, "end\n");
    expect(text.data, NULL, "block 'wide' has more than 1000 pins, parameters and lets, the limit");
    buffer_free(&text);
}

static void test_models(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    for (int k = 0; k < 10001; k++) {
        buffer_format(&text, "model m%d diode\nend\n", k);
    }
    expect(text.data, NULL, "the cell has more than 10000 models, the limit");
    buffer_free(&text);
}

static void test_processes(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    for (int k = 0; k < 21; k++) {
        buffer_text(&text, "process \"");
        for (int dots = 0; dots < k; dots++) {
            buffer_text(&text, "./");
        }
        buffer_text(&text, "n180.process\"\n");
    }
    expect(text.data, NULL, "the cell names more than 20 processes, the limit");
    buffer_free(&text);
}

static void test_sweeps(void **state)
{
    (void)state;
    expect("rail vdd 1 V\nresistor A vdd -> gnd 1k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n"
           "sweep vdd from 1 V to 2 V points 100000 show vdd.v, A.i, A.power for A = 1k 2k 3k 4k\n",
           NULL, "the sweeps have more than 10000000 values, the limit");
}

/* What a stranger's cell may name: files to read, never a pipe, a device or a folder. */
static void test_files(void **state)
{
    (void)state;
    expect("table T a -> gnd \"/dev/zero\"\n", NULL, "it is not an ordinary file");
    expect("process \"/dev/stdin\"\n", NULL, "there is no process file");
    expect("table T a -> gnd \"/\"\n", NULL, "it is a folder");
}

/* Names and texts that the reports ask for. */
static void test_words(void **state)
{
    (void)state;
    static const struct {
        const char *text, *row;
    } probes[] = {{"x.v", "v"},     {"vdd.current", "current"},   {"R.i", "i"},
                  {"y.low", "low"}, {"all.headroom", "headroom"}, {"cell.power", "power"}};
    struct bench bench;
    char text[100];
    bench_open(&bench, "words.cell",
               "rail vdd 3 V\nresistor R vdd -> x 1k\nresistor S x -> gnd 1k\n"
               "output y at 1 V from 0 V to 2 V\nresistor T vdd -> y 1k\n",
               NULL);
    assert_non_null(bench.circuit);
    circuit_unknown_name(bench.circuit, CIRCUIT_GROUND, text, sizeof text);
    assert_string_equal(text, "gnd");
    circuit_unknown_name(bench.circuit, 999, text, sizeof text);
    assert_string_equal(text, "unknown 999");
    for (size_t k = 0; k < sizeof probes / sizeof probes[0]; k++) {
        struct probe probe;
        assert_true(circuit_probe(bench.circuit, probes[k].text, SPAN_NONE,
                                  &bench.cell->diagnostics, &probe));
        assert_string_equal(probe_row(bench.circuit, &probe)->name, probes[k].row);
    }
    for (int k = 0; k < CAUTION_COUNT; k++) {
        const char *rule = caution_rule((enum caution_code)k); /* NULL: a fact, no rule */
        assert_true(rule == NULL || strlen(rule) > 10);
    }
    bench_close(&bench);
}

/* A value from outside takes the unit of the let, or must have its dimension. */
static void test_sets(void **state)
{
    (void)state;
    static const char text[] = "let ITAIL = 1 uA\nlet N = 2\nrail vdd 3 V\n"
                               "resistor R vdd -> x 1k\ncurrent I x -> gnd N * ITAIL\n";
    struct set_value set = {
        .name = "ITAIL", .value = {.value = 3e-6, .bare = true}, .where = SPAN_NONE};
    const struct circuit_settings settings = {.kelvin = NAN, .sets = &set, .set_count = 1};
    struct bench bench;
    bench_open(&bench, "sets.cell", text, &settings);
    assert_non_null(bench.circuit);
    const int k = circuit_find_instance(bench.circuit, "I");
    assert_true(fabs(bench.circuit->instances[k].own[0] / 6e-6 - 1) < 1e-15);
    bench_close(&bench);
    set.value = (struct quantity){.value = 2, .dimension = DIMENSION_VOLTAGE};
    expect(text, &settings, "ITAIL is a current in the cell; this is a voltage");
    set.name = "NOPE";
    expect(text, &settings, "no let is called 'NOPE'");
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_blocks_multiply), cmocka_unit_test(test_memory),
        cmocka_unit_test(test_errors),          cmocka_unit_test(test_names_of_a_block),
        cmocka_unit_test(test_models),          cmocka_unit_test(test_processes),
        cmocka_unit_test(test_sweeps),          cmocka_unit_test(test_files),
        cmocka_unit_test(test_words),           cmocka_unit_test(test_sets),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
