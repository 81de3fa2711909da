/* repairs.c: on the review page, what would meet the requirements that are not met. */
#include <math.h>

#include "analyses/repair.h"
#include "report/page_parts.h"
#include "report/show.h"

static const char *repair_text(struct layout *layout, const struct repair *it)
{
    const char *breaks = "";
    if (it->breaks != NULL) {
        breaks = layout_format(layout, ", which breaks `%s`", layout_clean(layout, it->breaks));
    }
    return layout_format(layout, "%s %s %s %s (%s)%s", layout_clean(layout, it->parameter),
                         show_round(layout, it->from, it->dimension),
                         layout->style.ascii ? "->" : "\xE2\x86\x92",
                         show_round(layout, it->to, it->dimension),
                         show_share(layout, it->change, "", true), breaks);
}

void page_repairs(struct layout *layout, const struct result *result)
{
    for (int k = 0; result->repairs != NULL && k < result->requirement_count; k++) {
        const struct repair_list *list = &result->repairs[k];
        if (!list->looked_for) {
            continue;
        }
        layout_gap(layout);
        layout_paragraph(
            layout, TONE_STRONG, 2,
            layout_format(layout,
                          "%s for %s:", list->count > 0 ? "one change" : "no single change found",
                          requirement_text(layout, result->requirements[k].requirement)));
        for (int r = 0; r < list->count; r++) {
            layout_paragraph(layout, list->list[r].breaks == NULL ? TONE_PLAIN : TONE_WARN, 6,
                             layout_format(layout, "  %s", repair_text(layout, &list->list[r])));
        }
    }
}
