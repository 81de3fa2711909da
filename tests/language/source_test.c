/* source_test.c: what may be read, and what is refused. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>

#include "language/source.h"

struct bench {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    uint32_t index;
};

static void start(struct bench *bench)
{
    memset(bench, 0, sizeof *bench);
    bench->arena = arena_create();
    assert_non_null(bench->arena);
    bench->diagnostics.arena = bench->arena;
}

static void check_text(const char *text, size_t length, const char *message, int line, int column)
{
    struct bench bench;
    start(&bench);
    enum status status = source_add_text(bench.arena, &bench.sources, "cell", text, length,
                                         &bench.diagnostics, &bench.index);
    if (message == NULL) {
        assert_int_equal(status, STATUS_OK);
        assert_int_equal(bench.diagnostics.count, 0);
    } else {
        int found_line = 0, found_column = 0;
        assert_int_equal(status, STATUS_INPUT);
        assert_string_equal(bench.diagnostics.list[0].text, message);
        source_position(&bench.sources.files[0], bench.diagnostics.list[0].where.begin, &found_line,
                        &found_column);
        assert_int_equal(found_line, line);
        assert_int_equal(found_column, column);
    }
    arena_destroy(bench.arena);
}

static void test_bytes(void **state)
{
    (void)state;
    check_text("", 0, NULL, 0, 0);
    check_text("\xCE\xA9 x", 4, NULL, 0, 0);
    check_text("ab\n\xCE\xA9 \xFFz", 8, "the byte 0xFF is not UTF-8 text", 2, 3);
    check_text("\xEF\xBB\xBFx\xC0\x80", 6, "the byte 0xC0 is not UTF-8 text", 1, 2);
    check_text("a\0b", 3, "a NUL byte cannot stand in a text", 1, 2);
    check_text("abc\xE2\x84", 5, "the byte 0xE2 is not UTF-8 text", 1, 4);
}

static void test_mark(void **state)
{
    (void)state;
    struct bench bench;
    start(&bench);
    assert_int_equal(source_add_text(bench.arena, &bench.sources, "cell", "\xEF\xBB\xBFrail", 7,
                                     &bench.diagnostics, &bench.index),
                     STATUS_OK);
    assert_string_equal(bench.sources.files[bench.index].text, "rail");
    assert_int_equal(bench.sources.files[bench.index].length, 4);
    arena_destroy(bench.arena);
}

/* One byte more than the limit is refused, and the message prints the limit. */
static void test_limit(void **state)
{
    (void)state;
    char *text = malloc(LANGUAGE_FILE_LIMIT + 1);
    assert_non_null(text);
    memset(text, ' ', LANGUAGE_FILE_LIMIT + 1);
    check_text(text, LANGUAGE_FILE_LIMIT, NULL, 0, 0);
    struct bench bench;
    start(&bench);
    assert_int_equal(source_add_text(bench.arena, &bench.sources, "big.cell", text,
                                     LANGUAGE_FILE_LIMIT + 1, &bench.diagnostics, &bench.index),
                     STATUS_INPUT);
    assert_string_equal(bench.diagnostics.list[0].text,
                        "'big.cell' is longer than the limit of 4194304 bytes");
    arena_destroy(bench.arena);
    free(text);
}

static void check_refused(const char *path, struct span where, const char *message)
{
    struct bench bench;
    start(&bench);
    assert_int_equal(source_read(bench.arena, &bench.sources, path, NULL, where, &bench.diagnostics,
                                 &bench.index),
                     STATUS_INPUT);
    assert_string_equal(bench.diagnostics.list[0].text, message);
    arena_destroy(bench.arena);
}

static void test_files(void **state)
{
    (void)state;
    char folder[] = "/tmp/ampstead-source-XXXXXX";
    char path[64], pipe_path[64], message[128];
    assert_non_null(mkdtemp(folder));
    (void)snprintf(path, sizeof path, "%s/a.cell", folder);
    (void)snprintf(pipe_path, sizeof pipe_path, "%s/pipe", folder);
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    assert_true(fputs("rail vbat 3 V\n", file) >= 0);
    assert_int_equal(fclose(file), 0);
    assert_int_equal(mkfifo(pipe_path, 0600), 0);

    struct bench bench;
    start(&bench);
    assert_int_equal(source_read(bench.arena, &bench.sources, path, "shown.cell", SPAN_NONE,
                                 &bench.diagnostics, &bench.index),
                     STATUS_OK);
    assert_string_equal(bench.sources.files[0].name, "shown.cell");
    assert_string_equal(bench.sources.files[0].text, "rail vbat 3 V\n");
    arena_destroy(bench.arena);
    assert_true(source_exists(path));
    assert_false(source_exists(folder));
    assert_false(source_exists(pipe_path));

    (void)snprintf(message, sizeof message, "cannot read '%s': it is a folder", folder);
    check_refused(folder, SPAN_NONE, message);
    check_refused("/dev/null", SPAN_NONE, "cannot read '/dev/null': it is not an ordinary file");
    /* A pipe named inside a cell could make the program wait for ever. */
    (void)snprintf(message, sizeof message, "cannot read '%s': it is not an ordinary file",
                   pipe_path);
    check_refused(pipe_path, (struct span){0, 0, 0}, message);
    assert_int_equal(unlink(path), 0);
    (void)snprintf(message, sizeof message, "cannot read '%s': there is no such file", path);
    check_refused(path, SPAN_NONE, message);
    assert_false(source_exists(path));
    assert_int_equal(unlink(pipe_path), 0);
    assert_int_equal(rmdir(folder), 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_bytes),
        cmocka_unit_test(test_mark),
        cmocka_unit_test(test_limit),
        cmocka_unit_test(test_files),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
