/*
 * row_iterate.c: one Newton iteration of a bias tree: evaluate, assemble, refactor, solve; beside
 * klu_refactor and klu_solve alone on the same matrix.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "bench/klu_alone.h"
#include "bench/problem.h"
#include "bench/stopwatch.h"
#include "bench/tree.h"

struct iterate {
    struct problem problem;
    struct klu_alone alone;
    double *start, *f, *scale, *dx, *klu_dx, *values; /* [n] each; [nonzeros] */
};

static bool run_iteration(void *self)
{
    struct iterate *t = self;
    struct system *s = t->problem.system;
    if (!s->face.evaluate(s, t->start, t->f, t->scale, t->values) ||
        linear_factor(s->solver, t->values) != LINEAR_OK) {
        return false;
    }
    memcpy(t->dx, t->f, (size_t)s->n * sizeof *t->f);
    linear_solve(s->solver, t->dx);
    return true;
}

static bool run_alone(void *self)
{
    struct iterate *t = self;
    memcpy(t->klu_dx, t->f, (size_t)t->problem.system->n * sizeof *t->f);
    return klu_alone_run(&t->alone, t->values, t->klu_dx);
}

static bool run_evaluate(void *self)
{
    struct iterate *t = self;
    struct system *s = t->problem.system;
    return s->face.evaluate(s, t->start, t->f, t->scale, t->values);
}

/* What a whole solve pays for an iteration, with its damping and its tests. */
static bool run_search(void *self)
{
    struct iterate *t = self;
    struct operating_point *point = &t->problem.point;
    memcpy(point->x, t->start, (size_t)t->problem.system->n * sizeof *point->x);
    point->report.iterations = 0;
    return operating_point_newton(point) == NEWTON_CONVERGED;
}

static const char *prepare(struct iterate *t, int leaves)
{
    struct buffer text = BUFFER_EMPTY;
    tree_write(&text, leaves);
    const char *trouble =
        text.failed ? "not enough memory" : problem_open(&t->problem, text.data, text.length);
    buffer_free(&text);
    if (trouble != NULL) {
        return trouble;
    }
    struct system *s = t->problem.system;
    t->start = calloc(5 * (size_t)s->n + (size_t)s->nonzeros, sizeof *t->start);
    if (t->start == NULL || !operating_point_guess(s, t->start)) {
        return "not enough memory";
    }
    t->f = t->start + s->n;
    t->scale = t->f + s->n;
    t->dx = t->scale + s->n;
    t->klu_dx = t->dx + s->n;
    t->values = t->klu_dx + s->n;
    if (!run_iteration(t) || !klu_alone_open(&t->alone, s->face.pattern, t->values)) {
        return "the matrix cannot be factored";
    }
    return NULL;
}

static void measure(struct iterate *t, const struct bench_options *options,
                    struct bench_result *result)
{
    struct contender all[] = {{.run = run_iteration, .self = t},
                              {.run = run_alone, .self = t},
                              {.run = run_evaluate, .self = t},
                              {.run = run_search, .self = t}};
    double ratios[2];
    if (!stopwatch_race(all, 4, options, CLOCK_WORK, ratios)) {
        result->trouble = "the tree cannot be solved";
        return;
    }
    const int n = t->problem.system->n;
    result->ratio = all[0].seconds / all[1].seconds;
    result->least = ratios[0];
    result->most = ratios[1];
    for (int k = 0; k < n; k++) {
        bench_differs(result, t->dx[k], t->klu_dx[k], 1e-3);
    }
    const int iterations = t->problem.point.report.iterations;
    bench_add(result, "unknowns", n, "");
    bench_add(result, "iteration", all[0].seconds, "s");
    bench_add(result, "klu_alone", all[1].seconds, "s");
    bench_add(result, "evaluate_and_assemble", all[2].seconds, "s");
    bench_add(result, "iterations_of_a_solve", iterations, "");
    bench_add(result, "solve_an_iteration", all[3].seconds / iterations, "s");
}

void bench_iterate(const struct bench_options *options, struct bench_result *result)
{
    struct iterate t = {.start = NULL};
    /* a sink has its drain and, with the points of the tree, two more nodes */
    result->trouble = prepare(&t, (options->quick ? 300 : 100000) / 3);
    if (result->trouble == NULL) {
        measure(&t, options, result);
    }
    klu_alone_close(&t.alone);
    problem_close(&t.problem);
    free(t.start);
}
