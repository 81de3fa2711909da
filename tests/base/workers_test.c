/* workers_test.c: every piece once, the first failure, and the wish to stop. */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <stdatomic.h>

#include "base/workers.h"

enum { PIECES = 1000 };

struct board {
    atomic_int done[PIECES];
    atomic_int total;
    int fails_at; /* -1: never */
    int stop_after;
    double last_share;
};

static enum status piece(void *self, struct worker *worker, int index)
{
    struct board *board = self;
    (void)worker;
    atomic_fetch_add(&board->done[index], 1);
    atomic_fetch_add(&board->total, 1);
    return index == board->fails_at ? STATUS_UNSOLVED : STATUS_OK;
}

static bool stopped(void *self)
{
    struct board *board = self;
    return atomic_load(&board->total) >= board->stop_after;
}

static void progress(void *self, const char *what, double share)
{
    struct board *board = self;
    assert_string_equal(what, "pieces");
    assert_true(share > 0 && share <= 1);
    board->last_share = share;
}

static struct board board;

static enum status run(int jobs, int fails_at, int stop_after)
{
    board = (struct board){.fails_at = fails_at, .stop_after = stop_after};
    const struct workers_task task = {.self = &board,
                                      .count = PIECES,
                                      .jobs = jobs,
                                      .piece = piece,
                                      .stopped = stopped,
                                      .stopped_self = &board,
                                      .progress = progress,
                                      .progress_self = &board,
                                      .what = "pieces"};
    return workers_run(&task);
}

static void each_once(void **state)
{
    (void)state;
    for (int jobs = 1; jobs <= 8; jobs++) {
        assert_int_equal(run(jobs, -1, PIECES + 1), STATUS_OK);
        for (int k = 0; k < PIECES; k++) {
            assert_int_equal(atomic_load(&board.done[k]), 1);
        }
    }
    assert_int_equal(run(1, -1, PIECES + 1), STATUS_OK);
    assert_true(board.last_share == 1);
}

static void ends_early(void **state)
{
    (void)state;
    assert_int_equal(run(1, 10, PIECES + 1), STATUS_UNSOLVED);
    assert_int_equal(atomic_load(&board.total), 11);
    assert_int_equal(run(1, -1, 10), STATUS_STOPPED);
    assert_int_equal(atomic_load(&board.total), 10);
    assert_int_equal(run(4, 10, PIECES + 1), STATUS_UNSOLVED);
}

static void jobs(void **state)
{
    (void)state;
    assert_int_equal(workers_jobs(3, 100), 3);
    assert_int_equal(workers_jobs(3, 2), 2);
    assert_int_equal(workers_jobs(1000, 100000), WORKERS_LIMIT);
    assert_int_equal(workers_jobs(4, 0), 1);
    assert_true(workers_jobs(0, 100) >= 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(each_once),
        cmocka_unit_test(ends_early),
        cmocka_unit_test(jobs),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
