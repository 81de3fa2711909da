/*
 * cell.c: reads a cell and the process files it names.
 */
#include "circuit/cell.h"

#include <stdlib.h>
#include <string.h>

#include "language/parser.h"
#include "language/source.h"

enum { FOLDER_LIMIT = 3, CIRCUIT_PROCESS_LIMIT = 20 };

/* The folder of a path with its slash, "" for a bare name. */
static const char *folder_of(struct arena *arena, const char *path)
{
    const char *slash = strrchr(path, '/');
    return arena_copy(arena, path, slash == NULL ? 0 : (size_t)(slash - path) + 1);
}

/* Where a process file is: beside the cell, else in the model folders; NULL when memory is short,
 * "" when it is nowhere. */
static const char *find_process(struct cell *cell, const char *name)
{
    if (name[0] == '/') {
        return source_exists(name) ? name : "";
    }
    const char *folder = folder_of(cell->arena, cell->path);
    const char *path = folder == NULL ? NULL : arena_format(cell->arena, "%s%s", folder, name);
    if (path == NULL || source_exists(path)) {
        return path;
    }
    for (int k = 0; cell->model_folders[k] != NULL; k++) {
        path = arena_format(cell->arena, "%s/%s", cell->model_folders[k], name);
        if (path == NULL || source_exists(path)) {
            return path;
        }
    }
    return "";
}

static bool ends_with(const char *text, const char *end)
{
    const size_t length = strlen(text), tail = strlen(end);
    return length >= tail && strcmp(text + length - tail, end) == 0;
}

/* "did you mean 'n180.process'?" when its ending was left out or a file beside the cell or in the
 * model folders has nearly the name. */
static const char *process_hint(struct cell *cell, const char *name)
{
    const char *full = arena_format(cell->arena, "%s.process", name);
    const char *path = full == NULL || ends_with(name, ".process") ? "" : find_process(cell, full);
    const char *near = path != NULL && path[0] != '\0' ? full : NULL;
    const char *folder = folder_of(cell->arena, cell->path);
    for (int k = -1; near == NULL && (k < 0 || cell->model_folders[k] != NULL); k++) {
        folder = k < 0 ? folder : cell->model_folders[k];
        near = folder == NULL ? NULL : source_near(cell->arena, folder, name, ".process");
    }
    return near == NULL ? "looked beside the cell and in the installed models"
                        : arena_format(cell->arena, "did you mean '%s'?", near);
}

static enum status read_process(struct cell *cell, const struct statement *statement)
{
    /* `models FILE.process` reads a cell of that one line, which nobody wrote: no place to show */
    const struct span where = ends_with(cell->path, ".process") ? SPAN_NONE : statement->text_span;
    for (int k = 0; k < cell->process_count; k++) {
        if (strcmp(cell->processes[k].name, statement->text) == 0) {
            diagnostics_add(&cell->diagnostics, statement->text_span, NULL,
                            "process \"%s\" is already in use", statement->text);
            return STATUS_INPUT;
        }
    }
    if (cell->process_count >= CIRCUIT_PROCESS_LIMIT) {
        diagnostics_add(&cell->diagnostics, statement->text_span, NULL,
                        "the cell names more than %d processes, the limit", CIRCUIT_PROCESS_LIMIT);
        return STATUS_INPUT;
    }
    const char *path = find_process(cell, statement->text);
    if (path == NULL) {
        return STATUS_MEMORY;
    }
    if (path[0] == '\0') {
        diagnostics_add(&cell->diagnostics, where, process_hint(cell, statement->text),
                        "there is no process file \"%s\"", statement->text);
        return STATUS_INPUT;
    }
    struct process_source *list = arena_grow(cell->arena, cell->processes, cell->process_count,
                                             &cell->process_capacity, sizeof *list);
    if (list == NULL) {
        return STATUS_MEMORY;
    }
    cell->processes = list;
    struct process_source *process = &list[cell->process_count++];
    *process = (struct process_source){.name = statement->text, .path = path};
    uint32_t index = 0;
    enum status status = source_read(cell->arena, &cell->sources, path, statement->text,
                                     statement->text_span, &cell->diagnostics, &index);
    if (status != STATUS_OK) {
        cell->process_count--;
        return status;
    }
    return parse_source(cell->arena, &cell->sources, index, TREE_PROCESS, &cell->diagnostics,
                        &process->tree);
}

static enum status read_all(struct cell *cell, const char *text, size_t length)
{
    uint32_t index = 0;
    enum status status =
        text == NULL ? source_read(cell->arena, &cell->sources, cell->path,
                                   strcmp(cell->path, "-") == 0 ? "standard input" : cell->path,
                                   SPAN_NONE, &cell->diagnostics, &index)
                     : source_add_text(cell->arena, &cell->sources, cell->path, text, length,
                                       &cell->diagnostics, &index);
    if (status != STATUS_OK) {
        return status;
    }
    enum status worst = parse_source(cell->arena, &cell->sources, index, TREE_CELL,
                                     &cell->diagnostics, &cell->tree);
    for (int k = 0; worst != STATUS_MEMORY && k < cell->tree.count; k++) {
        const struct statement *statement = cell->tree.statements[k];
        if (statement->kind == STATEMENT_PROCESS) {
            status = read_process(cell, statement);
            worst = status == STATUS_OK ? worst : status;
        }
    }
    return worst;
}

enum status cell_read(const char *path, const char *text, size_t length,
                      const char *const *model_folders, int folder_count, struct cell **out)
{
    *out = NULL;
    struct arena *arena = arena_create();
    struct cell *cell = arena == NULL ? NULL : arena_new(arena, struct cell);
    if (cell == NULL) {
        arena_destroy(arena);
        return STATUS_MEMORY;
    }
    cell->arena = arena;
    cell->diagnostics.arena = arena;
    cell->path = arena_copy(arena, path, strlen(path));
    for (int k = 0; k < folder_count && k < FOLDER_LIMIT; k++) {
        cell->model_folders[k] = arena_copy(arena, model_folders[k], strlen(model_folders[k]));
    }
    enum status status = arena_failed(arena) ? STATUS_MEMORY : read_all(cell, text, length);
    if (status == STATUS_MEMORY || cell->diagnostics.out_of_memory) {
        cell_free(cell);
        return STATUS_MEMORY;
    }
    *out = cell;
    return status;
}

void cell_free(struct cell *cell)
{
    if (cell != NULL) {
        arena_destroy(cell->arena);
    }
}
