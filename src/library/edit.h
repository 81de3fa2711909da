/* edit.h: help for editing that solves nothing. Private to library/. */
#ifndef LIBRARY_EDIT_H
#define LIBRARY_EDIT_H

#include "base/buffer.h"
#include "circuit/cell.h"

/*
 * edit_format: reads one file (a process file when its name ends with .process), without those it
 * names, and appends it in the house layout.
 *
 * text  NULL: the file is read; else the text itself, of `length` bytes
 * cell  out: holds the diagnostics; owned by the caller (cell_free), NULL with STATUS_MEMORY
 */
enum status edit_format(const char *path, const char *text, size_t length, struct cell **cell,
                        struct buffer *out);

/* Every error as one line; process files under the path where they were found. */
void edit_list_errors(struct cell *cell, struct buffer *out);

#endif
