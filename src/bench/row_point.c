/*
 * row_point.c: one cold solve of a loaded mirror of four transistors: KINSOL with KLU, GSL, a
 * program written by hand for this cell, and ours. All call the same device functions, start at the
 * same point and end at the same residual relative to the currents that meet in a node.
 */
#include <math.h>
#include <string.h>

#include "bench/hand_mirror.h"
#include "bench/peer_gsl.h"
#include "bench/peer_kinsol.h"
#include "bench/problem.h"
#include "bench/stopwatch.h"

/* M3 and M4 degenerate the mirror: transistors in triode, as in a cell without resistors. */
static const char text[] = "process \"n180.process\"\n"
                           "rail vdd 1.8 V\n"
                           "current IREF vdd -> ref 20 uA\n"
                           "nmos M1 d=ref g=ref s=s1 W=20u L=1u\n"
                           "nmos M2 d=out g=ref s=s2 W=20u L=1u\n"
                           "nmos M3 d=s1 g=vdd s=gnd W=2u L=2u\n"
                           "nmos M4 d=s2 g=vdd s=gnd W=2u L=2u\n"
                           "resistor RL vdd -> out 30k\n";

enum { UNKNOWN_LIMIT = 16, POINT_LIMIT = 256, GSL = 3 };

struct race {
    struct problem problem;
    struct peer_kinsol *kinsol;
    struct peer_gsl *gsl;
    struct hand_mirror hand;
    int node[HAND_N];
    double start[UNKNOWN_LIMIT], ours[UNKNOWN_LIMIT], theirs[UNKNOWN_LIMIT], gsl_x[UNKNOWN_LIMIT];
    double hand_x[HAND_N];
    int iterations;
};

static bool run_ours(void *self)
{
    struct race *r = self;
    struct operating_point *point = &r->problem.point;
    memcpy(point->x, r->start, (size_t)r->problem.system->n * sizeof *point->x);
    point->report.iterations = 0;
    return operating_point_newton(point) == NEWTON_CONVERGED;
}

static bool run_kinsol(void *self)
{
    struct race *r = self;
    return peer_kinsol_solve(r->kinsol, r->start, r->theirs);
}

static bool run_gsl(void *self)
{
    struct race *r = self;
    return peer_gsl_solve(r->gsl, r->start, r->gsl_x);
}

static bool run_hand(void *self)
{
    struct race *r = self;
    for (int k = 0; k < HAND_N; k++) {
        r->hand_x[k] = r->start[r->node[k]];
    }
    return hand_mirror_solve(&r->hand, r->hand_x);
}

/* The whole of it: the guess, the search, and the polish in long double. */
static bool run_whole(void *self)
{
    struct race *r = self;
    r->problem.point.report.iterations = 0;
    return operating_point_find(&r->problem.point) == STATUS_OK;
}

/* Largest |f|/scale at x; scale [n] out. */
static double residual_at(struct system *s, const double *x, double *scale)
{
    double f[UNKNOWN_LIMIT], values[POINT_LIMIT], worst = 0;
    if (!s->face.evaluate(s, x, f, scale, values)) {
        return NAN;
    }
    for (int k = 0; k < s->n; k++) {
        worst = fmax(worst, fabs(f[k]) / scale[k]);
    }
    return worst;
}

