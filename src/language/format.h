/* format.h: a cell or process text with its columns aligned. */
#ifndef LANGUAGE_FORMAT_H
#define LANGUAGE_FORMAT_H

#include "base/buffer.h"
#include "base/status.h"
#include "language/tree.h"

/*
 * format_source: the same statements and comments in the house layout, appended to `out`.
 *
 * The text must have been read without errors. No token is changed: each written line is read again
 * and compared, and a line that would read differently is left as it was. Formatting twice gives
 * the same bytes as formatting once. Line ends become LF, blank lines at most one, tabs spaces.
 *
 * Returns STATUS_OK or STATUS_MEMORY.
 */
enum status format_source(struct arena *arena, const struct source_set *sources, uint32_t file,
                          struct buffer *out);

#endif
