/*
 * circuit_fixture.h: a cell text to a circuit, with the diagnostics it earned.
 */
#ifndef TESTS_CIRCUIT_FIXTURE_H
#define TESTS_CIRCUIT_FIXTURE_H

#include <string.h>

#include "circuit/circuit.h"

struct bench {
    struct cell *cell;
    struct circuit *circuit; /* NULL after an error */
    enum status status;
    struct buffer out; /* the diagnostics as printed */
};

/* Builds `text` (NULL: the file `path`); `settings` NULL: the cell's own. Errors of reading and
 * building are both collected, as the program does. */
static inline void bench_open(struct bench *bench, const char *path, const char *text,
                              const struct circuit_settings *settings)
{
    static const char *const folders[] = {SOURCE_DIR "/models"};
    static const struct circuit_settings plain = {.kelvin = NAN};
    memset(bench, 0, sizeof *bench);
    bench->status =
        cell_read(path, text, text == NULL ? 0 : strlen(text), folders, 1, &bench->cell);
    if (bench->cell == NULL) {
        return;
    }
    const enum status built = circuit_build(bench->cell, settings == NULL ? &plain : settings,
                                            &bench->cell->diagnostics, &bench->circuit);
    bench->status = built != STATUS_OK ? built : bench->status;
    diagnostics_print(&bench->cell->diagnostics, &bench->cell->sources, false, &bench->out);
}

static inline void bench_close(struct bench *bench)
{
    circuit_free(bench->circuit);
    cell_free(bench->cell);
    buffer_free(&bench->out);
}

#endif
