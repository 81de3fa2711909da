/* reject_test.c: cells with errors of structure and value, and exactly what is said about each: the
 * files of reject/, the settings from outside, and the limits. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

#include <cmocka.h>

#include "circuit_fixture.h"
#include "language/parser.h"
#include "language/source.h"

enum { TEXT_LIMIT = 1 << 20 };

static bool ends_with(const char *text, const char *end)
{
    const size_t length = strlen(text), tail = strlen(end);
    return length >= tail && strcmp(text + length - tail, end) == 0;
}

static char *read_expected(const char *cell)
{
    char path[300];
    const int stem = (int)(strrchr(cell, '.') - cell);
    (void)snprintf(path, sizeof path, "%.*s.expected", stem, cell);
    FILE *file = fopen(path, "rb");
    if (file == NULL) {
        print_error("%s is missing\n", path);
        fail();
    }
    char *text = calloc(1, TEXT_LIMIT);
    assert_non_null(text);
    assert_true(fread(text, 1, TEXT_LIMIT - 1, file) > 0);
    assert_int_equal(fclose(file), 0);
    return text;
}

static void check_file(const char *name)
{
    struct bench bench;
    bench_open(&bench, name, NULL, NULL);
    char *expected = read_expected(name);
    if (bench.status != STATUS_INPUT || strcmp(bench.out.data, expected) != 0) {
        print_error("%s: status %d\n%s", name, (int)bench.status, bench.out.data);
        fail();
    }
    free(expected);
    bench_close(&bench);
}

/* Every file of the folder; names in messages are as the user wrote them, so the folder is entered.
 */
static void test_files(void **state)
{
    (void)state;
    int count = 0;
    assert_int_equal(chdir(SOURCE_DIR "/tests/circuit/reject"), 0);
    DIR *folder = opendir(".");
    assert_non_null(folder);
    for (const struct dirent *entry = readdir(folder); entry != NULL; entry = readdir(folder)) {
        if (ends_with(entry->d_name, ".cell")) {
            check_file(entry->d_name);
            count++;
        }
    }
    assert_int_equal(closedir(folder), 0);
    assert_true(count >= 20);
}

static const char plain_cell[] = "let R = 1k\n"
                                 "rail vdd 3 V\n"
                                 "model nch nmos\n threshold = 0.5 V\n kprime = 200 uA/V^2\nend\n"
                                 "corner slow\n nch.kprime *= 0.8\nend\n"
                                 "resistor R1 vdd -> gnd R\n";

static void check_text(const char *text, const struct circuit_settings *settings,
                       const char *expected)
{
    struct bench bench;
    bench_open(&bench, "cell", text, settings);
    assert_int_equal(bench.status, STATUS_INPUT);
    assert_null(bench.circuit);
    assert_string_equal(bench.out.data, expected);
    bench_close(&bench);
}

static void test_settings(void **state)
{
    (void)state;
    const struct set_value unknown = {.name = "RR", .value = {.value = 1}, .where = SPAN_NONE};
    const struct circuit_settings no_let = {.kelvin = NAN, .sets = &unknown, .set_count = 1};
    check_text(plain_cell, &no_let, "ampstead: no let is called 'RR'\n  did you mean 'R'?\n");
    const struct set_value volts = {
        .name = "R", .value = {.value = 1, .dimension = DIMENSION_VOLTAGE}, .where = SPAN_NONE};
    const struct circuit_settings wrong = {.kelvin = NAN, .sets = &volts, .set_count = 1};
    check_text(plain_cell, &wrong,
               "cell:10:24: a resistance is wanted; this is a voltage\n"
               "  10 |  resistor R1 vdd -> gnd R\n"
               "     |                         ^\n");
    const struct circuit_settings corner = {.kelvin = NAN, .corner = "slwo"};
    check_text(plain_cell, &corner,
               "ampstead: there is no corner 'slwo'\n  did you mean 'slow'?\n");
    check_text("rail vdd 3 V\nresistor R1 vdd -> gnd 1k\n", &corner,
               "ampstead: there is no corner 'slwo'\n"
               "  the processes of this cell have no corners\n");
}

