/*
 * table.h: aligned columns inside a layout.
 *
 * Columns are as wide as their widest cell. When a table is wider than the layout, first the
 * columns marked `may_drop` go, the highest mark first and of equal ones the rightmost, then those
 * marked `wraps` are broken at spaces, the widest first, then the first column is shortened in its
 * middle.
 */
#ifndef REPORT_TABLE_H
#define REPORT_TABLE_H

#include "report/layout.h"

enum { TABLE_COLUMN_LIMIT = 20 };

struct table_column {
    const char *head; /* "" everywhere: the table has no heading line */
    bool right;       /* aligned right */
    bool wraps;
    int may_drop; /* 0: never */
};

struct table {
    struct layout *layout;
    struct table_column columns[TABLE_COLUMN_LIMIT];
    int column_count;
    const char **cells; /* [row_count * column_count] */
    enum tone *tones;   /* [row_count] of the first column */
    int row_count, row_capacity;
};

void table_begin(struct table *table, struct layout *layout);
void table_column(struct table *table, struct table_column column);

/* Starts a row of empty cells; `tone` is that of its first column. */
void table_row(struct table *table, enum tone tone);

/* Sets a cell of the last row; the text must live as long as the layout. */
void table_cell(struct table *table, int column, const char *text);

/* Writes all rows; nothing when there are none. */
void table_write(struct table *table);

#endif
