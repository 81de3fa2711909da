/* web.h: the parts of the review as one HTML file. Private to report/. */
#ifndef REPORT_WEB_H
#define REPORT_WEB_H

#include "report/figures.h"

/* The style sheet and the script of the page, made from web/ by the build. */
extern const char web_style[];
extern const char web_script[];

/* One table of the page; its columns sort. Cells are added row by row. */
struct web_table {
    struct buffer *out;
    int column, row_count;
};

/* heads  [count] "" : the column does not sort; numbers  [count] aligned right */
void web_table_begin(struct web_table *table, struct buffer *out, const char *caption,
                     const char *const *heads, const bool *numbers, int count);
void web_table_row(struct web_table *table);
/* A cell of text. */
void web_table_text(struct web_table *table, const char *text);
/* The first cell of a row, its name; line of the cell file it links to, 0: none. */
void web_table_name(struct web_table *table, const char *text, int line);
/* A number: `value` to sort by (not finite: the cell is empty for sorting), `shown` to read. */
void web_table_value(struct web_table *table, double value, const char *shown);
/* A bar from the middle, -1 to 1 of its half width. */
void web_table_bar(struct web_table *table, double share);
/* A bar from the left, 0 to 1 of its width. */
void web_table_length(struct web_table *table, double share);
void web_table_end(struct web_table *table);

/* The parts, in the order they stand; each writes nothing when it has nothing to show. */
void web_verdict(struct layout *layout, const struct result *result);
void web_requirements(struct layout *layout, const struct result *result);
void web_outputs(struct layout *layout, const struct result *result);
void web_paper(struct layout *layout, const struct result *result);
/* The resting states with the loop curve; `states` only. */
void web_states(struct layout *layout, const struct result *result);
/* Conditions and mismatch; `spread` only. */
void web_spread(struct layout *layout, const struct result *result);
void web_devices(struct layout *layout, const struct result *result);
void web_cautions(struct layout *layout, const struct result *result);
void web_cell(struct layout *layout, const struct result *result);
void web_evidence(struct layout *layout, const struct result *result);

/* A picture with its crosshair, and all of a list. */
void web_figure(struct layout *layout, const struct figure *figure);
void web_figures(struct layout *layout, const struct figure_list *figures);

/* One paragraph; classes "" for none. */
void web_paragraph(struct layout *layout, const char *classes, const char *text);
/* A value as show.h makes it, with proper signs in its unit. */
const char *web_units(struct layout *layout, const char *shown);
/* Line of the cell file itself, 0 when the span lies elsewhere. */
int web_line(const struct result *result, struct span where);

/* A heading that can be jumped to. */
void web_heading(struct layout *layout, const char *id, const char *text);
/* The text with markup escaped. */
void web_text(struct layout *layout, const char *text);

#endif
