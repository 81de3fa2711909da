/*
 * problem.c: a cell from text to a system.
 */
#include "bench/problem.h"

#include <math.h>
#include <stdio.h>

static void print_diagnostics(const struct cell *cell)
{
    struct buffer out = BUFFER_EMPTY;
    diagnostics_print(&cell->diagnostics, &cell->sources, false, &out);
    fputs(out.data != NULL ? out.data : "", stderr);
    buffer_free(&out);
}

const char *problem_open(struct problem *p, const char *text, size_t length)
{
    static const char *const folders[] = {AMPSTEAD_SOURCE_MODELS};
    *p = (struct problem){.cell = NULL};
    enum status status = cell_read("bench.cell", text, length, folders, 1, &p->cell);
    if (status == STATUS_OK) {
        const struct circuit_settings settings = {.kelvin = NAN};
        status = circuit_build(p->cell, &settings, &p->cell->diagnostics, &p->circuit);
    }
    if (status != STATUS_OK) {
        if (p->cell != NULL) {
            print_diagnostics(p->cell);
        }
        return "the cell cannot be built";
    }
    p->system = system_create(p->circuit, p->circuit->kelvin, EFFECTS_FULL);
    if (p->system == NULL || !operating_point_create(&p->point, p->system, NULL, NULL)) {
        return "not enough memory";
    }
    return NULL;
}

void problem_close(struct problem *p)
{
    system_free(p->system);
    circuit_free(p->circuit);
    cell_free(p->cell);
}
