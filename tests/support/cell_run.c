/*
 * cell_run.c: one cell read, built and reviewed, for tests of whole cells.
 */
#include "support/cell_run.h"

#include <stdio.h>
#include <string.h>

static void print_errors(const struct cell *cell, const char *path, enum status status)
{
    struct buffer out = BUFFER_EMPTY;
    diagnostics_print(&cell->diagnostics, &cell->sources, false, &out);
    fprintf(stderr, "%s: status %d\n%s", path, (int)status, out.data != NULL ? out.data : "");
    buffer_free(&out);
}

bool cell_run_open(struct cell_run *run, const char *path, const char *text, enum view view,
                   double kelvin)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    memset(run, 0, sizeof *run);
    run->status = cell_read(path, text, text == NULL ? 0 : strlen(text), folders, 1, &run->cell);
    if (run->cell == NULL) {
        return false;
    }
    if (run->status == STATUS_OK) {
        const struct circuit_settings settings = {.kelvin = kelvin};
        run->status = circuit_build(run->cell, &settings, &run->cell->diagnostics, &run->circuit);
    }
    if (run->status != STATUS_OK) {
        print_errors(run->cell, path, run->status);
        return false;
    }
    const struct analysis_options options = {.view = view};
    run->status = analysis_review(run->circuit, &options, &run->result);
    if (run->status != STATUS_OK) {
        fprintf(stderr, "%s: review ended with status %d: %s\n", path, (int)run->status,
                run->result == NULL ? "no result" : run->result->point.solver.trouble);
        return false;
    }
    return run->result->point.solver.converged;
}

void cell_run_close(struct cell_run *run)
{
    if (run->result != NULL) {
        result_free(run->result);
    }
    if (run->circuit != NULL) {
        circuit_free(run->circuit);
    }
    cell_free(run->cell);
    memset(run, 0, sizeof *run);
}
