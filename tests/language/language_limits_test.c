/* language_limits_test.c: every limit of the language is met with a message that prints it, and
 * every way in which a file cannot be read has its words. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <fcntl.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>

#include "language/parser.h"
#include "language/source.h"

struct reading {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    struct buffer out;
    uint32_t file;
};

static void begin(struct reading *r)
{
    *r = (struct reading){.arena = arena_create()};
    assert_non_null(r->arena);
    r->diagnostics.arena = r->arena;
}

static void end(struct reading *r, const char *message)
{
    diagnostics_print(&r->diagnostics, &r->sources, false, &r->out);
    const char *said = r->out.data == NULL ? "" : r->out.data;
    if (message == NULL ? said[0] != '\0' : strstr(said, message) == NULL) {
        fail_msg("no '%s' in:\n%.2000s", message == NULL ? "" : message, said);
    }
    buffer_free(&r->out);
    arena_destroy(r->arena);
}

/* Parses a text as a cell and looks for a message. */
static void expect(const char *text, const char *message)
{
    struct reading r;
    struct tree tree;
    begin(&r);
    assert_int_equal(
        source_add_text(r.arena, &r.sources, "x.cell", text, strlen(text), &r.diagnostics, &r.file),
        STATUS_OK);
    assert_int_equal(parse_source(r.arena, &r.sources, r.file, TREE_CELL, &r.diagnostics, &tree),
                     STATUS_INPUT);
    end(&r, message);
}

static void test_depth(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "let A = ");
    buffer_repeat(&text, '(', 65);
    expect(text.data, "nested more than 64 deep, the limit");
    buffer_free(&text);
    buffer_text(&text, "let A = ");
    buffer_repeat(&text, '(', 64);
    buffer_text(&text, "2 V^2");
    expect(text.data, "nested more than 64 deep, the limit");
    buffer_free(&text);
}

static void test_arguments(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "let A = max(0");
    for (int k = 0; k < 10001; k++) {
        buffer_text(&text, ",1");
    }
    buffer_text(&text, ")\n");
    expect(text.data, "more than 10000 operators, the limit");
    buffer_free(&text);
}

/* So many errors that the rest is not read; inside a block, where they are counted too. */
static void test_errors(void **state)
{
    (void)state;
    struct buffer text = BUFFER_EMPTY;
    buffer_text(&text, "block b in\n");
    for (int k = 0; k < 1001; k++) {
        buffer_text(&text, "  let = 1\n");
    }
    buffer_text(&text, "end\n");
    expect(text.data, "more errors are not shown");
    buffer_free(&text);
}

/* Five files of the greatest length are more than a cell may name. */
static void test_total(void **state)
{
    (void)state;
    struct reading r;
    begin(&r);
    char *text = test_malloc(LANGUAGE_FILE_LIMIT);
    memset(text, '\n', LANGUAGE_FILE_LIMIT);
    for (int k = 0; k < 5; k++) {
        assert_int_equal(source_add_text(r.arena, &r.sources, "x", text, LANGUAGE_FILE_LIMIT,
                                         &r.diagnostics, &r.file),
                         k < 4 ? STATUS_OK : STATUS_INPUT);
    }
    test_free(text);
    end(&r, "the files of the cell are longer than the limit of 16777216 bytes");
}

/* Reads a path that another file names, and looks for the words. */
static void expect_file(const char *path, const char *message)
{
    struct reading r;
    begin(&r);
    assert_int_equal(source_read(r.arena, &r.sources, path, NULL, (struct span){0, 0, 0},
                                 &r.diagnostics, &r.file),
                     STATUS_INPUT);
    for (int k = 0; k < r.diagnostics.count; k++) {
        r.diagnostics.list[k].where = SPAN_NONE; /* there is no other file here */
    }
    end(&r, message);
}

static void test_odd_paths(void **state)
{
    (void)state;
    char folder[] = "/tmp/ampstead-limits-XXXXXX", path[100], name[5000];
    assert_non_null(mkdtemp(folder));
    (void)snprintf(path, sizeof path, "%s/loop", folder);
    assert_int_equal(symlink(path, path), 0);
    expect_file(path, "its links go round in a circle");
    assert_int_equal(unlink(path), 0);
    assert_int_equal(rmdir(folder), 0);
    memset(name, 'x', sizeof name - 1);
    name[sizeof name - 1] = '\0';
    expect_file(name, "the name is too long");
    /* an ordinary file, but nothing lies at address 0: the read fails */
    expect_file("/proc/self/mem", "the system refused");
}

static void test_unreadable(void **state)
{
    (void)state;
    char folder[] = "/tmp/ampstead-limits-XXXXXX", path[100];
    assert_non_null(mkdtemp(folder));
    (void)snprintf(path, sizeof path, "%s/long", folder);
    const int file = open(path, O_WRONLY | O_CREAT, 0600);
    assert_true(file >= 0);
    assert_int_equal(ftruncate(file, LANGUAGE_FILE_LIMIT + 1), 0);
    assert_int_equal(close(file), 0);
    expect_file(path, "is longer than the limit of 4194304 bytes");

    struct rlimit old, none;
    assert_int_equal(getrlimit(RLIMIT_NOFILE, &old), 0);
    none = old;
    none.rlim_cur = 0;
    assert_int_equal(setrlimit(RLIMIT_NOFILE, &none), 0);
    expect_file(path, "too many files are open");
    assert_int_equal(setrlimit(RLIMIT_NOFILE, &old), 0);

    /* root may read everything: as somebody else */
    const bool is_root = geteuid() == 0;
    assert_int_equal(chmod(path, 0), 0);
    assert_int_equal(chmod(folder, 0755), 0);
    assert_true(!is_root || seteuid(65534) == 0);
    expect_file(path, "reading it is not allowed");
    assert_true(!is_root || seteuid(0) == 0);
    assert_int_equal(unlink(path), 0);
    assert_int_equal(rmdir(folder), 0);
}

static void test_standard_input(void **state)
{
    (void)state;
    const int kept = dup(STDIN_FILENO), file = open(SOURCE_DIR "/LICENSE", O_RDONLY);
    struct reading r;
    assert_true(file >= 0 && dup2(file, STDIN_FILENO) == STDIN_FILENO);
    begin(&r);
    assert_int_equal(
        source_read(r.arena, &r.sources, "-", "standard input", SPAN_NONE, &r.diagnostics, &r.file),
        STATUS_OK);
    assert_true(r.sources.files[0].length > 100);
    end(&r, NULL);
    (void)close(STDIN_FILENO);
    begin(&r);
    assert_int_equal(
        source_read(r.arena, &r.sources, "-", "standard input", SPAN_NONE, &r.diagnostics, &r.file),
        STATUS_INPUT);
    end(&r, "the system refused");
    assert_true(kept < 0 || dup2(kept, STDIN_FILENO) == STDIN_FILENO);
    (void)close(file);
    (void)close(kept);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_depth),          cmocka_unit_test(test_arguments),
        cmocka_unit_test(test_errors),         cmocka_unit_test(test_total),
        cmocka_unit_test(test_odd_paths),      cmocka_unit_test(test_unreadable),
        cmocka_unit_test(test_standard_input),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
