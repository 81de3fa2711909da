/*
 * solved_cell.h: a cell from a text, built and solved, for the tests of the analyses.
 */
#ifndef TESTS_ANALYSES_SOLVED_CELL_H
#define TESTS_ANALYSES_SOLVED_CELL_H

#include <math.h>
#include <string.h>

#include "analyses/analysis.h"
#include "check.h"
#include "solve/operating_point.h"

struct solved_cell {
    struct cell *cell;
    struct circuit *circuit;
    struct system *system;
    struct operating_point point;
};

static const struct analysis_options plain_options = {.view = VIEW_FULL};

/* Reads and builds only; errors end the test. */
static inline void cell_open(struct solved_cell *it, const char *text)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    const struct circuit_settings settings = {.kelvin = NAN};
    *it = (struct solved_cell){0};
    assert_int_equal(cell_read("test.cell", text, strlen(text), folders, 1, &it->cell), STATUS_OK);
    const enum status status =
        circuit_build(it->cell, &settings, &it->cell->diagnostics, &it->circuit);
    if (status != STATUS_OK) {
        struct buffer out = BUFFER_EMPTY;
        diagnostics_print(&it->cell->diagnostics, &it->cell->sources, false, &out);
        print_error("%s\n", out.data);
        fail();
    }
}

static inline void cell_solve_as(struct solved_cell *it, const char *text, unsigned effects)
{
    cell_open(it, text);
    it->system = system_create(it->circuit, it->circuit->kelvin, effects);
    assert_non_null(it->system);
    assert_true(operating_point_create(&it->point, it->system, NULL, NULL));
    assert_int_equal(operating_point_find(&it->point), STATUS_OK);
}

static inline void cell_solve(struct solved_cell *it, const char *text)
{
    cell_solve_as(it, text, EFFECTS_FULL);
}

static inline void cell_close(struct solved_cell *it)
{
    system_free(it->system);
    circuit_free(it->circuit);
    cell_free(it->cell);
}

static inline struct probe probe_of(const struct solved_cell *it, const char *text)
{
    struct probe probe = {0};
    struct span nowhere = SPAN_NONE;
    assert_true(circuit_probe(it->circuit, text, nowhere, &it->cell->diagnostics, &probe));
    return probe;
}

#endif
