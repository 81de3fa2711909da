/* figures_parts.h: what the makers of pictures share. Private to report/figures*.c. */
#ifndef REPORT_FIGURES_PARTS_H
#define REPORT_FIGURES_PARTS_H

#include "report/figures.h"

enum { FIGURES_NOTES = 8 };

/* Curves share a picture while their sizes differ by less than this factor. */
#define FIGURES_SPAN 30.0

/* A new picture at the end of the list; NULL when memory is short. */
struct figure *figures_add(struct layout *layout, struct figure_list *figures);

/* Room for `series` curves with an edge and a mark each, and notes. False: memory is short. */
bool figures_room(struct layout *layout, struct figure *figure, int series);

/* Room for so many ranked bars, and notes; and one of them. False: memory is short. */
bool figures_rows(struct layout *layout, struct figure *figure, int rows);
void figures_row(struct figure *figure, const char *name, double value, const char *text,
                 const char *detail);

/* One line below the title, as long as there is room. */
void figures_note(struct figure *figure, const char *note);

/* Values in words, with proper signs in their units; _round without trailing zeros. */
const char *figures_value(struct layout *layout, double value, struct dimension dimension);
const char *figures_round(struct layout *layout, double value, struct dimension dimension);

/* A compound unit takes no prefix, and temperatures are shown in degrees Celsius. */
struct figure_axis figures_axis(struct layout *layout, const char *name,
                                struct dimension dimension);
struct figure_axis figures_knob_axis(struct layout *layout, const struct knob *knob);

/* Shown in %: flatness, sigma and the like of an output. */
bool figures_is_share(const struct probe *probe);

/* Zero stays on the axis unless the curves are far from it and vary little. */
bool figures_wants_zero(const struct figure *figure);

#endif