/* A probe, knob or sweep that is asked for from outside. */
static void test_late_names(void **state)
{
    (void)state;
    struct bench bench;
    bench_open(&bench, "cell", plain_cell, NULL);
    assert_int_equal(bench.status, STATUS_OK);
    struct probe probe;
    struct knob knob;
    struct diagnostics *diagnostics = &bench.cell->diagnostics;
    assert_false(circuit_probe(bench.circuit, "R1.ii", SPAN_NONE, diagnostics, &probe));
    assert_false(circuit_probe(bench.circuit, "R1", SPAN_NONE, diagnostics, &probe));
    assert_false(circuit_probe(bench.circuit, "vdd.x", SPAN_NONE, diagnostics, &probe));
    assert_false(circuit_probe(bench.circuit, "gnd.v", SPAN_NONE, diagnostics, &probe));
    assert_false(circuit_knob(bench.circuit, "R1.tolerance", SPAN_NONE, diagnostics, &knob));
    assert_false(circuit_knob(bench.circuit, "R1.value_shift", SPAN_NONE, diagnostics, &knob));
    diagnostics_print(diagnostics, &bench.cell->sources, false, &bench.out);
    assert_non_null(bench.out.data);
    static const char *const said[] = {"R1 has no quantity 'ii'\n",
                                       "'R1' has no dot\n",
                                       "it has: v, current, power",
                                       "gnd has no quantity 'v'\n",
                                       "'R1.tolerance' is nothing that can be turned\n",
                                       "'R1.value_shift' is nothing that can be turned\n"};
    for (size_t k = 0; k < sizeof said / sizeof said[0]; k++) {
        if (strstr(bench.out.data, said[k]) == NULL) {
            print_error("missing: %s\n%s", said[k], bench.out.data);
            fail();
        }
    }
    bench_close(&bench);
}

/* --- limits: each message prints the limit ---------------------------------------------------- */

static void check_limit(struct buffer *text, const char *said)
{
    struct bench bench;
    assert_false(text->failed);
    bench_open(&bench, "cell", text->data, NULL);
    assert_int_equal(bench.status, STATUS_INPUT);
    if (strstr(bench.out.data, said) == NULL) {
        print_error("missing: %s\n%.2000s", said, bench.out.data);
        fail();
    }
    bench_close(&bench);
    buffer_free(text);
}

static void test_limits(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "rail vdd 3 V\nresistor R1 vdd -> gnd LET0\nlet LET150 = 1k\n");
    for (int k = 0; k < 150; k++) {
        buffer_format(&text, "let LET%d = LET%d\n", k, k + 1);
    }
    check_limit(&text, "lets that use lets are nested deeper than 100\n");

    buffer_text(&text, "rail vdd 3 V\nlaw G1 vdd -> gnd i = 1 uA/V * (0 V");
    for (int k = 0; k < 17; k++) {
        buffer_format(&text, " + n%d.v", k);
    }
    buffer_text(&text, ")\n");
    check_limit(&text, "a law may use at most 16 node voltages\n");

    buffer_text(&text, "rail vdd 3 V\nlaw G1 vdd -> gnd i = 1 uA/V * (0 V");
    for (int k = 0; k < 3000; k++) {
        buffer_text(&text, " + vdd.v");
    }
    buffer_text(&text, ")\n");
    check_limit(&text, "this law is too long: at most 4000 steps");
}

static void test_table_limit(void **state)
{
    (void)state;
    char path[] = "/tmp/ampstead-table-XXXXXX";
    const int descriptor = mkstemp(path);
    assert_true(descriptor >= 0);
    FILE *file = fdopen(descriptor, "w");
    assert_non_null(file);
    for (int k = 0; k <= 100000; k++) {
        fprintf(file, "%d,%d\n", k, k);
    }
    assert_int_equal(fclose(file), 0);
    struct buffer text = BUFFER_EMPTY;
    buffer_format(&text, "rail vdd 3 V\ntable T1 vdd -> gnd \"%s\"\n", path);
    check_limit(&text, "a table may hold at most 100000 points\n");
    assert_int_equal(remove(path), 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_files),       cmocka_unit_test(test_settings),
        cmocka_unit_test(test_late_names),  cmocka_unit_test(test_limits),
        cmocka_unit_test(test_table_limit),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
