/*
 * damage_test.c: random bytes and damaged cells. Nothing may crash or hang; a text that is refused
 * has at least one diagnostic with a place inside it, and all of them can be printed.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include "language/expression.h"
#include "language/parser.h"
#include "language/source.h"

enum { LARGEST = 4096, ROUNDS = 3000 };

/* xorshift64 (Marsaglia 2003): the same damage in every run. */
static uint64_t next_random(uint64_t *seed)
{
    *seed ^= *seed << 13;
    *seed ^= *seed >> 7;
    *seed ^= *seed << 17;
    return *seed;
}

static size_t below(uint64_t *seed, size_t limit)
{
    return limit == 0 ? 0 : (size_t)(next_random(seed) % limit);
}

static void evaluate(const struct expression *expression, struct diagnostics *diagnostics)
{
    const struct expression_scope nothing = {.find = NULL, .thermal_voltage = 0.025852};
    struct quantity value;
    if (expression != NULL) {
        (void)expression_value(expression, &nothing, diagnostics, &value);
    }
}

static void read_text(const char *text, size_t length, enum tree_role role)
{
    struct arena *arena = arena_create();
    struct source_set sources = {NULL, 0, 0};
    struct diagnostics diagnostics = {.arena = arena};
    struct tree tree = {NULL, 0, 0};
    uint32_t file = 0;
    assert_non_null(arena);
    enum status status =
        source_add_text(arena, &sources, "damaged", text, length, &diagnostics, &file);
    if (status == STATUS_OK) {
        status = parse_source(arena, &sources, file, role, &diagnostics, &tree);
    }
    assert_true(status == STATUS_OK || status == STATUS_INPUT);
    assert_int_equal(status == STATUS_INPUT, diagnostics.count > 0);
    for (int i = 0; i < diagnostics.count; i++) {
        struct span where = diagnostics.list[i].where;
        assert_int_equal(where.file, file);
        assert_true(where.begin <= where.end && where.end <= sources.files[file].length);
    }
    for (int i = 0; i < tree.count; i++) {
        const struct statement *statement = tree.statements[i];
        evaluate(statement->value, &diagnostics);
        for (int k = 0; k < statement->assignment_count; k++) {
            assert_non_null(statement->assignments[k].value);
            evaluate(statement->assignments[k].value, &diagnostics);
        }
    }
    struct buffer out = BUFFER_EMPTY;
    diagnostics_print(&diagnostics, &sources, true, &out);
    assert_false(out.failed);
    buffer_free(&out);
    arena_destroy(arena);
}

static void test_random_bytes(void **state)
{
    (void)state;
    uint64_t seed = 20240117;
    char text[512];
    for (int round = 0; round < ROUNDS; round++) {
        size_t length = below(&seed, sizeof text);
        bool ascii = round % 2 == 0;
        for (size_t i = 0; i < length; i++) {
            text[i] = (char)(ascii ? 32 + below(&seed, 95) : below(&seed, 256));
            text[i] = below(&seed, 20) == 0 ? '\n' : text[i];
        }
        read_text(text, length, round % 3 == 0 ? TREE_PROCESS : TREE_CELL);
    }
}

/* Pieces of the language in random order come further into the parser than bytes do. */
static void test_random_words(void **state)
{
    (void)state;
    static const char *const pieces[] = {
        "model", "N",  "nmos", "end",   "\n",  "\n", "=",     "block",   "from", "to",  "show",
        "for",   "3",  "47k",  "-20 C", "(",   ")",  "^",     "*",       "/",    "->",  "a.b",
        "let",   "at", "+",    "-",     "2%",  ",",  "\"t\"", "require", "+=",   "use", "output",
        "sweep", "of", "so",   "hand",  "4k7", "V",  "min(",  "corner",  "rail", "\\\n"};
    uint64_t seed = 4711;
    for (int round = 0; round < ROUNDS; round++) {
        char text[1024] = "";
        size_t count = below(&seed, 100), length = 0;
        for (size_t i = 0; i < count; i++) {
            const char *piece = pieces[below(&seed, sizeof pieces / sizeof pieces[0])];
            length += (size_t)snprintf(text + length, sizeof text - length, "%s%s", piece,
                                       below(&seed, 4) == 0 ? "" : " ");
        }
        read_text(text, length, round % 3 == 0 ? TREE_PROCESS : TREE_CELL);
    }
}

/* Deletes, doubles, moves or changes a few bytes. Returns the new length. */
static size_t damage(uint64_t *seed, char *text, size_t length)
{
    size_t changes = 1 + below(seed, 8);
    while (changes-- > 0 && length > 1 && length < LARGEST - 64) {
        size_t at = below(seed, length), size = 1 + below(seed, 16);
        size = size > length - at ? length - at : size;
        switch (below(seed, 3)) {
        case 0:
            memmove(text + at, text + at + size, length - at - size);
            length -= size;
            break;
        case 1:
            memmove(text + at + size, text + at, length - at);
            length += size;
            break;
        default:
            text[at] = (char)below(seed, below(seed, 2) == 0 ? 128 : 256);
            break;
        }
    }
    return length;
}

static void damage_file(const char *name, enum tree_role role)
{
    char path[1024], whole[LARGEST], text[LARGEST];
    (void)snprintf(path, sizeof path, "%s/tests/language/accept/%s", SOURCE_DIR, name);
    FILE *file = fopen(path, "rb");
    assert_non_null(file);
    size_t length = fread(whole, 1, sizeof whole - 64, file);
    assert_int_equal(fclose(file), 0);
    assert_true(length > 0);
    uint64_t seed = 99991;
    for (int round = 0; round < ROUNDS; round++) {
        memcpy(text, whole, length);
        read_text(text, damage(&seed, text, length), role);
    }
    for (size_t end = 0; end < length; end++) {
        read_text(whole, end, role);
    }
}

static void test_damaged_cells(void **state)
{
    (void)state;
    damage_file("tail.cell", TREE_CELL);
    damage_file("blocks.cell", TREE_CELL);
    damage_file("practice.process", TREE_PROCESS);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_random_bytes),
        cmocka_unit_test(test_random_words),
        cmocka_unit_test(test_damaged_cells),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
