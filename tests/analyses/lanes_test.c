/*
 * lanes_test.c: samples side by side against one at a time, over all cells of netlists/; what a
 * sample is does not depend on its neighbours; lanes that need more than plain steps.
 */
#include <stdarg.h>
#include <stddef.h>
#include <setjmp.h>
#include <stdint.h>
#include <cmocka.h>

#include <glob.h>
#include <stdlib.h>

#include "analyses/solved_cell.h"
#include "analyses/lanes.h"
#include "analyses/sampling.h"
#include "analyses/setup.h"

enum { TEXT_LIMIT = 20000, COUNT = 61 };

/* Samples of one cell, solved in several ways. */
struct samples {
    struct solved_cell cell;
    struct setup setup;
    struct mismatch mismatch;
    struct arena *arena;
};

static void samples_open(struct samples *s, const char *text)
{
    const struct analysis_options options = {.view = VIEW_FULL};
    cell_open(&s->cell, text);
    s->arena = arena_create();
    assert_int_equal(setup_open(&s->setup, s->cell.circuit, NULL, 0, NULL, READING_ALL, &options),
                     STATUS_OK);
    assert_int_equal(setup_solve(&s->setup, NULL, 0, NULL), STATUS_OK);
    assert_true(mismatch_list(s->setup.system, s->arena, &s->mismatch));
}

static void samples_close(struct samples *s)
{
    setup_close(&s->setup);
    arena_destroy(s->arena);
    cell_close(&s->cell);
}

static struct sample_rows run(struct samples *s, int lanes, int jobs, int first, int count)
{
    const size_t n = (size_t)count;
    const struct analysis_options options = {
        .view = VIEW_FULL, .seed = 7, .lanes = lanes, .jobs = jobs};
    const struct sampling_plan plan = {s->cell.circuit,  &options, &s->mismatch,
                                       s->setup.point.x, first,    count};
    struct sample_rows rows = {
        arena_new_array(s->arena, double, n *(size_t)s->setup.list.probe_count),
        arena_new_array(s->arena, unsigned char, n *(size_t)s->cell.circuit->requirement_count),
        arena_new_array(s->arena, unsigned char, n)};
    assert_int_equal(sampling_run(&plan, &rows), STATUS_OK);
    return rows;
}

static void check_same(const struct samples *s, const struct sample_rows *a,
                       const struct sample_rows *b, int first, int count)
{
    const int probes = s->setup.list.probe_count, asked = s->cell.circuit->requirement_count;
    assert_memory_equal(a->values + first * probes, b->values,
                        (size_t)(count * probes) * sizeof(double));
    assert_memory_equal(a->states + first, b->states, (size_t)count);
    if (asked > 0) {
        assert_memory_equal(a->met + first * asked, b->met, (size_t)(count * asked));
    }
}

static void check_near_single(const struct samples *s, const struct sample_rows *rows,
                              const struct sample_rows *single)
{
    const int probes = s->setup.list.probe_count;
    for (int k = 0; k < COUNT * probes; k++) {
        if (isnan(single->values[k])) {
            assert_true(isnan(rows->values[k]));
        } else {
            check_near(rows->values[k], single->values[k], 1e-12);
        }
    }
    assert_memory_equal(rows->states, single->states, COUNT);
}

/* The cell without what the analysis of an output's whole curve answers: milliseconds a sample. */
static void read_plain(const char *path, char *text)
{
    FILE *file = fopen(path, "r");
    char line[1000];
    size_t length = 0;
    assert_non_null(file);
    while (fgets(line, sizeof line, file) != NULL) {
        const bool is_curve =
            strncmp(line, "require", 7) == 0 &&
            (strstr(line, ".compliance") != NULL || strstr(line, ".resistance") != NULL ||
             strstr(line, ".line") != NULL || strstr(line, ".tempco") != NULL ||
             strstr(line, ".flatness") != NULL || strstr(line, ".sigma") != NULL ||
             strstr(line, ".low") != NULL || strstr(line, ".high") != NULL);
        if (!is_curve) {
            assert_true(length + strlen(line) < TEXT_LIMIT);
            memcpy(text + length, line, strlen(line) + 1);
            length += strlen(line);
        }
    }
    (void)fclose(file);
}

