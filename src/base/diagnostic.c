/* diagnostic.c: collecting errors and printing them under their source lines. */
#include "base/diagnostic.h"

#include <stdlib.h>
#include <string.h>

#include "base/utf8.h"

enum {
    RECENT = 64,     /* how far back an equal diagnostic is looked for when one is added */
    LINE_WIDTH = 92, /* characters of a source line that are shown; longer ones get a window */
    WINDOW_LEAD = 40 /* characters shown before the mark in a window */
};

static bool same(const struct diagnostic *a, const struct diagnostic *b)
{
    return a->where.file == b->where.file && a->where.begin == b->where.begin &&
           a->where.end == b->where.end && strcmp(a->text, b->text) == 0;
}

void diagnostics_add(struct diagnostics *diagnostics, struct span where, const char *hint,
                     const char *format, ...)
{
    struct diagnostic added = {where, NULL, NULL};
    va_list arguments;
    va_start(arguments, format);
    added.text = arena_format_list(diagnostics->arena, format, arguments);
    va_end(arguments);
    if (hint != NULL) {
        added.hint = arena_copy(diagnostics->arena, hint, strlen(hint));
    }
    /* A hint that could not be made is NULL: the arena remembers why. */
    if (added.text == NULL || arena_failed(diagnostics->arena)) {
        diagnostics->out_of_memory = true;
        return;
    }
    for (int i = diagnostics->count - 1; i >= 0 && i >= diagnostics->count - RECENT; i--) {
        if (same(&diagnostics->list[i], &added)) {
            return;
        }
    }
    struct diagnostic *list = arena_grow(diagnostics->arena, diagnostics->list, diagnostics->count,
                                         &diagnostics->capacity, sizeof *list);
    if (list == NULL) {
        diagnostics->out_of_memory = true;
        return;
    }
    diagnostics->list = list;
    list[diagnostics->count++] = added;
}

/* Bytes of the character at `at`; a byte that is none counts as one character. */
static uint32_t step(const struct source_file *file, uint32_t at)
{
    uint32_t character = 0;
    size_t bytes = utf8_decode(file->text + at, file->length - at, &character);
    return bytes > 0 ? (uint32_t)bytes : 1;
}

static uint32_t line_begin(const struct source_file *file, uint32_t offset)
{
    while (offset > 0 && file->text[offset - 1] != '\n') {
        offset--;
    }
    return offset;
}

static uint32_t line_end(const struct source_file *file, uint32_t offset)
{
    while (offset < file->length && file->text[offset] != '\n') {
        offset++;
    }
    return offset > 0 && file->text[offset - 1] == '\r' ? offset - 1 : offset;
}

/* Characters from begin to end. */
static int characters(const struct source_file *file, uint32_t begin, uint32_t end)
{
    int count = 0;
    for (uint32_t at = begin; at < end; at += step(file, at)) {
        count++;
    }
    return count;
}

enum { LOST_LIMIT = 1000 };

void diagnostics_lose(struct diagnostics *d, const char *name)
{
    if (d->lost_count >= LOST_LIMIT) {
        return;
    }
    const char **list =
        arena_grow(d->arena, d->lost, d->lost_count, &d->lost_capacity, sizeof *list);
    if (list == NULL) {
        d->out_of_memory = true;
        return;
    }
    d->lost = list;
    d->lost[d->lost_count++] = name;
}

bool diagnostics_has_lost(struct diagnostics *d, const char *name)
{
    for (int k = 0; k < d->lost_count; k++) {
        if (strcmp(d->lost[k], name) == 0) {
            d->passed_over++;
            return true;
        }
    }
    return false;
}

void source_position(const struct source_file *file, uint32_t offset, int *line, int *column)
{
    uint32_t at = offset < file->length ? offset : file->length;
    *line = 1;
    for (uint32_t i = 0; i < at; i++) {
        *line += file->text[i] == '\n' ? 1 : 0;
    }
    *column = 1 + characters(file, line_begin(file, at), at);
}

