/*
 * part.h: a part of the samples of a spread as a text that tells what it is, and many of them
 * joined to the samples of one run. Private to library/.
 *
 * The text: a heading of lines "word value", then one line a sample, then "end" with the number of
 * samples; docs/spread.md shows one. A value is the bits
 * of its double in hexadecimal.
 */
#ifndef LIBRARY_PART_H
#define LIBRARY_PART_H

#include "analyses/sampling.h"
#include "base/buffer.h"
#include "circuit/circuit.h"

struct part {
    const char *name; /* of the file, for messages */
    /* what the run was asked for: */
    const char *version, *cell, *view, *corner, *temperature; /* NULL: not given */
    const char *const *sets;
    int set_count;
    uint64_t fingerprint; /* of all files that the cell was read from */
    uint64_t seed;
    int samples;       /* of the whole run */
    int number, parts; /* this is part `number` of `parts`, from 1 on */
    const char *lanes; /* how it was solved: "avx512", "avx2", "single" */
    /* what came out: samples first to first + count - 1 */
    int first, count, quantity_count, requirement_count;
    const double *values;              /* [count * quantity_count] */
    const unsigned char *states, *met; /* [count] and [count * requirement_count] */
};

/* "3/16". False: it is no such thing. */
bool part_parse(const char *text, int *number, int *parts);

/* Which samples a part has. */
void part_range(int samples, int number, int parts, int *first, int *count);

/* FNV-1a (Fowler, Noll and Vo 1991) over all texts of a cell. */
uint64_t part_fingerprint(const struct cell *cell);

void part_write(const struct part *part, struct buffer *out);

/* Reads a text. NULL, or what is wrong with it; memory: STATUS_MEMORY in *status. */
const char *part_read(const char *text, size_t length, struct arena *arena, struct part *part,
                      enum status *status);

/* All parts of a merge. */
struct parts {
    struct arena *arena;
    struct part *list; /* [count] */
    int count;         /* 0: there is no merge */
    struct sample_rows rows;
    struct buffer trouble; /* why they cannot be joined */
    const char *note;      /* what is to be known although they could; NULL: nothing */
};

struct ampstead_request;

/*
 * parts_join: reads and joins the parts of a request.
 *
 * whole  in: a copy of the request; out: that of the whole run. Its texts belong to the parts
 *
 * STATUS_INPUT: trouble says why.
 */
enum status parts_join(const struct ampstead_request *request, const char *version,
                       struct parts *parts, struct ampstead_request *whole);

/* Whether the cell is still that of the parts. STATUS_INPUT: trouble says why. */
enum status parts_check(struct parts *parts, const struct cell *cell,
                        const struct circuit *circuit);

void parts_free(struct parts *parts);

/*
 * part_join: the samples of the whole run from its parts.
 *
 * rows     out
 * trouble  out, when STATUS_INPUT: a part that is missing, there twice, or of another run
 */
enum status part_join(const struct part *parts, int count, struct arena *arena,
                      struct sample_rows *rows, struct buffer *trouble);

#endif