static void all_cells_agree(void **test)
{
    (void)test;
    glob_t found;
    static char text[TEXT_LIMIT];
    int sampled = 0;
    assert_int_equal(glob(SOURCE_DIR "/netlists/*.cell", 0, NULL, &found), 0);
    for (size_t f = 0; f < found.gl_pathc; f++) {
        struct samples s;
        read_plain(found.gl_pathv[f], text);
        samples_open(&s, text);
        const struct sample_rows single = run(&s, 1, 1, 0, COUNT);
        for (int lanes = 4; lanes <= 8; lanes += 4) {
            const struct sample_rows rows = run(&s, lanes, 1, 0, COUNT);
            check_near_single(&s, &rows, &single);
            /* any split, any number of threads: bit by bit */
            const struct sample_rows threads = run(&s, lanes, 2, 0, COUNT);
            const struct sample_rows head = run(&s, lanes, 1, 0, 13);
            const struct sample_rows tail = run(&s, lanes, 1, 13, COUNT - 13);
            check_same(&s, &rows, &threads, 0, COUNT);
            check_same(&s, &rows, &head, 0, 13);
            check_same(&s, &rows, &tail, 13, COUNT - 13);
        }
        sampled += s.mismatch.count > 0;
        samples_close(&s);
    }
    globfree(&found);
    assert_true(sampled >= 20);
}

/* A mirror whose values are off by so much that some samples need damping and others, with a
 * resistor near nothing, their device to prepare them; with a hand transistor and a law. Each
 * sample is what it is by itself. */
static const char wild[] = "process \"n180.process\"\n"
                           "rail vdd 1.8 V\n"
                           "resistor RB vdd -> in 40k match=30% tol=40%\n"
                           "nmos M1 d=in g=in s=gnd W=0.4u L=0.05u m=0.02\n"
                           "nmos M2 d=out g=in s=gnd W=0.4u L=0.05u m=0.02\n"
                           "nmos M3 d=high g=in s=gnd conduction=1mA/V^2 threshold=0.4V\n"
                           "resistor RL vdd -> high 100k match=50%\n"
                           "law LH high -> gnd i = 1 uA*(high.v/1 V)\n"
                           "output out at 0.9 V from 0 V to 1.8 V\n"
                           "require out.current above 1 uA\n"
                           "require M2.headroom above 0.1 V\n"
                           "require in.v below 1.7 V\n"
                           "require vdd.power below 1 mW\n"
                           "require all.headroom above 0.1 V\n";

static unsigned lanes_solved(struct samples *s, const struct lanes_kind *kind, uint64_t first)
{
    struct system *system = s->setup.system;
    const size_t n = (size_t)system->n;
    double *f = arena_new_array(s->arena, double, 2 * n);
    double *values = arena_new_array(s->arena, double, system->nonzeros);
    assert_true(system->face.evaluate(system, s->setup.point.x, f, f + n, values));
    assert_int_equal(linear_factor(system->solver, values), LINEAR_OK);
    enum status status;
    struct lanes_engine *engine =
        kind->begin(system, &s->mismatch, s->setup.point.x, values, s->arena, &status);
    assert_non_null(engine);
    return kind->solve(engine, 7, first);
}

static void lanes_fall_back(void **test)
{
    (void)test;
    struct samples s;
    samples_open(&s, wild);
    const struct sample_rows single = run(&s, 1, 1, 0, COUNT);
    for (int lanes = 4; lanes <= 8; lanes += 4) {
        const struct lanes_kind *kind = lanes_find(lanes);
        if (kind == NULL) {
            print_message("this processor or this build has no lanes\n");
            break;
        }
        const struct sample_rows rows = run(&s, lanes, 1, 0, COUNT);
        check_near_single(&s, &rows, &single);
        assert_memory_equal(rows.met, single.met, COUNT * 5);
        int solved = 0, left = 0;
        for (int k = 0; k < COUNT; k += kind->width) {
            const unsigned mask = lanes_solved(&s, kind, (uint64_t)k);
            for (int l = 0; l < kind->width; l++) {
                solved += (int)(mask >> l & 1);
                left += (int)(~mask >> l & 1);
            }
        }
        assert_true(solved > COUNT / 4 && left > 0);
    }
    samples_close(&s);
}

/* The curve of an output is analysed one sample at a time, from where the lane ended. */
static void outputs_agree(void **test)
{
    (void)test;
    struct samples s;
    samples_open(&s, "process \"n180.process\"\n"
                     "rail vdd 1.8 V\n"
                     "current I1 vdd -> in 10 uA\n"
                     "nmos M1 d=in g=in s=gnd W=10u L=1u\n"
                     "nmos M2 d=out g=in s=gnd W=10u L=1u\n"
                     "output out at 0.9 V from 0 V to 1.8 V\n"
                     "require out.resistance above 100 kohm\n"
                     "require out.compliance below 300 mV\n");
    const struct sample_rows single = run(&s, 1, 1, 0, COUNT);
    const struct sample_rows rows = run(&s, 0, 2, 0, COUNT);
    const int probes = s.setup.list.probe_count;
    for (int k = 0; k < COUNT * probes; k++) {
        check_near(rows.values[k], single.values[k], 1e-8); /* edges: 1e-9 V in some 0.1 V */
    }
    samples_close(&s);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(all_cells_agree),
        cmocka_unit_test(lanes_fall_back),
        cmocka_unit_test(outputs_agree),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
