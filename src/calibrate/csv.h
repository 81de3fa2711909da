/*
 * csv.h: the fields of a line of comma-separated text (RFC 4180, fields within one line).
 */
#ifndef CALIBRATE_CSV_H
#define CALIBRATE_CSV_H

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

#include "base/diagnostic.h"

enum { CSV_FIELD_LIMIT = 64 };

/* A field without its quotes and the blanks around it; bytes of the source. */
struct csv_field {
    uint32_t begin, end;
};

/*
 * csv_line: the fields of the line that begins at byte *at; moves *at behind its end.
 *
 * Lines without text and lines that begin with # are passed over. Returns the number of fields, 0
 * at the end of the text; fields beyond CSV_FIELD_LIMIT are dropped. Doubled quotes stay doubled.
 */
int csv_line(const struct source_file *file, uint32_t *at,
             struct csv_field fields[CSV_FIELD_LIMIT]);

/* The text of a field as a string in the arena; NULL when memory is short. */
const char *csv_text(struct arena *arena, const struct source_file *file, struct csv_field field);

/* True when the field reads as `word`, letter case aside. */
bool csv_is(const struct source_file *file, struct csv_field field, const char *word);

/*
 * csv_number: the whole field as a number with an optional sign. False for anything else, also for
 * "nan" and "inf".
 */
bool csv_number(const struct source_file *file, struct csv_field field, double *value);

#endif
