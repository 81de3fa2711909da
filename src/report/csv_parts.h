/* csv_parts.h: what the CSV writers share. Private to report/csv*.c. */
#ifndef REPORT_CSV_PARTS_H
#define REPORT_CSV_PARTS_H

#include "report/report.h"

/* A number that reads back as the same bits; nothing when it is not finite. */
void csv_put_number(struct buffer *out, double value);

/* "tail.current [A]", quoted where needed. */
void csv_heading(struct buffer *out, const char *name, struct dimension dimension);

/* The samples of a spread: number, state, each quantity. */
void csv_samples(const struct result *result, struct buffer *out);

#endif
