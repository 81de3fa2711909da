/* diagnostic_test.c: places, marks, order and near names. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <string.h>

#include <cmocka.h>

#include "base/diagnostic.h"
#include "base/utf8.h"

struct bench {
    struct arena *arena;
    struct source_file file;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct buffer out;
};

static void setup(struct bench *bench, const char *text)
{
    memset(bench, 0, sizeof *bench);
    bench->arena = arena_create();
    bench->diagnostics.arena = bench->arena;
    bench->file = (struct source_file){"tail.cell", text, (uint32_t)strlen(text)};
    bench->sources = (struct source_set){&bench->file, 1, 1};
}

static void finish(struct bench *bench, bool color, const char *wanted)
{
    diagnostics_print(&bench->diagnostics, &bench->sources, color, &bench->out);
    assert_false(bench->out.failed);
    assert_string_equal(bench->out.data, wanted);
    buffer_free(&bench->out);
    arena_destroy(bench->arena);
}

/* Tabs and characters of two bytes count one column each; order is by place. */
static void test_marks(void **state)
{
    (void)state;
    struct bench bench;
    setup(&bench, "a\n\tR\xCE\xA9 ref\r\nlast");
    diagnostics_add(&bench.diagnostics, (struct span){0, 16, 16}, NULL, "too short");
    diagnostics_add(&bench.diagnostics, (struct span){0, 7, 10}, "did you mean 'reg'?",
                    "no node '%s'", "ref");
    diagnostics_add(&bench.diagnostics, (struct span){0, 7, 10}, "again", "no node '%s'", "ref");
    diagnostics_add(&bench.diagnostics, SPAN_NONE, "see --help", "there is no option '-q'");
    assert_int_equal(bench.diagnostics.count, 3);
    assert_int_equal(source_line(&bench.sources, (struct span){0, 7, 10}), 2);
    assert_int_equal(source_line(&bench.sources, SPAN_NONE), 0);
    finish(&bench, false,
           "tail.cell:2:5: no node 'ref'\n"
           "   2 |   R\xCE\xA9 ref\n"
           "     |      ^~~  did you mean 'reg'?\n"
           "tail.cell:3:5: too short\n"
           "   3 |  last\n"
           "     |      ^\n"
           "ampstead: there is no option '-q'\n"
           "  see --help\n");
}

/* Escape sequences, directional marks and broken bytes of an input cannot reach the terminal. */
static void test_controls(void **state)
{
    (void)state;
    struct bench bench;
    setup(&bench, "x\033[2J\xE2\x80\xAEy\xFFz\x7F");
    diagnostics_add(&bench.diagnostics, (struct span){0, 0, 1}, NULL, "found '\033'");
    finish(&bench, false,
           "tail.cell:1:1: found ' '\n"
           "   1 |  x [2J y?z \n"
           "     |  ^\n");
}

static void test_color(void **state)
{
    (void)state;
    struct bench bench;
    setup(&bench, "xy");
    diagnostics_add(&bench.diagnostics, (struct span){0, 0, 2}, NULL, "bad");
    finish(&bench, true,
           "\033[1mtail.cell:1:1:\033[0m bad\n"
           "   1 |  xy\n"
           "     |  \033[1;31m^~\033[0m\n");
}

/* A mark in a long line is shown with what stands around it; one over lines ends with its first. */
static void test_window(void **state)
{
    (void)state;
    char text[401];
    for (int i = 0; i < 400; i++) {
        text[i] = (char)('a' + i % 26);
    }
    text[400] = '\0';
    struct bench bench;
    setup(&bench, text);
    diagnostics_add(&bench.diagnostics, (struct span){0, 200, 500}, NULL, "long");
    diagnostics_print(&bench.diagnostics, &bench.sources, false, &bench.out);
    const char *line = strstr(bench.out.data, "   1 |  ...");
    const char *mark = strchr(bench.out.data, '^');
    assert_non_null(line);
    assert_non_null(mark);
    const char *end = strchr(line, '\n');
    assert_true(end - line <= 110);
    assert_int_equal(end[-1], '.');
    ptrdiff_t column = mark - (end + 1);
    assert_int_equal(line[column], text[200]);
    assert_int_equal(strlen(mark), 92 - 40 + 1);
    buffer_free(&bench.out);
    arena_destroy(bench.arena);
}

