/*
 * invariance_test.c: what must not change an answer: the order of statements, the names of nodes
 * and parts, the locale, and asking again.
 */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <cmocka.h>

#include <locale.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "support/cell_run.h"

enum { TEXT_LIMIT = 4000, SHUFFLES = 8 };

/* A degenerated mirror with a p-channel copy, a bipolar buffer and a supply divider: several kinds
 * of devices, none of them alone. */
static const char *const lines[] = {
    ("model nmos nmos\n threshold = 0.45 V\n kprime = 300 uA/V^2\n body_effect = 0.45 V^0.5\n"
     " early = 8 V\nend\n"),
    "model pmos pmos\n threshold = 0.48 V\n kprime = 80 uA/V^2\n early = 7 V\nend\n",
    "model npn npn\n saturation_current = 2 fA\n early = 60 V\nend\n",
    "rail vdd 3 V\n",
    "resistor RB vdd -> ref 470k\n",
    "nmos M1 d=ref g=ref s=gnd W=8u L=4u\n",
    "nmos M2 d=fold g=ref s=deg W=16u L=4u\n",
    "resistor RE deg -> gnd 12k\n",
    "pmos M3 d=fold g=fold s=vdd W=12u L=4u\n",
    "pmos M4 d=load g=fold s=vdd W=24u L=4u\n",
    "resistor RD vdd -> half 200k\n",
    "npn Q1 c=vdd b=half e=buf\n",
    "resistor RF half -> gnd 200k\n",
    "resistor RL buf -> gnd 100k\n",
    "output load at 1 V from 0 V to 3 V\n",
    "hand load.current = 4 uA\n",
};
enum { LINE_COUNT = sizeof lines / sizeof lines[0] };

static const char *const nodes[] = {"ref", "fold", "deg", "half", "buf", "load"};
enum { NODE_COUNT = sizeof nodes / sizeof nodes[0] };

static void compose(const int *order, char *text)
{
    text[0] = '\0';
    for (int k = 0; k < LINE_COUNT; k++) {
        strncat(text, lines[order[k]], TEXT_LIMIT - 1 - strlen(text));
    }
}

static void compose_plain(char *text)
{
    int order[LINE_COUNT];
    for (int k = 0; k < LINE_COUNT; k++) {
        order[k] = k;
    }
    compose(order, text);
}

static double node_voltage(const struct cell_run *run, const char *name)
{
    const int node = circuit_find_node(run->circuit, name);
    assert_true(node > 0);
    return run->result->point.x[node - 1];
}

static void assert_same_bytes(const struct cell_run *a, const struct cell_run *b)
{
    const struct output_result *p = &a->result->outputs[0], *q = &b->result->outputs[0];
    const size_t size = sizeof(double) * (size_t)p->curve.count;
    assert_int_equal(a->circuit->unknown_count, b->circuit->unknown_count);
    assert_memory_equal(a->result->point.x, b->result->point.x,
                        sizeof(double) * (size_t)a->circuit->unknown_count);
    assert_int_equal(p->curve.count, q->curve.count);
    assert_memory_equal(p->curve.v, q->curve.v, size);
    assert_memory_equal(p->curve.current, q->curve.current, size);
    assert_memory_equal(&p->resistance, &q->resistance, sizeof p->resistance);
    assert_memory_equal(&p->compliance, &q->compliance, sizeof p->compliance);
    assert_memory_equal(&p->low, &q->low, sizeof p->low);
    assert_memory_equal(&p->tempco, &q->tempco, sizeof p->tempco);
}

static void asking_again_gives_the_same_bytes(void **state)
{
    (void)state;
    char text[TEXT_LIMIT];
    struct cell_run first, second;
    compose_plain(text);
    assert_true(cell_run_open(&first, "one.cell", text, VIEW_FULL, NAN));
    assert_true(cell_run_open(&second, "one.cell", text, VIEW_FULL, NAN));
    assert_same_bytes(&first, &second);
    cell_run_close(&first);
    cell_run_close(&second);
}