static const char *prepare(struct race *r)
{
    const char *trouble = problem_open(&r->problem, text, sizeof text - 1);
    if (trouble != NULL) {
        return trouble;
    }
    struct system *s = r->problem.system;
    const struct circuit *c = r->problem.circuit;
    static const char *const nodes[HAND_N] = {"ref", "s1", "s2", "out"};
    static const char *const transistors[HAND_N] = {"M1", "M2", "M3", "M4"};
    const void *blocks[HAND_N];
    for (int k = 0; k < HAND_N; k++) {
        r->node[k] = circuit_find_node(c, nodes[k]) - 1;
        blocks[k] = system_block(s, circuit_find_instance(c, transistors[k]));
    }
    const double tolerance = newton_default_options().tolerance;
    r->hand = (struct hand_mirror){blocks[0], blocks[1],  blocks[2], blocks[3], 1.8,
                                   20e-6,     1.0 / 30e3, tolerance, 0};
    if (!operating_point_guess(s, r->start)) {
        return "not enough memory";
    }
    if (!run_ours(r)) {
        return "ampstead does not converge";
    }
    memcpy(r->ours, r->problem.point.x, (size_t)s->n * sizeof *r->ours);
    r->iterations = r->problem.point.report.iterations;
    double scale[UNKNOWN_LIMIT];
    residual_at(s, r->ours, scale);
    r->kinsol = peer_kinsol_create(s, scale, tolerance, true);
    r->gsl = peer_gsl_create(s, scale, tolerance);
    return r->kinsol == NULL || r->gsl == NULL ? "a peer cannot be set up" : NULL;
}

static void compare(struct race *r, bool gsl_arrives, struct bench_result *result)
{
    const int n = r->problem.system->n;
    for (int k = 0; k < n; k++) {
        bench_differs(result, r->theirs[k], r->ours[k], 1e-6);
        if (gsl_arrives) {
            bench_differs(result, r->gsl_x[k], r->ours[k], 1e-6);
        }
    }
    for (int k = 0; k < HAND_N; k++) {
        bench_differs(result, r->hand_x[k], r->ours[r->node[k]], 1e-6);
    }
}

static void measure(struct race *r, const struct bench_options *options,
                    struct bench_result *result)
{
    struct contender all[] = {{.run = run_kinsol, .self = r},
                              {.run = run_ours, .self = r},
                              {.run = run_hand, .self = r},
                              {.run = run_gsl, .self = r},
                              {.run = run_whole, .self = r}};
    double ratios[2];
    /* GSL has no notion of a longest step: from some starts it does not arrive */
    const bool gsl_arrives = run_gsl(r);
    all[GSL].run = gsl_arrives ? run_gsl : run_ours;
    if (!stopwatch_race(all, sizeof all / sizeof all[0], options, CLOCK_WORK, ratios)) {
        result->trouble = "a peer does not converge";
        return;
    }
    double scale[UNKNOWN_LIMIT];
    struct system *s = r->problem.system;
    result->ratio = all[0].seconds / all[1].seconds;
    result->least = ratios[0];
    result->most = ratios[1];
    compare(r, gsl_arrives, result);
    bench_add(result, "ampstead", all[1].seconds, "s");
    bench_add(result, "kinsol_klu", all[0].seconds, "s");
    bench_add(result, "by_hand", all[2].seconds, "s");
    bench_add(result, "gsl_hybrid", gsl_arrives ? all[GSL].seconds : NAN, "s");
    bench_add(result, "with_guess_and_polish", all[4].seconds, "s");
    bench_add(result, "ratio_to_by_hand", all[1].seconds / all[2].seconds, "");
    bench_add(result, "ratio_of_gsl", gsl_arrives ? all[GSL].seconds / all[1].seconds : NAN, "");
    bench_add(result, "iterations", r->iterations, "");
    bench_add(result, "iterations_kinsol", peer_kinsol_iterations(r->kinsol), "");
    bench_add(result, "iterations_by_hand", r->hand.iterations, "");
    bench_add(result, "residual", residual_at(s, r->ours, scale), "");
    bench_add(result, "residual_kinsol", residual_at(s, r->theirs, scale), "");
}

void bench_point(const struct bench_options *options, struct bench_result *result)
{
    static struct race race;
    result->trouble = prepare(&race);
    if (result->trouble == NULL) {
        measure(&race, options, result);
    }
    peer_kinsol_destroy(race.kinsol);
    peer_gsl_destroy(race.gsl);
    problem_close(&race.problem);
}
