/*
 * run_fixture.h: a cell text solved, and any of its quantities by name.
 */
#ifndef TESTS_RUN_FIXTURE_H
#define TESTS_RUN_FIXTURE_H

#include <string.h>

#include "analyses/analysis.h"
#include "analyses/judge.h"
#include "check.h"

struct run {
    struct cell *cell;
    struct circuit *circuit;
    struct result *result;
    enum status status;
};

enum verb { VERB_POINT, VERB_REVIEW, VERB_SWEEP };

/* Stops the test on an input error; an unsolved cell leaves its status. */
static inline void run_open(struct run *run, const char *text, enum verb verb, enum view view,
                            double kelvin)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    memset(run, 0, sizeof *run);
    run->status = cell_read("cell", text, strlen(text), folders, 1, &run->cell);
    assert_non_null(run->cell);
    if (run->status == STATUS_OK) {
        const struct circuit_settings settings = {.kelvin = kelvin};
        run->status = circuit_build(run->cell, &settings, &run->cell->diagnostics, &run->circuit);
    }
    if (run->circuit == NULL) {
        struct buffer out = BUFFER_EMPTY;
        diagnostics_print(&run->cell->diagnostics, &run->cell->sources, false, &out);
        print_error("%s", out.data == NULL ? "no message\n" : out.data);
        buffer_free(&out);
        fail();
    }
    const struct analysis_options options = {.view = view};
    run->status = verb == VERB_POINT    ? analysis_point(run->circuit, &options, &run->result)
                  : verb == VERB_REVIEW ? analysis_review(run->circuit, &options, &run->result)
                                        : analysis_sweep(run->circuit, &options, &run->result);
    assert_non_null(run->result);
}

static inline void run_close(struct run *run)
{
    result_free(run->result);
    circuit_free(run->circuit);
    cell_free(run->cell);
}

/* A cell that must have an operating point. */
static inline void run_review(struct run *run, const char *text, enum view view)
{
    run_open(run, text, VERB_REVIEW, view, NAN);
    if (run->status != STATUS_OK) {
        print_error("%s\n", run->result->point.solver.trouble);
        fail();
    }
    assert_true(run->result->point.solver.worst_residual < 1e-12);
}

static inline double value_of(const struct run *run, const char *name)
{
    struct probe probe;
    if (!circuit_probe(run->circuit, name, SPAN_NONE, &run->cell->diagnostics, &probe)) {
        print_error("no quantity %s\n", name);
        fail();
    }
    return result_value(run->result, &probe);
}

static inline const struct output_result *output_of(const struct run *run, const char *name)
{
    const int k = circuit_find_output(run->circuit, name);
    assert_true(k >= 0 && k < run->result->output_count);
    return &run->result->outputs[k];
}

/* kT/q, exact constants of the SI 2019. */
static inline double thermal(double kelvin)
{
    return 1.380649e-23 / 1.602176634e-19 * kelvin;
}

/* w + ln w = z by Newton in w = e^y: the Lambert W function of e^z. */
static inline double lambert_of_exponent(double z)
{
    long double y = z > 1 ? logl((long double)z) : (long double)z;
    for (int k = 0; k < 60; k++) {
        const long double w = expl(y);
        y -= (w + y - z) / (w + 1);
    }
    return (double)expl(y);
}

/* 2q + ln q = v, the normalised charge of docs/devices.md */
static inline double charge_of(double v)
{
    return lambert_of_exponent(v + 0.69314718055994530942) / 2;
}

#endif
