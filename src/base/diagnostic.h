/*
 * diagnostic.h: what is wrong with an input, where, and what would be right.
 *
 * A span is a range of bytes of one source file; line and column are computed only when a
 * diagnostic is printed. Errors are collected, sorted by place and printed together, at most
 * DIAGNOSTIC_LIMIT of them (a last line tells how many more there were).
 */
#ifndef BASE_DIAGNOSTIC_H
#define BASE_DIAGNOSTIC_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/arena.h"
#include "base/buffer.h"

enum { DIAGNOSTIC_LIMIT = 20 };

/* No file: a diagnostic about the command line or the cell as a whole. */
#define SPAN_NO_FILE UINT32_MAX

struct span {
    uint32_t file;       /* index into the source set, or SPAN_NO_FILE */
    uint32_t begin, end; /* bytes; begin == end marks a point */
};

#define SPAN_NONE ((struct span){SPAN_NO_FILE, 0, 0})

/* One text that was read. Owned by the arena of its set. */
struct source_file {
    const char *name; /* as the user wrote it; shown in messages */
    const char *text; /* UTF-8, NUL-terminated, no NUL inside */
    uint32_t length;
};

struct source_set {
    struct source_file *files;
    int count, capacity;
};

struct diagnostic {
    struct span where;
    const char *text; /* what is wrong, what was found */
    const char *hint; /* what to write instead, or NULL */
};

struct diagnostics {
    struct arena *arena; /* owns the texts; borrowed */
    struct diagnostic *list;
    int count, capacity;
    bool out_of_memory; /* a diagnostic was lost: the call must end with STATUS_MEMORY */
    const char **lost;  /* names that lines with errors would have made */
    int lost_count, lost_capacity;
    int passed_over; /* times that one of them was missed */
};

/* Adds an error at `where`. `hint` (may be NULL) is copied. The same text at the same place is
 * kept once. */
void diagnostics_add(struct diagnostics *diagnostics, struct span where, const char *hint,
                     const char *format, ...) __attribute__((format(printf, 4, 5)));

/* A line that is wrong would have made something of this name (borrowed); at most 1000 are kept. */
void diagnostics_lose(struct diagnostics *diagnostics, const char *name);

/* Whether that was told, so that not to find it is no error of its own; counted in passed_over. */
bool diagnostics_has_lost(struct diagnostics *diagnostics, const char *name);

/* Line and column (both from 1; the column counts characters, not bytes) of a byte offset. */
void source_position(const struct source_file *file, uint32_t offset, int *line, int *column);

/* Line (from 1) of the beginning of a span, 0 when it has no file. */
int source_line(const struct source_set *sources, struct span where);

/*
 * diagnostics_print: all of them in the house form, sorted by file and place, into a buffer:
 *
 *     FILE:LINE:COLUMN: what is wrong
 *       LINE |  the source line
 *            |      ^~~~  hint
 *
 * (a diagnostic without a file: "ampstead: what is wrong" and the hint on its own line).
 * Control characters of the source are shown as spaces, so that a message cannot move the cursor.
 */
void diagnostics_print(const struct diagnostics *diagnostics, const struct source_set *sources,
                       bool color, struct buffer *out);

/* The same, all of them, one a line for editors: "FILE:LINE:COLUMN: error: what is wrong; hint". */
void diagnostics_list(const struct diagnostics *diagnostics, const struct source_set *sources,
                      struct buffer *out);

/*
 * near_name: the candidate that a mistyped name most likely meant, or NULL when none is near
 * (Damerau-Levenshtein distance in the restricted form, at most a third of the length, at least 1;
 * letter case alone counts half; a name that differs in nothing else is always near).
 */
const char *near_name(const char *wanted, const char *const *candidates, int count);

/* "did you mean 'NAME'?" with the near name, else `otherwise` (may be NULL). */
const char *hint_near(struct arena *arena, const char *wanted, const char *const *candidates,
                      int count, const char *otherwise);

/* "BEFOREa, b, c" with at most HINT_LIST_LIMIT names, each once; `otherwise` for an empty list. */
enum { HINT_LIST_LIMIT = 24 };
const char *hint_list(struct arena *arena, const char *before, const char *const *names, int count,
                      const char *otherwise);

#endif
