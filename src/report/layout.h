/*
 * layout.h: the page as lines with a margin on the left that names the part, plus the words and
 * widths that all text reports share.
 *
 *     outputs      tail sinks 816.4 nA at 1.200 V
 *                  resistance   82.41 Mohm
 *
 * A part that writes no line leaves no trace.
 */
#ifndef REPORT_LAYOUT_H
#define REPORT_LAYOUT_H

#include "base/arena.h"
#include "report/report.h"

enum { LAYOUT_MARGIN = 13 };

enum tone { TONE_PLAIN, TONE_STRONG, TONE_QUIET, TONE_GOOD, TONE_BAD, TONE_WARN };

struct layout {
    struct buffer *out;
    struct arena *arena; /* of the texts of one report */
    struct report_style style;
    const char *label; /* waits for the first line of its part */
    bool has_lines;    /* something was written: a new part begins with a blank line */
    int width;         /* characters right of the margin */
};

/* False when memory is short; out->failed is set then. */
bool layout_begin(struct layout *layout, const struct report_style *style, struct buffer *out);
/* Frees the texts and hands a failed allocation on to the buffer. */
void layout_end(struct layout *layout);

/* Begins a part; its label stands beside its first line. */
void layout_part(struct layout *layout, const char *label);

/* One line as it is; text may hold escapes made by layout_tone. */
void layout_line(struct layout *layout, enum tone tone, const char *text);

/* A blank line inside a part, only after a line. */
void layout_gap(struct layout *layout);

/* A text broken at spaces; lines after the first are indented by `hang`. */
void layout_paragraph(struct layout *layout, enum tone tone, int hang, const char *text);

/* Printed text in the report's arena; "" when memory is short (layout_end tells). */
const char *layout_format(struct layout *layout, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

/* A text of the user for the terminal: control characters become spaces, and with an ASCII style
 * every other character a '?'. */
const char *layout_clean(struct layout *layout, const char *text);

/* The same, at most `limit` characters; the middle of a longer one is left out. */
const char *layout_short(struct layout *layout, const char *text, int limit);

/* Escape that begins a tone, "" without colour; layout_tone(layout, TONE_PLAIN) ends it. */
const char *layout_tone(const struct layout *layout, enum tone tone);

/* Characters of UTF-8 text, not bytes. */
int text_width(const char *text);

/* Bytes of the first line of text when broken at spaces to `width` characters (at least one
 * character); `next` out: where the rest begins. */
size_t text_break(const char *text, int width, const char **next);

#endif