static void test_limit(void **state)
{
    (void)state;
    struct bench bench;
    setup(&bench, "x");
    for (int i = 0; i < 23; i++) {
        diagnostics_add(&bench.diagnostics, SPAN_NONE, NULL, "error %d", i);
    }
    diagnostics_print(&bench.diagnostics, &bench.sources, false, &bench.out);
    assert_non_null(strstr(bench.out.data, "error 19\nampstead: 3 more errors are not shown\n"));
    assert_null(strstr(bench.out.data, "error 20"));
    buffer_free(&bench.out);
    arena_destroy(bench.arena);
    setup(&bench, "x");
    diagnostics_print(&bench.diagnostics, &bench.sources, false, &bench.out);
    assert_null(bench.out.data);
    arena_destroy(bench.arena);
}

static void test_near(void **state)
{
    (void)state;
    static const char *const names[] = {"ref", "tail", "Tail", "vbat", "M1", "M2", "require"};
    static const struct {
        const char *wanted, *near;
    } cases[] = {
        {"reff", "ref"}, /* one letter too many */
        {"rfe", "ref"},  /* two exchanged: one step in the restricted distance */
        {"tial", "tail"},  {"TAIL", "tail"}, /* case alone is always near */
        {"taiL", "tail"}, /* letter case alone counts half, so the first of two */
        {"m1", "M1"},      {"reqire", "require"}, {"rquire", "require"},
        {"rqire", NULL},   {"x", NULL},           {"", NULL},
        {"vbatt", "vbat"}, {"M3", "M1"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const char *found = near_name(cases[i].wanted, names, 7);
        if (cases[i].near == NULL) {
            assert_null(found);
        } else {
            assert_non_null(found);
            assert_string_equal(found, cases[i].near);
        }
    }
}

/* Well-formed and ill-formed byte sequences of the Unicode Standard 15.0, table 3-7. */
static void test_utf8(void **state)
{
    (void)state;
    static const struct {
        const char *text;
        size_t bytes;
        uint32_t character;
    } cases[] = {
        {"A", 1, 0x41},
        {"\xC2\x80", 2, 0x80},
        {"\xE0\xA0\x80", 3, 0x800},
        {"\xED\x9F\xBF", 3, 0xD7FF},
        {"\xEF\xBF\xBF", 3, 0xFFFF},
        {"\xF0\x90\x80\x80", 4, 0x10000},
        {"\xF4\x8F\xBF\xBF", 4, 0x10FFFF},
        {"\x80", 0, 0},
        {"\xC0\x80", 0, 0},
        {"\xC1\xBF", 0, 0},
        {"\xE0\x9F\xBF", 0, 0},
        {"\xED\xA0\x80", 0, 0},
        {"\xF0\x8F\xBF\xBF", 0, 0},
        {"\xF4\x90\x80\x80", 0, 0},
        {"\xF5\x80\x80\x80", 0, 0},
        {"\xC3", 0, 0},
        {"\xC3"
         "A",
         0, 0},
        {"\xFF", 0, 0},
        {"", 0, 0},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        uint32_t character = 0;
        assert_int_equal(utf8_decode(cases[i].text, strlen(cases[i].text), &character),
                         cases[i].bytes);
        assert_int_equal(character, cases[i].character);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_marks), cmocka_unit_test(test_controls),
        cmocka_unit_test(test_color), cmocka_unit_test(test_window),
        cmocka_unit_test(test_limit), cmocka_unit_test(test_near),
        cmocka_unit_test(test_utf8),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
