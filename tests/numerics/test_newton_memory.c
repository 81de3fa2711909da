/*
 * test_newton_memory.c: the Newton loop allocates nothing after the first factorisation. Our own
 * calls are counted by the linker's wrappers, those of KLU by the hooks of SuiteSparse.
 */
#include "dense.h"

#include <suitesparse/SuiteSparse_config.h>

static int allocations; /* the hooks take no context */

void *__real_malloc(size_t size);
void *__real_calloc(size_t count, size_t size);
void *__real_realloc(void *block, size_t size);
void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t count, size_t size);
void *__wrap_realloc(void *block, size_t size);

void *__wrap_malloc(size_t size)
{
    allocations++;
    return __real_malloc(size);
}

void *__wrap_calloc(size_t count, size_t size)
{
    allocations++;
    return __real_calloc(count, size);
}

void *__wrap_realloc(void *block, size_t size)
{
    allocations++;
    return __real_realloc(block, size);
}

static void count_library(void)
{
#if defined(SUITESPARSE_MAIN_VERSION) && SUITESPARSE_MAIN_VERSION >= 6
    SuiteSparse_config_malloc_func_set(__wrap_malloc);
    SuiteSparse_config_calloc_func_set(__wrap_calloc);
    SuiteSparse_config_realloc_func_set(__wrap_realloc);
#else
    SuiteSparse_config.malloc_func = __wrap_malloc;
    SuiteSparse_config.calloc_func = __wrap_calloc;
    SuiteSparse_config.realloc_func = __wrap_realloc;
#endif
}

/* Broyden tridiagonal of 9 unknowns on its own sparse pattern. */
enum { N = 9 };

struct tridiagonal {
    int slots[3 * N];
    int seen_at; /* allocations when the second evaluation began, -1 before */
    int evaluations;
};

static bool evaluate(void *self, const double *x, double *f, double *scale, double *values)
{
    struct tridiagonal *t = self;
    t->evaluations++;
    if (t->evaluations == 2) { /* the first factorisation is done */
        t->seen_at = allocations;
    }
    int used = 0;
    for (int i = 0; i < N; i++) {
        double before = i > 0 ? x[i - 1] : 0;
        double after = i < N - 1 ? x[i + 1] : 0;
        f[i] = (3 - 2 * x[i]) * x[i] - before - 2 * after + 1;
        scale[i] = 1;
        values[t->slots[used++]] = 3 - 4 * x[i];
        if (i > 0) {
            values[t->slots[used++]] = -1;
        }
        if (i < N - 1) {
            values[t->slots[used++]] = -2;
        }
    }
    return true;
}

static void test_no_allocation(void **state)
{
    (void)state;
    struct arena *arena = arena_create();
    struct tridiagonal t = {.seen_at = -1};
    struct entry entries[3 * N];
    int count = 0;
    for (int i = 0; i < N; i++) {
        entries[count++] = (struct entry){i, i};
        if (i > 0) {
            entries[count++] = (struct entry){i, i - 1};
        }
        if (i < N - 1) {
            entries[count++] = (struct entry){i, i + 1};
        }
    }
    struct nonlinear_system system = {.n = N,
                                      .pattern = pattern_build(arena, N, entries, count, t.slots),
                                      .self = &t,
                                      .evaluate = evaluate};
    count_library();
    const int before = allocations;
    struct linear_solver *solver = linear_create(system.pattern);
    assert_true(allocations > before + 5); /* the counters see KLU */
    double *work = arena_new_array(arena, double, newton_work_size(&system));
    double x[N] = {-1, -1, -1, -1, -1, -1, -1, -1, -1};
    const struct newton_options options = newton_default_options();
    struct newton_report report = {0};
    const int start = allocations;
    assert_int_equal(newton_solve(&system, solver, &options, x, work, &report), NEWTON_CONVERGED);
    assert_true(t.seen_at > start); /* the first factorisation allocates */
    assert_true(t.evaluations > 3);
    assert_int_equal(allocations, t.seen_at);
    /* Whole steps that pass: one evaluation and one factorisation an iteration, and one more each
     * for the start and the last check. */
    int full, again;
    linear_counts(solver, &full, &again);
    assert_int_equal(t.evaluations, report.iterations + 1);
    assert_int_equal(full + again, report.iterations + 1);
    assert_near(x[0], -0.5706545, 6e-8);
    assert_near(x[8], -0.4164121, 6e-8);

    const int second_start = allocations;
    x[0] = x[4] = 0;
    assert_int_equal(newton_solve(&system, solver, &options, x, work, &report), NEWTON_CONVERGED);
    assert_int_equal(allocations, second_start);
    linear_destroy(solver);
    arena_destroy(arena);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_no_allocation),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
