/* arena_test.c: arenas and buffers. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <string.h>

#include <cmocka.h>

#include "base/arena.h"
#include "base/buffer.h"

/* Blocks are zeroed, aligned, apart, and counted, across many chunk boundaries. */
static void test_blocks(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    assert_non_null(arena);
    unsigned char *blocks[2000];
    for (size_t i = 0; i < 2000; i++) {
        size_t size = i % 97 == 0 ? 50000 : i % 41;
        blocks[i] = arena_array(arena, size, 1);
        assert_non_null(blocks[i]);
        assert_int_equal((uintptr_t)blocks[i] % _Alignof(max_align_t), 0);
        for (size_t k = 0; k < size; k++) {
            assert_int_equal(blocks[i][k], 0);
        }
        memset(blocks[i], (int)(i % 251), size);
    }
    for (size_t i = 0; i < 2000; i++) {
        size_t size = i % 97 == 0 ? 50000 : i % 41;
        for (size_t k = 0; k < size; k++) {
            assert_int_equal(blocks[i][k], i % 251);
        }
    }
    assert_true(arena_used(arena) >= 21 * 50000);
    assert_false(arena_failed(arena));
    arena_destroy(arena);
    arena_destroy(NULL);
}

/* A product that does not fit in size_t is a failure, not a small block. */
static void test_overflow(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    assert_null(arena_array(arena, SIZE_MAX / 2, 3));
    assert_true(arena_failed(arena));
    assert_null(arena_array(arena, SIZE_MAX, 1));
    assert_non_null(arena_new(arena, int));
    assert_true(arena_failed(arena));
    arena_destroy(arena);
}

static void test_grow(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    int *list = NULL, count = 0, capacity = 0;
    for (int i = 0; i < 10000; i++) {
        list = arena_grow(arena, list, count, &capacity, sizeof *list);
        assert_non_null(list);
        list[count++] = i;
        assert_true(capacity >= count);
    }
    for (int i = 0; i < 10000; i++) {
        assert_int_equal(list[i], i);
    }
    capacity = INT32_MAX - 1;
    assert_null(arena_grow(arena, list, capacity, &capacity, sizeof *list));
    arena_destroy(arena);
}

static void test_give_back(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    char *small = arena_copy(arena, "ampere", 6);
    const size_t before = arena_used(arena);
    char *large = arena_array(arena, 100000, 1), *other = arena_array(arena, 200000, 1);
    assert_non_null(large);
    assert_non_null(other);
    assert_int_equal(arena_used(arena), before + 300000);
    other[199999] = 'o';
    arena_give_back(arena, large);
    assert_int_equal(arena_used(arena), before + 200000);
    arena_give_back(arena, small); /* has no memory of its own: stays */
    arena_give_back(arena, NULL);
    assert_int_equal(arena_used(arena), before + 200000);
    assert_string_equal(small, "ampere");
    assert_int_equal(other[199999], 'o');
    arena_give_back(arena, other);
    assert_int_equal(arena_used(arena), before);
    assert_string_equal(arena_copy(arena, "volt", 4), "volt");
    arena_destroy(arena);
}

static void test_text(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    assert_string_equal(arena_copy(arena, "ampere", 3), "amp");
    assert_string_equal(arena_copy(arena, NULL, 0), "");
    assert_string_equal(arena_format(arena, "%s=%d", "m", 4), "m=4");
    arena_destroy(arena);
}

static void test_buffer(void **state)
{
    (void)state;
    struct buffer buffer = BUFFER_EMPTY;
    for (int i = 0; i < 300; i++) {
        buffer_format(&buffer, "%d,", i);
    }
    buffer_text(&buffer, "end");
    buffer_repeat(&buffer, '~', 3);
    buffer_repeat(&buffer, 'x', -1);
    buffer_put(&buffer, "abc", 2);
    assert_false(buffer.failed);
    /* 10 one-digit, 90 two-digit and 200 three-digit numbers with a comma each, and 8 more. */
    assert_int_equal(buffer.length, 10 * 2 + 90 * 3 + 200 * 4 + 8);
    assert_string_equal(buffer.data + buffer.length - 12, "299,end~~~ab");
    buffer_free(&buffer);
    assert_null(buffer.data);
    buffer.failed = true;
    buffer_text(&buffer, "lost");
    assert_null(buffer.data);
    buffer_free(&buffer);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_blocks), cmocka_unit_test(test_overflow),
        cmocka_unit_test(test_grow),   cmocka_unit_test(test_give_back),
        cmocka_unit_test(test_text),   cmocka_unit_test(test_buffer),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
