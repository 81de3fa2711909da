/* fuzz_curve.c: any bytes as the CSV file of a table, then a point with it. */
#define _GNU_SOURCE
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <unistd.h>

#include "analyses/analysis.h"
#include "report/report.h"

enum { QUESTIONS = 200 };

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

static bool ask_stopped(void *self)
{
    int *left = self;
    return --*left < 0;
}

static void solve(struct circuit *circuit)
{
    int left = QUESTIONS;
    const struct analysis_options options = {
        .view = VIEW_FULL, .stopped = ask_stopped, .stopped_self = &left};
    struct result *result = NULL;
    (void)analysis_point(circuit, &options, &result);
    if (result != NULL && result->point.solver.converged && !isfinite(result->point.x[0])) {
        abort();
    }
    result_free(result);
}

/* The bytes as a file of memory, the same one each time. */
static int refill(const uint8_t *bytes, size_t size)
{
    static int file = -1;
    if (file < 0) {
        file = memfd_create("curve", MFD_CLOEXEC);
    }
    if (file < 0 || ftruncate(file, 0) != 0 || pwrite(file, bytes, size, 0) != (ssize_t)size) {
        abort();
    }
    return file;
}

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    struct cell *cell = NULL;
    struct circuit *circuit = NULL;
    char text[200];
    snprintf(text, sizeof text,
             "rail vcc 3 V\nresistor R vcc -> x 10k\ntable T x -> gnd \"/proc/self/fd/%d\"\n",
             refill(bytes, size));
    if (cell_read("fuzz.cell", text, strlen(text), NULL, 0, &cell) != STATUS_OK) {
        abort();
    }
    const struct circuit_settings settings = {.kelvin = NAN};
    const enum status built = circuit_build(cell, &settings, &cell->diagnostics, &circuit);
    if ((built == STATUS_OK) != (cell->diagnostics.count == 0)) {
        abort();
    }
    struct buffer messages = BUFFER_EMPTY;
    diagnostics_print(&cell->diagnostics, &cell->sources, false, &messages);
    buffer_free(&messages);
    if (circuit != NULL) {
        solve(circuit);
    }
    circuit_free(circuit);
    cell_free(cell);
    return 0;
}
