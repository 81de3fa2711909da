/*
 * cell_run.h: one cell read, built and reviewed, for tests of whole cells.
 */
#ifndef SUPPORT_CELL_RUN_H
#define SUPPORT_CELL_RUN_H

#include "analyses/analysis.h"

struct cell_run {
    struct cell *cell;
    struct circuit *circuit;
    struct result *result;
    enum status status; /* of the last step that was tried */
};

/*
 * cell_run_open: reads `text` (NULL: the file `path`), builds it and reviews it in a view. Input
 * errors are printed.
 *
 * kelvin  NAN: the cell's own temperature
 *
 * Returns true when there is an operating point. cell_run_close frees all, also after a failure.
 */
bool cell_run_open(struct cell_run *run, const char *path, const char *text, enum view view,
                   double kelvin);
void cell_run_close(struct cell_run *run);

#endif
