/* table.c: aligned columns. */
#include "report/table.h"

enum { COLUMN_GAP = 2, DROP_MARKS = 3, FIRST_COLUMN_LEAST = 8, WRAP_LEAST = 16 };

void table_begin(struct table *table, struct layout *layout)
{
    *table = (struct table){.layout = layout};
}

void table_column(struct table *table, struct table_column column)
{
    if (table->column_count < TABLE_COLUMN_LIMIT) {
        table->columns[table->column_count++] = column;
    }
}

void table_row(struct table *table, enum tone tone)
{
    struct arena *arena = table->layout->arena;
    int columns = table->column_count;
    if (table->row_count == table->row_capacity) {
        int capacity = table->row_capacity == 0 ? 16 : 2 * table->row_capacity;
        const char **cells =
            arena_new_array(arena, const char *, (size_t)capacity *(size_t)columns);
        enum tone *tones = arena_new_array(arena, enum tone, capacity);
        if (cells == NULL || tones == NULL) {
            return; /* the arena remembers */
        }
        for (int k = 0; k < table->row_count * columns; k++) {
            cells[k] = table->cells[k];
        }
        for (int k = 0; k < table->row_count; k++) {
            tones[k] = table->tones[k];
        }
        table->cells = cells;
        table->tones = tones;
        table->row_capacity = capacity;
    }
    for (int k = 0; k < columns; k++) {
        table->cells[table->row_count * columns + k] = "";
    }
    table->tones[table->row_count++] = tone;
}

void table_cell(struct table *table, int column, const char *text)
{
    if (table->row_count > 0 && column < table->column_count) {
        table->cells[(table->row_count - 1) * table->column_count + column] = text;
    }
}

static const char *cell_at(const struct table *table, int row, int column)
{
    return table->cells[row * table->column_count + column];
}

static int total_width(const struct table *table, const int *widths)
{
    int total = -COLUMN_GAP;
    for (int c = 0; c < table->column_count; c++) {
        total += widths[c] > 0 ? widths[c] + COLUMN_GAP : 0;
    }
    return total;
}

/* The widest column that may still be narrowed by breaking its texts, or -1. */
static int widest_wrapping(const struct table *table, const int *widths)
{
    int found = -1;
    for (int c = 0; c < table->column_count; c++) {
        if (table->columns[c].wraps && widths[c] > WRAP_LEAST &&
            (found < 0 || widths[c] > widths[found])) {
            found = c;
        }
    }
    return found;
}

/* Natural widths, then narrowed until the table fits; 0 is a column that is not shown. */
static void find_widths(const struct table *table, int *widths)
{
    for (int c = 0; c < table->column_count; c++) {
        int widest = 0;
        for (int r = 0; r < table->row_count; r++) {
            int width = text_width(cell_at(table, r, c));
            widest = width > widest ? width : widest;
        }
        int head = text_width(table->columns[c].head);
        widths[c] = widest == 0 ? 0 : head > widest ? head : widest;
    }
    int limit = table->layout->width;
    for (int mark = DROP_MARKS; mark > 0; mark--) {
        for (int c = table->column_count - 1; c >= 0 && total_width(table, widths) > limit; c--) {
            if (table->columns[c].may_drop == mark) {
                widths[c] = 0;
            }
        }
    }
    while (total_width(table, widths) > limit) {
        int widest = widest_wrapping(table, widths);
        if (widest < 0) {
            break;
        }
        widths[widest]--;
    }
    int excess = total_width(table, widths) - limit;
    if (excess > 0 && widths[0] > 0) {
        int left = widths[0] - excess;
        widths[0] = left < FIRST_COLUMN_LEAST ? FIRST_COLUMN_LEAST : left;
    }
}

/* Appends one cell of a line; spaces owed are written only when something follows them. */
static void put_cell(struct buffer *line, int *owed, int width, bool right, const char *text,
                     size_t length, int characters)
{
    int before = right && width > characters ? width - characters : 0;
    if (length > 0) {
        buffer_repeat(line, ' ', *owed + before);
        buffer_put(line, text, length);
        *owed = width - characters - before;
    } else {
        *owed += width;
    }
    *owed += COLUMN_GAP;
}

static int count_characters(const char *text, size_t length)
{
    int count = 0;
    for (size_t k = 0; k < length; k++) {
        count += ((unsigned char)text[k] & 0xC0u) != 0x80u;
    }
    return count;
}

static void write_line(struct table *table, const int *widths, const char **cells, enum tone tone,
                       enum tone line_tone)
{
    struct layout *layout = table->layout;
    bool more = true;
    for (bool first = true; more; first = false) {
        struct buffer line = BUFFER_EMPTY;
        int owed = 0;
        more = false;
        for (int c = 0; c < table->column_count; c++) {
            if (widths[c] == 0) {
                continue;
            }
            const char *text = cells[c], *next = "";
            if (c == 0 && !table->columns[c].wraps) {
                text = layout_short(layout, text, widths[c]);
            }
            size_t length = text_break(text, widths[c], &next);
            if (!table->columns[c].wraps) {
                for (length = 0; text[length] != '\0'; length++) {
                }
                next = "";
            }
            bool toned = c == 0 && first && tone != TONE_PLAIN && length > 0;
            buffer_text(&line, toned ? layout_tone(layout, tone) : "");
            put_cell(&line, &owed, widths[c], table->columns[c].right, text, length,
                     count_characters(text, length));
            buffer_text(&line, toned ? layout_tone(layout, TONE_PLAIN) : "");
            cells[c] = next;
            more = more || *next != '\0';
        }
        layout_line(layout, line_tone, line.data == NULL ? "" : line.data);
        layout->out->failed = layout->out->failed || line.failed;
        buffer_free(&line);
    }
}

void table_write(struct table *table)
{
    int widths[TABLE_COLUMN_LIMIT] = {0};
    const char *cells[TABLE_COLUMN_LIMIT];
    if (table->row_count == 0 || arena_failed(table->layout->arena)) {
        return;
    }
    find_widths(table, widths);
    bool has_heads = false;
    for (int c = 0; c < table->column_count; c++) {
        cells[c] = table->columns[c].head;
        has_heads = has_heads || (widths[c] > 0 && cells[c][0] != '\0');
    }
    if (has_heads) {
        write_line(table, widths, cells, TONE_PLAIN, TONE_QUIET);
    }
    for (int r = 0; r < table->row_count; r++) {
        for (int c = 0; c < table->column_count; c++) {
            cells[c] = cell_at(table, r, c);
        }
        write_line(table, widths, cells, table->tones[r], TONE_PLAIN);
    }
}