/* The unknowns get another order, so the last digits may move; nothing before them may. */
static void order_of_statements_does_not_matter(void **state)
{
    (void)state;
    char text[TEXT_LIMIT];
    struct cell_run plain;
    compose_plain(text);
    assert_true(cell_run_open(&plain, "plain.cell", text, VIEW_FULL, NAN));
    int order[LINE_COUNT];
    uint32_t random = 1;
    for (int shuffle = 0; shuffle < SHUFFLES; shuffle++) {
        for (int k = 0; k < LINE_COUNT; k++) { /* Fisher and Yates */
            random = random * 1664525u + 1013904223u;
            const int j = shuffle == 0 ? 0 : (int)((random >> 16) % (unsigned)(k + 1));
            order[k] = k;
            const int swapped = order[j];
            order[j] = k;
            order[k] = j == k ? k : swapped;
        }
        compose(order, text);
        struct cell_run other;
        assert_true(cell_run_open(&other, "shuffled.cell", text, VIEW_FULL, NAN));
        for (int k = 0; k < NODE_COUNT; k++) {
            const double a = node_voltage(&plain, nodes[k]), b = node_voltage(&other, nodes[k]);
            assert_true(fabs(a - b) <= 1e-14 * fabs(a));
        }
        const struct output_result *p = &plain.result->outputs[0];
        const struct output_result *q = &other.result->outputs[0];
        assert_true(fabs(p->current - q->current) <= 1e-13 * p->current);
        assert_true(fabs(p->resistance - q->resistance) <= 1e-11 * fabs(p->resistance));
        assert_true(fabs(p->compliance - q->compliance) <= 1e-5);
        cell_run_close(&other);
    }
    cell_run_close(&plain);
}

/* Replaces every whole word `from` by `to`. */
static void rename_word(char *text, const char *from, const char *to)
{
    static const char word[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_";
    char result[TEXT_LIMIT] = "";
    size_t length = 0;
    for (const char *c = text; *c != '\0' && length < TEXT_LIMIT - 100;) {
        const size_t run = strspn(c, word);
        const bool is_match = run == strlen(from) && strncmp(c, from, run) == 0;
        const char *piece = is_match ? to : c;
        const size_t size = is_match ? strlen(to) : run > 0 ? run : 1;
        memcpy(result + length, piece, size);
        length += size;
        c += run > 0 ? run : 1;
    }
    result[length] = '\0';
    memcpy(text, result, length + 1);
}

static void names_do_not_matter(void **state)
{
    (void)state;
    static const char *const renames[][2] = {
        {"ref", "output"}, {"fold", "zz9"},    {"deg", "A"},        {"half", "rail"},
        {"buf", "_b"},     {"load", "Load_7"}, {"vdd", "resistor"}, {"M1", "Zulu"},
        {"M2", "a1"},      {"RB", "current"},  {"Q1", "M1"}};
    char text[TEXT_LIMIT];
    struct cell_run plain, other;
    compose_plain(text);
    assert_true(cell_run_open(&plain, "plain.cell", text, VIEW_FULL, NAN));
    for (size_t k = 0; k < sizeof renames / sizeof renames[0]; k++) {
        rename_word(text, renames[k][0], renames[k][1]);
    }
    assert_true(cell_run_open(&other, "renamed.cell", text, VIEW_FULL, NAN));
    assert_same_bytes(&plain, &other);
    cell_run_close(&plain);
    cell_run_close(&other);
}

static void locale_does_not_matter(void **state)
{
    (void)state;
    static const char *const comma[] = {"de_DE.UTF-8", "de_DE.utf8", "fr_FR.UTF-8",
                                        "fr_FR.utf8",  "de_DE",      "fr_FR"};
    char text[TEXT_LIMIT];
    struct cell_run plain, other;
    compose_plain(text);
    assert_true(cell_run_open(&plain, "plain.cell", text, VIEW_FULL, NAN));
    const char *set = NULL;
    for (size_t k = 0; set == NULL && k < sizeof comma / sizeof comma[0]; k++) {
        set = setlocale(LC_ALL, comma[k]);
    }
    const bool opened = cell_run_open(&other, "plain.cell", text, VIEW_FULL, NAN);
    setlocale(LC_ALL, "C");
    assert_true(opened);
    assert_same_bytes(&plain, &other);
    cell_run_close(&plain);
    cell_run_close(&other);
    if (set == NULL) {
        print_message("    no locale with a decimal comma is installed here\n");
        skip();
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(asking_again_gives_the_same_bytes),
        cmocka_unit_test(order_of_statements_does_not_matter),
        cmocka_unit_test(names_do_not_matter),
        cmocka_unit_test(locale_does_not_matter),
    };
    return cmocka_run_group_tests(tests, NULL, NULL) == 0 ? 0 : 1;
}
