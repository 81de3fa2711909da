/* repairs.c: on the review page, what would meet the requirements that are not met. */
#include <math.h>
#include <string.h>

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

/* Why nothing was tried for a requirement that is not met; NULL: something was, or it is met. */
static const char *why_not(const struct result *result, int k)
{
    const struct requirement_result *row = &result->requirements[k];
    if (result->repairs != NULL) {
        return result->repairs[k].why_not;
    }
    const bool failed = row->judgement == JUDGED_NOT_MET || row->judgement == JUDGED_UNKNOWN;
    if (strcmp(result->command, "spread") != 0 || !failed) {
        return NULL;
    }
    return row->requirement->scope == SCOPE_YIELD
               ? "a yield takes all samples anew for each value tried; the shares of the "
                 "variance above say which device to enlarge"
               : "`ampstead review` does";
}

void page_repairs(struct layout *layout, const struct result *result)
{
    for (int k = 0; k < result->requirement_count; k++) {
        const char *reason = why_not(result, k);
        if (reason != NULL) {
            layout_gap(layout);
            layout_paragraph(
                layout, TONE_QUIET, 2,
                layout_format(layout, "no single change looked for %s: %s",
                              requirement_text(layout, result->requirements[k].requirement),
                              reason));
        }
    }
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
