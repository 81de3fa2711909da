/*
 * source.h: files into memory, the only place where cells, processes and tables are opened.
 */
#ifndef LANGUAGE_SOURCE_H
#define LANGUAGE_SOURCE_H

#include "base/status.h"
#include "language/tree.h"

/*
 * source_read: reads a file ("-" is standard input) and adds it to the set.
 *
 * arena    owns text and name
 * path     what is opened
 * shown    the name shown in messages; NULL: the path
 * where    the place in another file that asked for it, or SPAN_NONE
 * index    out: place in the set
 *
 * A BOM is dropped. Invalid UTF-8, a NUL, a folder, a device, or more than LANGUAGE_FILE_LIMIT
 * bytes is an error in the diagnostics. Returns STATUS_OK, STATUS_INPUT or STATUS_MEMORY.
 */
enum status source_read(struct arena *arena, struct source_set *sources, const char *path,
                        const char *shown, struct span where, struct diagnostics *diagnostics,
                        uint32_t *index);

/* The same for a text in memory (copied). */
enum status source_add_text(struct arena *arena, struct source_set *sources, const char *name,
                            const char *text, size_t length, struct diagnostics *diagnostics,
                            uint32_t *index);

/* The file of a folder ("" is the current one), among those with an ending such as ".process", that
 * a mistyped name most likely meant; NULL when there is none. The text is of the arena. */
const char *source_near(struct arena *arena, const char *folder, const char *name,
                        const char *ending);

/* True when path names a file that can be opened for reading. */
bool source_exists(const char *path);

#endif
