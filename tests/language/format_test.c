/*
 * format_test.c: formatting changes blanks only. Over every cell and process file of the project
 * and over damaged ones that still read: the same tokens in the same lines, the same comments in
 * the same order, and nothing left to do the second time.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "language/format.h"
#include "language/lexer.h"
#include "language/parser.h"
#include "language/source.h"

enum { LARGEST = 65536 };

/* The text formatted, malloc'd; NULL when it does not read. */
static char *formatted(const char *text, enum tree_role role)
{
    struct arena *arena = arena_create();
    struct source_set sources = {NULL, 0, 0};
    struct diagnostics diagnostics = {.arena = arena};
    struct tree tree = {NULL, 0, 0};
    uint32_t file = 0;
    struct buffer out = BUFFER_EMPTY;
    assert_non_null(arena);
    enum status status =
        source_add_text(arena, &sources, "t", text, strlen(text), &diagnostics, &file);
    if (status == STATUS_OK) {
        status = parse_source(arena, &sources, file, role, &diagnostics, &tree);
    }
    if (status == STATUS_OK) {
        assert_int_equal(format_source(arena, &sources, file, &out), STATUS_OK);
        if (out.data == NULL) {
            buffer_text(&out, "");
        }
    }
    arena_destroy(arena);
    return status == STATUS_OK ? out.data : NULL;
}

/* Everything that has a meaning, one logical line a line: the bytes of each token. */
static void tokens_of(const char *text, struct buffer *out)
{
    struct arena *arena = arena_create();
    struct source_file source = {"t", text, (uint32_t)strlen(text)};
    struct source_set sources = {&source, 1, 1};
    struct lexer lexer;
    lexer_start(&lexer, arena, &sources, 0);
    while (lexer_next_line(&lexer)) {
        for (int k = 0; k < lexer.count - 1; k++) {
            buffer_put(out, text + lexer.tokens[k].begin,
                       lexer.tokens[k].end - lexer.tokens[k].begin);
            buffer_text(out, "\x1f");
        }
        buffer_text(out, "\n");
    }
    arena_destroy(arena);
}

/* The comments, one a line. A '#' in a text of one line is none. */
static void comments_of(const char *text, struct buffer *out)
{
    bool quoted = false, in_comment = false;
    size_t kept = 0;
    for (; *text != '\0'; text++) {
        if (*text == '\n') {
            if (in_comment) {
                out->length = kept; /* blanks at the end do not count */
                buffer_text(out, "\n");
            }
            quoted = in_comment = false;
        } else if (*text == '#' && !quoted) {
            in_comment = true;
        } else if (*text == '"' && !in_comment) {
            quoted = !quoted;
        }
        if (in_comment) {
            buffer_put(out, text, 1);
            kept = strchr(" \t\r", *text) == NULL ? out->length : kept;
        }
    }
    buffer_text(out, "\n");
}

static void check_text(const char *text, enum tree_role role, const char *name)
{
    char *once = formatted(text, role);
    if (once == NULL) {
        return;
    }
    char *twice = formatted(once, role);
    struct buffer before = BUFFER_EMPTY, after = BUFFER_EMPTY;
    if (twice == NULL || strcmp(once, twice) != 0) {
        fprintf(stderr, "%s: not settled:\n%s\n---\n%s\n---\n%s\n", name, text, once,
                twice == NULL ? "-" : twice);
        fail();
    }
    tokens_of(text, &before);
    tokens_of(once, &after);
    if (strcmp(before.data == NULL ? "" : before.data, after.data == NULL ? "" : after.data) != 0) {
        print_error("%s: other tokens:\n%s\n---\n%s\n", name, text, once);
        fail();
    }
    buffer_free(&before);
    buffer_free(&after);
    before = after = BUFFER_EMPTY;
    comments_of(text, &before);
    comments_of(once, &after);
    if (strncmp(before.data, after.data,
                before.length < after.length ? before.length - 1 : after.length - 1) != 0) {
        print_error("%s: other comments:\n%s\n---\n%s\n", name, before.data, after.data);
        fail();
    }
    buffer_free(&before);
    buffer_free(&after);
    free(once);
    free(twice);
}

static size_t read_file(const char *path, char *text)
{
    FILE *file = fopen(path, "rb");
    assert_non_null(file);
    size_t length = fread(text, 1, LARGEST - 1, file);
    (void)fclose(file);
    text[length] = '\0';
    if (strncmp(text, "\xEF\xBB\xBF", 3) == 0) { /* a BOM has no meaning and goes */
        memmove(text, text + 3, length - 2);
        length -= 3;
    }
    return length;
}

/* xorshift64 (Marsaglia 2003): the same damage in every run. */
static uint64_t next_random(uint64_t *seed)
{
    *seed ^= *seed << 13;
    *seed ^= *seed >> 7;
    *seed ^= *seed << 17;
    return *seed;
}

