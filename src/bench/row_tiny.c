/*
 * row_tiny.c: factor and solve, n = 3 to 30: the program's own way beside KLU alone and beside
 * dense LU of LAPACK. The matrices are as those of small cells: a few entries a row, some rows of
 * voltage sources with a zero on the diagonal.
 */
#include <math.h>
#include <stdint.h>
#include <string.h>

#include <klu.h>

#include "bench/klu_alone.h"
#include "bench/stopwatch.h"
#include "numerics/linear.h"
#include "numerics/random.h"

enum { LARGEST = 30, NONZERO_LIMIT = 8 * LARGEST };

/* LAPACK: A x = b with row exchanges. */
void dgesv_(const int *n, const int *columns, double *a, const int *lda, int *pivots, double *b,
            const int *ldb, int *info);

struct tiny {
    const struct pattern *pattern;
    double values[NONZERO_LIMIT], b[LARGEST];
    double ours[LARGEST], klu[LARGEST], lapack[LARGEST];
    struct linear_solver *solver;
    struct klu_alone alone;
};

static bool run_ours(void *self)
{
    struct tiny *t = self;
    if (linear_factor(t->solver, t->values) != LINEAR_OK) {
        return false;
    }
    memcpy(t->ours, t->b, (size_t)t->pattern->n * sizeof *t->b);
    linear_solve(t->solver, t->ours);
    return true;
}

static bool run_klu(void *self)
{
    struct tiny *t = self;
    memcpy(t->klu, t->b, (size_t)t->pattern->n * sizeof *t->b);
    return klu_alone_run(&t->alone, t->values, t->klu);
}

static bool run_lapack(void *self)
{
    struct tiny *t = self;
    const struct pattern *p = t->pattern;
    double a[LARGEST * LARGEST] = {0};
    int pivots[LARGEST], info = 0;
    const int one = 1;
    for (int column = 0; column < p->n; column++) {
        for (int k = p->start[column]; k < p->start[column + 1]; k++) {
            a[column * p->n + p->row[k]] = t->values[k];
        }
    }
    memcpy(t->lapack, t->b, (size_t)p->n * sizeof *t->b);
    dgesv_(&p->n, &one, a, &p->n, pivots, t->lapack, &p->n, &info);
    return info == 0;
}

/* Even between 0 and 1. */
static double draw(uint32_t *counter)
{
    const uint32_t at[4] = {(*counter)++}, key[2] = {6, 0};
    uint32_t out[4];
    random_philox(at, key, out);
    return (out[0] + 0.5) / 4294967296.0;
}

/* A conductance or a transistor between two nodes at random, then one source a ten nodes. */
static int draw_entries(int n, uint32_t *counter, struct entry *entries, double *amounts)
{
    const int sources = n / 10 + (n > 3), nodes = n - sources;
    int count = 0;
    for (int k = 0; k < nodes; k++) {
        const double g = 1e-6 * exp(4 * (draw(counter) - 0.5));
        const double gm = draw(counter) < 0.5 ? 20 * g : 0;
        const int other = (k + 1 + (int)(draw(counter) * (nodes - 1))) % nodes;
        entries[count] = (struct entry){k, k};
        amounts[count++] = 1.1 * g + gm;
        entries[count] = (struct entry){other, other};
        amounts[count++] = g;
        entries[count] = (struct entry){k, other};
        amounts[count++] = -g;
        entries[count] = (struct entry){other, k};
        amounts[count++] = -g - gm / 2;
    }
    for (int k = 0; k < sources; k++) {
        const int node = k * nodes / sources;
        entries[count] = (struct entry){nodes + k, node};
        amounts[count++] = 1;
        entries[count] = (struct entry){node, nodes + k};
        amounts[count++] = 1;
    }
    return count;
}

static bool prepare(struct tiny *t, struct arena *arena, int n)
{
    struct entry entries[NONZERO_LIMIT];
    double amounts[NONZERO_LIMIT];
    int slots[NONZERO_LIMIT];
    uint32_t counter = 1000 * (uint32_t)n;
    const int count = draw_entries(n, &counter, entries, amounts);
    memset(t->values, 0, sizeof t->values);
    t->pattern = pattern_build(arena, n, entries, count, slots);
    if (t->pattern == NULL) {
        return false;
    }
    for (int k = 0; k < count; k++) {
        t->values[slots[k]] += amounts[k];
    }
    for (int k = 0; k < n; k++) {
        t->b[k] = draw(&counter) - 0.5;
    }
    t->solver = linear_create(t->pattern);
    return t->solver != NULL && klu_alone_open(&t->alone, t->pattern, t->values) && run_klu(t);
}

static void measure(struct tiny *t, const struct bench_options *options,
                    struct bench_result *result, double *sum_lapack)
{
    struct contender all[] = {
        {.run = run_ours, .self = t}, {.run = run_klu, .self = t}, {.run = run_lapack, .self = t}};
    double ratios[2];
    if (!stopwatch_race(all, 3, options, CLOCK_WORK, ratios)) {
        result->trouble = "a matrix cannot be factored";
        return;
    }
    const double ratio = all[0].seconds / all[1].seconds;
    *sum_lapack += log(all[0].seconds / all[2].seconds);
    if (!(ratio <= result->ratio)) {
        result->ratio = ratio;
        result->least = ratios[0];
        result->most = ratios[1];
    }
    double largest = 0;
    for (int k = 0; k < t->pattern->n; k++) {
        largest = fmax(largest, fabs(t->lapack[k]));
    }
    for (int k = 0; k < t->pattern->n; k++) {
        bench_differs(result, t->ours[k], t->lapack[k], largest);
        bench_differs(result, t->klu[k], t->lapack[k], largest);
    }
    if (t->pattern->n % 9 == 3) {
        static const char *const names[] = {"over_klu_n_3", "over_klu_n_12", "over_klu_n_21",
                                            "over_klu_n_30"};
        bench_add(result, names[t->pattern->n / 9], ratio, "");
    }
}

void bench_tiny(const struct bench_options *options, struct bench_result *result)
{
    double sum_lapack = 0;
    int sizes = 0;
    for (int n = 3; n <= LARGEST && result->trouble == NULL; n += options->quick ? 9 : 1) {
        struct tiny t = {.pattern = NULL};
        struct arena *arena = arena_create();
        if (arena == NULL || !prepare(&t, arena, n)) {
            result->trouble = "a matrix cannot be set up";
        } else {
            measure(&t, options, result, &sum_lapack);
        }
        sizes++;
        klu_alone_close(&t.alone);
        linear_destroy(t.solver);
        arena_destroy(arena);
    }
    bench_add(result, "over_lapack_dense", exp(sum_lapack / sizes), "");
}
