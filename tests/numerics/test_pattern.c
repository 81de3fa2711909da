/* test_pattern.c: entries in any order become sorted compressed columns without repeats. */
#include "dense.h"

static void check_columns(const struct pattern *pattern)
{
    assert_int_equal(pattern->start[0], 0);
    for (int j = 0; j < pattern->n; j++) {
        assert_true(pattern->start[j] <= pattern->start[j + 1]);
        for (int k = pattern->start[j] + 1; k < pattern->start[j + 1]; k++) {
            assert_true(pattern->row[k - 1] < pattern->row[k]);
        }
    }
}

/* By hand: 4 by 4, column 1 empty, (2, 0) three times. */
static void test_by_hand(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    const struct entry entries[] = {{2, 0}, {3, 3}, {0, 2}, {2, 0}, {1, 0}, {2, 0}, {0, 3}};
    int slots[7];
    struct pattern *p = pattern_build(arena, 4, entries, 7, slots);
    assert_non_null(p);
    const int start[] = {0, 2, 2, 3, 5};
    const int row[] = {1, 2, 0, 0, 3};
    const int wanted_slots[] = {1, 4, 2, 1, 0, 1, 3};
    assert_int_equal(p->n, 4);
    assert_memory_equal(p->start, start, sizeof start);
    assert_memory_equal(p->row, row, sizeof row);
    assert_memory_equal(slots, wanted_slots, sizeof wanted_slots);
    arena_destroy(arena);
}

static void test_empty(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    int slots[1];
    struct pattern *p = pattern_build(arena, 0, NULL, 0, slots);
    assert_non_null(p);
    assert_int_equal(p->start[0], 0);
    p = pattern_build(arena, 3, NULL, 0, slots);
    assert_non_null(p);
    for (int k = 0; k <= 3; k++) {
        assert_int_equal(p->start[k], 0);
    }
    arena_destroy(arena);
}

/* Every entry finds itself through its slot; the number of entries is that of a table of marks. */
static void test_random(void **state)
{
    (void)state;
    uint32_t seed = 20240607;
    for (int round = 0; round < 200; round++) {
        struct arena *arena = arena_create();
        int n = 1 + (int)(20 * dense_random(&seed));
        int count = (int)(150 * dense_random(&seed));
        struct entry entries[150];
        int slots[150];
        bool seen[20][20] = {{false}};
        int different = 0;
        for (int i = 0; i < count; i++) {
            entries[i].row = (int)(n * dense_random(&seed));
            entries[i].column = (int)(n * dense_random(&seed));
            different += seen[entries[i].row][entries[i].column] ? 0 : 1;
            seen[entries[i].row][entries[i].column] = true;
        }
        struct pattern *p = pattern_build(arena, n, entries, count, slots);
        assert_non_null(p);
        check_columns(p);
        assert_int_equal(p->start[n], different);
        for (int i = 0; i < count; i++) {
            assert_in_range(slots[i], p->start[entries[i].column],
                            p->start[entries[i].column + 1] - 1);
            assert_int_equal(p->row[slots[i]], entries[i].row);
        }
        arena_destroy(arena);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_by_hand),
        cmocka_unit_test(test_empty),
        cmocka_unit_test(test_random),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
