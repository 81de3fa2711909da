/*
 * program_test.c: linear programs with known answers, and what their multipliers prove.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "check.h"
#include "interval/program.h"

struct problem {
    struct program p;
    double *a, *b; /* the rows as they were given */
    double *multipliers;
    void *block;
};

static void open_problem(struct problem *problem, int rows, int columns, const double *a,
                         const double *b, const bool *equality)
{
    const size_t cells = (size_t)rows * (size_t)columns;
    problem->block = malloc(program_bytes(rows, columns));
    problem->multipliers = calloc((size_t)rows, sizeof(double));
    problem->a = malloc(cells * sizeof *a);
    problem->b = malloc((size_t)rows * sizeof *b);
    assert_true(problem->block != NULL && problem->multipliers != NULL && problem->a != NULL &&
                problem->b != NULL);
    program_place(&problem->p, rows, columns, problem->block);
    memcpy(problem->p.a, a, cells * sizeof *a);
    memcpy(problem->p.value, b, (size_t)rows * sizeof *b);
    memcpy(problem->p.equality, equality, (size_t)rows * sizeof *equality);
    memcpy(problem->a, a, cells * sizeof *a);
    memcpy(problem->b, b, (size_t)rows * sizeof *b);
    program_start(&problem->p);
}

static void close_problem(struct problem *problem)
{
    free(problem->block);
    free(problem->multipliers);
    free(problem->a);
    free(problem->b);
}

/* Lower bound of c t[column] + sum p (row) - sum p b over 0 <= t <= 1: what the multipliers prove.
 */
static double proved(const struct problem *q, int column, double c)
{
    double sum = 0;
    for (int i = 0; i < q->p.rows; i++) {
        sum -= q->multipliers[i] * q->b[i];
        assert_true(q->p.equality[i] || q->multipliers[i] >= -1e-9);
    }
    for (int j = 0; j < q->p.columns; j++) {
        double d = j == column ? c : 0;
        for (int i = 0; i < q->p.rows; i++) {
            d += q->multipliers[i] * q->a[i * q->p.columns + j];
        }
        sum += fmin(d, 0);
    }
    return sum;
}

/* x + y = 1, x - y <= 0.2: x from 0 to 0.6, y from 0.4 to 1. */
static void test_bounds(void **state)
{
    (void)state;
    const double a[] = {1, 1, 1, -1}, b[] = {1, 0.2};
    const bool equality[] = {true, false};
    static const double answers[][3] = {{0, 1, 0}, {0, -1, -0.6}, {1, 1, 0.4}, {1, -1, -1}};
    struct problem q;
    open_problem(&q, 2, 2, a, b, equality);
    assert_int_equal(program_feasible(&q.p, q.multipliers), PROGRAM_DONE);
    for (int k = 0; k < 4; k++) {
        const int column = (int)answers[k][0];
        assert_int_equal(program_least(&q.p, column, answers[k][1], q.multipliers), PROGRAM_DONE);
        assert_true(fabs(proved(&q, column, answers[k][1]) - answers[k][2]) < 1e-12);
    }
    close_problem(&q);
}

/* x + y = 1 and x + y <= 0.9 contradict each other. */
static void test_infeasible(void **state)
{
    (void)state;
    const double a[] = {1, 1, 1, 1}, b[] = {1, 0.9};
    const bool equality[] = {true, false};
    struct problem q;
    open_problem(&q, 2, 2, a, b, equality);
    assert_int_equal(program_feasible(&q.p, q.multipliers), PROGRAM_INFEASIBLE);
    assert_true(proved(&q, -1, 0) > 0.05);
    close_problem(&q);
}

/* Random programs around a known point: it is never cut off, and infeasible ones are proved so. */
static void test_random(void **state)
{
    (void)state;
    enum { ROWS = 12, COLUMNS = 8 };
    unsigned seed = 7;
    int feasible = 0, infeasible = 0;
    for (int round = 0; round < 300; round++) {
        double a[ROWS * COLUMNS], b[ROWS], point[COLUMNS];
        bool equality[ROWS];
        for (int j = 0; j < COLUMNS; j++) {
            seed = seed * 1664525u + 1013904223u;
            point[j] = (double)(seed >> 8) / 16777216.0;
        }
        for (int i = 0; i < ROWS; i++) {
            equality[i] = i < 3;
            b[i] = 0;
            for (int j = 0; j < COLUMNS; j++) {
                seed = seed * 1664525u + 1013904223u;
                a[i * COLUMNS + j] = (double)(seed >> 8) / 8388608.0 - 1;
                b[i] += a[i * COLUMNS + j] * point[j];
            }
            b[i] += equality[i] ? 0 : 0.05;
        }
        if (round % 3 == 0) { /* the opposite of row 4, out of reach */
            for (int j = 0; j < COLUMNS; j++) {
                a[5 * COLUMNS + j] = -a[4 * COLUMNS + j];
            }
            b[5] = -b[4] - 0.2;
        }
        struct problem q;
        open_problem(&q, ROWS, COLUMNS, a, b, equality);
        const enum program_status status = program_feasible(&q.p, q.multipliers);
        if (round % 3 == 0) {
            assert_int_equal(status, PROGRAM_INFEASIBLE);
            assert_true(proved(&q, -1, 0) > 0);
            infeasible++;
        } else {
            assert_int_equal(status, PROGRAM_DONE);
            for (int j = 0; j < COLUMNS; j++) {
                assert_int_equal(program_least(&q.p, j, 1, q.multipliers), PROGRAM_DONE);
                const double least = proved(&q, j, 1);
                assert_true(least <= point[j] + 1e-9 && least >= -1e-9);
            }
            feasible++;
        }
        close_problem(&q);
    }
    assert_true(feasible > 0 && infeasible > 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_bounds),
        cmocka_unit_test(test_infeasible),
        cmocka_unit_test(test_random),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
