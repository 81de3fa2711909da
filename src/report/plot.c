/* plot.c: the pictures of a result as one document. */
#include "report/figures.h"

void report_plot(const struct result *result, struct buffer *out)
{
    struct layout layout;
    const struct report_style style = {.columns = 0};
    if (!layout_begin(&layout, &style, out)) {
        return;
    }
    struct figure_list figures = figures_of(&layout, result);
    if (figures.count > 0) {
        figures_document(figures.list, figures.count, out);
    }
    layout_end(&layout);
}
