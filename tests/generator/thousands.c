/*
 * thousands.c: generated cells solved from cold; what fails is printed with its seed and its text.
 *
 *     thousands COUNT [FROM [SAMPLE]]       solve, check, and print the statistics of
 *                                           docs/accuracy.md; exit 1 when a cell fails
 *     thousands --print NUMBER              one cell
 *
 * SAMPLE of the cells, evenly spread, are compared with the solution in quadruple precision.
 */
#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/analysis.h"
#include "generator/generator.h"
#ifdef HAVE_QUADMATH
#include "support/quad.h"
#endif

/* The one seed of all series; another would do as well. */
static const uint64_t seed = 20260;
static const double agreement = 1e-9;
static const double residual_limit = 1e-12;
static const double least_volts = 1e-3;
static const double runs_from = 1e-3; /* share of the current that a loop was sized for */
enum { METHOD_LIMIT = 12, SHOWN_FAILURES = 20, SHOWN_RESTING = 8 };

struct method_count {
    const char *name;
    int count;
};

struct tally {
    int cells, failures, hand, limited, compared;
    int loops, resting; /* references that bias themselves; those without current */
    uint64_t first_resting[SHOWN_RESTING];
    int *iterations; /* [cells] */
    double worst_residual, worst_difference;
    struct method_count methods[METHOD_LIMIT];
};

/* One cell on its way. */
struct trial {
    uint64_t number;
    struct generated generated;
    struct cell *cell;
    struct circuit *circuit;
    struct result *result;
    enum status status;
};

static void fail_with(struct tally *tally, const struct trial *trial, const char *what)
{
    if (tally->failures++ < SHOWN_FAILURES) {
        printf("FAILED: seed %" PRIu64 ", cell %" PRIu64 " (%s, %s view): %s\n", seed,
               trial->number, trial->generated.technology,
               trial->generated.is_hand ? "hand" : "full", what);
        fputs(trial->generated.text, stdout);
        puts("");
    }
}

static bool open_trial(struct trial *trial)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const char *text = trial->generated.text;
    trial->status = cell_read("generated.cell", text, strlen(text), folders, 1, &trial->cell);
    if (trial->status == STATUS_OK) {
        const struct circuit_settings settings = {.kelvin = NAN};
        trial->status =
            circuit_build(trial->cell, &settings, &trial->cell->diagnostics, &trial->circuit);
    }
    if (trial->status != STATUS_OK) {
        if (trial->cell != NULL) {
            struct buffer out = BUFFER_EMPTY;
            diagnostics_print(&trial->cell->diagnostics, &trial->cell->sources, false, &out);
            printf("%s", out.data != NULL ? out.data : "");
            buffer_free(&out);
        }
        return false;
    }
    const struct analysis_options options = {.view =
                                                 trial->generated.is_hand ? VIEW_HAND : VIEW_FULL};
    trial->status = analysis_point(trial->circuit, &options, &trial->result);
    return trial->status == STATUS_OK;
}

static void close_trial(struct trial *trial)
{
    result_free(trial->result);
    circuit_free(trial->circuit);
    cell_free(trial->cell);
}

static void count_method(struct tally *tally, const char *name)
{
    static const char *const known[] = {"direct",
                                        "balanced start",
                                        "from the all-region solution",
                                        "gain stepping",
                                        "settling",
                                        "patient settling",
                                        "source stepping",
                                        "conductance stepping",
                                        "arclength continuation"};
    for (size_t k = 0; k < sizeof known / sizeof known[0]; k++) {
        tally->methods[k].name = known[k];
        tally->methods[k].count += strcmp(name, known[k]) == 0;
    }
}

#ifdef HAVE_QUADMATH
/* Largest difference of a node voltage from the solution in quadruple precision. */
static double difference_from_quad(const struct trial *trial)
{
    static struct quad_solution solution;
    const double *x = trial->result->point.x;
    const struct quad_question question = {.circuit = trial->circuit,
                                           .effects = trial->generated.is_hand ? EFFECTS_HAND
                                                                               : EFFECTS_FULL,
                                           .kelvin = trial->circuit->kelvin,
                                           .held = -1};
    if (!quad_solve(&question, x, NULL, &solution)) {
        return INFINITY;
    }
    double worst = 0;
    for (int k = 0; k < trial->circuit->unknown_count; k++) {
        const bool is_node = k < trial->circuit->node_count - 1;
        const double want = (double)solution.x[k];
        const double off = (double)fabsq((quad)x[k] - solution.x[k]) /
                           fmax(fabs(want), is_node ? least_volts : 1e-18);
        worst = off <= worst ? worst : off;
    }
    return worst;
}
#endif

static double resistor_current(const struct trial *trial, int number)
{
    char name[16];
    const struct point_result *point = &trial->result->point;
    snprintf(name, sizeof name, "R%d", number);
    for (int k = 0; k < point->device_count; k++) {
        const struct instance *instance = point->devices[k].instance;
        if (strcmp(instance->name, name) == 0) {
            return point->devices[k].q[instance->type->quantity_current];
        }
    }
    return NAN;
}

