/* edit.c: the house layout, and errors for editors. */
#include "library/edit.h"

#include <string.h>

#include "language/format.h"
#include "language/parser.h"
#include "language/source.h"

static enum status format_cell(struct cell *cell, const char *text, size_t length,
                               struct buffer *out)
{
    static const char process[] = ".process";
    size_t bytes = strlen(cell->path);
    bool is_process =
        bytes >= sizeof process && strcmp(cell->path + bytes - (sizeof process - 1), process) == 0;
    uint32_t file = 0;
    enum status status = text == NULL ? source_read(cell->arena, &cell->sources, cell->path, NULL,
                                                    SPAN_NONE, &cell->diagnostics, &file)
                                      : source_add_text(cell->arena, &cell->sources, cell->path,
                                                        text, length, &cell->diagnostics, &file);
    if (status == STATUS_OK) {
        status =
            parse_source(cell->arena, &cell->sources, file, is_process ? TREE_PROCESS : TREE_CELL,
                         &cell->diagnostics, &cell->tree);
    }
    if (status == STATUS_OK) {
        status = format_source(cell->arena, &cell->sources, file, out);
    }
    return status;
}

enum status edit_format(const char *path, const char *text, size_t length, struct cell **out_cell,
                        struct buffer *out)
{
    *out_cell = NULL;
    struct arena *arena = arena_create();
    struct cell *cell = arena == NULL ? NULL : arena_new(arena, struct cell);
    if (cell != NULL) {
        cell->arena = arena;
        cell->diagnostics.arena = arena;
        cell->path = arena_copy(arena, path, strlen(path));
    }
    enum status status =
        cell == NULL || cell->path == NULL ? STATUS_MEMORY : format_cell(cell, text, length, out);
    if (status == STATUS_MEMORY) {
        arena_destroy(arena);
        return status;
    }
    *out_cell = cell;
    return status;
}

void edit_list_errors(struct cell *cell, struct buffer *out)
{
    for (int k = 0; k < cell->process_count; k++) {
        for (int s = 0; s < cell->sources.count; s++) {
            if (strcmp(cell->sources.files[s].name, cell->processes[k].name) == 0) {
                cell->sources.files[s].name = cell->processes[k].path;
            }
        }
    }
    diagnostics_list(&cell->diagnostics, &cell->sources, out);
}