int source_line(const struct source_set *sources, struct span where)
{
    int line = 0, column = 0;
    if (where.file != SPAN_NO_FILE && where.file < (uint32_t)sources->count) {
        source_position(&sources->files[where.file], where.begin, &line, &column);
    }
    return line;
}

/* Characters that could move the cursor or reorder the line: controls, line and paragraph
 * separators, marks of writing direction. */
static bool is_unsafe(uint32_t c)
{
    return c < 0x20 || (c >= 0x7F && c < 0xA0) || c == 0x200E || c == 0x200F ||
           (c >= 0x2028 && c <= 0x202E) || (c >= 0x2066 && c <= 0x2069) || c == 0xFEFF;
}

/* Writes text[length] with unsafe characters as spaces and broken UTF-8 as '?'. */
static void put_clean(struct buffer *out, const char *text, size_t length)
{
    for (size_t at = 0; at < length;) {
        uint32_t character = 0;
        size_t bytes = utf8_decode(text + at, length - at, &character);
        if (bytes == 0) {
            buffer_put(out, "?", 1);
            bytes = 1;
        } else if (is_unsafe(character)) {
            buffer_put(out, " ", 1);
        } else {
            buffer_put(out, text + at, bytes);
        }
        at += bytes;
    }
}

static void put_text(struct buffer *out, const char *text)
{
    put_clean(out, text, strlen(text));
}

/* The part of a source line that is shown, and where the mark stands below it. */
struct view {
    uint32_t begin, end; /* bytes shown */
    bool cut_before, cut_after;
    int indent, marked; /* characters */
};

static struct view choose_view(const struct source_file *file, struct span where)
{
    struct view view = {0, 0, false, false, 0, 1};
    uint32_t begin = where.begin < file->length ? where.begin : file->length;
    uint32_t end = where.end < file->length ? where.end : file->length;
    view.begin = line_begin(file, begin);
    view.end = line_end(file, begin);
    end = end < view.end ? end : view.end;
    view.indent = characters(file, view.begin, begin);
    view.marked = characters(file, begin, end);
    if (characters(file, view.begin, view.end) > LINE_WIDTH) {
        for (; view.indent > WINDOW_LEAD; view.indent--) {
            view.begin += step(file, view.begin);
            view.cut_before = true;
        }
        uint32_t stop = view.begin;
        for (int i = 0; i < LINE_WIDTH && stop < view.end; i++) {
            stop += step(file, stop);
        }
        view.cut_after = stop < view.end;
        view.end = stop;
    }
    int room = characters(file, view.begin, view.end) - view.indent;
    view.marked = view.marked > room ? room : view.marked;
    view.marked = view.marked < 1 ? 1 : view.marked;
    return view;
}

static void print_source(const struct diagnostic *diagnostic, const struct source_file *file,
                         int line, bool color, struct buffer *out)
{
    struct view view = choose_view(file, diagnostic->where);
    buffer_format(out, "%4d |  %s", line, view.cut_before ? "..." : "");
    put_clean(out, file->text + view.begin, view.end - view.begin);
    buffer_text(out, view.cut_after ? "...\n" : "\n");
    int digits = 4; /* the bar stands below the bar, whatever the width of the line number */
    for (int rest = line / 10000; rest > 0; rest /= 10) {
        digits++;
    }
    buffer_repeat(out, ' ', digits);
    buffer_text(out, " |  ");
    buffer_repeat(out, ' ', view.indent + (view.cut_before ? 3 : 0));
    buffer_text(out, color ? "\033[1;31m^" : "^");
    buffer_repeat(out, '~', view.marked - 1);
    buffer_text(out, color ? "\033[0m" : "");
    if (diagnostic->hint != NULL) {
        buffer_text(out, "  ");
        put_text(out, diagnostic->hint);
    }
    buffer_text(out, "\n");
}