/* Zero current is a solution of a self-biased reference too, and no fault of the search; which one
 * was found is counted, so that a change of the search cannot move cells there unseen. */
static void check_loops(struct tally *tally, const struct trial *trial)
{
    for (int k = 0; k < trial->generated.loop_count; k++) {
        const struct self_biased *loop = &trial->generated.loops[k];
        const double current = fabs(resistor_current(trial, loop->resistor));
        tally->loops++;
        if (!(current >= runs_from * loop->current)) {
            if (tally->resting < SHOWN_RESTING) {
                tally->first_resting[tally->resting] = trial->number;
            }
            tally->resting++;
        }
    }
}

static void check_trial(struct tally *tally, const struct trial *trial, bool compare)
{
    char what[300];
    const struct solver_result *solver = &trial->result->point.solver;
    tally->worst_residual = fmax(tally->worst_residual, solver->worst_residual);
    if (!(solver->worst_residual < residual_limit)) {
        tally->limited++;
        if (solver->limited_by == NULL) {
            snprintf(what, sizeof what, "worst residual %.3g, and nothing says why",
                     solver->worst_residual);
            fail_with(tally, trial, what);
        }
    }
    (void)compare;
#ifdef HAVE_QUADMATH
    if (compare) {
        const double difference = difference_from_quad(trial);
        tally->compared++;
        tally->worst_difference = fmax(tally->worst_difference, difference);
        if (!(difference <= agreement)) {
            snprintf(what, sizeof what, "differs by %.3g from quadruple precision", difference);
            fail_with(tally, trial, what);
        }
    }
#endif
}

static void run_cell(struct tally *tally, uint64_t number, bool compare)
{
    static struct trial trial;
    memset(&trial, 0, sizeof trial);
    trial.number = number;
    generator_make(seed, number, &trial.generated);
    tally->hand += trial.generated.is_hand;
    if (open_trial(&trial)) {
        tally->iterations[tally->cells++] = trial.result->point.solver.iterations;
        count_method(tally, trial.result->point.solver.method);
        check_trial(tally, &trial, compare);
        check_loops(tally, &trial);
    } else {
        fail_with(tally, &trial,
                  trial.result == NULL ? "was not read" : trial.result->point.solver.trouble);
    }
    close_trial(&trial);
}

static int by_size(const void *a, const void *b)
{
    const int p = *(const int *)a, q = *(const int *)b;
    return (p > q) - (p < q);
}

static void print_table(const struct tally *tally, int count)
{
    const int *sorted = tally->iterations;
    printf("%d cells, %d of them in the hand view; not solved: %d\n", count, tally->hand,
           count - tally->cells);
    for (int k = 0; k < METHOD_LIMIT; k++) {
        if (tally->methods[k].count > 0) {
            printf("  %-30s %6d\n", tally->methods[k].name, tally->methods[k].count);
        }
    }
    if (tally->cells > 0) {
        printf("Newton iterations: median %d, 99 %% %d, worst %d\n", sorted[tally->cells / 2],
               sorted[tally->cells * 99 / 100], sorted[tally->cells - 1]);
    }
    printf("worst_residual at most %.1e; above 1e-12: %d, each with its reason\n",
           tally->worst_residual, tally->limited);
    printf("references that bias themselves: %d; at rest without current: %d", tally->loops,
           tally->resting);
    for (int k = 0; k < tally->resting && k < SHOWN_RESTING; k++) {
        printf("%s%" PRIu64, k == 0 ? " (cells " : ", ", tally->first_resting[k]);
    }
    puts(tally->resting > SHOWN_RESTING ? ", ...)" : tally->resting > 0 ? ")" : "");
    if (tally->compared > 0) {
        printf("against quadruple precision: %d cells, largest difference %.1e\n", tally->compared,
               tally->worst_difference);
    }
}

int main(int argc, char **argv)
{
    if (argc == 3 && strcmp(argv[1], "--print") == 0) {
        static struct generated generated;
        generator_make(seed, strtoull(argv[2], NULL, 10), &generated);
        fputs(generated.text, stdout);
        return 0;
    }
    const int count = argc > 1 ? atoi(argv[1]) : 0;
    const uint64_t from = argc > 2 ? strtoull(argv[2], NULL, 10) : 0;
    const int sample = argc > 3 ? atoi(argv[3]) : 0;
    struct tally tally = {0};
    tally.iterations = count > 0 ? calloc((size_t)count, sizeof *tally.iterations) : NULL;
    if (tally.iterations == NULL) {
        fprintf(stderr, "thousands COUNT [FROM [SAMPLE]], thousands --print NUMBER\n");
        return 2;
    }
    for (int k = 0; k < count; k++) {
        const bool compare = sample > 0 && k % (count / sample > 0 ? count / sample : 1) == 0;
        run_cell(&tally, from + (uint64_t)k, compare);
    }
    qsort(tally.iterations, (size_t)tally.cells, sizeof *tally.iterations, by_size);
    print_table(&tally, count);
    free(tally.iterations);
    return tally.failures == 0 ? 0 : 1;
}
