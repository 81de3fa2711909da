/* output.h: texts to files and to standard output, with every failure reported. */
#ifndef CLI_OUTPUT_H
#define CLI_OUTPUT_H

#include <stdbool.h>
#include <stddef.h>

/*
 * output_file: writes `length` bytes under `path`: into a temporary file of the same folder, which
 * is then renamed, so that the old file or the new one stands there, never half of one. A path
 * that is no regular file (a device, a pipe) is written directly.
 *
 * False after a message to standard error.
 */
bool output_file(const char *path, const char *bytes, size_t length);

/* Whether the file holds exactly this text. */
bool output_same(const char *path, const char *text);

/* Writes to standard output; failures show in output_close. */
void output_text(const char *text);

/* Whether the path of an option means standard output: none, or "-". */
bool output_is_stdout(const char *path);

/* One text to its file or to standard output; NULL is a failure of memory. False after a message.
 */
bool output_deliver(const char *path, const char *text);

/* Flushes and closes standard output. False after a message: not everything arrived. */
bool output_close(void);

#endif
