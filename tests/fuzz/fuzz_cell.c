/*
 * fuzz_cell.c: tree to solved cell, with small limits: the text of a cell is built, solved by one
 * of the commands, and shown in every form. A cell that converges must say so with a residual.
 */
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "analyses/analysis.h"
#include "report/report.h"

enum { PARTS = 200, QUESTIONS = 100, TEXT = 4000 };

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

/* Asked once an iteration of Newton and once a point. */
static bool ask_stopped(void *self)
{
    int *left = self;
    return --*left < 0;
}

static void check(const struct result *result, enum status status)
{
    const struct solver_result *solver = &result->point.solver;
    if (solver->converged && !(solver->worst_residual < 1e-9)) {
        abort();
    }
    for (int k = 0; solver->converged && k < result->circuit->unknown_count; k++) {
        if (!isfinite(result->point.x[k])) {
            abort();
        }
    }
    if (status == STATUS_UNSOLVED && !solver->converged && solver->trouble == NULL) {
        abort();
    }
}

static void show(const struct result *result)
{
    const struct report_style style = {.columns = 80};
    struct buffer text = BUFFER_EMPTY;
    if (strcmp(result->command, "point") == 0) {
        report_point(result, &style, &text);
    } else if (strcmp(result->command, "sweep") == 0) {
        report_sweep(result, &style, &text);
    } else {
        report_page(result, &style, &text);
    }
    report_json(result, "0", &text);
    report_csv(result, &text);
    buffer_free(&text);
}

static void solve(struct circuit *circuit, unsigned choice)
{
    int left = QUESTIONS;
    const struct analysis_options options = {.view = (choice & 1) != 0 ? VIEW_HAND : VIEW_FULL,
                                             .stopped = ask_stopped,
                                             .stopped_self = &left};
    struct result *result = NULL;
    choice = choice / 2 % 3;
    const enum status status = choice == 0   ? analysis_review(circuit, &options, &result)
                               : choice == 1 ? analysis_point(circuit, &options, &result)
                                             : analysis_sweep(circuit, &options, &result);
    if (result != NULL) {
        check(result, status);
        show(result);
    }
    result_free(result);
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    struct cell *cell = NULL;
    struct circuit *circuit = NULL;
    if (size < 2 || size > TEXT) {
        return -1;
    }
    /* The last byte chooses: seeds stay readable cells. */
    const enum status status =
        cell_read("fuzz.cell", (const char *)bytes, size - 1, folders, 1, &cell);
    if (cell != NULL) {
        const struct circuit_settings settings = {.kelvin = NAN, .part_limit = PARTS};
        const enum status built = circuit_build(cell, &settings, &cell->diagnostics, &circuit);
        if (status == STATUS_OK && (built == STATUS_OK) != (cell->diagnostics.count == 0)) {
            abort();
        }
        struct buffer text = BUFFER_EMPTY;
        diagnostics_print(&cell->diagnostics, &cell->sources, true, &text);
        buffer_free(&text);
    }
    if (circuit != NULL) {
        solve(circuit, bytes[size - 1]);
    }
    circuit_free(circuit);
    cell_free(cell);
    return 0;
}