/* Blanks, line ends, comments and signs put in, or bytes taken out: many of these still read. */
static void check_damaged(const char *text, size_t length, enum tree_role role, const char *name,
                          int rounds)
{
    static const char *const scraps[] = {" ",        "  ",     "\t", "\n", "\\\n",  "\r\n",
                                         "# note\n", "\n\n\n", "(",  ")",  "1",     "=",
                                         "-> ",      " # x",   ",",  "+ ", "\\ \n", "\xC2\xB5"};
    static char damaged[LARGEST + 64];
    uint64_t seed = 88172645463325252u + length;
    for (int round = 0; round < rounds; round++) {
        const char *scrap = scraps[next_random(&seed) % (sizeof scraps / sizeof scraps[0])];
        size_t at = (size_t)(next_random(&seed) % (length + 1));
        size_t cut = (size_t)(next_random(&seed) % 3);
        cut = at + cut > length ? 0 : cut;
        snprintf(damaged, sizeof damaged, "%.*s%s%s", (int)at, text, scrap, text + at + cut);
        check_text(damaged, role, name);
    }
}

static int check_folder(const char *folder, const char *ending, enum tree_role role)
{
    char path[1024];
    static char text[LARGEST];
    int count = 0;
    snprintf(path, sizeof path, SOURCE_DIR "/%s", folder);
    DIR *listing = opendir(path);
    assert_non_null(listing);
    for (struct dirent *entry; (entry = readdir(listing)) != NULL;) {
        const char *end = strrchr(entry->d_name, '.');
        if (end == NULL || strcmp(end, ending) != 0) {
            continue;
        }
        snprintf(path, sizeof path, SOURCE_DIR "/%s/%s", folder, entry->d_name);
        size_t length = read_file(path, text);
        check_text(text, role, path);
        check_damaged(text, length, role, path, 150);
        count++;
    }
    (void)closedir(listing);
    return count;
}

static void test_all_files(void **state)
{
    (void)state;
    assert_true(check_folder("netlists", ".cell", TREE_CELL) > 20);
    assert_true(check_folder("models", ".process", TREE_PROCESS) > 2);
    assert_true(check_folder("tests/language/accept", ".cell", TREE_CELL) > 1);
    assert_true(check_folder("tests/language/accept", ".process", TREE_PROCESS) > 0);
}

/* The layout itself, written by hand. */
static void test_layout(void **state)
{
    (void)state;
    static const char text[] = "\n# head  \ntitle  \"a # b\"\nprocess\t\"n180.process\"\n\n\n"
                               "let  A=1 uA # one\nlet BCD = 2*( A + 3 nA )#two\n"
                               "rail vdd 1.8 V\r\n"
                               "nmos M1 d=x g = x s=gnd W=10u L=4u\n"
                               "nmos M20 d=longer g=x s=gnd W=5u L=4u # wide\n"
                               "resistor R1 x->gnd 4k7 \\\n  tempco= 30 ppm/K\n"
                               "law G a -> b i=1 uA*( a.v/1 V )\n"
                               "block half in out r=1k\nresistor R in->out r\nend\n"
                               "model d1 diode\nsaturation_current=2 fA\nemission = 1\nend\n"
                               "hand x.v=0.5 V\nrequire x.v below 1 V everywhere\n\n";
    static const char wanted[] = "# head\n"
                                 "title   \"a # b\"\n"
                                 "process \"n180.process\"\n"
                                 "\n"
                                 "let A = 1 uA               # one\n"
                                 "let BCD = 2*(A + 3 nA)     # two\n";
    char *out = formatted(text, TREE_CELL);
    assert_non_null(out);
    assert_memory_equal(out, wanted, 58);
    static const char *const lines[] = {
        "nmos      M1   d=x       g=x  s=gnd  W=10u  L=4u\n",
        "nmos      M20  d=longer  g=x  s=gnd  W=5u   L=4u  # wide\n",
        "resistor  R1   x -> gnd  4k7 \\\n        tempco=30 ppm/K\n",
        "law       G    a -> b  i = 1 uA*(a.v/1 V)\n",
        "block half in out r=1k\n    resistor  R  in -> out  r\nend\n",
        "    saturation_current = 2 fA\n    emission           = 1\nend\n",
        "hand      x.v = 0.5 V\n",
        "require   x.v  below 1 V  everywhere\n",
    };
    for (size_t k = 0; k < sizeof lines / sizeof lines[0]; k++) {
        if (strstr(out, lines[k]) == NULL) {
            print_error("missing: %s in\n%s\n", lines[k], out);
            fail();
        }
    }
    assert_string_equal(out + strlen(out) - 12, " everywhere\n");
    free(out);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_layout),
        cmocka_unit_test(test_all_files),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
