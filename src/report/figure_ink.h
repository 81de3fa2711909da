/* figure_ink.h: what the parts of one drawing share. Private to report/figure*.c. */
#ifndef REPORT_FIGURE_INK_H
#define REPORT_FIGURE_INK_H

#include "report/figure.h"
#include "report/scale.h"

/* Places in px. */
enum { FIGURE_LEFT = 78, FIGURE_RIGHT = 24, FIGURE_HEAD = 30, FIGURE_NOTE_LINE = 17 };

/* The widths that text takes are estimated: glyphs of the common sans-serif faces average this. */
#define INK_GLYPH 6.4

struct drawing {
    const struct figure *figure;
    struct buffer *out;
    struct scale x, y;
    double top, bottom; /* of the panel being drawn */
    double right;
};

/* A piece of markup and the number behind it (INK_NONE: none); a list ends with a NULL text. */
struct ink_piece {
    const char *text;
    double number;
};
#define INK_NONE ((double)NAN)

void ink(struct drawing *drawing, const char *text);
void ink_pieces(struct drawing *drawing, const struct ink_piece *pieces);
void ink_line(struct drawing *drawing, const char *classes, double x1, double y1, double x2,
              double y2);
void ink_rect(struct drawing *drawing, const char *classes, double x, double y, double width,
              double height);

/* anchor: "start", "middle" or "end"; the caller ends the element */
void ink_begin_text(struct drawing *drawing, const char *classes, const char *anchor, double x,
                    double y);
void ink_words(struct drawing *drawing, const char *classes, const char *anchor, double x, double y,
               const char *text);

/* Px that a text takes, by its characters. */
double ink_width(const char *text);

/* Below the notes of a figure. */
double figure_panel_top(const struct figure *figure);

/* figure_rows.c: ranked bars, instead of a panel with axes. */
int figure_rows_height(const struct figure *figure);
void figure_rows_draw(struct drawing *drawing);

#endif
