/*
 * row_grow.c: a bias tree of 1e2 to 1e6 devices in one solve: how its time and its memory grow.
 * Each size is a process of its own, so that its peak of memory is that of this size alone.
 */
#include <math.h>
#include <stdlib.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include "bench/peer_kinsol.h"
#include "bench/problem.h"
#include "bench/stopwatch.h"
#include "bench/tree.h"

enum { SIZES = 5, KINSOL_LIMIT = 5000 };

/* What the process of one size tells. */
struct growth {
    int devices, unknowns, iterations;
    double read, solve; /* s: text to system; system to the polished point */
    double kilobytes;   /* peak of the process */
    double difference;  /* of a node from KINSOL's answer; 0 when it was not asked */
    bool is_good;
};

static double against_kinsol(struct problem *p)
{
    struct system *s = p->system;
    double *work = calloc(4 * (size_t)s->n + (size_t)s->nonzeros, sizeof *work);
    if (work == NULL) {
        return NAN;
    }
    double *scale = work, *start = work + s->n, *x = start + s->n, *f = x + s->n;
    double worst = NAN;
    if (s->face.evaluate(s, p->point.x, f, scale, f + s->n) && operating_point_guess(s, start)) {
        struct peer_kinsol *peer = peer_kinsol_create(s, scale, 1e-10, true);
        worst = peer != NULL && peer_kinsol_solve(peer, start, x) ? 0 : NAN;
        for (int k = 0; k < s->node_count; k++) {
            worst = fmax(worst, fabs(x[k] - p->point.x[k]) / fmax(fabs(p->point.x[k]), 1e-3)) +
                    0 * worst;
        }
        peer_kinsol_destroy(peer);
    }
    free(work);
    return worst;
}

static struct growth grow_to(int leaves)
{
    struct growth it = {.is_good = false};
    struct problem p;
    struct buffer text = BUFFER_EMPTY;
    tree_write(&text, leaves);
    const double begin = stopwatch_now(CLOCK_WORK);
    const char *trouble = text.failed ? "" : problem_open(&p, text.data, text.length);
    const double opened = stopwatch_now(CLOCK_WORK);
    if (trouble == NULL) {
        it.is_good = operating_point_find(&p.point) == STATUS_OK;
        it.solve = stopwatch_now(CLOCK_WORK) - opened;
        struct rusage used = {.ru_maxrss = 0};
        getrusage(RUSAGE_SELF, &used);
        it.kilobytes = (double)used.ru_maxrss;
        it.read = opened - begin;
        it.devices = p.circuit->instance_count;
        it.unknowns = p.circuit->unknown_count;
        it.iterations = p.point.solver.iterations;
        it.difference = it.devices <= KINSOL_LIMIT ? against_kinsol(&p) : 0;
    }
    problem_close(&p);
    buffer_free(&text);
    return it;
}

/* The same in a process of its own. */
static struct growth grow_apart(int leaves)
{
    struct growth it = {.is_good = false};
    int ends[2];
    if (pipe(ends) != 0) {
        return it;
    }
    const pid_t pid = fork();
    if (pid == 0) {
        it = grow_to(leaves);
        const bool told = write(ends[1], &it, sizeof it) == (ssize_t)sizeof it;
        _exit(told ? 0 : 1);
    }
    close(ends[1]);
    if (pid < 0 || read(ends[0], &it, sizeof it) != (ssize_t)sizeof it) {
        it.is_good = false;
    }
    close(ends[0]);
    if (pid > 0) {
        waitpid(pid, NULL, 0);
    }
    return it;
}

/* Slope of ln time over ln devices by least squares. */
static double exponent_of(const struct growth *sizes, int from, int count)
{
    double sx = 0, sy = 0, sxx = 0, sxy = 0;
    for (int k = from; k < count; k++) {
        const double x = log(sizes[k].devices), y = log(sizes[k].solve);
        sx += x;
        sy += y;
        sxx += x * x;
        sxy += x * y;
    }
    const int n = count - from;
    return (n * sxy - sx * sy) / (n * sxx - sx * sx);
}

void bench_grow(const struct bench_options *options, struct bench_result *result)
{
    static double solves[SIZES][REPEAT_LIMIT], reads[SIZES][REPEAT_LIMIT];
    static const int devices[SIZES] = {100, 1000, 10000, 100000, 1000000};
    const int sizes = options->quick ? 3 : SIZES;
    struct growth all[SIZES] = {{.is_good = false}};
    result->least = INFINITY;
    result->most = -INFINITY;
    for (int r = 0; r < options->repeats; r++) {
        for (int k = 0; k < sizes; k++) {
            all[k] = grow_apart((int)(devices[k] / 4.11));
            if (!all[k].is_good) {
                result->trouble = "a tree was not solved";
                return;
            }
            solves[k][r] = all[k].solve;
            reads[k][r] = all[k].read;
            bench_differs(result, 1 + all[k].difference, 1, 1);
        }
        const double exponent = exponent_of(all, 0, sizes);
        result->least = fmin(result->least, exponent);
        result->most = fmax(result->most, exponent);
    }
    static const char *const solve_names[SIZES] = {"solve_1e2", "solve_1e3", "solve_1e4",
                                                   "solve_1e5", "solve_1e6"};
    for (int k = 0; k < sizes; k++) {
        all[k].solve = stopwatch_median(solves[k], options->repeats);
        all[k].read = stopwatch_median(reads[k], options->repeats);
        bench_add(result, solve_names[k], all[k].solve, "s");
    }
    const struct growth *last = &all[sizes - 1];
    result->ratio = exponent_of(all, 0, sizes);
    bench_add(result, "exponent_of_the_last_two", exponent_of(all, sizes - 2, sizes), "");
    bench_add(result, "devices", last->devices, "");
    bench_add(result, "unknowns", last->unknowns, "");
    bench_add(result, "iterations", last->iterations, "");
    bench_add(result, "read_and_build", last->read, "s");
    bench_add(result, "peak_bytes_a_device", last->kilobytes * 1024 / last->devices, "B");
}
