/* names_test.c: the table of names, at the size of the largest cells. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include "circuit/names.h"

enum { MANY = 100000 };

/* 1e5 names of two sorts: each is found with its own index, none is found under the other sort. */
static void test_many(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct names *names = names_create(arena);
    assert_non_null(names);
    char text[32];
    for (int k = 0; k < MANY; k++) {
        const int length = snprintf(text, sizeof text, "X%d.M%d", k / 10, k % 10);
        const char *name = arena_copy(arena, text, (size_t)length);
        assert_true(names_add(names, k % 2 == 0 ? NAME_NODE : NAME_INSTANCE, name, k));
    }
    for (int k = 0; k < MANY; k++) {
        (void)snprintf(text, sizeof text, "X%d.M%d", k / 10, k % 10);
        const enum name_sort sort = k % 2 == 0 ? NAME_NODE : NAME_INSTANCE;
        assert_int_equal(names_find(names, sort, text), k);
        assert_int_equal(names_find(names, k % 2 == 0 ? NAME_INSTANCE : NAME_NODE, text), -1);
    }
    assert_int_equal(names_find(names, NAME_NODE, "X0.M"), -1);
    assert_int_equal(names_find(names, NAME_NODE, ""), -1);
    arena_destroy(arena);
}

/* The same name under every sort, and the list in the order of coming, cut at its limit. */
static void test_sorts(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct names *names = names_create(arena);
    assert_non_null(names);
    for (int sort = NAME_NODE; sort <= NAME_BLOCK; sort++) {
        assert_true(names_add(names, (enum name_sort)sort, "tail", 7 * sort));
    }
    for (int sort = NAME_NODE; sort <= NAME_BLOCK; sort++) {
        assert_int_equal(names_find(names, (enum name_sort)sort, "tail"), 7 * sort);
    }
    assert_true(names_add(names, NAME_LET, "ITAIL", 1));
    assert_true(names_add(names, NAME_LET, "VREF", 2));
    const char *list[3] = {NULL, NULL, NULL};
    assert_int_equal(names_list(names, NAME_LET, list, 2), 2);
    assert_string_equal(list[0], "tail");
    assert_string_equal(list[1], "ITAIL");
    assert_null(list[2]);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_many), cmocka_unit_test(test_sorts)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
