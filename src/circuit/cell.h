/*
 * cell.h: a cell file with the process files it names, read and parsed. It owns all texts and
 * trees; circuits that are built from it borrow them.
 */
#ifndef CIRCUIT_CELL_H
#define CIRCUIT_CELL_H

#include "base/arena.h"
#include "base/diagnostic.h"
#include "base/status.h"
#include "language/tree.h"

/* A process file or the cell itself (its models and corners). */
struct process_source {
    struct tree tree;
    const char *name; /* as written in the `process` statement */
    const char *path; /* where it was found */
};

struct cell {
    struct arena *arena;
    struct source_set sources;
    struct diagnostics diagnostics;
    const char *path;
    struct tree tree;
    struct process_source *processes;
    int process_count, process_capacity;
    const char *model_folders[4]; /* searched after the cell's own folder; NULL-terminated */
};

/*
 * cell_read: reads a cell and its process files.
 *
 * path           "-" is standard input
 * text           NULL, or the cell's text itself (length bytes); path is then only its name
 * model_folders  [count] folders searched for process files after the cell's own; copied
 * cell           out: owned by the caller (cell_free), also after errors, so that the diagnostics
 * can be printed; NULL only with STATUS_MEMORY
 */
enum status cell_read(const char *path, const char *text, size_t length,
                      const char *const *model_folders, int folder_count, struct cell **cell);

/* Frees the cell; NULL is allowed. Circuits built from it must be gone before. */
void cell_free(struct cell *cell);

#endif
