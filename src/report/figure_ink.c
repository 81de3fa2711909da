/* figure_ink.c: lines, boxes and words as SVG elements. */
#include "report/figure_ink.h"

#include <math.h>

#include "report/markup.h"

void ink(struct drawing *drawing, const char *text)
{
    buffer_text(drawing->out, text);
}

void ink_pieces(struct drawing *drawing, const struct ink_piece *pieces)
{
    for (; pieces->text != NULL; pieces++) {
        ink(drawing, pieces->text);
        if (!isnan(pieces->number)) {
            markup_fixed(drawing->out, pieces->number, 2);
        }
    }
}

void ink_line(struct drawing *drawing, const char *classes, double x1, double y1, double x2,
              double y2)
{
    const struct ink_piece pieces[] = {{"<line class=\"", INK_NONE},
                                       {classes, INK_NONE},
                                       {"\" x1=\"", x1},
                                       {"\" y1=\"", y1},
                                       {"\" x2=\"", x2},
                                       {"\" y2=\"", y2},
                                       {"\"/>\n", INK_NONE},
                                       {NULL, 0.0}};
    ink_pieces(drawing, pieces);
}

void ink_rect(struct drawing *drawing, const char *classes, double x, double y, double width,
              double height)
{
    const struct ink_piece pieces[] = {{"<rect class=\"", INK_NONE},
                                       {classes, INK_NONE},
                                       {"\" x=\"", x},
                                       {"\" y=\"", y},
                                       {"\" width=\"", width},
                                       {"\" height=\"", height},
                                       {"\"/>\n", INK_NONE},
                                       {NULL, 0.0}};
    ink_pieces(drawing, pieces);
}

void ink_begin_text(struct drawing *drawing, const char *classes, const char *anchor, double x,
                    double y)
{
    const struct ink_piece pieces[] = {{"<text class=\"", INK_NONE},
                                       {classes, INK_NONE},
                                       {"\" text-anchor=\"", INK_NONE},
                                       {anchor, INK_NONE},
                                       {"\" x=\"", x},
                                       {"\" y=\"", y},
                                       {"\">", INK_NONE},
                                       {NULL, 0.0}};
    ink_pieces(drawing, pieces);
}

void ink_words(struct drawing *drawing, const char *classes, const char *anchor, double x, double y,
               const char *text)
{
    ink_begin_text(drawing, classes, anchor, x, y);
    markup_text(drawing->out, text);
    ink(drawing, "</text>\n");
}

double ink_width(const char *text)
{
    int count = 0;
    for (const char *at = text; *at != '\0'; at++) {
        count += ((unsigned char)*at & 0xC0) != 0x80;
    }
    return INK_GLYPH * count;
}