static void print_one(const struct diagnostic *diagnostic, const struct source_set *sources,
                      bool color, struct buffer *out)
{
    const char *bold = color ? "\033[1m" : "", *plain = color ? "\033[0m" : "";
    struct span where = diagnostic->where;
    if (where.file == SPAN_NO_FILE || where.file >= (uint32_t)sources->count) {
        buffer_format(out, "%sampstead:%s ", bold, plain);
        put_text(out, diagnostic->text);
        buffer_text(out, "\n");
        if (diagnostic->hint != NULL) {
            buffer_text(out, "  ");
            put_text(out, diagnostic->hint);
            buffer_text(out, "\n");
        }
        return;
    }
    const struct source_file *file = &sources->files[where.file];
    int line = 0, column = 0;
    source_position(file, where.begin, &line, &column);
    buffer_text(out, bold);
    put_text(out, file->name);
    buffer_format(out, ":%d:%d:%s ", line, column, plain);
    put_text(out, diagnostic->text);
    buffer_text(out, "\n");
    print_source(diagnostic, file, line, color, out);
}

/* By file, then by place, then in the order they were added (all point into one list). */
static int compare(const void *left, const void *right)
{
    const struct diagnostic *a = *(const struct diagnostic *const *)left;
    const struct diagnostic *b = *(const struct diagnostic *const *)right;
    if (a->where.file != b->where.file) {
        return a->where.file < b->where.file ? -1 : 1;
    }
    if (a->where.begin != b->where.begin) {
        return a->where.begin < b->where.begin ? -1 : 1;
    }
    return a < b ? -1 : a > b ? 1 : 0;
}

/* All diagnostics in order, each once. NULL when memory is short; the caller frees it. */
static const struct diagnostic **sorted(const struct diagnostics *diagnostics, size_t *count)
{
    size_t all = (size_t)diagnostics->count, kept = 0;
    const struct diagnostic **order = calloc(all, sizeof(const struct diagnostic *));
    if (order == NULL) {
        return NULL;
    }
    for (size_t i = 0; i < all; i++) {
        order[i] = &diagnostics->list[i];
    }
    qsort(order, all, sizeof *order, compare);
    for (size_t i = 0; i < all; i++) {
        if (i == 0 || !same(order[i], order[kept - 1])) {
            order[kept++] = order[i];
        }
    }
    *count = kept;
    return order;
}

void diagnostics_print(const struct diagnostics *diagnostics, const struct source_set *sources,
                       bool color, struct buffer *out)
{
    size_t count = 0;
    if (diagnostics->count == 0) {
        return;
    }
    const struct diagnostic **order = sorted(diagnostics, &count);
    if (order == NULL) {
        out->failed = true;
        return;
    }
    for (size_t i = 0; i < count && i < DIAGNOSTIC_LIMIT; i++) {
        print_one(order[i], sources, color, out);
    }
    if (count > DIAGNOSTIC_LIMIT) {
        int more = (int)(count - DIAGNOSTIC_LIMIT);
        buffer_format(out, "ampstead: %d more error%s not shown\n", more,
                      more == 1 ? " is" : "s are");
    }
    free(order);
}

void diagnostics_list(const struct diagnostics *diagnostics, const struct source_set *sources,
                      struct buffer *out)
{
    size_t count = 0;
    if (diagnostics->count == 0) {
        return;
    }
    const struct diagnostic **order = sorted(diagnostics, &count);
    if (order == NULL) {
        out->failed = true;
        return;
    }
    for (size_t i = 0; i < count; i++) {
        struct span where = order[i]->where;
        int line = 1, column = 1;
        bool has_file = where.file < (uint32_t)sources->count;
        const struct source_file *file = has_file ? &sources->files[where.file] : NULL;
        if (file == NULL && sources->count > 0) {
            file = &sources->files[0]; /* about the whole: its first line */
        } else if (file != NULL) {
            source_position(file, where.begin, &line, &column);
        }
        put_text(out, file != NULL ? file->name : "ampstead");
        buffer_format(out, ":%d:%d: error: ", line, column);
        put_text(out, order[i]->text);
        if (order[i]->hint != NULL) {
            buffer_text(out, "; ");
            put_text(out, order[i]->hint);
        }
        buffer_text(out, "\n");
    }
    free(order);
}
