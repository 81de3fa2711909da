/*
 * cells_test.c: every cell of netlists/ against the independent quadruple-precision reference
 * (tests/support/quad.h): operating point, devices, outputs, compliance, band edges and curves.
 */
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <cmocka.h>

#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "support/cell_run.h"
#include "support/quad.h"

enum { CELL_LIMIT = 200, SHOWN_FAILURES = 12, ITERATION_LIMIT = 200, MOVE_TRIALS = 40 };

/* Tolerances of the issue: voltages and currents, resistances and slopes, one step of a root. */
static const double POINT_TOLERANCE = 1e-9;
static const double SLOPE_TOLERANCE = 1e-7;
static const double ROOT_STEP = 20e-6; /* V */

/* One cell under test; counts what is wrong so that one run shows all of it. */
struct check {
    const char *name;
    struct cell_run run;
    struct quad_question question;
    struct quad_solution at; /* the operating point */
    int failures, comparisons;
    double worst; /* largest relative difference of a point value */
};

static void fail_with(struct check *c, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

static void fail_with(struct check *c, const char *format, ...)
{
    if (c->failures++ < SHOWN_FAILURES) {
        va_list arguments;
        va_start(arguments, format);
        fprintf(stderr, "    %s: ", c->name);
        vfprintf(stderr, format, arguments);
        fprintf(stderr, "\n");
        va_end(arguments);
    }
}

/* `got` of the program within `tolerance` of `want`, relative to max(|want|, least). */
static void near(struct check *c, const char *thing, const char *quantity, double got, quad want,
                 double tolerance, double least)
{
    const double size = fabs((double)want) > least ? fabs((double)want) : least;
    const double off = (double)fabsq((quad)got - want) / size;
    c->comparisons++;
    if (!(off <= tolerance)) {
        fail_with(c, "%s.%s is %.15g, reference %.15g (off by %.2g)", thing, quantity, got,
                  (double)want, off);
    }
    c->worst = off > c->worst && tolerance <= POINT_TOLERANCE ? off : c->worst;
}

/* ---- operating point ---- */

static void check_nodes(struct check *c)
{
    const struct circuit *circuit = c->run.circuit;
    for (int k = 1; k < circuit->node_count; k++) {
        near(c, circuit->nodes[k].name, "v", c->run.result->point.x[k - 1], c->at.x[k - 1],
             POINT_TOLERANCE, 1e-3);
    }
}

static void near_named(struct check *c, const struct device_result *device, const char *quantity,
                       quad want, double tolerance, double least)
{
    const int k = quantity_find(device->instance->type, quantity);
    if (k >= 0 && want == want && isfinite(device->q[k])) {
        near(c, device->instance->name, quantity, device->q[k], want, tolerance, least);
    }
}

static void check_devices(struct check *c)
{
    const struct point_result *point = &c->run.result->point;
    for (int k = 0; k < point->device_count; k++) {
        const struct device_result *device = &point->devices[k];
        const int index = (int)(device->instance - c->run.circuit->instances);
        const struct quad_device_state state = quad_device(&c->question, &c->at, index);
        const struct device_type *type = device->instance->type;
        if (state.current == state.current) {
            near(c, device->instance->name, type->quantities[type->quantity_current].name,
                 device->q[type->quantity_current], state.current, POINT_TOLERANCE, 1e-21);
        }
        near_named(c, device, "vth", state.vth, POINT_TOLERANCE, 1e-3);
        near_named(c, device, "inversion", state.inversion, POINT_TOLERANCE, 1e-12);
        near_named(c, device, "vdsat", state.vdsat, POINT_TOLERANCE, 1e-3);
        near_named(c, device, "headroom", state.headroom, POINT_TOLERANCE, 1e-3);
        near_named(c, device, "gm", state.gm, SLOPE_TOLERANCE, 1e-21);
        near_named(c, device, "gds", state.gds, SLOPE_TOLERANCE, 1e-24);
        near_named(c, device, "gmb", state.gmb, SLOPE_TOLERANCE, 1e-21);
    }
}

static void check_rails(struct check *c)
{
    for (int k = 0; k < c->run.circuit->rail_count; k++) {
        const struct rail *rail = &c->run.circuit->rails[k];
        const struct instance *source = &c->run.circuit->instances[rail->instance];
        near(c, rail->name, "current", c->run.result->point.rails[k].current,
             -c->at.x[source->local[source->type->terminal_count]], POINT_TOLERANCE, 1e-21);
    }
}

static void check_solver(struct check *c)
{
    const struct solver_result *solver = &c->run.result->point.solver;
    if (!(solver->worst_residual < 1e-12)) {
        fail_with(c, "worst residual %g at %s", solver->worst_residual, solver->worst_name);
    }
    if (solver->iterations > ITERATION_LIMIT) {
        fail_with(c, "%d Newton iterations (%s)", solver->iterations, solver->method);
    }
}

/* ---- outputs ---- */

/*
 * move: the cell solved with output k held at v, beginning at `from`; where that is too far, half
 * way first.
 */
static bool move(struct check *c, int k, double v, const struct quad_solution *from,
                 struct quad_question *question, struct quad_solution *solution)
{
    const struct output *output = &c->run.circuit->outputs[k];
    struct quad_solution here = *from;
    *question = c->question;
    question->held = output->instance;
    double step = v - (double)here.x[output->unknown];
    for (int trial = 0; trial < MOVE_TRIALS; trial++) {
        const double left = v - (double)here.x[output->unknown];
        step = fabs(step) > fabs(left) ? left : step;
        question->held_value = step == left ? v : v - left + step;
        if (!quad_solve(question, NULL, &here, solution)) {
            step /= 4;
        } else if (question->held_value == v) {
            return true;
        } else {
            here = *solution;
            step *= 2;
        }
    }
    fail_with(c, "the reference found no solution with %s at %.9g V (residual %.2g)", output->name,
              v, (double)solution->residual);
    return false;
}

/* Current with the sign of the direction at `at`. */
static quad signed_current(const struct check *c, int k, const struct quad_question *question,
                           const struct quad_solution *solution)
{
    const quad current = quad_output_current(question, solution, k);
    return c->run.result->outputs[k].is_sink ? current : -current;
}

static quad headroom_of(const struct quad_question *question, const struct quad_solution *solution,
                        int instance)
{
    return quad_device(question, solution, instance).headroom;
}

/* Every transistor with headroom at the operating point has it at `solution` too. */
static void check_held(struct check *c, const struct quad_question *question,
                       const struct quad_solution *solution, const char *where, double v)
{
    for (int k = 0; k < c->run.circuit->instance_count; k++) {
        const struct instance *it = &c->run.circuit->instances[k];
        if (it->type->is_transistor && headroom_of(&c->question, &c->at, k) > 0 &&
            !(headroom_of(question, solution, k) > 0)) {
            fail_with(c, "%s has lost its headroom %s %.9g V", it->name, where, v);
        }
    }
}

static void check_compliance(struct check *c, int k)
{
    const struct output_result *out = &c->run.result->outputs[k];
    const double inward = out->is_sink ? ROOT_STEP : -ROOT_STEP;
    struct quad_question question;
    struct quad_solution moved;
    if (isnan(out->compliance)) {
        const double end = out->is_sink ? out->output->from : out->output->to;
        if (out->compliance_beyond && move(c, k, end, &c->at, &question, &moved)) {
            check_held(c, &question, &moved, "at the end of the sweep,", end);
        }
        return;
    }
    const int loser = circuit_find_instance(c->run.circuit, out->compliance_device);
    if (loser < 0) {
        fail_with(c, "%s.compliance names no device", out->output->name);
        return;
    }
    if (!(headroom_of(&c->question, &c->at, loser) > 0)) {
        fail_with(c, "%s had no headroom at the start", out->compliance_device);
    }
    if (move(c, k, out->compliance + inward, &c->at, &question, &moved)) {
        check_held(c, &question, &moved, "before the compliance,", out->compliance + inward);
    }
    if (move(c, k, out->compliance - inward, &c->at, &question, &moved) &&
        headroom_of(&question, &moved, loser) > 0) {
        fail_with(c, "%s still has headroom below %s.compliance", out->compliance_device,
                  out->output->name);
    }
}

/* |I/I(at) - 1| - within at v */
static double band_excess(struct check *c, int k, double v)
{
    struct quad_question question;
    struct quad_solution moved;
    if (!move(c, k, v, &c->at, &question, &moved)) {
        return NAN;
    }
    const quad nominal = signed_current(c, k, &c->question, &c->at);
    const quad share = signed_current(c, k, &question, &moved) / nominal - 1;
    return (double)(fabsq(share) - (quad)c->run.result->outputs[k].output->within);
}

/* `inward` is the step from the edge towards the operating point; NaN edges: the band holds at the
 * end of the sweep. */
static void check_edge(struct check *c, int k, const char *what, double edge, double end,
                       double inward)
{
    const char *name = c->run.result->outputs[k].output->name;
    if (isnan(edge)) {
        if (band_excess(c, k, end) > 1e-9) {
            fail_with(c, "%s leaves its band by %g V, %s says it does not", name, end, what);
        }
    } else if (!(band_excess(c, k, edge + inward) <= 0 && band_excess(c, k, edge - inward) >= 0)) {
        fail_with(c, "%s.%s at %.9g V is not the edge of the band (%g inside, %g outside)", name,
                  what, edge, band_excess(c, k, edge + inward), band_excess(c, k, edge - inward));
    }
}

/* Least and greatest current between the compliance and the far end of the sweep. */
struct range {
    double from, to;
    quad least, most;
};

static void widen(struct range *range, double v, quad current)
{
    if (v >= range->from && v <= range->to) {
        range->least = current < range->least ? current : range->least;
        range->most = current > range->most ? current : range->most;
    }
}

/* The reference with output k at v; `walker` comes from a voltage near it and is left at v. */
static bool walk(struct check *c, int k, double v, struct quad_solution *walker,
                 struct range *range, quad *current)
{
    struct quad_question question;
    struct quad_solution moved;
    if (!move(c, k, v, walker, &question, &moved)) {
        return false;
    }
    *walker = moved;
    *current = signed_current(c, k, &question, walker);
    widen(range, v, *current);
    return true;
}

/* The middle of segment j: how far the straight line is from the reference. */
static void check_segment(struct check *c, int k, int j, struct quad_solution *walker,
                          struct range *range)
{
    const struct output_result *out = &c->run.result->outputs[k];
    const struct curve_points *curve = &out->curve;
    const double v = (curve->v[j] + curve->v[j + 1]) / 2;
    quad truth;
    if (!walk(c, k, v, walker, range, &truth)) {
        return;
    }
    const double share = (v - curve->v[j]) / (curve->v[j + 1] - curve->v[j]);
    const double line = curve->current[j] + share * (curve->current[j + 1] - curve->current[j]);
    const double allowed = fmax(0.001 * out->current, 0.01 * fabs((double)truth));
    if (!((double)fabsq((quad)line - truth) <= allowed)) {
        fail_with(c, "%s: curve at %.6g V is %.9g A by the line, %.9g A by the reference",
                  out->output->name, v, line, (double)truth);
    }
}

/* Point j of the curve itself. */
static void check_curve_point(struct check *c, int k, int j, struct quad_solution *walker,
                              struct range *range)
{
    const struct output_result *out = &c->run.result->outputs[k];
    quad truth;
    if (walk(c, k, out->curve.v[j], walker, range, &truth)) {
        near(c, out->output->name, "curve", out->curve.current[j], truth, 1e-8,
             1e-6 * out->current);
    }
}

static void check_flatness(struct check *c, int k, struct range *range)
{
    const struct output_result *out = &c->run.result->outputs[k];
    struct quad_solution walker = c->at;
    quad truth;
    if (!isnan(out->compliance)) {
        walk(c, k, out->compliance, &walker, range, &truth);
    }
    /* points and middles of the curve do not hit an extreme in between exactly */
    const double flatness = (double)((range->most - range->least) / (quad)out->current);
    if (!(fabs(out->flatness - flatness) <= 1e-4 + 0.005 * flatness)) {
        fail_with(c, "%s.flatness is %g, reference %g", out->output->name, out->flatness, flatness);
    }
}

static void check_curve(struct check *c, int k)
{
    const struct output_result *out = &c->run.result->outputs[k];
    const struct curve_points *curve = &out->curve;
    if (curve->count < 2 || curve->v[0] != out->output->from ||
        curve->v[curve->count - 1] != out->output->to) {
        fail_with(c, "%s: the curve does not reach from end to end", out->output->name);
        return;
    }
    int middle = 0;
    while (middle < curve->count - 1 && curve->v[middle + 1] <= out->output->at) {
        middle++;
    }
    struct range range = {
        .from = out->output->from, .to = out->output->to, .least = INFINITY, .most = -INFINITY};
    if (!isnan(out->compliance)) {
        *(out->is_sink ? &range.from : &range.to) = out->compliance;
    }
    widen(&range, out->output->at, signed_current(c, k, &c->question, &c->at));
    struct quad_solution walker = c->at;
    for (int j = middle; j < curve->count - 1; j++) {
        check_segment(c, k, j, &walker, &range);
        check_curve_point(c, k, j + 1, &walker, &range);
    }
    walker = c->at;
    for (int j = middle; j >= 0; j--) {
        check_curve_point(c, k, j, &walker, &range);
        if (j > 0) {
            check_segment(c, k, j - 1, &walker, &range);
        }
    }
    check_flatness(c, k, &range);
}

/* Relative change per kelvin, from two temperatures near each other. */
static void check_tempco(struct check *c, int k)
{
    const struct output_result *out = &c->run.result->outputs[k];
    struct quad_question question = c->question;
    struct quad_solution moved;
    const double step = 1.0 / 1024;
    quad current[2];
    for (int j = 0; j < 2; j++) {
        question.kelvin = c->question.kelvin + (j == 0 ? -step : step);
        if (!quad_solve(&question, NULL, &c->at, &moved)) {
            fail_with(c, "the reference found no solution at %.6f K", question.kelvin);
            return;
        }
        current[j] = signed_current(c, k, &question, &moved);
    }
    near(c, out->output->name, "tempco", out->tempco,
         (current[1] - current[0]) / (2 * step * (quad)out->current), SLOPE_TOLERANCE, 1e-6);
}

/* Current, resistance and the effect of each rail, from linear solves. */
static void check_derivatives(struct check *c, int k)
{
    const struct output_result *out = &c->run.result->outputs[k];
    const char *name = out->output->name;
    const quad current = signed_current(c, k, &c->question, &c->at);
    near(c, name, "current", out->current, current, POINT_TOLERANCE, 0);
    quad slope = 0;
    if (!quad_output_slope(&c->question, &c->at, k, out->output->instance, &slope)) {
        fail_with(c, "the reference is singular at the operating point");
    } else if (out->resistance_unlimited) {
        if (fabs((double)slope) > 1e-18) { /* the design's limit of what is shown */
            fail_with(c, "%s.resistance is %g ohm, not unlimited", name, 1 / (double)slope);
        }
    } else {
        near(c, name, "resistance", out->resistance, 1 / slope, SLOPE_TOLERANCE, 0);
    }
    for (int r = 0; r < c->run.circuit->rail_count; r++) {
        if (quad_output_slope(&c->question, &c->at, k, c->run.circuit->rails[r].instance, &slope)) {
            const quad share = (out->is_sink ? slope : -slope) / current;
            near(c, name, "line", out->line[r], share, SLOPE_TOLERANCE, 1e-9);
        }
    }
}

static void check_output(struct check *c, int k)
{
    const struct output_result *out = &c->run.result->outputs[k];
    check_derivatives(c, k);
    check_tempco(c, k);
    check_compliance(c, k);
    check_edge(c, k, "low", out->low, out->output->from, ROOT_STEP);
    check_edge(c, k, "high", out->high, out->output->to, -ROOT_STEP);
    check_curve(c, k);
}

/* ---- what was asked ---- */

static void check_requests(struct check *c)
{
    const struct result *result = c->run.result;
    for (int k = 0; k < result->requirement_count; k++) {
        const struct requirement_result *r = &result->requirements[k];
        const enum judgement wanted =
            r->requirement->scope == SCOPE_YIELD ? JUDGED_NOT : JUDGED_MET;
        if (r->judgement != wanted) {
            fail_with(c, "'%s' is judged %d (computed %g)", r->requirement->text, (int)r->judgement,
                      r->computed);
        }
    }
    for (int k = 0; k < result->hand_count; k++) {
        const struct hand_result *h = &result->hands[k];
        if (!isfinite(h->computed) ||
            fabs(h->computed - h->hand->value - h->difference) > 1e-12 * fabs(h->computed)) {
            fail_with(c, "hand %s: computed %g, difference %g", h->hand->probe.text, h->computed,
                      h->difference);
        }
    }
    if (result->hand_count == 0 || result->requirement_count == 0) {
        fail_with(c, "has no hand line or no requirement");
    }
    if (result->verdict != VERDICT_MET) {
        fail_with(c, "verdict %d", (int)result->verdict);
    }
}

/* Opens a cell in a view and solves the reference from the program's answer. */
static bool begin(struct check *c, const char *path, enum view view, double kelvin)
{
    memset(c, 0, sizeof *c);
    const char *slash = strrchr(path, '/');
    c->name = slash != NULL ? slash + 1 : path;
    if (!cell_run_open(&c->run, path, NULL, view, kelvin)) {
        fail_with(c, "is not solved (view %d)", (int)view);
        return false;
    }
    c->question = (struct quad_question){.circuit = c->run.circuit,
                                         .effects = view == VIEW_FULL ? EFFECTS_FULL : EFFECTS_HAND,
                                         .kelvin = c->run.circuit->kelvin,
                                         .held = -1};
    if (!quad_solve(&c->question, c->run.result->point.x, NULL, &c->at) ||
        !(c->at.residual <= 1e-28)) {
        fail_with(c, "the reference does not converge from the program's answer (view %d, %g)",
                  (int)view, (double)c->at.residual);
        return false;
    }
    return true;
}

/* The full view: everything. */
static void cell_holds(void **state)
{
    struct check c;
    if (begin(&c, *state, VIEW_FULL, NAN)) {
        check_solver(&c);
        check_nodes(&c);
        check_devices(&c);
        check_rails(&c);
        for (int k = 0; k < c.run.result->output_count; k++) {
            check_output(&c, k);
        }
        check_requests(&c);
        print_message("    %d comparisons, largest relative difference %.2g, %d iterations\n",
                      c.comparisons, c.worst, c.run.result->point.solver.iterations);
    }
    cell_run_close(&c.run);
    assert_int_equal(c.failures, 0);
}

/* The hand view: the operating point of the paper design. */
static void paper_design_holds(void **state)
{
    struct check c;
    if (begin(&c, *state, VIEW_HAND, NAN)) {
        check_nodes(&c);
        check_devices(&c);
        check_rails(&c);
    }
    cell_run_close(&c.run);
    assert_int_equal(c.failures, 0);
}

/* Cold and hot: the operating point and what hangs on it. */
static void cell_holds_cold_and_hot(void **state)
{
    static const double kelvins[] = {253.15, 358.15};
    int failures = 0;
    for (int t = 0; t < 2; t++) {
        struct check c;
        if (begin(&c, *state, VIEW_FULL, kelvins[t])) {
            if (!(c.run.result->point.solver.worst_residual < 1e-12)) {
                fail_with(&c, "worst residual %g", c.run.result->point.solver.worst_residual);
            }
            check_nodes(&c);
            check_devices(&c);
            check_rails(&c);
            for (int k = 0; k < c.run.result->output_count; k++) {
                check_derivatives(&c, k);
                check_compliance(&c, k);
                check_tempco(&c, k);
            }
        }
        cell_run_close(&c.run);
        failures += c.failures;
    }
    assert_int_equal(failures, 0);
}

/* ---- the folder ---- */

static int by_name(const void *a, const void *b)
{
    return strcmp(*(char *const *)a, *(char *const *)b);
}

/* Paths of the cells, sorted. */
static int find_cells(char **paths, int limit)
{
    static const char folder[] = SOURCE_DIR "/netlists";
    DIR *directory = opendir(folder);
    int count = 0;
    for (struct dirent *entry = NULL;
         directory != NULL && count < limit && (entry = readdir(directory)) != NULL;) {
        const char *dot = strrchr(entry->d_name, '.');
        const size_t size = sizeof folder + 1 + strlen(entry->d_name);
        if (dot != NULL && strcmp(dot, ".cell") == 0 && (paths[count] = malloc(size)) != NULL) {
            snprintf(paths[count++], size, "%s/%s", folder, entry->d_name);
        }
    }
    if (directory != NULL) {
        closedir(directory);
    }
    qsort(paths, (size_t)count, sizeof *paths, by_name);
    return count;
}

static void library_is_complete(void **state)
{
    assert_true(*(const int *)*state >= 22); /* issue 2, item 7 */
}

int main(void)
{
    static const struct {
        const char *suffix;
        CMUnitTestFunction function;
    } kinds[] = {{"full view", cell_holds},
                 {"hand view", paper_design_holds},
                 {"-20 C and 85 C", cell_holds_cold_and_hot}};
    enum { KINDS = sizeof kinds / sizeof kinds[0] };
    static char *paths[CELL_LIMIT];
    static char names[KINDS * CELL_LIMIT][300];
    static struct CMUnitTest tests[KINDS * CELL_LIMIT + 1];
    int count = find_cells(paths, CELL_LIMIT), test_count = 0;
    tests[test_count++] = (struct CMUnitTest){.name = "the library has its cells",
                                              .test_func = library_is_complete,
                                              .initial_state = &count};
    for (int k = 0; k < KINDS * count; k++) {
        const int kind = k % KINDS;
        snprintf(names[k], sizeof names[k], "%s, %s", strrchr(paths[k / KINDS], '/') + 1,
                 kinds[kind].suffix);
        tests[test_count++] = (struct CMUnitTest){
            .name = names[k], .test_func = kinds[kind].function, .initial_state = paths[k / KINDS]};
    }
    const int failures =
        _cmocka_run_group_tests("library cells", tests, (size_t)test_count, NULL, NULL);
    for (int k = 0; k < count; k++) {
        free(paths[k]);
    }
    return failures == 0 ? 0 : 1;
}
